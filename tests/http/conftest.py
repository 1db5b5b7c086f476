"""The service without a network, every reply checked against the OpenAPI document it serves.

``trial`` is an operation that exists for these tests alone: it counts what it is told to, and fails when asked to.
"""

from __future__ import annotations

import json
from collections.abc import Iterable, Mapping
from typing import Any

import pytest
from flask import Flask
from jsonschema_rs import Draft202012Validator
from werkzeug.test import TestResponse

from pathgate.criteria.errors import OutOfTime
from pathgate.graphs import InvalidGraph, read_graph
from pathgate.graphs.errors import Fault
from pathgate.web.app import create_app
from pathgate.web.endpoints import OPERATIONS
from pathgate.web.operations import GRAPH_REFERENCE, Call, Example, Operation
from pathgate.web.settings import Settings

TINY_GRAPH = {"nodes": ["weather", "delay"], "edges": [{"source": "weather", "target": "delay"}]}


class Service:
    """A client whose every reply was checked; ``unchecked`` is one whose replies were not."""

    def __init__(self, app: Flask) -> None:
        self.unchecked = app.test_client()
        self.document = self.unchecked.get("/openapi.json").json
        self._validators: dict[str, Draft202012Validator] = {}

    def post(self, path: str, body: Any, **more: Any) -> TestResponse:
        """Ask with a JSON body; bytes are sent as they are."""
        data = body if isinstance(body, bytes) else json.dumps(body).encode()
        return self.send("POST", path, data=data, **{"content_type": "application/json", **more})

    def get(self, path: str, **more: Any) -> TestResponse:
        return self.send("GET", path, **more)

    def send(self, method: str, path: str, **more: Any) -> TestResponse:
        reply = self.unchecked.open(path, method=method, **more)
        self.check(method, path, reply)
        return reply

    def check(self, method: str, path: str, reply: TestResponse) -> None:
        """The status is documented, its media type too, and the body has the shape promised for both."""
        assert reply.headers["X-Content-Type-Options"] == "nosniff"
        assert reply.headers["Cache-Control"]
        assert len(reply.headers["X-Request-Id"]) == 36
        if method == "HEAD" or reply.status_code in (204, 302):
            return
        answers = self._answers(method, path)
        if answers is None:
            assert reply.status_code in (404, 405)
            schema, wanted = {"$ref": "#/components/schemas/Problem"}, "application/problem+json"
        else:
            content = self._resolved(answers[str(reply.status_code)])["content"]
            wanted = reply.headers["Content-Type"]
            schema = content[wanted]["schema"]
        assert reply.headers["Content-Type"] == wanted
        value = reply.text if wanted.startswith("text/") else json.loads(reply.data)
        errors = [error.message for error in self._validator(schema).iter_errors(value)]
        assert not errors, (path, reply.status_code, errors[:3], reply.text[:500])

    def _answers(self, method: str, path: str) -> Mapping[str, Any] | None:
        paths = self.document["paths"]
        steps = path.partition("?")[0].rsplit("/", 1)
        known = {
            "/problems": "/problems/{slug}",
            "/schemas": "/schemas/{name}",
            "/docs/rules": "/docs/rules/{name}",
        }
        name = known.get(steps[0], "/".join(steps))
        return paths.get(name, {}).get(method.lower(), {}).get("responses")

    def _resolved(self, answer: Mapping[str, Any]) -> Mapping[str, Any]:
        if "$ref" not in answer:
            return answer
        return self.document["components"]["responses"][answer["$ref"].rpartition("/")[2]]

    def _validator(self, schema: Mapping[str, Any]) -> Draft202012Validator:
        key = json.dumps(schema)
        if key not in self._validators:
            self._validators[key] = Draft202012Validator(
                {**schema, "components": self.document["components"]}
            )
        return self._validators[key]


def count_names(call: Call) -> dict[str, Any]:
    """The trial operation's answer."""
    match call.body.get("fail"):
        case "crash":
            raise ZeroDivisionError("the secret of the trial")
        case "time":
            raise OutOfTime(10)
    nodes: tuple[str, ...] = ()
    if "graph" in call.graphs:
        try:
            nodes = read_graph(call.graph).names
        except InvalidGraph as error:
            call.faults.extend(fault.below(("graph",)) for fault in error.faults)
    names = call.body.get("names", [])
    named = [names] if isinstance(names, str) else names
    call.faults.extend(
        Fault("unknown-node", ("names", place), f"no node is named {name}")
        for place, name in enumerate(named)
        if nodes and name not in nodes
    )
    call.refuse_faults()
    return {"zeta": len(named), "alpha": len(nodes)}


_NAME = {"title": "a name", "type": "string", "minLength": 1, "maxLength": 20}
_COUNT = {"type": "integer", "minimum": 0}

TRIAL = Operation(
    name="trial-count",
    summary="How many names are there?",
    description="Counts `names`, and the nodes of the graph.\n\nThat is all.",
    request_schema={
        "type": "object",
        "properties": {
            "graph": GRAPH_REFERENCE,
            "names": {
                "anyOf": [{"$ref": "#/components/schemas/Name"}, {"$ref": "#/components/schemas/Names"}]
            },
            "fail": {"enum": ["crash", "time"], "x-not-yet": ["slowly"]},
            "meta": {},
        },
        "required": ["graph", "names"],
        "additionalProperties": False,
        "x-not-yet": ["sorted_by"],
    },
    response_schema={
        "type": "object",
        "properties": {"zeta": _COUNT, "alpha": _COUNT},
        "required": ["zeta", "alpha"],
        "additionalProperties": False,
    },
    examples=(Example("two", "Two names", {"graph": TINY_GRAPH, "names": ["weather", "delay"]}),),
    answer=count_names,
    components={
        "Name": _NAME,
        "Names": {
            "title": "a list of names",
            "type": "array",
            "items": {"$ref": "#/components/schemas/Name"},
        },
    },
)


def service_with(operations: Iterable[Operation], **settings: Any) -> Service:
    """A service of one's own making."""
    return Service(create_app(Settings(**settings), tuple(operations)))


@pytest.fixture(scope="session")
def service() -> Service:
    """The service as it is, under default settings."""
    return service_with(OPERATIONS)


@pytest.fixture(scope="session")
def trial() -> Service:
    """A service with the trial operation alone, under tight limits."""
    return service_with([TRIAL], max_body_bytes=4_000, max_depth=20, max_errors=5)
