"""POST /v1/reviews: many configs against one graph, each answered by itself."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from pathgate.demo import demo_configs, demo_graph
from pathgate.graphs.graph import CausalGraph
from pathgate.review.provenance import graph_digest
from pathgate.web.endpoints.reading import graph_of
from pathgate.web.endpoints.review_schema import REVIEW_COMPONENTS
from pathgate.web.endpoints.shared_schemas import GRAPH
from pathgate.web.judging import judged
from pathgate.web.operations import CONFIGS_APART, Call, Example, Json, Operation


def answer(call: Call) -> Json:
    """All reviews in one document."""
    return {"reviews": list(lines(call))}


def lines(call: Call) -> Iterator[Json]:
    """The reviews one by one, in the order of the configs; what is wrong with the graph is refused before."""
    graph = graph_of(call)
    call.refuse_faults()
    return _judged_one_by_one(call, graph)


def _judged_one_by_one(call: Call, graph: CausalGraph) -> Iterator[Json]:
    configs, hinges = call.body["configs"], call.body.get("hinges", False)
    digest = graph_digest(graph)
    for index, config in enumerate(configs):
        name = config.get("name", "") if isinstance(config, dict) else ""
        head = {"index": index, "count": len(configs), "name": name if isinstance(name, str) else ""}
        yield head | judged(
            config, graph, call.settings, hinges=hinges, place=("configs", index), known_digest=digest
        )


LINE: dict[str, Any] = {
    "type": "object",
    "description": "one config: its review, or the problem that it has",
    "properties": {
        "index": {"type": "integer", "minimum": 0, "description": "the place of the config in the request"},
        "count": {"type": "integer", "minimum": 0, "description": "how many there are in all"},
        "name": {"type": "string"},
        "review": {"$ref": "#/components/schemas/Review"},
        "problem": {
            "type": "object",
            "description": "a problem document without instance: why this config could not be reviewed",
            "properties": {
                "type": {"type": "string"},
                "status": {"type": "integer"},
                "detail": {"type": "string"},
            },
            "required": ["type", "title", "status", "detail", "retryable"],
        },
    },
    "required": ["index", "count", "name"],
    "oneOf": [{"required": ["review"]}, {"required": ["problem"]}],
    "additionalProperties": False,
}

OPERATION = Operation(
    name="reviews",
    summary="Do the numbers of many model configs mean what they claim?",
    description=(
        "Reviews many configs against one graph, which is read once. With `Accept: application/x-ndjson` each config"
        " is answered on a line of its own as soon as it is judged; every line says how many there will be, so that"
        " a stream that was cut short shows. A faulty config is one line with its problem, and never the end of the"
        " others. The time budget holds for each config. What verdicts hinge on is left out unless `hinges` is true."
    ),
    request_schema={
        "type": "object",
        "properties": {
            "graph": GRAPH,
            "configs": {
                "type": "array",
                "title": "a list of model configs",
                "items": CONFIGS_APART,
                "description": "each a Config, judged by itself: a faulty one is no fault of the request",
            },
            "hinges": {
                "title": "true or false",
                "type": "boolean",
                "default": False,
                "description": "whether to say what each sound verdict hinges on",
            },
        },
        "required": ["graph", "configs"],
        "additionalProperties": False,
    },
    response_schema={
        "type": "object",
        "properties": {"reviews": {"type": "array", "items": {"$ref": "#/components/schemas/ReviewLine"}}},
        "required": ["reviews"],
        "additionalProperties": False,
    },
    components={**REVIEW_COMPONENTS, "ReviewLine": LINE},
    examples=(
        Example(
            "two-configs",
            "Two configs of the demo, and one that names a column the graph does not have.",
            {
                "graph": demo_graph(),
                "configs": [
                    *demo_configs()[:2],
                    {"name": "misspelt", "treatment": "late_delivry", "outcome": "refund", "covariates": []},
                ],
            },
        ),
    ),
    answer=answer,
    lines=lines,
    line_schema={"$ref": "#/components/schemas/ReviewLine"},
)
