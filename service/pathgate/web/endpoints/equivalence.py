"""POST /v1/equivalence: which arrows can independencies speak about, and do they tell two graphs apart?"""

from __future__ import annotations

from collections.abc import Iterator
from decimal import Decimal
from typing import Any

from pathgate.criteria.distinguishing import distinguishing
from pathgate.criteria.equivalence import Arrow, equivalence
from pathgate.graphs.errors import Fault
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import members
from pathgate.graphs.names import hint_within, quoted
from pathgate.web.endpoints.reading import graph_of
from pathgate.web.endpoints.shared_schemas import GRAPH, NAME_LIST
from pathgate.web.operations import Call, Example, Json, Operation

# The largest integer that every JSON reader takes exactly.
_LARGEST_EXACT = 2**53 - 1


def answer(call: Call) -> Json:
    """What independencies say of the graph's arrows; where there is another, how they tell it from the graph."""
    graph = _fully_measured(call, "graph")
    if "other" not in call.graphs:
        call.refuse_faults()
        return _arrows_and_class(graph, call)
    other = _fully_measured(call, "other")
    if call.is_sound("graph") and call.is_sound("other"):
        call.faults.extend(_different_nodes(graph, other))
    call.refuse_faults()
    found = distinguishing(graph, other, call.deadline)
    if found is None:
        return {"equivalent": True, "statement": None}
    statement = {"x": found.x, "y": found.y, "given": list(found.given), "holds_in": found.holds_in}
    return {"equivalent": False, "statement": statement}


def _arrows_and_class(graph: CausalGraph, call: Call) -> Json:
    found = equivalence(graph, call.deadline)
    return {
        "compelled": _edges(found.compelled),
        "reversible": _edges(found.reversible),
        "fixed_by_time": _edges(found.fixed_by_time),
        "class_size": _written(found.class_size),
    }


def _edges(arrows: tuple[Arrow, ...]) -> list[Json]:
    return [{"source": source, "target": target} for source, target in arrows]


def _written(number: int) -> int | str:
    # Decimal writes numbers of any length; str() of an integer refuses more than 4,300 digits.
    return number if number <= _LARGEST_EXACT else str(Decimal(number))


def _fully_measured(call: Call, member: str) -> CausalGraph:
    """The graph that a member holds, with a fault for each cause in it that is not a column."""
    graph = graph_of(call, member)
    if member in call.graphs and call.is_sound(member):
        call.faults.extend(_hidden_causes(graph, call.graphs[member]["edges"], member))
    return graph


def _hidden_causes(graph: CausalGraph, edges: list[Json], member: str) -> Iterator[Fault]:
    for node in members(graph.everything & ~graph.measured):
        name = graph.name(node)
        detail = f"{quoted(name)} is marked as unmeasured; this question needs every node to be measured"
        yield Fault("invalid-request", (member, "nodes", node, "measured"), detail, (name,))
    for place, edge in enumerate(edges):
        if edge.get("kind") == "bidirected":
            ends = (edge["source"], edge["target"])
            detail = (
                f"the edge between {quoted(ends[0])} and {quoted(ends[1])} is bidirected, an unmeasured cause;"
                " this question needs every cause to be a measured node"
            )
            yield Fault("invalid-request", (member, "edges", place, "kind"), detail, ends)


def _different_nodes(graph: CausalGraph, other: CausalGraph) -> list[Fault]:
    faults: list[Fault] = []
    for place, name in enumerate(other.names):
        if name not in graph.index:
            hint = hint_within(faults, name, graph.names)
            detail = f'{quoted(name)} is no node of "graph"{hint}; both graphs need the same nodes'
            faults.append(Fault("invalid-request", ("other", "nodes", place), detail, (name,)))
    for name in graph.names:
        if name not in other.index:
            detail = f'{quoted(name)}, a node of "graph", is missing here; both graphs need the same nodes'
            faults.append(Fault("invalid-request", ("other", "nodes"), detail, (name,)))
    return faults


_EDGES: dict[str, Any] = {
    "type": "array",
    "items": {
        "type": "object",
        "properties": {"source": {"type": "string"}, "target": {"type": "string"}},
        "required": ["source", "target"],
        "additionalProperties": False,
    },
}

