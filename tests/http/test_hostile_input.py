"""Bad input to every operation there is: a clear problem each time, never a 500, never half an answer.

The operations and their examples are read from the service, so an operation added later is tried as well.
"""

from __future__ import annotations

import copy
import json
from collections.abc import Iterator
from typing import Any

import pytest

from pathgate.web.endpoints import OPERATIONS
from tests.http.conftest import TINY_GRAPH

PATHS = [operation.path for operation in OPERATIONS]
# Spoilt at every place, a request that holds many configs or two graphs takes long.
LONG = {"/v1/changes", "/v1/reviews"}
EXAMPLES = [
    pytest.param(
        operation.path,
        example.request,
        id=f"{operation.name}-{example.name}",
        marks=[pytest.mark.slow] if operation.path in LONG else [],
    )
    for operation in OPERATIONS
    for example in operation.examples
]
HUGE = b"9" * 5_000
NOT_JSON = {
    "empty": b"",
    "blank": b" \n",
    "cut short": b'{"graph": {"nodes": [',
    "two values": b"{} {}",
    "single quotes": b"{'graph': 1}",
    "trailing comma": b'{"graph": 1,}',
    "comment": b"{} // done",
    "repeated key": b'{"graph": {"nodes": [], "nodes": [], "edges": []}}',
    "repeated key, escaped": b'{"graph": 1, "gr\\u0061ph": 1}',
    "NaN": b'{"graph": NaN}',
    "Infinity": b'{"graph": -Infinity}',
    "bad UTF-8": b'{"graph": "\xc3"}',
    "overlong UTF-8": b'{"graph": "\xc0\xaf"}',
    "UTF-16": '{"graph": 1}'.encode("utf-16"),
    "byte order mark": b"\xef\xbb\xbf{}",
    "lone surrogate": b'{"graph": "\\ud800"}',
    "lone surrogate as a key": b'{"\\udfff": 1}',
    "number out of range": b'{"graph": 1e400}',
    "huge digits": b'{"graph": ' + HUGE + b"}",
    "huge fraction": b'{"graph": 0.' + HUGE + b"}",
    "500 levels of lists": b'{"graph": ' + b"[" * 500 + b"]" * 500 + b"}",
    "500 levels of objects": b'{"graph": ' * 500 + b"1" + b"}" * 500,
    "a million levels": b"[" * 1_000_000,
    "control character": b'{"graph": "\x01"}',
    "bytes": bytes(range(256)),
}
WRONG: list[Any] = [
    *[
        None,
        True,
        0,
        -1,
        1.5,
        10**20,
        1e300,
        "",
        "x",
        "x" * 201,
        "\u0000",
        [],
        [[]],
        [None],
        [""],
        ["x", "x"],
    ],
    *[{}, {"": {}}, {"columns": []}, {"nodes": {}}, [{}], ["x"] * 500],
]


@pytest.mark.parametrize("path", PATHS)
@pytest.mark.parametrize("body", NOT_JSON.values(), ids=NOT_JSON.keys())
def test_what_is_not_json_is_refused_with_line_and_column(service, path, body):
    reply = service.post(path, body)
    assert reply.status_code == 400
    problem = json.loads(reply.data)
    assert problem["type"] == "/problems/not-json"
    assert problem["line"] >= 1
    assert problem["column"] >= 1


@pytest.mark.parametrize("path", PATHS)
def test_nine_megabytes_are_too_large(service, path):
    reply = service.post(path, b" " * 9_000_000)
    assert reply.status_code == 413


@pytest.mark.parametrize("path", PATHS)
@pytest.mark.parametrize("value", [None, True, 0, "graph", [], ["graph"]])
def test_a_body_that_is_no_object_is_refused_as_a_whole(service, path, value):
    reply = service.post(path, value)
    assert reply.status_code == 422
    assert [fault["pointer"] for fault in json.loads(reply.data)["errors"]] == ["#"]


@pytest.mark.parametrize("path", PATHS)
def test_an_empty_object_is_told_all_that_is_missing(service, path):
    reply = service.post(path, {})
    assert reply.status_code == 422
    assert any('"graph" is missing' in fault["detail"] for fault in json.loads(reply.data)["errors"])


def places(value: Any, place: tuple[str | int, ...] = ()) -> Iterator[tuple[str | int, ...]]:
    """Every place in a value but the root, no more than the first two items of each list."""
    steps = (
        value.items() if isinstance(value, dict) else enumerate(value[:2]) if isinstance(value, list) else ()
    )
    for step, below in steps:
        yield (*place, step)
        yield from places(below, (*place, step))


def changed(value: Any, place: tuple[str | int, ...], new: Any) -> Any:
    """A copy of a value with ``new`` at ``place``."""
    copied = copy.deepcopy(value)
    holder = copied
    for step in place[:-1]:
        holder = holder[step]
    holder[place[-1]] = new
    return copied


