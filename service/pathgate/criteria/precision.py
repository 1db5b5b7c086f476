"""Which valid covariate set gives the most precise estimate, and what does each column do to the precision?

In linear models (and for differences of means) some valid sets are proven never to be worse than others
(Henckel, Perković & Maathuis 2022; Rotnitzky & Smucler 2020). Taking what can be taken away and adding what
can be added, over and over, leads from any valid set to one that no step improves. Where all valid sets lead
to the same one it is uniformly the best; else which is best depends on strengths the graph does not tell
(with unmeasured nodes: Runge 2021; Smucler, Sapienza & Rotnitzky 2022), and the ends of all ways are listed.
"""

from __future__ import annotations

from dataclasses import dataclass

from pathgate.criteria.adjustment import Effect, covariates_in, valid_set
from pathgate.criteria.deadline import Deadline
from pathgate.criteria.errors import OutOfTime
from pathgate.criteria.precision_regions import Region, narrowed, parted
from pathgate.criteria.reachability import Conditions, connected
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import members

# How many nodes and edges a search looks at, all its regions together, before it ends with what it has: a few
# seconds, and more regions than a graph of a dozen nodes can have.
BUDGET = 400_000


@dataclass(frozen=True, slots=True)
class MostPrecise:
    """The valid sets that can give the least variance.

    Attributes:
        uniform: is the one set at least as good as every valid set, whatever the strengths?
        sets: that set, or the candidates: one for each way to be the best, the smallest; small ones first.
            Empty where no set is valid.
        complete: false where the search for candidates had to stop early.
    """

    uniform: bool
    sets: tuple[int, ...]
    complete: bool


@dataclass(frozen=True, slots=True)
class PrecisionNotes:
    """What columns do to the variance of the estimate a valid set gives; masks.

    Attributes:
        wasted: columns of the set that tell nothing more about the outcomes; they raise the variance, or leave
            it where they tell nothing about the treatments either.
        helpful: columns of the set that lower it and are not there for validity.
        missed: usable columns outside the set that would lower it.
    """

    wasted: int
    helpful: int
    missed: int


def most_precise(
    effect: Effect, deadline: Deadline, *, required: int = 0, allowed: int = -1, budget: int = BUDGET
) -> MostPrecise:
    """The valid set of least large-sample variance among those that hold ``required`` and keep to ``allowed``.

    A claim about the coefficients of a linear regression, each treatment's on each outcome. In graphs with
    every node measured and no bidirected edge the parents of the nodes on causal paths come out at once; else
    the search may part the valid sets into regions, which can be many: it ends when it has looked at
    ``budget`` nodes and edges, or at the deadline, with what it has by then. The work for each region is
    polynomial.

    >>> from pathgate.criteria import keep_rows, total_effect
    >>> from pathgate.graphs import CausalGraph
    >>> graph = CausalGraph.of(("rain", "late"), ("rain", "refund"), ("late", "refund"), ("price", "refund"))
    >>> found = most_precise(total_effect(keep_rows(graph), 2, 4), Deadline.never())
    >>> found.uniform, [graph.names_of(each) for each in found.sets]
    (True, [('rain', 'price')])
    """
    search = _Search.within(effect, required, allowed)
    first = valid_set(effect, required=required, allowed=allowed)
    if first is None:
        return MostPrecise(uniform=False, sets=(), complete=True)
    found, complete = search.unimproved(deadline, budget)
    found = found or {search.best_from(first | effect.kept.conditioned)}
    ordered = sorted(found, key=lambda mask: (mask.bit_count(), tuple(members(mask))))
    return MostPrecise(
        uniform=complete and len(ordered) == 1,
        sets=tuple(covariates_in(effect, mask, required) for mask in ordered),
        complete=complete,
    )


def precision_notes(effect: Effect, covariates: int) -> PrecisionNotes:
    """What the columns inside and outside a valid set do to its precision. O(nodes + edges).

    >>> from pathgate.criteria import keep_rows, total_effect
    >>> from pathgate.graphs import CausalGraph
    >>> graph = CausalGraph.of(("app", "late"), ("late", "refund"), ("price", "refund"))
    >>> notes = precision_notes(total_effect(keep_rows(graph), 2, 4), 1)
    >>> graph.names_of(notes.wasted), graph.names_of(notes.missed)
    (('app',), ('price',))
    """
    graph, conditioned = effect.kept.graph, covariates | effect.kept.conditioned
    own = covariates & ~effect.kept.conditioned
    tell_of_treatments = _joined(graph, effect.treatments, conditioned)
    tell_of_outcomes = _joined(graph, effect.outcomes, conditioned | effect.treatments)
    return PrecisionNotes(
        wasted=own & ~tell_of_outcomes,
        helpful=own & tell_of_outcomes & ~tell_of_treatments,
        # A column that tells nothing about the treatments never makes a valid set invalid.
        missed=effect.usable & ~conditioned & tell_of_outcomes & ~tell_of_treatments,
    )


def _joined(graph: CausalGraph, starts: int, conditioned: int) -> int:
    """The nodes that tell something about ``starts`` that (the rest of) what is conditioned on does not.

    A path that a conditioned node opens and that leads to that node can be cut short, from the collider
    straight down: so one search answers for each conditioned node as if it alone were not conditioned on.
    """
    return connected(graph, starts, Conditions.on(graph, conditioned))


@dataclass(frozen=True, slots=True)
class _Search:
    """Valid sets within bounds; all masks of sets hold what the kept rows condition on.

    Attributes:
        held, optional: what every set holds, and what it may hold besides.
    """

    effect: Effect
    held: int
    optional: int

    @classmethod
    def within(cls, effect: Effect, required: int, allowed: int) -> _Search:
        held = required | effect.kept.conditioned
        return cls(effect, held, effect.usable & allowed & ~held)

    def unimproved(self, deadline: Deadline, budget: int) -> tuple[set[int], bool]:
        """Every set that no step improves; and false where the budget or the time did not suffice for all."""
        graph, found, waiting = self.effect.kept.graph, set[int](), [Region(self.held, self.optional)]
        regions = max(1, budget // (graph.size + len(graph.sources) + len(graph.lower_ends)))
        try:
            while waiting and regions:
                regions -= 1
                region = narrowed(self.effect, waiting.pop(), deadline)
                if region is not None and region.optional:
                    waiting += parted(self.effect, region)
                elif region is not None:
                    found.add(self.best_from(region.held))
        except OutOfTime:
            return found, False
        return found, not waiting

    def best_from(self, valid: int) -> int:
        """Where steps lead from a valid set: a set that none improves, and the smallest of its equals.

        What can be added can be added all at once, and likewise taken away. A set that comes out of both
        unchanged has no equals but itself with columns that change nothing, and leads to nothing better.
        """
        graph, treatments = self.effect.kept.graph, self.effect.treatments
        current = self._tightened(valid)
        while True:
            added = self.optional & ~_joined(graph, treatments, current)
            better = self._tightened(current | added)
            if better == current:
                return current
            current = better

    def _tightened(self, valid: int) -> int:
        """The set without the columns that tell nothing more about the outcomes."""
        conditioned = valid | self.effect.treatments
        return valid & (self.held | _joined(self.effect.kept.graph, self.effect.outcomes, conditioned))
