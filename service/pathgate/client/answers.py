"""Is what came back an answer of the service? Media types, JSON, and the members that callers rely on.

A member that is missing, of the wrong type or against the others (a sound verdict beside an error) means that
somebody else is answering, or the service does so wrongly: no answer then. Members that are not known are let be,
since within /v1 the service may add some.
"""

from __future__ import annotations

import json
from collections.abc import Iterable, Iterator, Mapping
from typing import Any

from pathgate.client.errors import OUT_OF_REACH, ClientError, NotAnAnswer, Refused, Unreachable, plain
from pathgate.client.waiting import read_retry_after
from pathgate.client.wire import Answer

Json = dict[str, Any]

JSON = "application/json"
LINES = "application/x-ndjson"
PROBLEM = "application/problem+json"
VERDICTS = ("sound", "biased", "unanswerable")
SEVERITIES = ("error", "warning", "note")
# Far more than the service ever says of one config.
MOST_BYTES = 64_000_000

_PROBLEM_MEMBERS = {"type": str, "title": str, "detail": str, "retryable": bool}
_REVIEW_MEMBERS = {
    "name": str,
    "verdict": str,
    "summary": str,
    "findings": list,
    "columns": list,
    "coefficients": list,
    "remedies": list,
    "provenance": dict,
    "cautions": list,
}
_FINDING_MEMBERS = {"rule": str, "severity": str, "columns": list, "message": str, "pointer": str}


def check_media(answer: Answer, wanted: str) -> None:
    """Go on where an answer is declared as wanted, in UTF-8 and as it is.

    Raises:
        NotAnAnswer: it is not.
    """
    said = answer.header("Content-Type") or ""
    media_type, _, parameters = said.partition(";")
    charset = parameters.replace(" ", "").replace('"', "").lower()
    if media_type.strip().lower() != wanted or charset not in ("", "charset=utf-8"):
        raise NotAnAnswer(
            f"the answer (status {answer.status}) is declared as {plain(said) or 'nothing'}, not {wanted}"
        )
    if (answer.header("Content-Encoding") or "identity").lower() != "identity":
        raise NotAnAnswer("the answer is compressed, which was not asked for")


def document_of(answer: Answer) -> Any:
    """The one JSON document that an answer holds."""
    content = bytearray()
    for piece in answer.pieces():
        content += piece
        _check_size(len(content))
    return parsed(bytes(content))


def lines_of(answer: Answer) -> Iterator[Any]:
    """The JSON documents that an answer holds, one a line, each as soon as it is there."""
    rest = bytearray()
    for piece in answer.pieces():
        rest += piece
        if b"\n" in piece:
            *whole, last = rest.split(b"\n")
            yield from (parsed(bytes(line)) for line in whole)
            rest = bytearray(last)
        _check_size(len(rest))
    if rest:
        raise NotAnAnswer("the answer was cut short: its last line has no end")


def parsed(content: bytes) -> Any:
    """The value that JSON text holds.

    Raises:
        NotAnAnswer: it is none, or one that readers take differently.
    """
    try:
        return json.loads(content.decode(), object_pairs_hook=_object, parse_constant=_no_constant)
    except (ValueError, RecursionError) as error:
        raise NotAnAnswer(f"the answer is no JSON: {plain(str(error))}") from None


def check_success(answer: Answer, wanted: str, now: float) -> None:
    """Go on where an answer has status 200 and is declared as wanted; ``now`` is seconds since 1970.

    Raises:
        Refused: the service says why it does not answer.
        Unreachable: something in between could not reach the service.
        NotAnAnswer: anything else.
    """
    if answer.status == 200:
        check_media(answer, wanted)
        return
    try:
        problem = _problem_in(answer)
    except NotAnAnswer as error:
        raise _without_problem(answer, error) from None
    raise Refused(answer.status, problem, read_retry_after(answer.header("Retry-After"), now))


def _problem_in(answer: Answer) -> Json:
    check_media(answer, PROBLEM)
    problem = _problem(document_of(answer))
    if problem["status"] != answer.status:
        raise NotAnAnswer(f"a problem of status {problem['status']} came with status {answer.status}")
    return problem