def check_refusal(reply: Any) -> None:
    """An answer or a refusal that names places; the service fixture has checked its shape already."""
    assert reply.status_code in (200, 422)
    if reply.status_code == 422:
        document = json.loads(reply.data)
        assert document.get("errors") or document["type"] in ("/problems/bad-cursor", "/problems/too-costly")


FIRST_EXAMPLES = {operation.path: operation.examples[0].request for operation in OPERATIONS}


@pytest.mark.parametrize(("path", "request_body"), EXAMPLES)
def test_a_wrong_value_at_any_place_is_refused_or_answered(service, path, request_body):
    for place in places(request_body):
        # Every operation reads its graphs in the same way, so one example of each is spoilt there.
        if place[0] not in ("graph", "other") or request_body is FIRST_EXAMPLES[path]:
            for wrong in WRONG:
                check_refusal(service.post(path, changed(request_body, place, wrong)))


@pytest.mark.parametrize(("path", "request_body"), EXAMPLES)
def test_an_unknown_member_beside_any_known_one_of_the_envelope_is_refused(service, path, request_body):
    for place in places(request_body):
        in_graph = place[0] in ("graph", "other")
        in_free_object = in_graph and place[1:2] in (("nodes",), ("edges",), ("graph",))
        if isinstance(place[-1], str) and not in_free_object and "meta" not in place:
            beside = (*place[:-1], "no_such_member")
            reply = service.post(path, changed(request_body, beside, 1))
            document = json.loads(reply.data)
            if place[0] == "configs" and len(place) > 2:
                # Of many configs each has its own problem, and the others are answered.
                assert reply.status_code == 200
                listed = "reviews" if path == "/v1/reviews" else "configs"
                document = document[listed][place[1]]["problem"]
            else:
                assert reply.status_code == 422
            pointers = [fault["pointer"] for fault in document["errors"]]
            assert pointers == ["#/" + "/".join(map(str, beside))]


@pytest.mark.parametrize(("path", "request_body"), EXAMPLES)
def test_a_member_left_out_anywhere_is_refused_or_answered(service, path, request_body):
    for place in places(request_body):
        if isinstance(place[-1], str):
            copied = copy.deepcopy(request_body)
            holder = copied
            for step in place[:-1]:
                holder = holder[step]
            del holder[place[-1]]
            check_refusal(service.post(path, copied))


def turned(value: Any) -> Any:
    """The same value, the members of its objects written in the opposite order."""
    if isinstance(value, dict):
        return {name: turned(value[name]) for name in reversed(value)}
    return [turned(each) for each in value] if isinstance(value, list) else value


@pytest.mark.parametrize(("path", "request_body"), EXAMPLES)
def test_the_same_request_gets_the_same_bytes_and_the_order_of_members_changes_nothing(
    service, path, request_body
):
    first, again = (service.post(path, request_body) for _ in range(2))
    assert first.data == again.data
    assert service.post(path, turned(request_body)).json == first.json


@pytest.mark.parametrize(
    ("path", "members"),
    [
        ("/v1/separation", {"statements": [{"x": 1, "y": 2, "given": 3}] * 5_000}),
        ("/v1/adjustment", {"treatment": "weather", "outcome": "delay", "check": [1] * 10_001, "require": 5}),
        ("/v1/colliders", {"given": [1] * 10_001, "selected_on": 5}),
        ("/v1/review", {"config": {"covariates": [1] * 10_001, "row_filter": 5, "treatment": 5}}),
    ],
)
def test_what_comes_after_more_faults_than_are_looked_for_is_not_taken_for_sound(service, path, members):
    reply = service.post(path, {"graph": TINY_GRAPH, **members})
    assert reply.status_code == 422
    assert json.loads(reply.data)["errors_omitted"] == 10_000 - 100


def test_of_a_hundred_thousand_misspelt_names_only_the_first_are_given_hints(service):
    nodes = [f"locker_{number:05}" for number in range(20_000)]
    edges = [{"source": f"lokcer_{number:05}", "target": "x"} for number in range(50_000)]
    covariates = [f"lokcer_{number:05}" for number in range(100_000)]
    config = {"treatment": nodes[0], "outcome": nodes[1], "covariates": covariates}
    for more in ({"edges": edges}, {"edges": []}):
        reply = service.post("/v1/review", {"graph": {"nodes": nodes, **more}, "config": config})
        problem = json.loads(reply.data)
        assert problem["errors_omitted"] >= 99_900
        assert "did you mean" in problem["errors"][0]["detail"]
        assert "did you mean" not in problem["errors"][-1]["detail"]


def test_a_node_with_a_million_faults_is_told_the_first_hundred_thousand(service):
    graph = {"nodes": [{"id": "locker", "columns": [1] * 1_000_000}], "edges": []}
    problem = json.loads(service.post("/v1/graph-check", {"graph": graph}).data)
    assert problem["errors_omitted"] == 100_000 - 100
    assert problem["errors"][0]["pointer"] == "#/graph/nodes/0/columns/0"