_STATEMENT: dict[str, Any] = {
    "type": "object",
    "properties": {
        "x": {"type": "string"},
        "y": {"type": "string"},
        "given": {
            **NAME_LIST,
            "description": "x and y are separated given these columns, none of them to spare",
        },
        "holds_in": {
            "enum": ["graph", "other"],
            "description": "the one of the two graphs in which it holds",
        },
    },
    "required": ["x", "y", "given", "holds_in"],
    "additionalProperties": False,
}

_PARCELS: Json = {
    "nodes": ["promotion", "parcels", "weather", "locker_full", "late_pickup"],
    "edges": [
        {"source": "promotion", "target": "parcels"},
        {"source": "parcels", "target": "locker_full"},
        {"source": "weather", "target": "locker_full"},
        {"source": "locker_full", "target": "late_pickup"},
    ],
}

OPERATION = Operation(
    name="equivalence",
    summary="Which arrows can independencies speak about, and do they tell two graphs apart?",
    description=(
        "For a graph without cycles, unmeasured nodes and bidirected edges. With `graph` alone: `compelled` are"
        " the arrows that every graph with the same independencies has; `fixed_by_time` those that"
        " independencies leave open and `recorded` fixes, the arrows that these force included; `reversible`"
        " those whose direction nothing but what the team knows can tell. Each list is ordered by source, then"
        " target, in the order of the nodes. `class_size` is the number of graphs with the same independencies,"
        " this one included, whatever was recorded when.\n\n"
        "With `other`, a graph over the same nodes: can independencies tell the two apart at all, and if so by"
        " which `statement`? It holds in one of the two and not in the other, so data that contradict it speak"
        " against the one named in `holds_in`. Times play no part in that."
    ),
    request_schema={
        "type": "object",
        "properties": {"graph": GRAPH, "other": GRAPH},
        "required": ["graph"],
        "additionalProperties": False,
    },
    response_schema={
        "type": "object",
        "properties": {
            "compelled": {**_EDGES, "description": "arrows whose direction independencies fix"},
            "reversible": {**_EDGES, "description": "arrows whose direction neither they nor times fix"},
            "fixed_by_time": {**_EDGES, "description": "open to independencies, fixed by `recorded`"},
            "class_size": {
                "description": "exactly; a string of decimal digits where it is above 2^53 - 1",
                "anyOf": [
                    {"type": "integer", "minimum": 1, "maximum": _LARGEST_EXACT},
                    {"type": "string", "pattern": "^[1-9][0-9]{15,}$"},
                ],
            },
            "equivalent": {"type": "boolean", "description": "have the two graphs the same independencies?"},
            "statement": {
                "description": "what tells the two apart; null where they are equivalent",
                "anyOf": [_STATEMENT, {"type": "null"}],
            },
        },
        "oneOf": [
            {"required": ["compelled", "reversible", "fixed_by_time", "class_size"], "maxProperties": 4},
            {"required": ["equivalent", "statement"], "maxProperties": 2},
        ],
        "additionalProperties": False,
    },
    examples=(
        Example(
            "what-arrows-rest-on",
            "Data can speak about the arrows around a full locker; not about promotion and parcels.",
            {"graph": _PARCELS},
        ),
        Example(
            "fixed-by-time",
            "The promotion was recorded before the parcels, which fixes what independencies leave open.",
            {
                "graph": {
                    "nodes": [
                        {"id": "promotion", "recorded": 1},
                        {"id": "parcels", "recorded": 2},
                        "late_pickup",
                    ],
                    "edges": [
                        {"source": "promotion", "target": "parcels"},
                        {"source": "parcels", "target": "late_pickup"},
                    ],
                }
            },
        ),
        Example(
            "a-change-under-review",
            "An arrow turned round: one independency tells the new graph from the old one.",
            {
                "graph": _PARCELS,
                "other": {
                    **_PARCELS,
                    "edges": [
                        {"source": "promotion", "target": "parcels"},
                        {"source": "parcels", "target": "locker_full"},
                        {"source": "locker_full", "target": "weather"},
                        {"source": "locker_full", "target": "late_pickup"},
                    ],
                },
            },
        ),
    ),
    answer=answer,
)
