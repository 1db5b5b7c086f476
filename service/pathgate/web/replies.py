"""How answers and failures leave: bytes, media types, the headers that every reply carries."""

from __future__ import annotations

import logging
import re
from collections.abc import Iterator
from typing import Any
from uuid import uuid4

import msgspec
from flask import Flask, Response, g, request
from werkzeug.exceptions import HTTPException

from pathgate.graphs.errors import PathgateError
from pathgate.graphs.names import did_you_mean, quoted
from pathgate.web.json_faults import NotJson
from pathgate.web.media import JSON, LINES
from pathgate.web.problems import PROBLEM_TYPES, Failed, Problem, Refused, problem_of, refusal
from pathgate.web.settings import Settings

PROBLEM_JSON = "application/problem+json"
REQUEST_ID = "X-Request-Id"

_LOG = logging.getLogger(__name__)
_UUID = re.compile(r"[0-9a-f]{8}(?:-[0-9a-f]{4}){3}-[0-9a-f]{12}", re.IGNORECASE)


def json_reply(document: Any, status: int = 200, media_type: str = JSON) -> Response:
    """A reply that holds a JSON document, its members in the order given."""
    return Response(msgspec.json.encode(document), status, content_type=media_type)


def lines_reply(documents: Iterator[Any]) -> Response:
    """A reply that holds one JSON document a line, each sent as soon as it is there."""
    return Response((msgspec.json.encode(each) + b"\n" for each in documents), content_type=LINES)


def request_id() -> str:
    """The id of the request being answered: the caller's, where it is a UUID, else a new one."""
    known: str | None = g.get("request_id")
    if known is None:
        given = request.environ.get("HTTP_X_REQUEST_ID")
        known = given.lower() if given and _UUID.fullmatch(given) else str(uuid4())
        g.request_id = known
    return known


def add_headers(reply: Response) -> Response:
    """What every reply carries. Answers are not to be stored: the question was in the body, not in the URL."""
    headers = reply.headers
    headers.add(REQUEST_ID, request_id())
    headers.add("X-Content-Type-Options", "nosniff")
    headers.add("Cache-Control", "no-store")
    return reply


def install_error_handlers(app: Flask, settings: Settings) -> None:
    """Make every failure of ``app``, expected or not, a problem document."""

    def reply_to(problem: Problem) -> Response:
        members = problem.members(request_id(), settings.max_errors)
        reply = json_reply(members, problem.type.status, PROBLEM_JSON)
        reply.headers.extend(dict(problem.headers))
        return reply

    def on_error(error: Exception) -> Response:
        problem = _problem_of(error, app)
        if problem is None:
            # The trace belongs in the log and nowhere else; the id ties it to the reply.
            _LOG.error("request %s failed", request_id(), exc_info=error)
            problem = Problem.of("internal-error", "an unexpected error; it is in the service's log")
        return reply_to(problem)

    app.register_error_handler(Exception, on_error)


def _problem_of(error: Exception, app: Flask) -> Problem | None:
    """The problem that an exception stands for, or None where nobody expected it."""
    match error:
        case Failed():
            return error.problem
        case Refused():
            return refusal(error.faults)
        case NotJson():
            return Problem.of("not-json", str(error), line=error.line, column=error.column)
        case PathgateError():
            return problem_of(error)
        case HTTPException():
            return _problem_of_http(error, app)
    return None


def _problem_of_http(error: HTTPException, app: Flask) -> Problem | None:
    match error.code:
        case 404:
            paths = sorted({rule.rule for rule in app.url_map.iter_rules() if not rule.arguments})
            hint = did_you_mean(request.path, paths)
            return Problem.of("not-found", f"nothing is served at {quoted(request.path)}{hint}")
        case 405:
            allowed = ", ".join(sorted(getattr(error, "valid_methods", None) or ()))
            detail = f"{quoted(request.path)} does not take {quoted(request.method)} but {allowed}"
            return Problem(PROBLEM_TYPES["method-not-allowed"], detail, headers={"Allow": allowed})
    same_status = (each for each in PROBLEM_TYPES.values() if each.status == error.code)
    known = next(same_status, None)
    return Problem(known, known.title) if known else None
