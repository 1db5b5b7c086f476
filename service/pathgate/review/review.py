"""Does the number that a model config reports mean what it claims?

The verdict: ``sound`` where these covariates on these rows carry the effect claimed; ``unanswerable`` where
no choice of measured covariates and of filter parts would; ``biased`` otherwise, and then with a remedy.
It speaks of the graph that it was given.
"""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date

from pathgate.criteria.deadline import Deadline
from pathgate.criteria.measuring import MeasureNext
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import mask_of
from pathgate.review.assumptions import assumption_findings
from pathgate.review.breaks import breaking_findings
from pathgate.review.claims import Claim
from pathgate.review.coefficients import Coefficient, coefficients
from pathgate.review.computed import computed_findings
from pathgate.review.config import Config
from pathgate.review.crossing import term_findings
from pathgate.review.degenerate import degenerate_findings
from pathgate.review.everybody import population_findings
from pathgate.review.findings import Finding, Verdict
from pathgate.review.measuring import measure_next_for
from pathgate.review.remedies import Remedy, find_remedies
from pathgate.review.roles import ColumnRole, column_roles
from pathgate.review.rules import SEVERITIES
from pathgate.review.summary import summarise
from pathgate.review.timing import timing_findings
from pathgate.review.waivers import accept
from pathgate.review.warnings import warning_findings

_GRAVITY = {severity: rank for rank, severity in enumerate(SEVERITIES)}


@dataclass(frozen=True, slots=True)
class Review:
    """The verdict on one config, and all that led to it.

    Attributes:
        graph: the team's graph.
        config: the config that was read against it.
        claim: what was judged.
        findings: errors first, then warnings, each group in the order of the config.
        columns: role and advice for the columns of the config, its remedies and its open paths.
        coefficients: what each of the model's may be read as.
        remedies: fewest changes first; empty unless the verdict is ``biased``.
        measure_next: where the verdict is ``unanswerable``, the cheapest that would have to be measured for some
            choice to do; None where nothing helps.
        summary: the whole in one sentence.
    """

    graph: CausalGraph
    config: Config
    claim: Claim
    verdict: Verdict
    findings: tuple[Finding, ...]
    columns: tuple[ColumnRole, ...]
    coefficients: tuple[Coefficient, ...]
    remedies: tuple[Remedy, ...]
    summary: str
    measure_next: MeasureNext | None = None

    @property
    def falls_short(self) -> bool:
        """Is it not sound, by an error that no waiver accepts?"""
        return any(each.severity == "error" and each.accepted is None for each in self.findings)


def review(
    graph: CausalGraph,
    config: Config,
    deadline: Deadline | None = None,
    *,
    all_columns: bool = False,
    today: date | None = None,
) -> Review:
    """Judge a config against a graph; with ``all_columns`` every column of the graph is given its role.

    Waivers run out by ``today``, in UTC the day it is where none is given.

    Raises:
        OutOfTime: the deadline came first.

    >>> from pathgate.review.config import read_config
    >>> graph = CausalGraph.of(("rain", "delay"), ("rain", "refund"), ("delay", "refund"))
    >>> config = read_config({"treatment": "delay", "outcome": "refund", "covariates": []}, graph)
    >>> answer = review(graph, config)
    >>> answer.verdict, answer.findings[0].rule, answer.findings[0].columns
    ('biased', 'missing-covariate', ('rain',))
    """
    deadline = deadline or Deadline.never()
    claim = Claim.of(config)
    verdict, findings = verdict_and_findings(claim, config, deadline, today)
    remedies = find_remedies(claim, deadline) if verdict == "biased" else ()
    columns = claim.graph.measured if all_columns else 0
    columns |= _columns_in_question(claim, findings, remedies)
    first = remedies[0] if remedies else None
    return Review(
        graph=graph,
        config=config,
        claim=claim,
        verdict=verdict,
        findings=tuple(findings),
        columns=column_roles(claim, columns, first, deadline, is_sound=verdict == "sound"),
        coefficients=tuple(coefficients(claim, config, deadline)),
        remedies=remedies,
        summary=summarise(claim, verdict, findings, first),
        measure_next=measure_next_for(claim, deadline) if verdict == "unanswerable" else None,
    )


def verdict_and_findings(
    claim: Claim, config: Config, deadline: Deadline, today: date | None = None
) -> tuple[Verdict, list[Finding]]:
    """The part of a review that the verdict rests on; errors first.

    Raises:
        OutOfTime: the deadline came first.
    """
    findings = [
        *degenerate_findings(claim, config),
        *breaking_findings(claim, config, deadline),
        *population_findings(claim, config),
        *warning_findings(claim, config, deadline),
        *timing_findings(claim, config),
        *term_findings(claim, config),
        *computed_findings(claim, config),
        *assumption_findings(claim, config),
    ]
    findings = accept(findings, config.accepted, today)
    findings.sort(key=lambda finding: _GRAVITY[finding.severity])
    return _verdict(claim, findings), findings


def _verdict(claim: Claim, findings: list[Finding]) -> Verdict:
    if not any(finding.severity == "error" for finding in findings):
        return "sound"
    return "biased" if claim.can_be_carried else "unanswerable"


def _columns_in_question(claim: Claim, findings: list[Finding], remedies: tuple[Remedy, ...]) -> int:
    graph = claim.graph
    nodes = claim.ends | claim.adjusted_for
    for part in (*claim.parts, *claim.silent):
        nodes |= part.columns
    for remedy in remedies:
        nodes |= remedy.covariates
    for finding in findings:
        labels = finding.path.nodes if finding.path else finding.causal_path
        on_path = mask_of(graph.index[label] for label in labels if isinstance(label, str))
        nodes |= on_path & graph.measured
    return nodes
