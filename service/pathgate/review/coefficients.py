"""What may each coefficient of a model be read as: the total effect of its column, the direct one, or neither?

The treatment's verdict does not carry over to the covariates (Westreich & Greenland 2013): each column is judged as
if it were the treatment, the other terms being what is adjusted for. Direct effects are those of linear models. Two
criteria a term, each O(nodes + edges).
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Literal

from pathgate.criteria.adjustment import Effect, direct_effect, is_valid, total_effect
from pathgate.criteria.deadline import Deadline
from pathgate.criteria.determined import determined_by
from pathgate.criteria.paths import find_open_path
from pathgate.criteria.selection import fixed_by
from pathgate.graphs.masks import mask_of
from pathgate.review.claims import Claim
from pathgate.review.config import Config
from pathgate.review.terms import ModelTerm
from pathgate.review.wording import arrow_text, listed, names_in

ReadsAs = Literal["total", "direct", "neither"]


@dataclass(frozen=True, slots=True)
class Coefficient:
    """How one coefficient may be read.

    Attributes:
        term: the term as the config writes it.
        reads_as: the total effect on the outcome, the direct one, or neither.
        why: one sentence.
    """

    term: str
    reads_as: ReadsAs
    why: str


def coefficients(claim: Claim, config: Config, deadline: Deadline) -> Iterator[Coefficient]:
    """One for each term of the model, in its order.

    Raises:
        OutOfTime: the deadline came first.
    """
    reading = _Reading(claim, config)
    for term in config.terms:
        deadline.poll()
        reads_as, why = reading.read(term)
        yield Coefficient(term.written, reads_as, why)


class _Reading:
    """Judges the terms of one model; the rows kept are the same for all."""

    def __init__(self, claim: Claim, config: Config) -> None:
        self._claim = claim
        self._columns = config.columns
        self._graph = claim.graph
        self._kept = claim.effect.kept
        self._terms = claim.usable.covariates | mask_of(named.node for named in config.treated)
        absorbing = claim.usable.fixed_effects
        self._absorbed = absorbing | claim.absorbed(absorbing)
        self._outcomes = listed(self._graph.names_of(claim.outcomes))
        self._pinned = fixed_by(claim.parts)
        self._unfit = self._why_unfit()

    def read(self, term: ModelTerm) -> tuple[ReadsAs, str]:
        """How one term reads, and why."""
        if term.node is None:
            return "neither", self._product(term)
        if term.crossed:
            others = self._graph.names_of(term.crossed)
            where = (
                "is zero or at its first level" if len(others) == 1 else "are zero or at their first levels"
            )
            return "neither", f"the effect where {listed(others)} {where}: the terms let it differ"
        if term.is_bent:
            return "neither", "several terms together describe this column: none of them is its effect alone"
        return self._column(term.node)

    def _why_unfit(self) -> str:
        """Why no coefficient of this model means anything; empty where some may."""
        missing = self._graph.names_of(self._claim.ends & ~self._graph.measured)
        if missing:
            return f"the platform does not hold {listed(missing)}, so no such model can be fitted"
        adjusted = self._graph.names_of(self._claim.adjusted_for & self._claim.outcomes)
        if adjusted:
            return (
                f"the model adjusts for the outcome {listed(adjusted)} itself, so nothing is left to explain"
            )
        for fixed, what in ((self._pinned, "rows kept have"), (self._absorbed, "fixed effects leave")):
            names = self._graph.names_of(self._claim.outcomes & fixed)
            if names:
                return f"the {what} one value of {listed(names)}, so nothing is left to explain"
        return ""

    def _product(self, term: ModelTerm) -> str:
        columns = self._graph.names_of(term.crossed)
        if not columns:
            return "it is declared as outside the graph: nothing is known of it"
        if len(columns) < 2:
            return "several terms together describe this column: none of them is its effect alone"
        return f"how the effect of {listed(columns[:1])} differs by {listed(columns[1:])}, and no effect of a column"

    def _column(self, node: int) -> tuple[ReadsAs, str]:
        if self._unfit:
            return "neither", self._unfit
        causes = self._columns.bases(node)
        unfit = self._why_no_cause(node, causes)
        if unfit:
            return "neither", unfit
        others = self._terms & ~(1 << node) | self._absorbed
        stuck = self._without_variation(node, causes, others)
        if stuck:
            return "neither", stuck
        total = self._total_effect(causes)
        if is_valid(total, others):
            return "total", self._total(total)
        direct = self._direct(causes)
        if direct is not None and is_valid(direct, others):
            return "direct", self._direct_words(total, direct, others)
        return "neither", self._neither(total, direct, others)

    def _why_no_cause(self, node: int, causes: int) -> str:
        """Why the column itself can have no effect here; empty where it can."""
        own, outcomes = 1 << node, self._claim.outcomes
        missing = self._graph.names_of((own | causes) & ~self._graph.measured)
        if missing:
            of_it = "it" if own & ~self._graph.measured else f"{listed(missing)}, which it is computed from"
            return f"the platform does not hold {of_it}"
        if outcomes & own:
            return "it is the outcome itself"
        if outcomes & causes:
            return f"it is computed from the outcome {listed(self._graph.names_of(outcomes & causes))}"
        if self._pinned & own:
            return "the rows kept have one value of it, so nothing of it is left to vary"
        pinned = self._graph.names_of(self._pinned & causes)
        if pinned:
            return f"it is computed from {listed(pinned)}, of which the rows kept have one value"
        return ""

    def _total_effect(self, causes: int) -> Effect:
        claim = self._claim
        if claim.asks == "total" and causes == claim.treatments:
            return claim.effect
        return total_effect(self._kept, causes, claim.outcomes)

    def _direct(self, causes: int) -> Effect | None:
        outcomes = self._claim.outcomes
        if causes.bit_count() > 1 or outcomes.bit_count() > 1:
            return None
        return direct_effect(self._kept, causes, outcomes)

    def _without_variation(self, node: int, causes: int, others: int) -> str:
        """Why nothing of the column is left once the other terms are held fixed; empty where something is."""
        shared = self._graph.names_of(causes & others)
        if 1 << node & others:
            return "the fixed effects absorb it, so nothing of it is left to vary"
        if shared:
            return f"it is computed from {listed(shared)}, which the model holds fixed as well"
        inputs = self._claim.inputs
        held = others | self._kept.conditioned & self._graph.everything
        if inputs and determined_by(held, inputs) & (causes | 1 << node):
            return "what else is held fixed determines it, so nothing of it is left to vary"
        stuck = self._claim.only_varied_by(causes, held)
        if stuck:
            names = listed(self._graph.names_of(stuck))
            are = "are" if stuck.bit_count() > 1 else "is"
            return f"{names} {are} computed from it and held fixed, so nothing of it is left to vary"
        return ""

    def _total(self, effect: Effect) -> str:
        if not effect.on_causal_paths:
            return f"nothing leads from it to {self._outcomes}: by this graph the effect is zero"
        return f"what else the model holds fixed leaves open nothing but its effect on {self._outcomes}"

    def _direct_words(self, total: Effect, direct: Effect, others: int) -> str:
        held = names_in(self._kept, others & total.forbidden)
        by_way = f", with {listed(held)} held fixed on the way" if held else ""
        if not direct.on_causal_paths:
            return f"the effect of its own arrow to {self._outcomes}{by_way}; there is none, so by this graph zero"
        return f"the effect of its own arrow to {self._outcomes} in a linear model{by_way}"

    def _neither(self, total: Effect, direct: Effect | None, others: int) -> str:
        held = others | self._kept.conditioned
        effect = direct if direct is not None and held & total.forbidden else total
        barred = names_in(self._kept, held & effect.forbidden)
        if barred:
            return f"the model holds {listed(barred)} fixed, which its effect on {self._outcomes} acts upon"
        graph = effect.back_door_graph
        trail = find_open_path(graph, effect.treatments, effect.outcomes, effect.conditioning(held))
        if trail is None:
            return f"the rows kept leave nothing of it or of {self._outcomes} to vary"
        return f"the path {arrow_text(self._kept, trail, held)} stays open beside its effect"
