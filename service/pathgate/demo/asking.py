"""How is a running service asked for a review, and what counts as no answer?

One POST for each config, with the standard library alone. Anything but a review in a 200 is a ``NoAnswer``
whose text is one line that says what happened.
"""

from __future__ import annotations

import json
from http.client import HTTPException
from typing import Any
from urllib.error import HTTPError, URLError
from urllib.request import ProxyHandler, Request, build_opener

from pathgate.review.visible import visible

Json = dict[str, Any]

PATIENCE_SECONDS = 30


class NoAnswer(Exception):
    """The service did not review the config; the text says why, on one line."""


def ask_review(url: str, graph: Json, config: Json) -> Json:
    """The answer of ``/v1/review`` of the service at ``url``.

    Raises:
        NoAnswer: the service cannot be reached, or answered with anything but a review.
    """
    if not url.startswith(("http://", "https://")):
        raise NoAnswer(f"{url!r} is no address of a service: it has to start with http:// or https://")
    body = json.dumps({"graph": graph, "config": config}).encode()
    answer = _parsed(_post(f"{url}/v1/review", body), url)
    if not isinstance(answer, dict) or not isinstance(answer.get("verdict"), str):
        raise NoAnswer(f"what answers at {url} is not this service: it sent no review")
    return answer


def _post(address: str, body: bytes) -> bytes:
    # The caller names a service of its own, often on this very machine: no proxy stands in between.
    opener = build_opener(ProxyHandler({}))
    try:
        request = Request(address, body, {"Content-Type": "application/json"})  # noqa: S310 - http or https
        with opener.open(request, timeout=PATIENCE_SECONDS) as response:
            content: bytes = response.read()
            status: int = response.status
    except HTTPError as error:
        raise NoAnswer(f"{address} answered {error.code}: {_reason(error)}") from None
    except (URLError, OSError, HTTPException, ValueError) as error:
        reason = getattr(error, "reason", error)
        said = getattr(reason, "strerror", None) or str(reason) or type(reason).__name__
        raise NoAnswer(f"{address} cannot be reached: {visible(str(said))}") from None
    if status != 200:
        raise NoAnswer(f"{address} answered {status} where 200 was due")
    return content


def _reason(error: HTTPError) -> str:
    """What a problem document says, or else the status line."""
    try:
        document = json.loads(error.read())
    except (ValueError, OSError, HTTPException):
        document = None
    detail = document.get("detail") if isinstance(document, dict) else None
    return visible(detail if isinstance(detail, str) else str(error.reason))


def _parsed(content: bytes, url: str) -> Any:
    try:
        return json.loads(content)
    except ValueError:
        raise NoAnswer(f"what answers at {url} is not this service: it sent no JSON") from None
