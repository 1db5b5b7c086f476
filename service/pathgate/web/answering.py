"""One request to an operation, from its bytes to the bytes of its answer."""

from __future__ import annotations

from collections.abc import Callable

from flask import Response, request
from gunicorn.http.errors import ParseException  # type: ignore[import-untyped]
from werkzeug.exceptions import ClientDisconnected

from pathgate.criteria.deadline import Deadline
from pathgate.web.body import read_json
from pathgate.web.media import check_accept, check_content, prefers_lines
from pathgate.web.operations import Operation, envelope_shape, open_call
from pathgate.web.problems import Failed, Problem
from pathgate.web.replies import json_reply, lines_reply
from pathgate.web.settings import Settings


def view_of(operation: Operation, settings: Settings) -> Callable[[], Response]:
    """The view that answers ``operation``; whatever is wrong with a request leaves it as an exception."""
    shape = envelope_shape(operation)

    def view() -> Response:
        said = request.environ
        check_content(said.get("CONTENT_TYPE"), said.get("HTTP_CONTENT_ENCODING"))
        accept = said.get("HTTP_ACCEPT")
        in_lines = operation.lines if prefers_lines(accept) else None
        if in_lines is None:
            check_accept(accept)
        body = _read_body(settings.max_body_bytes)
        # Time spent waiting for the body is the caller's; only what follows is computing.
        deadline = Deadline(settings.time_budget_seconds)
        value = read_json(body, settings.max_depth)
        call = open_call(operation, shape, value, settings, deadline)
        if in_lines is not None:
            return lines_reply(in_lines(call))
        answer = operation.answer(call)
        call.refuse_faults()
        return json_reply(answer)

    return view


def _read_body(limit: int) -> bytes:
    """The bytes of the body, at most ``limit``."""
    if (request.content_length or 0) > limit:
        raise _too_large(limit)
    # Where no length is declared, the stream ends without a word at its limit: one byte more tells it apart.
    request.max_content_length = limit + 1
    try:
        body = request.get_data(cache=False)
    except ClientDisconnected as error:
        raise _cut_short(timed_out=isinstance(error.__context__, TimeoutError | BlockingIOError)) from None
    except ParseException:
        raise _unreadable("the chunks that the body is sent in do not follow HTTP") from None
    if len(body) > limit:
        raise _too_large(limit)
    if len(body) < (request.content_length or 0):
        raise _cut_short(timed_out=False)
    return body


def _too_large(limit: int) -> Failed:
    return Failed(Problem.of("body-too-large", f"the body is larger than {limit:,} bytes"))


def _cut_short(*, timed_out: bool) -> Failed:
    if timed_out:
        return Failed(Problem.of("request-timeout", "the body of the request did not arrive in time"))
    return _unreadable("the request ended before its body was complete")


def _unreadable(detail: str) -> Failed:
    return Failed(Problem.of("not-json", detail, line=1, column=1))
