"""What HTTP asks of any operation: media types, sizes, methods, ids, and a problem for every failure."""

from __future__ import annotations

import json
import logging
from io import BytesIO
from typing import Any
from uuid import UUID

import pytest
from gunicorn.http.errors import InvalidChunkSize

from tests.http.conftest import TINY_GRAPH, TRIAL, Service, service_with

PATH = "/v1/trial-count"
GOOD = {"graph": TINY_GRAPH, "names": ["weather"]}


def problem(reply: Any, slug: str, status: int) -> dict[str, Any]:
    """The problem that a reply holds, which must be this one."""
    document = json.loads(reply.data)
    assert reply.status_code == document["status"] == status, document
    assert document["type"] == f"/problems/{slug}"
    assert document["instance"] == f"urn:uuid:{reply.headers['X-Request-Id']}"
    return document


def test_an_answer_keeps_the_order_of_its_members(trial):
    reply = trial.post(PATH, GOOD)
    assert reply.data == b'{"zeta":1,"alpha":2}'
    assert reply.headers["Content-Type"] == "application/json"
    assert reply.headers["Cache-Control"] == "no-store"


@pytest.mark.parametrize(
    "content_type",
    [
        "application/json; charset=utf-8",
        "application/json;charset=UTF-8",
        'Application/JSON; charset="utf-8"',
    ],
)
def test_json_in_utf8_is_taken_however_it_is_written(trial, content_type):
    assert trial.post(PATH, GOOD, content_type=content_type).status_code == 200


@pytest.mark.parametrize(
    ("content_type", "said"),
    [
        (None, "no Content-Type"),
        ("", "no Content-Type"),
        ("text/plain", "text/plain"),
        ("application/json-seq", "json-seq"),
        ("application/x-www-form-urlencoded", "urlencoded"),
        ("application/json; charset=latin-1", "latin-1"),
        ("nonsense", "nonsense"),
    ],
)
def test_anything_else_is_an_unsupported_media_type(trial, content_type, said):
    reply = trial.post(PATH, GOOD, content_type=content_type)
    assert said in problem(reply, "unsupported-media-type", 415)["detail"]


def test_a_compressed_body_is_refused_and_not_misread(trial):
    reply = trial.post(PATH, b"\x1f\x8b", headers={"Content-Encoding": "gzip"})
    assert "gzip" in problem(reply, "unsupported-media-type", 415)["detail"]


@pytest.mark.parametrize(
    "accept",
    [
        "*/*",
        "application/*",
        "application/json",
        "text/html, application/json;q=0.1",
        "text/html, */*;q=0.01",
        "",
    ],
)
def test_json_is_sent_where_it_is_accepted(trial, accept):
    assert trial.post(PATH, GOOD, headers={"Accept": accept}).status_code == 200


@pytest.mark.parametrize(
    "accept", ["text/html", "application/problem+json", "application/json;q=0", "image/*"]
)
def test_where_it_is_not_the_request_is_not_acceptable(trial, accept):
    problem(trial.post(PATH, GOOD, headers={"Accept": accept}), "not-acceptable", 406)


def test_a_problem_is_problem_json_whatever_accept_says(trial):
    reply = trial.post(PATH, b"{", headers={"Accept": "application/json"})
    assert reply.headers["Content-Type"] == "application/problem+json"


def test_a_body_over_the_limit_is_refused_by_its_declared_length(trial):
    reply = trial.post(PATH, b" " * 4_001)
    assert "4,000" in problem(reply, "body-too-large", 413)["detail"]


def test_a_body_that_is_just_as_long_as_allowed_is_read(trial):
    body = json.dumps(GOOD).encode()
    assert trial.post(PATH, body + b" " * (4_000 - len(body))).status_code == 200


def chunked(service: Service, body: Any) -> Any:
    """A body without a declared length, as a server hands it over after decoding the chunks."""
    environ = {"wsgi.input": body, "wsgi.input_terminated": True, "CONTENT_LENGTH": ""}
    reply = service.unchecked.post(PATH, content_type="application/json", environ_overrides=environ)
    service.check("POST", PATH, reply)
    return reply


