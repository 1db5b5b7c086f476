"""POST /v1/separation: does a set of columns separate two others, and if not, along which path are they joined?"""

from __future__ import annotations

from typing import Any

from pathgate.criteria.separation import Separation, separation_of
from pathgate.graphs.errors import Fault
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import mask_of
from pathgate.graphs.names import quoted
from pathgate.review.config import NameReader
from pathgate.review.document import path_document
from pathgate.review.schema import SOME_NAMES
from pathgate.web.endpoints.reading import graph_of, names_of
from pathgate.web.endpoints.shared_schemas import GIVEN, GRAPH, NAME_LIST, PATH_COMPONENTS
from pathgate.web.operations import Call, Example, Json, Operation
from pathgate.web.problems import Refused

_Question = tuple[int, int, int]


def answer(call: Call) -> Json:
    """A verdict for every statement, in order."""
    count = len(call.body.get("statements", ()))
    if count > call.settings.max_statements:
        detail = f"the request has {count:,} statements; the limit is {call.settings.max_statements:,}"
        raise Refused([Fault("over-limit", ("statements",), detail)])
    graph = graph_of(call)
    names = names_of(call, graph)
    questions = [_question(names, graph, place, said) for place, said in call.sound_items("statements")]
    call.refuse_faults()
    explain = call.body.get("explain", True)
    verdicts = []
    for xs, ys, given in questions:
        call.deadline.poll()
        verdicts.append(_verdict(separation_of(graph, xs, ys, given, explain=explain), explain=explain))
    return {"verdicts": verdicts}


def _question(names: NameReader, graph: CausalGraph, place: int, said: dict[str, Any]) -> _Question:
    sets = [
        mask_of(named.node for named in names.read(said.get(member, []), ("statements", place, member)))
        for member in ("x", "y", "given")
    ]
    xs, ys, given = sets
    shared = (xs & ys) | (xs & given) | (ys & given)
    for name in graph.names_of(shared):
        detail = f"{quoted(name)} is named on more than one side"
        names.faults.append(Fault("invalid-request", ("statements", place), detail, (name,)))
    return xs, ys, given


def _verdict(found: Separation, *, explain: bool) -> Json:
    verdict: Json = {
        "x": list(found.x),
        "y": list(found.y),
        "given": list(found.given),
        "separated": found.separated,
    }
    if explain:
        verdict["open_path"] = path_document(found.open_path) if found.open_path else None
    return verdict


_PARCELS: Json = {
    "nodes": ["weather", "courier_delay", "promotion", "locker_full", "late_pickup"],
    "edges": [
        {"source": "weather", "target": "courier_delay"},
        {"source": "promotion", "target": "locker_full"},
        {"source": "courier_delay", "target": "late_pickup"},
        {"source": "locker_full", "target": "late_pickup"},
    ],
}

OPERATION = Operation(
    name="separation",
    summary="Does a set of columns separate two others?",
    description=(
        "d-separation, and m-separation where there are bidirected edges. `x`, `y` and `given` are disjoint; any"
        " node may be named, measured or not. Where the two are not separated, `open_path` is a shortest open"
        " path between them with the reason why each of its steps is open. With `explain: false` the verdicts"
        " come alone, and fast."
    ),
    request_schema={
        "type": "object",
        "properties": {
            "graph": GRAPH,
            "statements": {
                "type": "array",
                "description": "the questions",
                "items": {
                    "type": "object",
                    "properties": {
                        "x": {**SOME_NAMES, "description": "one side"},
                        "y": {**SOME_NAMES, "description": "the other side"},
                        "given": GIVEN,
                    },
                    "required": ["x", "y"],
                    "additionalProperties": False,
                },
            },
            "explain": {"type": "boolean", "default": True, "description": "false: verdicts alone"},
        },
        "required": ["graph", "statements"],
        "additionalProperties": False,
        "x-not-yet": ["sweeps", "paths"],
    },
    response_schema={
        "type": "object",
        "properties": {
            "verdicts": {
                "type": "array",
                "items": {
                    "type": "object",
                    "properties": {
                        "x": NAME_LIST,
                        "y": NAME_LIST,
                        "given": NAME_LIST,
                        "separated": {"type": "boolean"},
                        "open_path": {
                            "description": "null where separated; absent with explain: false",
                            "anyOf": [{"$ref": "#/components/schemas/Path"}, {"type": "null"}],
                        },
                    },
                    "required": ["x", "y", "given", "separated"],
                    "additionalProperties": False,
                },
            }
        },
        "required": ["verdicts"],
        "additionalProperties": False,
    },
    components=PATH_COMPONENTS,
    examples=(
        Example(
            "a-collider-opened",
            "Weather and promotions have nothing to do with each other, until one looks at late pick-ups only.",
            {
                "graph": _PARCELS,
                "statements": [
                    {"x": "weather", "y": "promotion"},
                    {"x": "weather", "y": "promotion", "given": ["late_pickup"]},
                ],
            },
        ),
    ),
    answer=answer,
)
