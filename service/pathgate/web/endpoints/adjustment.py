"""POST /v1/adjustment: which covariate sets carry an effect, and why does a given one not?"""

from __future__ import annotations

from typing import Any

from pathgate.criteria.adjustment import Effect, valid_set
from pathgate.criteria.diagnosis import forbidden_nodes
from pathgate.graphs.errors import Fault
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import members
from pathgate.graphs.names import quoted
from pathgate.review.breaks import breaking_findings
from pathgate.review.claims import Claim
from pathgate.review.config import Config, Named, understand_ends
from pathgate.review.degenerate import degenerate_findings
from pathgate.review.document import finding_document
from pathgate.review.schema import NAMES, SOME_NAMES
from pathgate.review.wording import arrow_text, listed
from pathgate.web.endpoints.reading import graph_of, names_of
from pathgate.web.endpoints.shared_schemas import GRAPH, NAME_LIST, PATH_COMPONENTS
from pathgate.web.operations import Call, Example, Json, Operation


def answer(call: Call) -> Json:
    """Whether some measured set is valid, one such set, and what is wrong with the set to be checked."""
    graph = graph_of(call)
    names = names_of(call, graph)
    treatments, outcomes = understand_ends(call.body, names)
    checked = names.read(call.body.get("check", []), ("check",))
    _refuse_unmeasured(call, graph, (*treatments, *outcomes))
    call.refuse_faults()
    config = Config("", treatments, outcomes, checked)
    claim = Claim.of(graph, config)
    effect = claim.effect_among(())
    found = valid_set(effect)
    document: Json = {
        "exists": found is not None,
        "sets": [] if found is None else [_set_document(graph, found)],
        "forbidden": _forbidden(effect),
    }
    if "check" in call.body:
        document["check"] = _check(call, claim, config)
    return document


def _refuse_unmeasured(call: Call, graph: CausalGraph, ends: tuple[Named, ...]) -> None:
    for named in ends:
        if not graph.measured >> named.node & 1:
            name = graph.name(named.node)
            detail = f"{quoted(name)} is marked as unmeasured: no column holds it"
            call.faults.append(Fault("invalid-request", named.place, detail, (name,)))


def _set_document(graph: CausalGraph, columns: int) -> Json:
    cost = sum(graph.cost(node) for node in members(columns))
    return {"columns": list(graph.names_of(columns)), "cost": cost}


def _forbidden(effect: Effect) -> list[Json]:
    graph = effect.kept.graph
    told = []
    for found in forbidden_nodes(effect, effect.forbidden & ~effect.outcomes):
        drawn = arrow_text(effect.kept, found.causal_path, 0)
        above = listed([graph.name(found.descends_from)])
        why = (
            f"lies on the causal path {drawn}"
            if found.is_on_path
            else f"is a consequence of {above} on the causal path {drawn}"
        )
        told.append({"column": graph.name(found.node), "why": why})
    return told


def _check(call: Call, claim: Claim, config: Config) -> Json:
    findings = [
        *degenerate_findings(claim, config),
        *breaking_findings(claim, config, call.deadline),
    ]
    reasons = [finding_document(finding) for finding in findings]
    for reason in reasons:
        del reason["severity"], reason["pointer"]
    return {"valid": not reasons, "reasons": reasons}


_REASON: dict[str, Any] = {
    "type": "object",
    "properties": {
        "rule": {"type": "string"},
        "columns": NAME_LIST,
        "message": {"type": "string"},
        "open_path": {"$ref": "#/components/schemas/Path"},
        "causal_path": {"type": "array", "items": {"$ref": "#/components/schemas/Label"}},
        "descent": {"type": "array", "items": {"$ref": "#/components/schemas/Label"}},
    },
    "required": ["rule", "columns", "message"],
    "additionalProperties": False,
}

OPERATION = Operation(
    name="adjustment",
    summary="Which covariates carry an effect, and why does a given set not?",
    description=(
        "The adjustment criterion for total effects of sets on sets, complete also with bidirected edges and"
        " unmeasured nodes: where some set of measured columns is valid, one is found that holds nothing it can"
        " do without; where none is, `exists` is false. `check` asks whether exactly this set is valid, with"
        " every reason why not. `forbidden` lists the nodes that no valid set can hold: those on causal paths and"
        " what descends from them."
    ),
    request_schema={
        "type": "object",
        "properties": {
            "graph": GRAPH,
            "treatment": {**SOME_NAMES, "description": "the columns whose joint effect is asked for"},
            "outcome": {**SOME_NAMES, "description": "the columns on which the effect is asked for"},
            "asks": {"enum": ["total"], "default": "total", "description": "which effect"},
            "check": {**NAMES, "description": "is exactly this set valid? [] asks about the empty set"},
        },
        "required": ["graph", "treatment", "outcome"],
        "additionalProperties": False,
        "x-not-yet": [
            "require",
            "exclude",
            "selected_on",
            "population",
            "measured_everywhere",
            "prefer",
            "limit",
            "cursor",
        ],
    },
    response_schema={
        "type": "object",
        "properties": {
            "exists": {"type": "boolean", "description": "is any set of measured columns valid?"},
            "sets": {
                "type": "array",
                "description": "one valid set where any exists",
                "items": {
                    "type": "object",
                    "properties": {"columns": NAME_LIST, "cost": {"type": "number"}},
                    "required": ["columns", "cost"],
                    "additionalProperties": False,
                },
            },
            "forbidden": {
                "type": "array",
                "items": {
                    "type": "object",
                    "properties": {"column": {"type": "string"}, "why": {"type": "string"}},
                    "required": ["column", "why"],
                    "additionalProperties": False,
                },
            },
            "check": {
                "type": "object",
                "description": "present where the request has check",
                "properties": {
                    "valid": {"type": "boolean"},
                    "reasons": {"type": "array", "description": "none where valid", "items": _REASON},
                },
                "required": ["valid", "reasons"],
                "additionalProperties": False,
            },
        },
        "required": ["exists", "sets", "forbidden"],
        "additionalProperties": False,
    },
    components=PATH_COMPONENTS,
    examples=(
        Example(
            "a-mediator-checked",
            "Adjusting for the ticket takes away the part of the effect that runs through it.",
            {
                "graph": {
                    "nodes": ["depot", "late_pickup", "ticket_opened", "refund"],
                    "edges": [
                        {"source": "depot", "target": "late_pickup"},
                        {"source": "depot", "target": "refund"},
                        {"source": "late_pickup", "target": "ticket_opened"},
                        {"source": "ticket_opened", "target": "refund"},
                    ],
                },
                "treatment": "late_pickup",
                "outcome": "refund",
                "check": ["depot", "ticket_opened"],
            },
        ),
    ),
    answer=answer,
)
