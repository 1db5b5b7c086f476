"""Which promised independency would an edge between two columns break, so that data could show the edge?

That of the two themselves, where both are measured and some set of columns separates them: an edge breaks it
whatever is given. It is told as the graph's basis states it. Whether a pair can be separated is seen at once where
not even a path with every collider open joins the two; the rest is asked pair by pair, or for very many partners
of a node at once (``separable``).
"""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property

from pathgate.criteria.deadline import Deadline
from pathgate.criteria.independencies import Independency, basis
from pathgate.criteria.reachability import Conditions, connected
from pathgate.criteria.selection import keep_rows
from pathgate.criteria.separable import Pairs
from pathgate.criteria.verdict import are_separated
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.kinship import ancestors
from pathgate.graphs.masks import members

# More partners of a node than these are cheaper to ask about all at once.
FEW = 8


@dataclass(frozen=True)
class Exposing:
    """The promised independencies of the pairs of a small graph, as they are asked for.

    Attributes:
        graph: the graph that promises them.
        deadline: when to stop.
        hubs: nodes that many pairs have in common; these are asked about from there.
    """

    graph: CausalGraph
    deadline: Deadline
    hubs: int = 0
    _joined: dict[int, int] = field(default_factory=dict, repr=False)
    _above: dict[int, int] = field(default_factory=dict, repr=False)
    _separable: dict[int, tuple[int, int]] = field(default_factory=dict, repr=False)

    def above(self, node: int) -> int:
        """A node and its ancestors."""
        found = self._above.get(node)
        if found is None:
            found = self._above[node] = ancestors(self.graph, 1 << node)
        return found

    def statements(self, node: int, others: int) -> dict[int, Independency | None]:
        """For each of some other nodes the statement about it and ``node``; None where there is none.

        Raises:
            OutOfTime: the deadline came first.
        """
        separable = self._separable_from(node, others)
        return {
            other: self._statement(node, other) if separable >> other & 1 else None
            for other in members(others)
        }

    def _statement(self, node: int, other: int) -> Independency:
        first, second = (node, other) if node < other else (other, node)
        if self._is_fully_measured:
            return basis(self._pairs, first, second)
        return Independency(first, 1 << second, self._widest(first, second))

    def _separable_from(self, node: int, others: int) -> int:
        """Which of these can be separated from ``node`` by columns? What is found is remembered."""
        graph = self.graph
        if not graph.measured >> node & 1:
            return 0
        asked = others & graph.measured
        known, separable = self._separable.get(node, (0, 0))
        if asked & ~known:
            separable |= self._found_separable(node, asked & ~known)
            self._separable[node] = known | asked, separable
        return separable & asked

    def _found_separable(self, node: int, asked: int) -> int:
        graph = self.graph
        asked &= ~(graph.child_masks[node] | graph.parent_masks[node] | graph.spouse_masks[node])
        if self._is_fully_measured:
            return asked
        doubted = asked & ~self.hubs
        doubted &= self._joined_to(node) if doubted else 0
        for hub in members(asked & self.hubs):
            if self._joined_to(hub) >> node & 1:
                doubted |= 1 << hub
        separable = asked & ~doubted
        later = doubted >> node << node
        if later.bit_count() > FEW:
            separable |= self._pairs.separable(node, self.deadline) & later
            doubted &= ~later
        for other in members(doubted):
            self.deadline.poll()
            if are_separated(graph, 1 << node, 1 << other, self._widest(node, other)):
                separable |= 1 << other
        return separable

    def _joined_to(self, node: int) -> int:
        """What a path joins to the node on which only colliders are measured; without one nothing is inseparable."""
        if node not in self._joined:
            hopeful = Conditions(self.graph.measured & ~(1 << node), self.graph.everything)
            self._joined[node] = connected(self.graph, 1 << node, hopeful)
        return self._joined[node]

    def _widest(self, first: int, second: int) -> int:
        """The columns above a pair: they separate it where anything does."""
        above = self.above(first) | self.above(second)
        return above & self.graph.measured & ~(1 << first | 1 << second)

    @cached_property
    def _pairs(self) -> Pairs:
        return Pairs(keep_rows(self.graph))

    @cached_property
    def _is_fully_measured(self) -> bool:
        return self.graph.measured == self.graph.everything and not len(self.graph.lower_ends)
