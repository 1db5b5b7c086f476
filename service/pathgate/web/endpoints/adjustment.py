"""POST /v1/adjustment: which covariate sets carry an effect, and why does a given one not?"""

from __future__ import annotations

from typing import Any

from pathgate.criteria.populations import AmongKept, InEverybody, Population
from pathgate.criteria.precision import most_precise
from pathgate.demo import demo_graph
from pathgate.graphs.errors import Fault
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import members
from pathgate.graphs.names import quoted
from pathgate.review.breaks import breaking_findings
from pathgate.review.claims import Claim
from pathgate.review.config import Config, understand_ends
from pathgate.review.degenerate import degenerate_findings
from pathgate.review.derived import Columns
from pathgate.review.document import finding_document, measure_document
from pathgate.review.findings import Finding
from pathgate.review.names import NameReader
from pathgate.review.parts import read_parts
from pathgate.review.rows_kept import RowsKept
from pathgate.review.schema import ASKS, NAMES, SOME_NAMES
from pathgate.review.warnings import warning_findings
from pathgate.web.endpoints.adjustment_words import (
    forbidden_told,
    not_recovered_told,
    precision_told,
    set_told,
    unusable_told,
)
from pathgate.web.endpoints.reading import graph_of, mask_in, names_of
from pathgate.web.endpoints.shared_schemas import (
    CURSOR,
    GRAPH,
    LIMIT,
    MEASURE_NEXT,
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
    known = mask_in(call, names, "measured_everywhere")
    _refuse_meaningless(call, graph, config, required, excluded)
    _refuse_combinations(call, config)
    call.refuse_faults()
    claim = Claim.of(config)
    effect = claim.effect_among(claim.parts)
    is_whole = call.body.get("population", "kept") == "whole"
    population: Population = InEverybody(effect, known) if is_whole else AmongKept(effect)
    # What every page repeats comes first, so that a long listing may use up the rest of the time.
    repeated: Json = {
        "forbidden": forbidden_told(effect, call.deadline),
        "unusable": unusable_told(population, call.deadline),
        "needed": list(graph.names_of(population.needed(call.deadline))),
        "warnings": [_reason(finding) for finding in warning_findings(claim, config, call.deadline)],
    }
    if "check" in call.body:
        repeated["check"] = _check(call, claim, config, population)
    return _listed(call, population, required, ~excluded) | repeated


def _question(call: Call, names: NameReader) -> Config:
    """The question in the terms of a review: ``check`` as covariates, ``selected_on`` as row filter."""
    treatments, outcomes = understand_ends(call.body, names)
    return Config(
        name="",
        columns=Columns(names.graph),
        treatments=treatments,
        outcomes=outcomes,
        covariates=names.read(call.body.get("check", []), ("check",)),
        rows=RowsKept(read_parts(call.body.get("selected_on", []), names, ("selected_on",))),
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


def _refuse_combinations(call: Call, config: Config) -> None:
    """Refuse what nobody has an answer to."""
    if call.body.get("population") == "whole":
        if config.asks == "direct":
            detail = "a direct effect is judged among the rows kept only"
            call.faults.append(Fault("invalid-request", ("population",), detail))
        if call.body.get("prefer") == "most-precise":
            detail = "the most precise set is known for the effect among the rows kept only"
            call.faults.append(Fault("invalid-request", ("prefer",), detail))
    elif "measured_everywhere" in call.body:
        detail = 'what is measured everywhere matters for "population": "whole" only'
        call.faults.append(Fault("invalid-request", ("measured_everywhere",), detail))
    if config.asks == "direct" and call.body.get("prefer") == "most-precise":
        detail = "there is no theory of the most precise set for a direct effect"
        call.faults.append(Fault("invalid-request", ("prefer",), detail))


def _listed(call: Call, population: Population, required: int, allowed: int) -> Json:
    """Does any set exist, and those of this page; where none exists, what to measure."""
    prefer = call.body.get("prefer", "every-minimal")
    extra: Json = {}
    if prefer == "every-minimal":
        every = population.every_minimal(call.deadline, required=required, allowed=allowed)
        found, page = page_of(call, "adjustment", every)
        found.sort(key=lambda columns: (columns.bit_count(), list(members(columns))))
    elif prefer == "most-precise":
        best = most_precise(population.effect, call.deadline, required=required, allowed=allowed)
        found, page = list(best.sets), {"complete": True}
        extra = {"uniform": best.uniform, "every_candidate": best.complete}
    else:
        least = population.least(prefer, call.deadline, required=required, allowed=allowed)
        found, page = [] if least is None else [least], {"complete": True}
    exists = bool(found) or population.one(required=required, allowed=allowed) is not None
    if not exists:
        extra["measure_next"] = measure_document(
            population.effect.kept.graph,
            population.measure_next(call.deadline, required=required, allowed=allowed),
        )
    sets = [set_told(population.effect.kept.graph, columns) for columns in found]
    return {"exists": exists, "sets": sets, **page, **extra}


def _check(call: Call, claim: Claim, config: Config, population: Population) -> Json:
    findings = [*degenerate_findings(claim, config), *breaking_findings(claim, config, call.deadline)]
    reasons = [_reason(finding) for finding in findings]
    if not findings and not population.carries(claim.covariates):
        reasons = [not_recovered_told(population, claim.covariates)]
    # What is known of variances is about total effects among the rows that the model sees.
    has_notes = not reasons and config.asks == "total" and isinstance(population, AmongKept)
    notes = precision_told(population.effect, claim.covariates) if has_notes else []
    return {"valid": not reasons, "reasons": reasons, "precision": notes}


def _reason(finding: Finding) -> Json:
    """A finding without what only a review has."""
    document = finding_document(finding)
    for member in ("severity", "pointer", "help"):
        del document[member]
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
        " depend neither on `require` nor on `exclude`. `selected_on` says which rows are kept; `population` whose"
        " effect is meant. `most-precise` lists the set of least large-sample variance (in linear models), or the"
        " candidates where that depends on unknown strengths. Where no set exists, `measure_next` says what"
        " measuring would make one."
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
            "population": {
                "enum": ["kept", "whole"],
                "default": "kept",
                "description": "whose effect: that of the rows kept, or that of everybody recovered from them by"
                " adjusting (total effects only)",
            },
            "measured_everywhere": {
                **NAMES,
                "description": "columns whose joint distribution over everybody is known, to recover the effect in"
                " everybody with",
            },
            "prefer": {
                "enum": ["every-minimal", "smallest", "cheapest", "most-precise"],
                "default": "every-minimal",
                "description": "which valid sets to list",
            },
            "limit": LIMIT,
            "cursor": CURSOR,
        },
        "required": ["graph", "treatment", "outcome"],
        "additionalProperties": False,
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
            "uniform": {
                "type": "boolean",
                "description": "with most-precise: is the one set best whatever the strengths?",
            },
            "every_candidate": {
                "type": "boolean",
                "description": "with most-precise: false where the search for candidates had to stop early",
            },
            "measure_next": {
                "description": "where no set exists: the cheapest unmeasured nodes and common causes behind"
                " bidirected edges whose measuring would make one; null where none would",
                "anyOf": [MEASURE_NEXT, {"type": "null"}],
            },
            "check": {
                "type": "object",
                "description": "present where the request has check",
                "properties": {
                    "valid": {"type": "boolean"},
                    "reasons": {"type": "array", "description": "none where valid", "items": _REASON},
                    "precision": {
                        "type": "array",
                        "description": "for a valid set: columns that only raise the variance, or lower it",
                        "items": {
                            "type": "object",
                            "properties": {
                                "rule": {
                                    "enum": ["raises-variance", "lowers-variance", "would-lower-variance"]
                                },
                                "columns": NAME_LIST,
                                "message": {"type": "string"},
                            },
                            "required": ["rule", "columns", "message"],
                            "additionalProperties": False,
                        },
                    },
                },
                "required": ["valid", "reasons", "precision"],
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
