"""POST /v1/review: does the number that a model config reports mean what it claims?"""

from __future__ import annotations

from dataclasses import replace

from pathgate.demo import demo_configs, demo_graph
from pathgate.graphs.graph import CausalGraph
from pathgate.review.config import Config, understand_config
from pathgate.review.hinge_document import whole_document
from pathgate.review.review import review
from pathgate.web.endpoints.reading import graph_of
from pathgate.web.endpoints.review_schema import REVIEW_COMPONENTS
from pathgate.web.endpoints.shared_schemas import GRAPH
from pathgate.web.operations import Call, Example, Json, Operation
from pathgate.web.problems import Failed, Problem


def answer(call: Call) -> Json:
    """The verdict on one config, and what it hinges on."""
    graph = graph_of(call)
    config = _config_of(call, graph)
    all_columns = call.whole.get("columns", "in-question") == "all"
    judged = review(graph, config, call.deadline, all_columns=all_columns)
    document = whole_document(judged, call.deadline, hinges=call.whole.get("hinges", True))
    if call.whole.get("as_gate", False) and judged.falls_short:
        raise Failed(Problem.of("falls-short", judged.summary, review=document))
    return document


def _config_of(call: Call, graph: CausalGraph) -> Config:
    # Places are counted from the config while it is read, and from the request where it is refused.
    faults = [fault for fault in call.faults if fault.place[:1] != ("config",)]
    in_config = [
        replace(fault, place=fault.place[1:]) for fault in call.faults if fault.place[:1] == ("config",)
    ]
    config = understand_config(call.whole.get("config"), graph, in_config)
    call.faults[:] = faults + [fault.below(("config",)) for fault in in_config]
    call.refuse_faults()
    if config is None:
        message = "a config without faults can be understood"
        raise AssertionError(message)
    return config


OPERATION = Operation(
    name="review",
    summary="Does the number a model config reports mean what it claims?",
    description=(
        "Reviews one model config against the graph: a verdict, every column or filter that breaks it with the"
        " path that shows it, the role of each column, and what to change. A condition of the row filter becomes"
        " a node of its own that is conditioned on, so a filter that merely narrows a column never blocks a path"
        " through it; one that holds a column at one value (`fixed`) conditions on that column."
    ),
    request_schema={
        "type": "object",
        "properties": {
            "graph": GRAPH,
            "config": {"$ref": "#/components/schemas/Config"},
            "hinges": {
                "title": "true or false",
                "type": "boolean",
                "default": True,
                "description": "whether to say what a sound verdict hinges on",
            },
            "as_gate": {
                "title": "true or false",
                "type": "boolean",
                "default": False,
                "description": "answer with status 409 and the review inside where the config is not sound by an error"
                " that no waiver accepts, for callers that look at the status alone",
            },
            "columns": {
                "enum": ["in-question", "all"],
                "default": "in-question",
                "description": "whose roles to give: of the columns of the config, its remedies and its open paths,"
                " or of every column of the graph",
            },
        },
        "required": ["graph", "config"],
        "additionalProperties": False,
        "x-not-yet": ["include"],
    },
    response_schema={"$ref": "#/components/schemas/Review"},
    components=REVIEW_COMPONENTS,
    examples=(
        Example(
            "a-filter-on-a-ticket",
            "Only parcels with a ticket are kept, and late parcels are not the only ones that get a ticket.",
            {
                "graph": {
                    "nodes": ["weather", "late_delivery", "ticket_opened", "order_value", "refund"],
                    "edges": [
                        {"source": "weather", "target": "late_delivery"},
                        {"source": "weather", "target": "refund"},
                        {"source": "late_delivery", "target": "refund"},
                        {"source": "late_delivery", "target": "ticket_opened"},
                        {"source": "order_value", "target": "ticket_opened"},
                        {"source": "order_value", "target": "refund"},
                    ],
                },
                "config": {
                    "name": "refund-uplift",
                    "treatment": "late_delivery",
                    "outcome": "refund",
                    "covariates": ["weather"],
                    "row_filter": ["ticket_opened"],
                },
            },
        ),
        Example(
            "a-filter-in-sql",
            "The condition on tickets is to be dropped; the one on the region holds it at one value and may stay.",
            {
                "graph": {
                    "nodes": ["region", "late_delivery", "ticket_opened", "order_value", "refund"],
                    "edges": [
                        {"source": "region", "target": "late_delivery"},
                        {"source": "region", "target": "refund"},
                        {"source": "late_delivery", "target": "refund"},
                        {"source": "late_delivery", "target": "ticket_opened"},
                        {"source": "order_value", "target": "ticket_opened"},
                        {"source": "order_value", "target": "refund"},
                    ],
                },
                "config": {
                    "name": "refunds-in-the-north",
                    "treatment": "late_delivery",
                    "outcome": "refund",
                    "covariates": [],
                    "row_filter": "ticket_opened = TRUE AND region = 'north'",
                    "dialect": "duckdb",
                },
            },
        ),
        *(
            Example(config["name"], config["meta"]["why"], {"graph": demo_graph(), "config": config})
            for config in demo_configs()
            if config["name"] in ("late-delivery-refunds", "ticket-refunds")
        ),
    ),
    answer=answer,
    failures={409: ("falls-short",)},
)
