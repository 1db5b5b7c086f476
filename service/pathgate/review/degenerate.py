"""Faults of a config that need no path to see: unmeasured columns, treatment or outcome where neither can be.

The comparison cannot be made at all, or is empty, whatever paths there are. Linear in the config, but for what fixed
effects absorb.
"""

from __future__ import annotations

from collections.abc import Iterator

from pathgate.graphs.masks import members
from pathgate.review.claims import Claim
from pathgate.review.config import Config
from pathgate.review.findings import Finding
from pathgate.review.names import Named
from pathgate.review.wording import condition_text, listed


def degenerate_findings(claim: Claim, config: Config) -> Iterator[Finding]:
    """The faults of treatments, outcomes, covariates and filter parts by themselves."""
    for ends, role in ((config.treatments, "treatment"), (config.outcomes, "outcome")):
        for named in ends:
            if _is_unmeasured(claim, named.node):
                yield _unmeasured(claim, named, role)
    for named in config.adjusted_for:
        yield from _covariate(claim, config, named)
    yield from _absorbed_ends(claim, config)
    stuck = claim.leaves_no_variation(claim.usable)
    yield from _stuck_covariates(claim, config, stuck)
    yield from _stuck_conditions(claim, config, stuck)
    yield from _filter(claim, config)


def _absorbed_ends(claim: Claim, config: Config) -> Iterator[Finding]:
    """Fixed effects that hold a treatment or an outcome fixed."""
    graph = claim.graph
    for named in config.fixed_effects:
        for node in members(claim.absorbed(1 << named.node) & claim.ends):
            role = "treatment" if claim.treatments >> node & 1 else "outcome"
            columns = graph.names_of(1 << named.node | 1 << node)
            message = (
                f"The {role} {listed([graph.name(node)])} has one value within each value of"
                f" {listed([graph.name(named.node)])}: once its fixed effects are absorbed, nothing is left to"
                " compare. Take these fixed effects out."
            )
            yield Finding("no-variation-left", columns, message, named.place)


def _stuck_covariates(claim: Claim, config: Config, stuck: int) -> Iterator[Finding]:
    """Columns adjusted for that only the treatments can make vary."""
    graph = claim.graph
    for named in config.adjusted_for:
        if stuck >> named.node & 1:
            made_of = graph.names_of(claim.inputs[named.node])
            message = (
                f"{listed([graph.name(named.node)])} is computed from {listed(made_of)}: with what else the model"
                f" adjusts for, only {listed(graph.names_of(claim.treatments), 'or')} can make it differ, so within"
                " one value of it the treatment has no variation of its own. Stop adjusting for"
                f" {listed([graph.name(named.node)])}."
            )
            yield Finding("no-variation-left", (graph.name(named.node),), message, named.place)


def _stuck_conditions(claim: Claim, config: Config, stuck: int) -> Iterator[Finding]:
    """The same where a condition on the rows holds such a column at one value."""
    graph = claim.graph
    for filter_part in config.rows.filter_parts:
        part = filter_part.part
        for node in members(stuck & part.columns if part.fixed else 0):
            made_of = graph.names_of(claim.inputs[node])
            message = (
                f"{condition_text(part.written)} keeps one value of {listed([graph.name(node)])}, which is"
                f" computed from {listed(made_of)}: with what the model adjusts for, only"
                f" {listed(graph.names_of(claim.treatments), 'or')} can make it differ, so the treatment is left no"
                " variation of its own. Drop that condition."
            )
            yield Finding("no-variation-left", (graph.name(node),), message, filter_part.place, part.written)


def _both(config: Config, named: Named, name: str, role: str) -> str:
    """How it reads that the model adjusts for its own treatment or outcome."""
    treated = {each.written for each in config.treated if config.columns.inputs.get(each.node, 0)}
    is_input = named.node not in {each.node for each in config.treated}
    if role == "treatment" and treated and is_input:
        made = listed(sorted(treated))
        shown = listed([name])
        also = f"The treatment {made} is computed from {shown}, which the model also adjusts for."
        return f"{also} Stop adjusting for {shown}."
    also = f"The {role} {listed([name])} is also adjusted for: within one value of it nothing varies."
    return f"{also} Stop adjusting for it."


def _covariate(claim: Claim, config: Config, named: Named) -> Iterator[Finding]:
    name = claim.graph.name(named.node)
    for ends, role in ((claim.treatments, "treatment"), (claim.outcomes, "outcome")):
        if ends >> named.node & 1:
            yield Finding(f"{role}-among-covariates", (name,), _both(config, named, name, role), named.place)
    if _is_unmeasured(claim, named.node) and not claim.ends >> named.node & 1:
        yield _unmeasured(claim, named, "covariate")


def _filter(claim: Claim, config: Config) -> Iterator[Finding]:
    for filter_part in config.rows.filter_parts:
        part, place = filter_part.part, filter_part.place
        unmeasured = claim.graph.names_of(part.columns & ~claim.readable)
        if unmeasured:
            message = (
                f"The row filter reads {listed(unmeasured)}, which the graph marks as unmeasured: the platform"
                " holds no such column, so no rows can be kept by it. Drop that condition; or, if you do hold the"
                " column, take `measured: false` off its node."
            )
            yield Finding("unmeasured-filter-column", unmeasured, message, place, part.written)
        for node in members(part.columns & claim.ends if part.fixed else 0):
            role = "treatment" if claim.treatments >> node & 1 else "outcome"
            name = claim.graph.name(node)
            message = (
                f"{condition_text(part.written)} keeps one value of the {role} {listed([name])}:"
                " nothing is left to compare. Drop that condition."
            )
            yield Finding(f"{role}-fixed", (name,), message, place, part.written)


def _unmeasured(claim: Claim, named: Named, role: str) -> Finding:
    name = claim.graph.name(named.node)
    instead = "take it out of the config" if role == "covariate" else f"ask about a measured {role}"
    message = (
        f"The {role} {listed([name])} is marked as unmeasured in the graph: the platform holds no such column. If"
        f" you do hold it, take `measured: false` off its node; else {instead}."
    )
    return Finding(f"unmeasured-{role}", (name,), message, named.place)


def _is_unmeasured(claim: Claim, node: int) -> bool:
    return not claim.graph.measured >> node & 1