def test_a_chunked_body_is_read_and_limited_as_well(trial):
    assert chunked(trial, BytesIO(json.dumps(GOOD).encode())).status_code == 200
    problem(chunked(trial, BytesIO(b" " * 4_001)), "body-too-large", 413)


class Stalled(BytesIO):
    """A body that never comes, as the server finds out while it is read."""

    def __init__(self, error: type[OSError]) -> None:
        super().__init__()
        self.error = error

    def read(self, *_size: Any) -> bytes:
        raise self.error

    readinto = read


@pytest.mark.parametrize("error", [TimeoutError, BlockingIOError])
def test_a_body_that_does_not_arrive_is_a_request_timeout(trial, error):
    assert problem(chunked(trial, Stalled(error)), "request-timeout", 408)["retryable"] is True


def test_a_body_that_ends_early_is_not_json(trial):
    environ = {"wsgi.input": BytesIO(b'{"na'), "CONTENT_LENGTH": "400"}
    reply = trial.unchecked.post(PATH, content_type="application/json", environ_overrides=environ)
    trial.check("POST", PATH, reply)
    assert "ended before" in problem(reply, "not-json", 400)["detail"]


@pytest.mark.parametrize("method", ["GET", "HEAD", "PUT", "PATCH", "DELETE", "TRACE"])
def test_another_method_is_answered_with_those_that_are_allowed(trial, method):
    reply = trial.send(method, PATH)
    assert reply.status_code == 405
    assert set(reply.headers["Allow"].split(", ")) == {"OPTIONS", "POST"}
    if method != "HEAD":
        problem(reply, "method-not-allowed", 405)


def test_options_says_what_is_allowed_and_no_more(trial):
    reply = trial.send("OPTIONS", PATH)
    assert (reply.status_code, reply.data) == (204, b"")
    assert set(reply.headers["Allow"].split(", ")) == {"OPTIONS", "POST"}


@pytest.mark.parametrize(
    "path", ["/v1/trial-cuont", "/v1/trial-count/", "/V1/trial-count", "/docs/", "/%00", "/é"]
)
def test_an_unknown_path_is_not_found(trial, path):
    problem(trial.post(path, GOOD), "not-found", 404)


def test_an_unknown_path_is_answered_with_the_nearest(trial):
    assert '"/v1/trial-count"' in json.loads(trial.get("/v1/trial-cuont").data)["detail"]


def test_the_callers_request_id_is_kept_where_it_is_a_uuid(trial):
    given = "6BA7B810-9DAD-41D1-80B4-00C04FD430C8"
    reply = trial.post(PATH, b"", headers={"X-Request-Id": given})
    assert reply.headers["X-Request-Id"] == given.lower()
    problem(reply, "not-json", 400)


@pytest.mark.parametrize("given", ["", "42", "x" * 36, "6ba7b810-9dad-41d1-80b4-00c04fd430c8, 1"])
def test_any_other_request_id_is_replaced(trial, given):
    sent = [trial.post(PATH, GOOD, headers={"X-Request-Id": given}).headers["X-Request-Id"] for _ in range(2)]
    assert sent[0] != sent[1]
    assert all(UUID(each).version == 4 for each in sent)


def test_all_faults_of_envelope_graph_and_names_come_in_one_answer(trial):
    body = {
        "graph": {"nodes": ["weather"], "edges": [{"source": "weather", "target": "wether"}]},
        "names": [3, ""],
        "sorted_by": "name",
        "mta": 1,
    }
    document = problem(trial.post(PATH, body), "invalid-request", 422)
    assert [each["pointer"] for each in document["errors"]] == [
        "#/sorted_by",
        "#/mta",
        "#/names/0",
        "#/names/1",
        "#/graph/edges/0/target",
    ]
    assert "5 faults" in document["detail"]


