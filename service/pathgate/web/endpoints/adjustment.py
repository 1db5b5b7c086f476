"""POST /v1/adjustment: which covariate sets carry an effect, and why does a given one not?"""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from pathgate.criteria.adjustment import Effect, covariates_in, valid_set, valid_sets
from pathgate.criteria.diagnosis import forbidden_nodes
from pathgate.criteria.usability import needed_columns, unusable_columns
from pathgate.demo import demo_graph
from pathgate.graphs.errors import Fault
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import members
from pathgate.graphs.names import quoted
from pathgate.review.breaks import breaking_findings
from pathgate.review.claims import Claim
from pathgate.review.config import Config, NameReader, read_parts, understand_ends
from pathgate.review.degenerate import degenerate_findings
from pathgate.review.document import finding_document
from pathgate.review.findings import Finding
from pathgate.review.schema import ASKS, NAMES, SOME_NAMES
from pathgate.review.warnings import warning_findings
from pathgate.review.wording import arrow_text, listed
from pathgate.web.endpoints.reading import graph_of, mask_in, names_of
from pathgate.web.endpoints.shared_schemas import (
    CURSOR,
    GRAPH,
    LIMIT,
    NAME_LIST,
    NEXT_PAGE,
    PATH_COMPONENTS,
    SELECTED_ON,
)
from pathgate.web.operations import Call, Example, Json, Operation
from pathgate.web.paging import page_of


def answer(call: Call) -> Json:
    """The valid sets asked for, what can be in none and what is in all, and what is wrong with the set to check."""
    graph = graph_of(call)
    names = names_of(call, graph)
    config = _question(call, names)
    required, excluded = mask_in(call, names, "require"), mask_in(call, names, "exclude")
    _refuse_meaningless(call, graph, config, required, excluded)
    call.refuse_faults()
    claim = Claim.of(graph, config)
    effect = claim.effect_among(claim.parts)
    found, page = _page(call, effect, required, ~excluded)
    document: Json = {
        "exists": bool(found) or valid_set(effect, required=required, allowed=~excluded) is not None,
        "sets": [_set_document(graph, columns) for columns in found],
        **page,
    }
    if "check" in call.body:
        document["check"] = _check(call, claim, config)
    return document | {
        "forbidden": _forbidden(call, effect),
        "unusable": _unusable(call, effect),
        "needed": list(graph.names_of(needed_columns(effect, call.deadline))),
        "warnings": [_reason(finding) for finding in warning_findings(claim, config)],
    }


def _question(call: Call, names: NameReader) -> Config:
    """The question in the terms of a review: ``check`` as covariates, ``selected_on`` as row filter."""
    treatments, outcomes = understand_ends(call.body, names)
    return Config(
        name="",
        treatments=treatments,
        outcomes=outcomes,
        covariates=names.read(call.body.get("check", []), ("check",)),
        filter_parts=read_parts(call.body.get("selected_on", []), names, ("selected_on",)),
        asks=call.body.get("asks", "total"),
        may_read_unmeasured=True,
    )


def _refuse_meaningless(call: Call, graph: CausalGraph, config: Config, required: int, excluded: int) -> None:
    for named in (*config.treatments, *config.outcomes):
        if not graph.measured >> named.node & 1:
            name = graph.name(named.node)
            detail = f"{quoted(name)} is marked as unmeasured: no column holds it"
            call.faults.append(Fault("invalid-request", named.place, detail, (name,)))
    for node in members(required & ~graph.measured):
        detail = f"{quoted(graph.name(node))} is marked as unmeasured and cannot be required"
        call.faults.append(Fault("invalid-request", ("require",), detail, (graph.name(node),)))
    for node in members(required & excluded):
        detail = f"{quoted(graph.name(node))} is both required and excluded"
        call.faults.append(Fault("invalid-request", ("exclude",), detail, (graph.name(node),)))


def _page(call: Call, effect: Effect, required: int, allowed: int) -> tuple[list[int], dict[str, Any]]:
    """The sets of this page; of every minimal set, the smallest of a page come first."""
    bounded = valid_sets(effect, required=required, allowed=allowed)
    prefer = call.body.get("prefer", "every-minimal")
    if prefer == "every-minimal":

        def minimal() -> Iterator[int]:
            if bounded is not None:
                yield from (
                    covariates_in(effect, each, required) for each in bounded.every_minimal(call.deadline)
                )

        found, page = page_of(call, "adjustment", minimal())
        return sorted(found, key=lambda columns: (columns.bit_count(), list(members(columns)))), page
    best = None if bounded is None else bounded.smallest() if prefer == "smallest" else bounded.cheapest()
    return ([] if best is None else [covariates_in(effect, best, required)]), {"complete": True}


def _set_document(graph: CausalGraph, columns: int) -> Json:
    cost = sum(graph.cost(node) for node in members(columns))
    return {"columns": list(graph.names_of(columns)), "cost": cost}


