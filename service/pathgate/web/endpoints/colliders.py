"""POST /v1/colliders: where do arrowheads meet, what opens those colliders, and which columns does that join?"""

from __future__ import annotations

from collections.abc import Iterator

from pathgate.criteria.colliders import Collider, Induced, colliders, induced
from pathgate.criteria.errors import OutOfTime
from pathgate.criteria.selection import keep_rows
from pathgate.review.parts import read_parts
from pathgate.web.endpoints.reading import graph_of, mask_in, names_of
from pathgate.web.endpoints.shared_schemas import (
    CURSOR,
    GIVEN,
    GRAPH,
    LIMIT,
    NAME_LIST,
    NEXT_PAGE,
    SELECTED_ON,
)
from pathgate.web.operations import Call, Example, Json, Operation
from pathgate.web.paging import page_of


def answer(call: Call) -> Json:
    """The colliders of the graph, a page at a time, and the pairs of columns that conditioning joined."""
    graph = graph_of(call)
    names = names_of(call, graph)
    given = mask_in(call, names, "given")
    parts = read_parts(call.body.get("selected_on", []), names, ("selected_on",))
    call.refuse_faults()
    kept = keep_rows(graph, (one.part for one in parts))
    listing = colliders(kept, given, columns=graph.everything)
    found, page = page_of(call, "colliders", listing)
    joined, is_all = _as_far_as_allowed(call, induced(kept, given, deadline=call.deadline))
    return {
        "colliders": [_collider(each) for each in found],
        "induced": [{"x": pair.x, "y": pair.y, "through": list(pair.through)} for pair in joined],
        "induced_complete": is_all,
        **page,
    }


def _as_far_as_allowed(call: Call, pairs: Iterator[Induced]) -> tuple[list[Induced], bool]:
    """The pairs found in time, up to the largest page, and whether these are all."""
    found: list[Induced] = []
    try:
        for pair in pairs:
            if len(found) == call.settings.max_page:
                return found, False
            found.append(pair)
    except OutOfTime:
        return found, False
    return found, True


def _collider(found: Collider) -> Json:
    return {
        "node": found.node,
        "between": list(found.between),
        "shielded": found.shielded,
        "open": found.open,
        "opened_by": list(found.opened_by),
    }


OPERATION = Operation(
    name="colliders",
    summary="Which colliders does a graph hold, and which does conditioning open?",
    description=(
        "One entry for each node and each pair of distinct neighbours with arrowheads at it. A collider is open"
        " where it or a descendant of it is conditioned on, by `given` or by the rows kept; `opened_by` names"
        " the columns that do it. `induced` lists the pairs of measured columns that are separated given nothing"
        " and joined given `given` and the rows kept, with the colliders on a shortest path between them."
    ),
    request_schema={
        "type": "object",
        "properties": {
            "graph": GRAPH,
            "given": GIVEN,
            "selected_on": SELECTED_ON,
            "limit": LIMIT,
            "cursor": CURSOR,
        },
        "required": ["graph"],
        "additionalProperties": False,
    },
    response_schema={
        "type": "object",
        "properties": {
            "colliders": {
                "type": "array",
                "items": {
                    "type": "object",
                    "properties": {
                        "node": {"type": "string"},
                        "between": {**NAME_LIST, "minItems": 2, "maxItems": 2},
                        "shielded": {"type": "boolean", "description": "are the two neighbours adjacent?"},
                        "open": {"type": "boolean"},
                        "opened_by": {**NAME_LIST, "description": "the conditioned columns that open it"},
                    },
                    "required": ["node", "between", "shielded", "open", "opened_by"],
                    "additionalProperties": False,
                },
            },
            "induced": {
                "type": "array",
                "description": "the same on every page",
                "items": {
                    "type": "object",
                    "properties": {
                        "x": {"type": "string"},
                        "y": {"type": "string"},
                        "through": {
                            **NAME_LIST,
                            "description": "opened colliders; empty where keeping rows alone joins the two",
                        },
                    },
                    "required": ["x", "y", "through"],
                    "additionalProperties": False,
                },
            },
            "induced_complete": {
                "type": "boolean",
                "description": "false where the largest page or the time had no room for more induced pairs",
            },
            **NEXT_PAGE,
        },
        "required": ["colliders", "induced", "induced_complete", "complete"],
        "additionalProperties": False,
    },
    examples=(
        Example(
            "rows-kept-by-a-ticket",
            "Keeping only parcels with a ticket joins what causes tickets.",
            {
                "graph": {
                    "nodes": ["locker_full", "late_pickup", "ticket_opened", "refund"],
                    "edges": [
                        {"source": "locker_full", "target": "ticket_opened"},
                        {"source": "late_pickup", "target": "ticket_opened"},
                        {"source": "late_pickup", "target": "refund"},
                    ],
                },
                "selected_on": ["ticket_opened"],
            },
        ),
    ),
    answer=answer,
)
