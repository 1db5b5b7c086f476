"""POST /v1/constraints: what do linear models of the graph promise of covariances beyond independencies?"""

from __future__ import annotations

from pathgate.criteria.tetrads import Tetrad, tetrads_from
from pathgate.web.endpoints.reading import graph_of
from pathgate.web.endpoints.shared_schemas import CURSOR, GRAPH, LIMIT, NAME_LIST, NEXT_PAGE
from pathgate.web.operations import Call, Example, Json, Operation
from pathgate.web.paging import page_at


def answer(call: Call) -> Json:
    """The vanishing tetrads among the measured columns, a page at a time, each with its choke point."""
    graph = graph_of(call)
    call.refuse_faults()
    found, page = page_at(call, "constraints", lambda start: tetrads_from(graph, start, call.deadline))
    return {"tetrads": [_tetrad(each) for each in found], **page}


def _tetrad(found: Tetrad) -> Json:
    return {
        "rows": list(found.rows),
        "columns": list(found.columns),
        "choke": {"rows_side": list(found.rows_side), "columns_side": list(found.columns_side)},
    }


_PAIR = {**NAME_LIST, "minItems": 2, "maxItems": 2}
_SIDE = {**NAME_LIST, "maxItems": 1}

OPERATION = Operation(
    name="constraints",
    summary="Which tetrads of covariances vanish, though none of their covariances does?",
    description=(
        "A tetrad of rows a, b and columns c, d is cov(a, c) · cov(b, d) − cov(a, d) · cov(b, c). Listed is every"
        " tetrad of four measured columns that is zero in every linear model of the graph, each once, except"
        " those that are zero because covariances in them are. They test graphs whose unmeasured causes leave"
        " no independency at all.\n\n"
        "A trek leads from its top down the arrows to a row and down the arrows to a column; the top is a node,"
        " or a bidirected edge, each of whose ends begins one of the two ways. The tetrad vanishes because every"
        " trek between the rows and the columns passes the one node of `choke`: on its way to the row"
        " (`rows_side`) or on its way to the column (`columns_side`), the top counted to both ways. The node may"
        " be unmeasured. The cause behind a bidirected edge bears no name: where it is a choke point, so are the"
        " edge's ends, and one of these is given. Of several choke points the one nearest to the rows is given.\n\n"
        "The statement is about linear models only; rows of nonlinear data may break it though the graph is right."
    ),
    request_schema={
        "type": "object",
        "properties": {"graph": GRAPH, "limit": LIMIT, "cursor": CURSOR},
        "required": ["graph"],
        "additionalProperties": False,
    },
    response_schema={
        "type": "object",
        "properties": {
            "tetrads": {
                "type": "array",
                "items": {
                    "type": "object",
                    "properties": {
                        "rows": _PAIR,
                        "columns": _PAIR,
                        "choke": {
                            "type": "object",
                            "description": "the one node that every trek passes, under the side where it does",
                            "properties": {"rows_side": _SIDE, "columns_side": _SIDE},
                            "required": ["rows_side", "columns_side"],
                            "additionalProperties": False,
                        },
                    },
                    "required": ["rows", "columns", "choke"],
                    "additionalProperties": False,
                },
            },
            **NEXT_PAGE,
        },
        "required": ["tetrads", "complete"],
        "additionalProperties": False,
    },
    examples=(
        Example(
            "one-habit-behind-four-columns",
            "Customers' haste is not measured and leaves no independency, yet three tetrads vanish.",
            {
                "graph": {
                    "nodes": [
                        {"id": "haste", "measured": False},
                        "late_pickup",
                        "ticket_opened",
                        "refund",
                        "app_opens",
                    ],
                    "edges": [
                        {"source": "haste", "target": "late_pickup"},
                        {"source": "haste", "target": "ticket_opened"},
                        {"source": "haste", "target": "refund"},
                        {"source": "haste", "target": "app_opens"},
                    ],
                },
            },
        ),
        Example(
            "a-common-cause-as-choke-point",
            "All treks pass the cause behind a bidirected edge; one of the edge's ends is given for it.",
            {
                "graph": {
                    "nodes": ["late_pickup", "reminder_sent", "ticket_opened", "refund"],
                    "edges": [
                        {"source": "late_pickup", "target": "reminder_sent"},
                        {"source": "ticket_opened", "target": "refund"},
                        {"source": "late_pickup", "target": "ticket_opened", "kind": "bidirected"},
                    ],
                },
            },
        ),
    ),
    answer=answer,
)