def _forbidden(call: Call, effect: Effect) -> list[Json]:
    told = []
    for found in forbidden_nodes(effect, effect.forbidden & ~effect.outcomes):
        call.deadline.poll()
        name = effect.kept.graph.name(found.node)
        if name:
            drawn = arrow_text(effect.kept, found.causal_path, 0)
            above = listed([effect.kept.graph.name(found.descends_from)])
            lies = "lies on" if found.is_on_path else f"is a consequence of {above} on"
            told.append({"column": name, "why": f"{lies} the causal path {drawn}"})
    return told


def _unusable(call: Call, effect: Effect) -> list[Json]:
    told = []
    for found in unusable_columns(effect, call.deadline):
        call.deadline.poll()
        drawn = arrow_text(effect.kept, found.opens, 1 << found.node)
        name = effect.kept.graph.name(found.node)
        why = f"adjusting for it opens the path {drawn}, whatever else is adjusted for"
        told.append({"column": name, "why": why})
    return told


def _check(call: Call, claim: Claim, config: Config) -> Json:
    findings = [*degenerate_findings(claim, config), *breaking_findings(claim, config, call.deadline)]
    return {"valid": not findings, "reasons": [_reason(finding) for finding in findings]}


def _reason(finding: Finding) -> Json:
    """A finding without what only a review has."""
    document = finding_document(finding)
    del document["severity"], document["pointer"]
    return document


_REASON: dict[str, Any] = {
    "type": "object",
    "properties": {
        "rule": {"type": "string"},
        "columns": NAME_LIST,
        "message": {"type": "string"},
        "part": {"description": "the condition on the rows it is about, as written"},
        "open_path": {"$ref": "#/components/schemas/Path"},
        "causal_path": {"type": "array", "items": {"$ref": "#/components/schemas/Label"}},
        "descent": {"type": "array", "items": {"$ref": "#/components/schemas/Label"}},
    },
    "required": ["rule", "columns", "message"],
    "additionalProperties": False,
}

_TOLD: dict[str, Any] = {
    "type": "array",
    "items": {
        "type": "object",
        "properties": {"column": {"type": "string"}, "why": {"type": "string"}},
        "required": ["column", "why"],
        "additionalProperties": False,
    },
}

OPERATION = Operation(
    name="adjustment",
    summary="Which covariate sets carry an effect, and why does a given one not?",
    description=(
        "The adjustment criterion for sets of treatments and outcomes, complete also with bidirected edges and"
        " unmeasured nodes: where some set of measured columns within `require` and `exclude` is valid, one is"
        " found. `prefer` says which sets to list: every minimal one (a page at a time, the smallest of a page"
        " first; the first page of an astronomically long list comes at once), the smallest, or the cheapest."
        " `check` asks whether exactly this set is valid, with every reason why not. `forbidden` lists the nodes"
        " that no valid set can hold because they lie on causal paths or descend from them, `unusable` the"
        " other measured columns that no valid set holds, `needed` those that every valid set holds; these three"
        " depend neither on `require` nor on `exclude`. `selected_on` says which rows are kept."
    ),
    request_schema={
        "type": "object",
        "properties": {
            "graph": GRAPH,
            "treatment": {**SOME_NAMES, "description": "the columns whose joint effect is asked for"},
            "outcome": {**SOME_NAMES, "description": "the columns on which the effect is asked for"},
            "asks": ASKS,
            "check": {**NAMES, "description": "is exactly this set valid? [] asks about the empty set"},
            "require": {**NAMES, "description": "columns that every set listed must hold"},
            "exclude": {**NAMES, "description": "columns that no set listed may hold"},
            "selected_on": SELECTED_ON,
            "prefer": {
                "enum": ["every-minimal", "smallest", "cheapest"],
                "default": "every-minimal",
                "description": "which valid sets to list",
            },
            "limit": LIMIT,
            "cursor": CURSOR,
        },
        "required": ["graph", "treatment", "outcome"],
        "additionalProperties": False,
        "x-not-yet": ["population", "measured_everywhere"],
    },
    response_schema={
        "type": "object",
        "properties": {
            "exists": {"type": "boolean", "description": "is any set within require and exclude valid?"},
            "sets": {
                "type": "array",
                "items": {
                    "type": "object",
                    "properties": {
                        "columns": NAME_LIST,
                        "cost": {"type": "number", "description": "the columns' costs added up"},
                    },
                    "required": ["columns", "cost"],
                    "additionalProperties": False,
                },
            },
            **NEXT_PAGE,
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
            "forbidden": _TOLD,
            "unusable": _TOLD,
            "needed": NAME_LIST,
            "warnings": {
                "type": "array",
                "description": "how the number is easily misread, valid or not",
                "items": _REASON,
            },
        },
        "required": ["exists", "sets", "complete", "forbidden", "unusable", "needed", "warnings"],
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
        Example(
            "cheapest",
            "Of all valid sets, the one whose columns cost least.",
            {
                "graph": demo_graph(),
                "treatment": "late_delivery",
                "outcome": "refund",
                "prefer": "cheapest",
            },
        ),
        Example(
            "direct-effect",
            "What lateness does to refunds by itself, past everything it leads to.",
            {
                "graph": demo_graph(),
                "treatment": "late_delivery",
                "outcome": "refund",
                "asks": "direct",
                "limit": 5,
            },
        ),
    ),
    answer=answer,
)
