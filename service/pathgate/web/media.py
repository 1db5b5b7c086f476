"""Is the body of a request declared as JSON, and does the caller take JSON back?"""

from __future__ import annotations

from werkzeug.datastructures import MIMEAccept
from werkzeug.http import parse_accept_header, parse_options_header

from pathgate.web.problems import Failed, Problem

JSON = "application/json"
LINES = "application/x-ndjson"


def check_content(content_type: str | None, encoding: str | None) -> None:
    """Go on where the body is said to be plain JSON in UTF-8.

    Raises:
        Failed: it is said to be something else, or nothing is said.
    """
    if encoding is not None and encoding.strip().lower() not in ("", "identity"):
        raise _unsupported(f"the body is sent with Content-Encoding {encoding}; send it as it is")
    if content_type == JSON:
        return
    if not content_type:
        raise _unsupported(f"the request has no Content-Type; send {JSON}")
    media_type, parameters = parse_options_header(content_type)
    if media_type.lower() != JSON:
        raise _unsupported(f"the body is declared as {media_type or content_type}; send {JSON}")
    charset = parameters.get("charset", "utf-8")
    if charset.lower() not in ("utf-8", "utf8"):
        raise _unsupported(f"the body is declared as {charset}; JSON is sent in UTF-8")


def check_accept(accept: str | None, offered: str = JSON) -> None:
    """Go on where an ``Accept`` header admits what is offered; no header admits everything.

    Raises:
        Failed: it does not.
    """
    if accept is None or accept in ("*/*", offered) or not accept.strip():
        return
    if parse_accept_header(accept, MIMEAccept).quality(offered) <= 0:
        detail = f"the answer is {offered}, which the Accept header of the request rules out"
        raise Failed(Problem.of("not-acceptable", detail))


def prefers_lines(accept: str | None) -> bool:
    """Would the caller rather have the answer line by line than as one document?"""
    if accept is None or LINES not in accept:
        return False
    wanted = parse_accept_header(accept, MIMEAccept)
    return wanted.quality(LINES) > 0 and wanted.best_match([JSON, LINES], JSON) == LINES


def _unsupported(detail: str) -> Failed:
    return Failed(Problem.of("unsupported-media-type", detail))
