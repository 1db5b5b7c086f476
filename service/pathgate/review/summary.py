"""The whole verdict in one sentence that can stand alone in a chat or a log.

It names the effect, the columns to blame and the first remedy, and says no more than the findings do.
"""

from __future__ import annotations

from collections.abc import Sequence

from pathgate.criteria.whole import weighting
from pathgate.review.claims import Claim
from pathgate.review.findings import Finding, Verdict
from pathgate.review.remedies import Remedy
from pathgate.review.wording import listed, part_text

SOUND_MEANS = (
    "Sound means that these covariates on these rows suffice if the graph is right: it says nothing of"
    " functional form, interference or measurement error, nor of odds and hazard ratios, which change with any"
    " cause of the outcome that is adjusted for."
)
ABOUT_THE_GRAPH = (
    "A verdict is about the graph it was given: it does not show that the graph is right. Where a number decides"
    " about people's health, credit, work or safety, a qualified statistician and the local rules come first."
)


def summarise(
    claim: Claim,
    verdict: Verdict,
    findings: Sequence[Finding],
    remedy: Remedy | None,
) -> str:
    """One sentence that names the effect, the verdict, the culprits and the way out."""
    graph = claim.graph
    ends = f"{listed(graph.names_of(claim.treatments))} on {listed(graph.names_of(claim.outcomes))}"
    effect = f"{claim.effect_name} of {ends}"
    if verdict == "sound":
        adjusted = graph.names_of(claim.adjusted_for)
        how = f"adjusted for {listed(adjusted)}" if adjusted else "without covariates"
        how += _weighted(claim)
        return f"Sound: {effect}, {how}, is what the model reports, if the graph is right."
    culprits = _culprits(findings)
    if verdict == "unanswerable":
        return f"Unanswerable: no choice of measured covariates gives {effect} ({culprits})."
    return f"Biased: the model does not report {effect} ({culprits}); {remedy_text(claim, remedy)}."


def _weighted(claim: Claim) -> str:
    """By what the estimate must be weighted for it to speak of everybody."""
    if claim.population != "whole":
        return ""
    by = weighting(claim.effect, claim.usable_covariates, claim.known)
    return (
        f" and weighted by how {listed(claim.graph.names_of(by))} is distributed in everybody" if by else ""
    )


def remedy_text(claim: Claim, remedy: Remedy | None) -> str:
    """What a remedy asks for, as the end of a sentence."""
    if remedy is None:
        return "no remedy was found"
    graph = claim.graph
    steps = []
    if remedy.add:
        steps.append(f"adjust for {listed(graph.names_of(remedy.add))}")
    if remedy.drop:
        steps.append(f"stop adjusting for {listed(graph.names_of(remedy.drop))}")
    if remedy.drop_parts:
        shown = " and ".join(part_text(part.written) for part in remedy.drop_parts)
        steps.append(f"stop filtering by {shown}")
    return f"to mend it, {' and '.join(steps)}"


def _culprits(findings: Sequence[Finding]) -> str:
    told = dict.fromkeys(
        f"{finding.rule}: {listed(finding.columns)}" for finding in findings if finding.severity == "error"
    )
    shown = list(told)
    more = [f"{len(shown) - 3} more"] if len(shown) > 3 else []
    return "; ".join([*shown[:3], *more])