@pytest.mark.parametrize(
    ("body", "slug", "pointers"),
    [
        ({"graph": TINY_GRAPH, "names": ["rain"]}, "unknown-node", ["#/names/0"]),
        ({"graph": TINY_GRAPH, "names": [], "sorted_by": 1}, "not-supported", ["#/sorted_by"]),
        ({"graph": TINY_GRAPH, "names": [], "fail": "slowly"}, "not-supported", ["#/fail"]),
        ({"names": []}, "invalid-request", ["#"]),
        ({"graph": None, "names": []}, "invalid-request", ["#/graph"]),
        ({"graph": TINY_GRAPH, "names": [], "a/b c~ü": 1}, "invalid-request", ["#/a~1b%20c~0%C3%BC"]),
        ([], "invalid-request", ["#"]),
        (None, "invalid-request", ["#"]),
        ("text", "invalid-request", ["#"]),
    ],
)
def test_faults_of_one_kind_make_a_problem_of_that_kind(trial, body, slug, pointers):
    document = problem(trial.post(PATH, body), slug, 422)
    assert [each["pointer"] for each in document["errors"]] == pointers


def test_a_cycle_is_shown_as_a_member(trial):
    edges = [{"source": "a", "target": "b"}, {"source": "b", "target": "a"}]
    document = problem(
        trial.post(PATH, {"graph": {"nodes": ["a", "b"], "edges": edges}, "names": []}), "cycle", 422
    )
    assert document["cycle"] in (["a", "b", "a"], ["b", "a", "b"])


def test_faults_beyond_the_number_listed_are_counted(trial):
    document = problem(trial.post(PATH, {"graph": TINY_GRAPH, "names": [0] * 12}), "invalid-request", 422)
    assert len(document["errors"]) == 5
    assert document["errors_omitted"] == 7


def test_a_question_that_takes_too_long_is_too_costly(trial):
    document = problem(trial.post(PATH, {**GOOD, "fail": "time"}), "too-costly", 422)
    assert document["seconds"] == 10


def test_an_unexpected_error_is_logged_and_never_shown(trial, caplog):
    with caplog.at_level(logging.ERROR):
        reply = trial.post(PATH, {**GOOD, "fail": "crash"})
    assert problem(reply, "internal-error", 500)["retryable"] is True
    assert "secret" not in reply.text
    assert "Traceback" not in reply.text
    assert "the secret of the trial" in caplog.text
    assert reply.headers["X-Request-Id"] in caplog.text


def test_a_small_limit_of_depth_is_enforced(trial):
    deep: Any = 1
    for _ in range(30):
        deep = [deep]
    assert "20 levels" in problem(trial.post(PATH, {**GOOD, "meta": deep}), "not-json", 400)["detail"]


def test_two_operations_cannot_give_one_name_to_two_schemas():
    other = {**TRIAL.components, "Name": {"type": "string"}}
    clashing = [TRIAL, type(TRIAL)(**{**_fields(TRIAL), "name": "trial-other", "components": other})]
    with pytest.raises(ValueError, match="Name"):
        service_with(clashing)


def _fields(operation: Any) -> dict[str, Any]:
    return {name: getattr(operation, name) for name in operation.__dataclass_fields__}


class Garbled(BytesIO):
    """A body sent in chunks that are none, as the server finds out while it is read."""

    def read(self, *_size: Any) -> bytes:
        raise InvalidChunkSize(b"zz")

    readinto = read


def test_chunks_that_are_none_are_the_callers_fault(trial):
    assert "chunks" in problem(chunked(trial, Garbled()), "not-json", 400)["detail"]


def test_a_body_shorter_than_declared_is_not_taken_for_whole_even_where_it_is_json(trial):
    body = json.dumps(GOOD).encode()
    environ = {
        "wsgi.input": BytesIO(body),
        "wsgi.input_terminated": True,
        "CONTENT_LENGTH": str(len(body) + 1),
    }
    reply = trial.unchecked.post(PATH, content_type="application/json", environ_overrides=environ)
    trial.check("POST", PATH, reply)
    assert "ended before" in problem(reply, "not-json", 400)["detail"]