def _without_problem(answer: Answer, error: NotAnAnswer) -> ClientError:
    """A failure that the service itself does not explain, as it explains all of its own."""
    status = answer.status
    if status in OUT_OF_REACH:
        return Unreachable(f"the service is out of reach: status {status} without a problem document")
    if 300 <= status < 400:
        where = plain(answer.header("Location") or "nowhere")
        return NotAnAnswer(f"the service answers with a redirect (to {where}), and none is followed")
    return error


def review_of(value: Any, name: str | None) -> Json:
    """A review, of the config of that name where it has one.

    Raises:
        NotAnAnswer: the value is none.
    """
    review = _members(value, _REVIEW_MEMBERS, "the review")
    if name is not None and review["name"] != name:
        raise NotAnAnswer(f"the review is of {plain(review['name'])!r}, not of {plain(name)!r}")
    if review["verdict"] not in VERDICTS:
        raise NotAnAnswer(f"{plain(review['verdict'])!r} is no verdict")
    for finding in review["findings"]:
        _check_finding(finding)
    for remedy in review["remedies"]:
        _members(remedy, {"message": str}, "a remedy")
    if not all(isinstance(caution, str) for caution in review["cautions"]):
        raise NotAnAnswer("a caution of the review is no text")
    if (review["verdict"] == "sound") == bool(errors_of(review)):
        raise NotAnAnswer(f"the verdict {review['verdict']} does not go with the findings of the review")
    return review


def line_of(value: Any, place: tuple[int, int], name: str | None) -> Json:
    """One line of /v1/reviews: the ``place[0]``-th of ``place[1]``, of the config of that name.

    Raises:
        NotAnAnswer: the value is no such line.
    """
    line = _members(value, {"index": int, "count": int, "name": str}, "a line")
    index, count = place
    if (line["index"], line["count"]) != (index, count):
        said = f"{line['index']} of {line['count']}"
        raise NotAnAnswer(f"line {index} of {count} was due, and {said} came")
    if name is not None and line["name"] != name:
        raise NotAnAnswer(f"the line is of {plain(line['name'])!r}, not of {plain(name)!r}")
    if ("review" in line) == ("problem" in line):
        raise NotAnAnswer("a line has neither or both of review and problem")
    if "review" in line:
        review_of(line["review"], name)
    else:
        _problem(line["problem"])
    return line


def errors_of(review: Mapping[str, Any]) -> list[Json]:
    """The findings of a review that are errors."""
    return [finding for finding in review["findings"] if finding["severity"] == "error"]


def passes(review: Mapping[str, Any]) -> bool:
    """Is the verdict sound, or every error accepted by a waiver?"""
    return all(isinstance(finding.get("accepted"), dict) for finding in errors_of(review))


def _check_finding(value: Any) -> None:
    finding = _members(value, _FINDING_MEMBERS, "a finding")
    if finding["severity"] not in SEVERITIES:
        raise NotAnAnswer(f"{plain(finding['severity'])!r} is no severity")
    if not all(isinstance(column, str) for column in finding["columns"]):
        raise NotAnAnswer("a finding blames columns that have no names")
    accepted = finding.get("accepted")
    if accepted is not None:
        _members(accepted, {"why": str, "owner": str}, "a waiver")


def _problem(value: Any) -> Json:
    problem = _members(value, {**_PROBLEM_MEMBERS, "status": int}, "the problem")
    for error in _list_in(problem, "errors"):
        _members(error, {"pointer": str, "detail": str}, "an error of the problem")
    return problem


def _list_in(value: Json, member: str) -> Iterable[Any]:
    held = value.get(member, [])
    if not isinstance(held, list):
        raise NotAnAnswer(f"{member} is no list")
    return held


def _members(value: Any, wanted: Mapping[str, type], what: str) -> Json:
    if not isinstance(value, dict):
        raise NotAnAnswer(f"{what} is no object")
    for member, kind in wanted.items():
        # True and False are integers to Python, and no counts.
        if type(value.get(member)) is not kind:
            raise NotAnAnswer(f"{what} has no {member}, or not one of the right type")
    return value


def _object(pairs: list[tuple[str, Any]]) -> Json:
    value = dict(pairs)
    if len(value) < len(pairs):
        raise ValueError("a member stands twice in an object")
    return value


def _no_constant(said: str) -> Any:
    raise ValueError(f"{said} is no number")


def _check_size(size: int) -> None:
    if size > MOST_BYTES:
        raise NotAnAnswer(f"the answer is larger than {MOST_BYTES:,} bytes")
