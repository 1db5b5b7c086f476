"""What does an optional column do to the precision of an estimate, in linear models?

With and without it the estimate is right; its variance is that of the outcome given treatments and covariates over
that of the treatments given the covariates. A column that is independent of the treatments given the other
covariates can only lower the first; one that is independent of the outcome given these and the treatments can only
lower the second (Henckel, Perković & Maathuis 2022). Where neither holds it depends on strengths that no graph
tells. Two separations, each O(nodes + edges).
"""

from __future__ import annotations

from typing import Literal

from pathgate.criteria.adjustment import Effect
from pathgate.criteria.verdict import are_separated

Precision = Literal["raises", "lowers", "none"]


def precision_of(effect: Effect, others: int, node: int) -> Precision:
    """What adjusting for ``node`` beside the ``others`` does to the precision; both choices carry the effect."""
    graph, column = effect.kept.graph, 1 << node
    given = others & ~column | effect.kept.conditioned
    if not are_separated(graph, effect.treatments, column, given):
        return "lowers"
    is_apart_from_outcome = are_separated(graph, effect.outcomes, column, given | effect.treatments)
    return "none" if is_apart_from_outcome else "raises"
