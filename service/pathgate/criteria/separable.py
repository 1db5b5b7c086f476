"""Which pairs of measured nodes can be separated at all?

Two nodes can be separated by measured nodes exactly when their measured ancestors (with those of what the kept
rows condition on) do it; otherwise an inducing path joins them (Verma & Pearl 1990; Richardson & Spirtes
2002). All partners of a node are asked about at once, each as a lane of one search (``batch``):
O(nodes · (nodes + edges)) bit operations a node.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field
from functools import cached_property

from pathgate.criteria.batch import Lanes
from pathgate.criteria.deadline import Deadline
from pathgate.criteria.paths import Trail, find_open_path
from pathgate.criteria.reachability import Conditions, connected
from pathgate.criteria.selection import Kept
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.kinship import ancestors
from pathgate.graphs.masks import mask_of, members


def is_fully_measured(graph: CausalGraph) -> bool:
    """Every node measured and no bidirected edge."""
    return graph.measured == graph.everything and not len(graph.lower_ends)


@dataclass(frozen=True)
class Pairs:
    """The pairs of columns of a graph on kept rows.

    Attributes:
        kept: the graph and the rows kept.
        known: what ``Cliques`` found out for one pair and can use for others.
    """

    kept: Kept
    known: dict[int, int] = field(default_factory=dict, repr=False)
    _above: dict[int, int] = field(default_factory=dict, repr=False)
    _joined: dict[int, int] = field(default_factory=dict, repr=False)

    @cached_property
    def columns(self) -> int:
        """The measured nodes that vary among the kept rows."""
        return self.kept.graph.measured & ~self.kept.conditioned

    def separable(self, node: int, deadline: Deadline) -> int:
        """The columns after ``node`` in the graph's order from which some set of columns separates it.

        Raises:
            OutOfTime: the deadline came first.
        """
        graph = self.kept.graph
        later = self.columns >> (node + 1) << (node + 1)
        later &= ~self.adjacent(node)
        if not later or (is_fully_measured(graph) and not self.kept.conditioned):
            # In a DAG all of whose nodes are measured, the parents of the two separate them.
            return later
        always = self.above(node)
        blocked = [0] * graph.size
        for other in members(self.columns & ~(1 << node)):
            # Lane y stands for the pair of node and y, and y is not conditioned on in its own lane.
            lanes = later if always >> other & 1 else self.below[other] & later
            blocked[other] = lanes & ~(1 << other)
        for conditioned in members(self.kept.conditioned):
            blocked[conditioned] = later
        starts = [0] * graph.size
        starts[node] = later
        lanes_run = Lanes.of(graph, starts, blocked)
        lanes_run.run(deadline)
        return later & ~mask_of(other for other in members(later) if lanes_run.at(other) >> other & 1)

    def inseparable(self, deadline: Deadline) -> Iterator[tuple[int, int]]:
        """The pairs of columns without an edge between them that no set of columns separates.

        Raises:
            OutOfTime: the deadline came first.
        """
        for node in members(self.columns):
            later = self.columns >> (node + 1) << (node + 1)
            joined = later & ~self.adjacent(node) & ~self.separable(node, deadline)
            yield from ((node, other) for other in members(joined))

    def joined_alone(self, node: int) -> int:
        """The nodes that an open path joins to this one on the kept rows, with no column conditioned on."""
        found = self._joined.get(node)
        if found is None:
            # Asked about pair by pair: the last node's answer is all that is worth keeping.
            self._joined.clear()
            if self.kept.conditioned:
                conditions = Conditions.on(self.kept.graph, self.kept.conditioned)
                found = connected(self.kept.graph, 1 << node, conditions)
            else:
                found = self._below_the_same(self.above(node))
            self._joined[node] = found
        return found

    def _below_the_same(self, nodes: int) -> int:
        """What lies below some nodes, or below the other ends of their bidirected edges."""
        graph = self.kept.graph
        found = 0
        for node in members(nodes):
            if not found >> node & 1:
                found |= self.below[node]
            for spouse in graph.spouses(node):
                found |= self.below[spouse]
        return found

    def adjacent(self, node: int) -> int:
        """The nodes that an edge joins to this one."""
        graph = self.kept.graph
        if graph.is_small:
            return graph.parent_masks[node] | graph.child_masks[node] | graph.spouse_masks[node]
        return mask_of(graph.neighbour_lists[node])

    def widest(self, first: int, second: int) -> int:
        """The columns above a pair: they separate it where anything does."""
        above = self.above(first) | self.above(second)
        return above & self.columns & ~(1 << first | 1 << second)

    def inducing_path(self, first: int, second: int) -> Trail:
        """For an inseparable pair, a path that stays open whatever columns are conditioned on.

        Between its ends every node but the colliders is unmeasured, and every collider lies above an end or above
        what the kept rows condition on.
        """
        graph = self.kept.graph
        conditions = Conditions.on(graph, self.widest(first, second) | self.kept.conditioned)
        trail = find_open_path(graph, 1 << first, 1 << second, conditions)
        if trail is None:
            message = "no path joins an inseparable pair"
            raise AssertionError(message)
        return trail

    def above(self, node: int) -> int:
        """A node, its ancestors, and those of what the kept rows condition on."""
        if self.kept.graph.is_small:
            return self._all_above[node]
        found = self._above.get(node)
        if found is None:
            found = self._above[node] = ancestors(self.kept.graph, 1 << node) | self._above_kept
        return found

    @cached_property
    def _all_above(self) -> list[int]:
        graph = self.kept.graph
        above = [1 << node | self._above_kept for node in range(graph.size)]
        for node in graph.topological_order:
            for parent in graph.parents(node):
                above[node] |= above[parent]
        return above

    @cached_property
    def _above_kept(self) -> int:
        return ancestors(self.kept.graph, self.kept.conditioned)

    @cached_property
    def below(self) -> list[int]:
        """For each node itself and its descendants."""
        graph = self.kept.graph
        below = [1 << node for node in range(graph.size)]
        for node in reversed(graph.topological_order):
            for child in graph.children(node):
                below[node] |= below[child]
        return below
