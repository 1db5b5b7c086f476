"""POST /v1/separation: does a set of columns separate two others, and if not, along which path are they joined?"""

from __future__ import annotations

from typing import Any

from pathgate.criteria.batch import Statement, separated_each
from pathgate.criteria.reachability import Conditions, connected
from pathgate.criteria.separation import DEFAULT_PATHS, Blocker, Separation, explained, on_two_sides
from pathgate.graphs.errors import Fault
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.names import quoted
from pathgate.review.document import path_document
from pathgate.review.names import NameReader
from pathgate.review.schema import SOME_NAMES
from pathgate.web.endpoints.reading import graph_of, names_of
from pathgate.web.endpoints.shared_schemas import GIVEN, GRAPH, NAME_LIST, PATH_COMPONENTS
from pathgate.web.operations import Call, Example, Json, Operation
from pathgate.web.problems import Refused

MOST_PATHS = 20


def answer(call: Call) -> Json:
    """A verdict for every statement and the verdicts of every sweep, in order."""
    _refuse_too_many(call)
    graph = graph_of(call)
    names = names_of(call, graph)
    statements, sweeps = (_read(call, names, member) for member in ("statements", "sweeps"))
    call.refuse_faults()
    document: Json = {"verdicts": _verdicts(call, graph, statements)}
    if "sweeps" in call.body:
        document["sweeps"] = [_sweep(call, graph, xs, given) for xs, _ys, given in sweeps]
    return document


def _refuse_too_many(call: Call) -> None:
    counts = {
        member: len(call.whole[member]) for member in ("statements", "sweeps") if _is_list(call, member)
    }
    most = call.settings.max_statements
    if sum(counts.values()) > most:
        asked = " and ".join(f"{count:,} {member}" for member, count in counts.items())
        raise Refused(
            [Fault("over-limit", (next(iter(counts)),), f"the request has {asked}; the limit is {most:,}")]
        )


def _is_list(call: Call, member: str) -> bool:
    return isinstance(call.whole.get(member), list)


def _read(call: Call, names: NameReader, member: str) -> list[Statement]:
    """The statements or sweeps of a member; one with a fault is read as far as it goes, to find all its faults."""
    if not _is_list(call, member):
        return []
    sound = dict(call.sound_items(member))
    return [
        _sets(names, (member, place), sound.get(place) or _sound_sides(call, member, place, said))
        for place, said in enumerate(call.whole[member])
    ]


def _sound_sides(call: Call, member: str, place: int, said: Any) -> dict[str, Any]:
    sides = (
        {side: said[side] for side in ("x", "y", "given") if side in said} if isinstance(said, dict) else {}
    )
    return {side: named for side, named in sides.items() if call.is_sound(member, place, side)}


def _sets(names: NameReader, place: tuple[str | int, ...], said: dict[str, Any]) -> Statement:
    """x, y and given of a statement, or x and given of a sweep; a node on two sides is a fault."""
    xs, ys, given = (names.mask(said.get(member, []), (*place, member)) for member in ("x", "y", "given"))
    for name in names.graph.names_of(on_two_sides(xs, ys, given)):
        detail = f"{quoted(name)} is named on more than one side"
        names.faults.append(Fault("invalid-request", place, detail, (name,)))
    return xs, ys, given


def _verdicts(call: Call, graph: CausalGraph, statements: list[Statement]) -> list[Json]:
    if call.body.get("explain", True):
        paths = int(call.body.get("paths", DEFAULT_PATHS))
        return [_explained(graph, explained(graph, one, paths, call.deadline)) for one in statements]
    answers = separated_each(graph, statements, call.deadline)
    return [
        {
            "x": list(graph.names_of(xs)),
            "y": list(graph.names_of(ys)),
            "given": list(graph.names_of(given)),
            "separated": separated,
        }
        for (xs, ys, given), separated in zip(statements, answers, strict=True)
    ]


def _explained(graph: CausalGraph, found: Separation) -> Json:
    return {
        "x": list(found.x),
        "y": list(found.y),
        "given": list(found.given),
        "separated": found.separated,
        "open_path": path_document(found.open_path) if found.open_path else None,
        "blockers": [_blocker(graph, blocker) for blocker in found.blockers],
        "separator": None if found.separator is None else list(found.separator),
    }


