"""Which sets of nodes cut several things at once, where each is cut in a graph of its own?

Every question is a vertex cut of an augmented graph (``hubs``); a joint cut holds a cut of each. One alone is
``separators``' business. A least joint cut is searched for: take or leave one node at a time, between the
bounds that minimum cuts give (Land & Doig 1960), and give a branch up once what is left cannot cut, or some
node taken cannot be needed any more: no open way leads to it from both sides. A branch costs one minimum cut for
each thing to cut; at worst there are exponentially many branches, so the search watches the deadline.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction

from pathgate.criteria.cuts import cheapest_cut, smallest_cut
from pathgate.criteria.deadline import Deadline
from pathgate.criteria.hubs import Hubs
from pathgate.criteria.separators import Separators
from pathgate.graphs.masks import members


@dataclass(frozen=True)
class Cut:
    """One thing to cut; all sets are masks.

    Attributes:
        hubs: the augmented graph.
        xs, ys: what is to be cut apart.
        choosable: the nodes a cut may take.
        removed: the nodes that are gone already.
    """

    hubs: Hubs
    xs: int
    ys: int
    choosable: int
    removed: int

    @classmethod
    def of(cls, bounds: Separators) -> Cut:
        """The sets within these bounds, less what all of them hold."""
        ends = bounds.xs | bounds.ys
        hubs = Hubs.over(bounds.graph, ends | bounds.required)
        choosable = bounds.allowed & hubs.relevant & ~(ends | bounds.required)
        return cls(hubs, bounds.xs, bounds.ys, choosable, bounds.required)

    def is_made_by(self, taken: int) -> bool:
        """Does nothing lead from x to y any more?"""
        reached, _stopped = self.hubs.spread(self.xs, self.removed | taken & self.choosable)
        return not reached & self.ys

    def needed(self, taken: int) -> int:
        """The nodes taken to which open ways lead from both sides: without one, the two would be joined."""
        stops = self.removed | taken & self.choosable
        _reached, from_x = self.hubs.spread(self.xs, stops)
        _reached, from_y = self.hubs.spread(self.ys, stops)
        return from_x & from_y & taken & self.choosable

    def core(self, taken: int) -> int:
        """A minimal part of a set that makes the cut: always the same one, the part nearest to x."""
        _reached, met = self.hubs.spread(self.xs, self.removed | taken & self.choosable)
        _reached, met = self.hubs.spread(self.ys, self.removed | met)
        return met & self.choosable


@dataclass(frozen=True)
class JointCuts:
    """The sets that make every one of several cuts."""

    cuts: tuple[Cut, ...]

    @property
    def choosable(self) -> int:
        """All nodes that some cut may take."""
        mask = 0
        for cut in self.cuts:
            mask |= cut.choosable
        return mask

    def needed(self, taken: int) -> int:
        """The nodes without which some cut would be open; all of them where a joint cut is minimal."""
        mask = 0
        for cut in self.cuts:
            mask |= cut.needed(taken)
        return mask

    def least(self, costs: Mapping[int, Fraction], deadline: Deadline) -> int | None:
        """A joint cut of the least total cost; None where there is none.

        A branch is bounded from below by its costliest single cut, from above by all its cuts together.

        Raises:
            OutOfTime: the deadline came first.
        """
        best: tuple[Fraction, int] | None = None
        waiting = [(0, 0)]
        while waiting:
            deadline.poll()
            taken, left = waiting.pop()
            if not self._is_hopeful(taken, left):
                continue
            single = [_cheapest(cut, taken, left, costs) for cut in self.cuts]
            together = taken
            for each in single:
                together |= each
            if best is None or _cost(together, costs) < best[0]:
                best = (_cost(together, costs), together)
            bound = _cost(taken, costs) + max(_cost(each, costs) for each in single)
            if bound < best[0]:
                node = (together & ~taken) & -(together & ~taken)
                waiting.append((taken, left | node))
                waiting.append((taken | node, left))
        return None if best is None else best[1]

    def _is_hopeful(self, taken: int, left: int) -> bool:
        """Can what is neither taken nor left still cut everything, and may every node taken be needed?"""
        rest = self.choosable & ~left
        return all(cut.is_made_by(rest) for cut in self.cuts) and self.needed(taken) == taken


def _cheapest(cut: Cut, taken: int, left: int, costs: Mapping[int, Fraction]) -> int:
    """The cheapest way to make one cut with nodes that are not left, those taken being gone."""
    if cut.is_made_by(taken):
        return 0
    free, removed = cut.choosable & ~(taken | left), cut.removed | taken & cut.choosable
    if len(set(costs.values())) == 1:
        return smallest_cut(cut.hubs, cut.xs, cut.ys, free, removed)
    priced = {node: costs[node] for node in members(free)}
    return cheapest_cut(cut.hubs, cut.xs, cut.ys, priced, removed)


def _cost(nodes: int, costs: Mapping[int, Fraction]) -> Fraction:
    return sum((costs[node] for node in members(nodes)), Fraction(0))
