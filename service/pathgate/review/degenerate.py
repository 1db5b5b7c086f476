"""Faults of a config that need no path to see: unmeasured columns, treatment or outcome where neither can be."""

from __future__ import annotations

from collections.abc import Iterator

from pathgate.graphs.masks import members
from pathgate.review.claims import Claim
from pathgate.review.config import Config, Named
from pathgate.review.findings import Finding
from pathgate.review.wording import listed, part_text


def degenerate_findings(claim: Claim, config: Config) -> Iterator[Finding]:
    """The faults of treatments, outcomes, covariates and filter parts by themselves."""
    for ends, role in ((config.treatments, "treatment"), (config.outcomes, "outcome")):
        for named in ends:
            if _is_unmeasured(claim, named.node):
                yield _unmeasured(claim, named, role)
    for named in config.covariates:
        yield from _covariate(claim, named)
    yield from _filter(claim, config)


def _covariate(claim: Claim, named: Named) -> Iterator[Finding]:
    name = claim.graph.name(named.node)
    for ends, role in ((claim.treatments, "treatment"), (claim.outcomes, "outcome")):
        if ends >> named.node & 1:
            message = (
                f"The {role} {listed([name])} is also a covariate: within one value of it nothing varies."
            )
            yield Finding(f"{role}-among-covariates", (name,), message, named.place)
    if _is_unmeasured(claim, named.node) and not claim.ends >> named.node & 1:
        yield _unmeasured(claim, named, "covariate")


def _filter(claim: Claim, config: Config) -> Iterator[Finding]:
    for filter_part in config.filter_parts:
        part, place = filter_part.part, filter_part.place
        unmeasured = claim.graph.names_of(part.columns & ~claim.readable)
        if unmeasured:
            message = (
                f"The row filter reads {listed(unmeasured)}, which the graph marks as unmeasured: the platform"
                " holds no such column, so no rows can be kept by it."
            )
            yield Finding("unmeasured-filter-column", unmeasured, message, place, part.written)
        for node in members(part.columns & claim.ends if part.fixed else 0):
            role = "treatment" if claim.treatments >> node & 1 else "outcome"
            name = claim.graph.name(node)
            message = (
                f"The condition {part_text(part.written)} keeps one value of the {role} {listed([name])}:"
                " nothing is left to compare."
            )
            yield Finding(f"{role}-fixed", (name,), message, place, part.written)


def _unmeasured(claim: Claim, named: Named, role: str) -> Finding:
    name = claim.graph.name(named.node)
    message = f"The {role} {listed([name])} is marked as unmeasured in the graph: the platform holds no such column."
    return Finding(f"unmeasured-{role}", (name,), message, named.place)


def _is_unmeasured(claim: Claim, node: int) -> bool:
    return not claim.graph.measured >> node & 1