def _blocker(graph: CausalGraph, found: Blocker) -> Json:
    nodes = [graph.name(node) for node in found.path.nodes]
    return {
        "path": {"nodes": nodes, "arrows": list(found.path.arrows)},
        "node": graph.name(found.node),
        "role": found.role,
        "because": found.because,
    }


def _sweep(call: Call, graph: CausalGraph, xs: int, given: int) -> Json:
    call.deadline.poll()
    others = graph.measured & ~(xs | given)
    joined = connected(graph, xs, Conditions.on(graph, given)) & others
    return {
        "x": list(graph.names_of(xs)),
        "given": list(graph.names_of(given)),
        "separated_from": list(graph.names_of(others & ~joined)),
        "connected_to": list(graph.names_of(joined)),
    }


_BLOCKER: Json = {
    "type": "object",
    "description": "A path, and the first node on it that blocks it.",
    "properties": {
        "path": {
            "type": "object",
            "properties": {
                "nodes": NAME_LIST,
                "arrows": {"type": "array", "items": {"enum": ["forward", "backward", "both"]}},
            },
            "required": ["nodes", "arrows"],
            "additionalProperties": False,
        },
        "node": {"type": "string"},
        "role": {"enum": ["chain", "fork", "collider"]},
        "because": {"enum": ["conditioned", "collider-not-conditioned"]},
    },
    "required": ["path", "node", "role", "because"],
    "additionalProperties": False,
}

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
        " path between them with the reason why each of its steps is open; where they are, `blockers` names for"
        " each of the shortest paths between them a node that blocks it. `separator` is a smallest set of"
        " measured nodes that would separate the two. With `explain: false` the verdicts come alone, and fast:"
        " thousands of statements share the work. A sweep answers for every other measured node at once."
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
            "sweeps": {
                "type": "array",
                "description": "one side and what is given: what of all the rest is it joined to?",
                "items": {
                    "type": "object",
                    "properties": {"x": {**SOME_NAMES, "description": "one side"}, "given": GIVEN},
                    "required": ["x"],
                    "additionalProperties": False,
                },
            },
            "paths": {
                "type": "integer",
                "minimum": 0,
                "maximum": MOST_PATHS,
                "default": DEFAULT_PATHS,
                "description": "for how many of the shortest paths to name a blocker",
            },
            "explain": {"type": "boolean", "default": True, "description": "false: verdicts alone"},
        },
        "required": ["graph"],
        "additionalProperties": False,
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
                        "blockers": {
                            "type": "array",
                            "description": "empty where no path joins the two; absent with explain: false",
                            "items": {"$ref": "#/components/schemas/Blocker"},
                        },
                        "separator": {
                            "description": "null where no measured set separates; absent with explain: false",
                            "anyOf": [NAME_LIST, {"type": "null"}],
                        },
                    },
                    "required": ["x", "y", "given", "separated"],
                    "additionalProperties": False,
                },
            },
            "sweeps": {
                "type": "array",
                "description": "present where asked for",
                "items": {
                    "type": "object",
                    "properties": {
                        "x": NAME_LIST,
                        "given": NAME_LIST,
                        "separated_from": NAME_LIST,
                        "connected_to": NAME_LIST,
                    },
                    "required": ["x", "given", "separated_from", "connected_to"],
                    "additionalProperties": False,
                },
            },
        },
        "required": ["verdicts"],
        "additionalProperties": False,
    },
    components={**PATH_COMPONENTS, "Blocker": _BLOCKER},
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
        Example(
            "a-sweep",
            "All that is still joined to late pick-ups once full lockers are held fixed.",
            {"graph": _PARCELS, "sweeps": [{"x": "late_pickup", "given": ["locker_full"]}]},
        ),
        Example(
            "verdicts-alone",
            "Without explanations, for thousands of statements.",
            {
                "graph": _PARCELS,
                "statements": [{"x": "weather", "y": "late_pickup", "given": ["courier_delay"]}],
                "explain": False,
            },
        ),
    ),
    answer=answer,
)
