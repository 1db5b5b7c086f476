"""POST /v1/graph-check: is this a causal graph, and what is wrong with it?"""

from __future__ import annotations

from typing import Any

from pathgate.demo import demo_graph
from pathgate.graphs.errors import Fault, pointer
from pathgate.web.endpoints.reading import examine
from pathgate.web.endpoints.shared_schemas import GRAPH, NAME_LIST
from pathgate.web.operations import Call, Example, Json, Operation

_COUNT: dict[str, Any] = {"type": "integer", "minimum": 0}


def answer(call: Call) -> Json:
    """Every fault of the graph as a finding; a body that is no graph at all is refused."""
    call.refuse_faults()
    examined = examine(call)
    call.faults.extend(
        fault.below(("graph",)) for fault in examined.faults if fault.slug == "invalid-request"
    )
    call.refuse_faults()
    edges = call.graph["edges"]
    return {
        "acyclic": examined.is_acyclic,
        "counts": {
            "nodes": len(call.graph["nodes"]),
            "edges": len(edges),
            "bidirected": sum(edge.get("kind") == "bidirected" for edge in edges),
            "measured": examined.graph.measured.bit_count(),
        },
        "findings": [_finding(fault) for fault in examined.faults],
    }


def _finding(fault: Fault) -> Json:
    return {
        "rule": fault.rule or fault.slug,
        "severity": "error",
        "columns": list(fault.columns),
        "message": fault.detail,
        "pointer": pointer(("graph", *fault.place)),
        **({"cycle": list(fault.cycle)} if fault.cycle else {}),
    }


OPERATION = Operation(
    name="graph-check",
    summary="Is this a causal graph, and what is wrong with it?",
    description=(
        "Checks a graph by itself: repeated ids and edges, edges to undeclared nodes, self-loops, arrows back in"
        " time, and directed cycles (one shown for each cyclic component). Here a faulty graph is an answer;"
        " every other operation refuses it."
    ),
    request_schema={
        "type": "object",
        "properties": {"graph": GRAPH},
        "required": ["graph"],
        "additionalProperties": False,
    },
    response_schema={
        "type": "object",
        "properties": {
            "acyclic": {"type": "boolean", "description": "no directed cycle and no self-loop of an arrow"},
            "counts": {
                "type": "object",
                "description": "how many nodes and edges were sent; edges counts both kinds",
                "properties": {"nodes": _COUNT, "edges": _COUNT, "bidirected": _COUNT, "measured": _COUNT},
                "required": ["nodes", "edges", "bidirected", "measured"],
                "additionalProperties": False,
            },
            "findings": {
                "type": "array",
                "items": {
                    "type": "object",
                    "properties": {
                        "rule": {
                            "enum": [
                                "ambiguous-name",
                                "arrow-back-in-time",
                                "cycle",
                                "repeated-edge",
                                "repeated-id",
                                "self-loop",
                                "undeclared-node",
                            ]
                        },
                        "severity": {"enum": ["error", "warning", "note"]},
                        "columns": NAME_LIST,
                        "message": {"type": "string"},
                        "pointer": {"type": "string", "description": "where in the request"},
                        "cycle": {**NAME_LIST, "description": "the nodes of a cycle, the first one repeated"},
                    },
                    "required": ["rule", "severity", "columns", "message", "pointer"],
                    "additionalProperties": False,
                },
            },
        },
        "required": ["acyclic", "counts", "findings"],
        "additionalProperties": False,
    },
    examples=(
        Example("a-sound-graph", "The demo's graph: nothing to find.", {"graph": demo_graph()}),
        Example(
            "a-cycle-and-a-typo",
            "Two columns that cause each other, and an edge to a node nobody declared.",
            {
                "graph": {
                    "nodes": ["locker_full", "late_pickup"],
                    "edges": [
                        {"source": "locker_full", "target": "late_pickup"},
                        {"source": "late_pickup", "target": "locker_full"},
                        {"source": "late_pickup", "target": "locker_ful"},
                    ],
                }
            },
        ),
    ),
    answer=answer,
)
