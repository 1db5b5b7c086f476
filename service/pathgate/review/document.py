"""A review as the JSON document that HTTP callers and the command print: the same members, the same bytes."""

from __future__ import annotations

from typing import Any

from pathgate.criteria.measuring import MeasureNext
from pathgate.criteria.paths import OpenPath, Step
from pathgate.criteria.selection import Label, Part
from pathgate.graphs.errors import pointer
from pathgate.graphs.graph import CausalGraph
from pathgate.review.claims import Claim
from pathgate.review.config import NO_META
from pathgate.review.findings import Finding
from pathgate.review.remedies import Remedy
from pathgate.review.review import Review
from pathgate.review.roles import ColumnRole
from pathgate.review.summary import ABOUT_THE_GRAPH, SOUND_MEANS, remedy_text

Json = dict[str, Any]


def review_document(answer: Review) -> Json:
    """The answer of /v1/review."""
    claim = answer.claim
    document: Json = {
        "name": answer.config.name,
        "verdict": answer.verdict,
        "summary": answer.summary,
        "findings": [finding_document(finding) for finding in answer.findings],
        "columns": [_role_document(each) for each in answer.columns],
        "coefficients": [
            {"term": each.term, "reads_as": each.reads_as, "why": each.why} for each in answer.coefficients
        ],
        "remedies": [remedy_document(claim, remedy) for remedy in answer.remedies],
        "cautions": [SOUND_MEANS, ABOUT_THE_GRAPH] if answer.verdict == "sound" else [ABOUT_THE_GRAPH],
    }
    if answer.verdict == "unanswerable":
        document["measure_next"] = measure_document(claim.graph, answer.measure_next)
    if answer.config.meta is not NO_META:
        document["meta"] = answer.config.meta
    return document


def _role_document(found: ColumnRole) -> Json:
    document: Json = {"column": found.column, "role": found.role, "advice": found.advice}
    if found.precision is not None:
        document["precision"] = found.precision
    return document


def finding_document(finding: Finding) -> Json:
    """One finding; with its part and its paths only where it has them."""
    document: Json = {
        "rule": finding.rule,
        "severity": finding.severity,
        "columns": list(finding.columns),
        "message": finding.message,
        "pointer": pointer(("config", *finding.place)),
        "help": f"/docs/rules/{finding.rule}",
    }
    if finding.part is not None:
        document["part"] = finding.part
    if finding.accepted is not None:
        until = finding.accepted.until
        document["accepted"] = {
            "why": finding.accepted.why,
            "owner": finding.accepted.owner,
            "until": None if until is None else until.isoformat(),
        }
    if finding.path is not None:
        document["open_path"] = path_document(finding.path)
    if finding.causal_path:
        document["causal_path"] = [label_document(label) for label in finding.causal_path]
        document["descent"] = [label_document(label) for label in finding.descent]
    return document


def remedy_document(claim: Claim, remedy: Remedy) -> Json:
    """One remedy; its lists of columns in the graph's order."""
    names = claim.graph.names_of
    return {
        "covariates": list(names(remedy.covariates & ~claim.beside | remedy.add)),
        "add": list(names(remedy.add)),
        "drop": list(names(remedy.drop)),
        "drop_filter_parts": [part.written for part in remedy.drop_parts],
        "population": claim.population,
        "message": remedy_text(claim, remedy),
    }


def measure_document(graph: CausalGraph, found: MeasureNext | None) -> Json | None:
    """What to measure so that some choice of covariates would do; None where no measuring helps."""
    if found is None:
        return None
    return {
        "measure": list(graph.names_of(found.nodes)),
        "causes_of": [[graph.name(first), graph.name(second)] for first, second in found.causes_of],
    }


def path_document(path: OpenPath) -> Json:
    """A path as answers show it."""
    return {
        "nodes": [label_document(label) for label in path.nodes],
        "arrows": list(path.arrows),
        "steps": [_step_document(step) for step in path.steps],
    }


def label_document(label: Label) -> Any:
    """A node's name, or the condition that a selection node stands for."""
    return {"part": label.written} if isinstance(label, Part) else label


def _step_document(step: Step) -> Json:
    document: Json = {
        "node": label_document(step.node),
        "role": step.role,
        "open": True,
        "because": step.because,
    }
    if step.through:
        document["through"] = [label_document(label) for label in step.through]
    return document
