"""By what does a config adjust for a node: a covariate, weights, matching, or fixed effects that absorb it?

Each way is one thing to blame, with the place that names it. Linear in what the config adjusts for.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from pathgate.graphs.errors import Place
from pathgate.review.claims import Claim
from pathgate.review.config import Config
from pathgate.review.wording import listed


@dataclass(frozen=True, slots=True)
class Adjustment:
    """One thing in a config that holds a node fixed.

    Attributes:
        doing: what the config does, as the subject of a sentence.
        undone: what stops it, as a request.
        columns: the column that it names.
        place: where it names it.
    """

    doing: str
    undone: str
    columns: tuple[str, ...]
    place: Place


def adjustments(claim: Claim, config: Config, node: int) -> Iterator[Adjustment]:
    """Everything in a config by which it adjusts for a node, in the order of its members."""
    graph = claim.graph
    if not claim.usable_covariates >> node & 1:
        return
    for doing, several in (
        ("adjusting for", config.covariates),
        ("weighting by", config.weighted_by),
        ("matching on", config.matched_on),
        ("absorbing the fixed effects of", config.fixed_effects),
    ):
        for named in several:
            if named.node == node:
                columns = (graph.name(node),)
                full = f"{doing} {listed(columns)}"
                yield Adjustment(full, f"stop {full}", columns, named.place)
    for named in config.fixed_effects:
        if named.node != node and claim.absorbed(1 << named.node) >> node & 1:
            columns = (graph.name(named.node),)
            held = listed([graph.name(node)])
            full = f"absorbing the fixed effects of {listed(columns)}"
            doing = f"{full}, which hold {held} fixed,"
            yield Adjustment(doing, f"stop {full}", columns, named.place)
