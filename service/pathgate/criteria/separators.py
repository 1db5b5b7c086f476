"""Which sets of nodes separate two sets? A minimal one, a smallest, a cheapest, and all minimal ones.

Every question is bounded: a set must contain ``required`` and may contain ``allowed`` besides. If any such
set separates, all allowed ancestors do (van der Zander, Liśkiewicz & Textor 2019), and every minimal one
consists of ancestors of x, y and ``required``; so all questions are about vertex cuts of the augmented graph
of those ancestors. A minimal set takes two passes, O(nodes + edges) (van der Zander & Liśkiewicz 2020); a
smallest or cheapest one a minimum cut (Menger 1927); all minimal ones come with polynomial delay, by moving
nodes to the side of x one at a time (Takata 2010).
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property

from pathgate.criteria.cuts import cheapest_cut, smallest_cut
from pathgate.criteria.deadline import Deadline
from pathgate.criteria.disjoint import fewest_nodes_between
from pathgate.criteria.hubs import Cliques, Hubs
from pathgate.criteria.verdict import are_apart
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import members


@dataclass(frozen=True)
class Separators:
    """The separating sets of two disjoint sets of nodes, within bounds; all sets are masks.

    Attributes:
        graph: the graph.
        xs, ys: what is to be separated.
        required: what every set contains (measured or not, whatever else conditions on it).
        allowed: what a set may contain besides; x, y and required in it do not count.

    >>> graph = CausalGraph.of(("rain", "delay"), ("delay", "refund"), ("rain", "promo"), ("promo", "refund"))
    >>> found = Separators(graph, graph.mask("rain"), graph.mask("refund"), 0, graph.measured)
    >>> [graph.names_of(each) for each in found.every_minimal(Deadline.never())]
    [('delay', 'promo')]
    """

    graph: CausalGraph
    xs: int
    ys: int
    required: int
    allowed: int

    @cached_property
    def _hubs(self) -> Hubs:
        return Hubs.over(self.graph, self.xs | self.ys | self.required)

    @cached_property
    def _augmented(self) -> Cliques | Hubs:
        """The graph to be cut, in the form that suits its size."""
        if self.graph.is_small:
            return Cliques.over(self.graph, self.xs | self.ys | self.required)
        return self._hubs

    @cached_property
    def _choosable(self) -> int:
        """The nodes that a cut may take: allowed, relevant, and not there already."""
        return self.allowed & self._augmented.relevant & ~(self.xs | self.ys | self.required)

    @cached_property
    def exists(self) -> bool:
        """Does any set within the bounds separate?"""
        reached, _stopped = self._augmented.spread(self.xs, self._choosable | self.required)
        return not reached & self.ys

    def minimal(self) -> int | None:
        """A set that separates, of which no part that holds ``required`` does; None where none separates."""
        reached, near_x = self._augmented.spread(self.xs, self._choosable | self.required)
        if reached & self.ys:
            return None
        _, near_both = self._augmented.spread(self.ys, near_x | self.required)
        return (near_both & self._choosable) | self.required

    def smallest(self) -> int | None:
        """A separating set of the fewest nodes: of those the one nearest to x. None where none separates."""
        if isinstance(self._augmented, Cliques):
            if are_apart(self.graph, self.xs, self.ys, self.required, self._augmented.relevant):
                return self.required
            found = fewest_nodes_between(self._augmented, self.xs, self.ys, self._choosable, self.required)
            return None if found is None else found | self.required
        if not self.exists:
            return None
        return smallest_cut(self._hubs, self.xs, self.ys, self._choosable, self.required) | self.required

    def cheapest(self) -> int | None:
        """A separating set whose columns cost least together: of those the one nearest to y. None likewise."""
        if not self.exists:
            return None
        costs = {node: Fraction(self.graph.cost(node)) for node in members(self._choosable)}
        return cheapest_cut(self._hubs, self.xs, self.ys, costs, self.required) | self.required

    def every_minimal(self, deadline: Deadline) -> Iterator[int]:
        """All minimal sets that hold ``required``, each once; the next one always comes in polynomial time.

        Raises:
            OutOfTime: the deadline came first.
        """
        if not self.exists:
            return
        beside_x = self._absorbed(self.xs)
        # Every entry: a connected side of x, the separator nearest to it, and what must stay in the separator.
        waiting = [(beside_x, self._nearest(beside_x), 0)]
        while waiting:
            deadline.poll()
            side, separator, staying = waiting.pop()
            if separator is None or staying & ~separator:
                continue
            yield separator | self.required
            for node in members(separator & ~staying):
                deadline.poll()
                wider = self._absorbed(side | 1 << node)
                waiting.append((wider, self._nearest(wider), staying))
                staying |= 1 << node

    def _absorbed(self, side: int) -> int:
        """The side of x with every neighbour that no cut may take."""
        reached, _stopped = self._augmented.spread(side, self._choosable | self.required)
        return reached

    def _nearest(self, side: int) -> int | None:
        """The minimal separator nearest to a side of x: the part of its neighbours that y's side touches."""
        if side & self.ys:
            return None
        _, around = self._augmented.spread(side, self._choosable | self.required)
        _, touched = self._augmented.spread(self.ys, around | self.required)
        return touched & self._choosable
