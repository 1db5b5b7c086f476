"""POST /v1/changes: what does replacing one graph by another do to a team's configs, and to what is promised?"""

from __future__ import annotations

from pathgate.criteria.deadline import Deadline
from pathgate.demo import demo_configs, demo_graph
from pathgate.review.changed_promises import lost_and_gained
from pathgate.review.culprits import MOST_TRIALS
from pathgate.review.graph_difference import Difference
from pathgate.web.changing import config_entry, difference_document, promise_document
from pathgate.web.endpoints.change_schema import CHANGES, CONFIG_CHANGE
from pathgate.web.endpoints.reading import graph_of
from pathgate.web.endpoints.review_schema import REVIEW_COMPONENTS
from pathgate.web.endpoints.shared_schemas import CURSOR, GRAPH, LIMIT
from pathgate.web.operations import CONFIGS_APART, Call, Example, Json, Operation
from pathgate.web.paging import page_at


def answer(call: Call) -> Json:
    """Every config's entry, all that differs, and a page of the promises lost and gained."""
    graph, other = graph_of(call), graph_of(call, "other")
    call.refuse_faults()
    difference = Difference(graph, other)
    # Before the configs, which have time budgets of their own, may have used up the call's.
    found, page = page_at(
        call,
        "changes",
        lambda start: lost_and_gained(difference, call.deadline, start),
        first_may_be_empty=True,
    )
    return {
        "configs": _entries(call, difference),
        **difference_document(difference),
        "independencies": {
            side: [promise_document(each) for which, each in found if which == side]
            for side in ("lost", "gained")
        },
        **page,
    }


def _entries(call: Call, difference: Difference) -> list[Json]:
    settings = call.settings
    search = Deadline(settings.time_budget_seconds)
    return [
        config_entry(config, f"#/configs/{index}", difference, settings, search, ("configs", index))
        for index, config in enumerate(call.body["configs"])
    ]


def _with_one_more_arrow(graph: Json) -> Json:
    """The demo's graph after somebody has drawn one arrow more."""
    note = "the far districts are served last"
    arrow = {"source": "district", "target": "late_delivery", "note": note}
    return {**graph, "edges": [*graph["edges"], arrow]}


OPERATION = Operation(
    name="changes",
    summary="What does a change of graph do to a team's configs?",
    description=(
        "For the review of a change: each config is judged against `graph` (before) and against `other` (after), and"
        " `change` says how the two compare. `edges` and `nodes` of an entry are a set of changes that did it: with"
        " them alone `graph` gives what `other` gives (for a broken config: not sound; for a mended one: sound; else"
        " the same verdict by the same errors), and with no proper subset of them. An arrow turned round, or an edge"
        " that changed its kind, is one change; a node comes and goes with its edges; costs, notes and doubts count for"
        f" nothing. At most {MOST_TRIALS} sets are tried for a config, all within one time budget; `complete` of the"
        " entry is false where that was not enough. A config that cannot be read against a graph, or that is no"
        " config, carries its `problem`, counts as not sound there, and is never the end of the others.\n\n"
        "`nodes` and `edges` of the answer list all that differs, and `independencies` the statements of each graph's"
        " basis that the other does not keep, page by page: one that names a node which the other graph lacks or does"
        " not measure is lost. Where time runs out before the first of them, the page is empty and not complete, and"
        " the rest of the answer stands. Arrows come in the order of the nodes of `other`, then of those that only"
        " `graph` has."
    ),
    request_schema={
        "type": "object",
        "properties": {
            "graph": GRAPH,
            "other": GRAPH,
            "configs": {
                "type": "array",
                "title": "a list of model configs",
                "items": CONFIGS_APART,
                "description": "each judged by itself; a faulty one is no fault of the request",
            },
            "limit": LIMIT,
            "cursor": CURSOR,
        },
        "required": ["graph", "other", "configs"],
        "additionalProperties": False,
    },
    response_schema=CHANGES,
    components={**REVIEW_COMPONENTS, "ConfigChange": CONFIG_CHANGE},
    examples=(
        Example(
            "an-arrow-drawn",
            "Somebody adds an arrow to the demo's graph: what breaks, and which promises does it take back?",
            {
                "graph": demo_graph(),
                "other": _with_one_more_arrow(demo_graph()),
                "configs": demo_configs(),
                "limit": 5,
            },
        ),
        Example(
            "a-column-is-dropped",
            "The forecaster is no longer paid, so the weather is still there, and no longer measured.",
            {
                "graph": {
                    "nodes": ["weather", "late_delivery", "refund"],
                    "edges": [
                        {"source": "weather", "target": "late_delivery"},
                        {"source": "weather", "target": "refund"},
                        {"source": "late_delivery", "target": "refund"},
                    ],
                },
                "other": {
                    "nodes": [{"id": "weather", "measured": False}, "late_delivery", "refund"],
                    "edges": [
                        {"source": "weather", "target": "late_delivery"},
                        {"source": "weather", "target": "refund"},
                        {"source": "late_delivery", "target": "refund"},
                    ],
                },
                "configs": [
                    {
                        "name": "refund-uplift",
                        "treatment": "late_delivery",
                        "outcome": "refund",
                        "covariates": ["weather"],
                    },
                ],
            },
        ),
    ),
    answer=answer,
)
