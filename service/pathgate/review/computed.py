"""What a config should know about the columns that it computes, and about names that its graph does not have.

A recode stands for its column in the verdict, and what it loses of it is told here. Linear in the config.
"""

from __future__ import annotations

from collections.abc import Iterator

from pathgate.criteria.determined import determined_by_others
from pathgate.review.claims import Claim
from pathgate.review.config import Config
from pathgate.review.findings import Finding
from pathgate.review.names import Named
from pathgate.review.wording import listed


def computed_findings(claim: Claim, config: Config) -> Iterator[Finding]:
    """Warnings on computed columns, and a note on names outside the graph; none of them changes the verdict."""
    yield from _treatments(claim, config)
    yield from _coarse(claim, config)
    yield from _redundant(claim, config)
    yield from _outside(config)


def _treatments(claim: Claim, config: Config) -> Iterator[Finding]:
    for named in config.treated:
        bases = claim.graph.names_of(config.columns.bases(named.node))
        if len(bases) > 1:
            message = (
                f"The treatment {listed([named.written])} is computed from {listed(bases)}: setting it is not one"
                " well-defined action, since many values of these give the same one. What is judged is the effect"
                " of setting all of them. Make these columns the treatment instead, or one of them."
            )
            yield Finding("treatment-of-several-columns", bases, message, named.place)


def _coarse(claim: Claim, config: Config) -> Iterator[Finding]:
    keeps_a_part = config.columns.recodes
    whole = {named.node for named in config.adjusted_for if not keeps_a_part.get(named.written)}
    for named in (*config.adjusted_for, *config.repeated):
        if keeps_a_part.get(named.written) and named.node not in whole:
            name = claim.graph.name(named.node)
            message = (
                f"{listed([named.written])} keeps only a part of {listed([name])}: adjusting for it is partial, and"
                " what differs within one value of it still counts. The verdict takes it for the whole column. Adjust"
                f" for {listed([name])} itself if you can."
            )
            yield Finding("coarse-covariate", (name,), message, named.place)


def _redundant(claim: Claim, config: Config) -> Iterator[Finding]:
    redundant = determined_by_others(claim.adjusted_for, claim.inputs)
    for named in config.adjusted_for:
        if redundant >> named.node & 1:
            yield _told_redundant(claim, named, claim.graph.names_of(claim.inputs[named.node]))
    whole = {named.node for named in config.adjusted_for if not config.columns.recodes.get(named.written)}
    # Of two buckets of a column neither determines the other.
    for named in (each for each in config.repeated if each.node in whole):
        yield _told_redundant(claim, named, (claim.graph.name(named.node),))


def _told_redundant(claim: Claim, named: Named, made_of: tuple[str, ...]) -> Finding:
    message = (
        f"{listed([named.written])} is determined by {listed(made_of)}, which the model adjusts for already: it adds"
        f" nothing but a singular or nearly singular fit. Take {listed([named.written])} out."
    )
    return Finding("redundant-covariate", (claim.graph.name(named.node),), message, named.place)


def _outside(config: Config) -> Iterator[Finding]:
    told = dict[str, tuple[str | int, ...]]()
    for name, place in config.passed_over:
        told.setdefault(name, place)
    for name, place in told.items():
        message = (
            f"{listed([name])} is declared as outside the graph: nothing is known of it, and the verdict takes it to"
            " matter for nothing. If it may matter, put it into the graph."
        )
        yield Finding("outside-graph", (name,), message, place)
