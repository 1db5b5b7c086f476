"""Verdicts on many statements about one graph at once.

Every statement is a lane: one bit of an integer that each node holds for each way of entering it. One pass
along the arrows moves all lanes together, so a thousand statements cost little more than one. Passes against
and along the arrows alternate until nothing moves; a path that turns k times at open colliders takes k
passes over the nodes it touches. O(turns · (nodes + edges) · statements / word) at the worst.
"""

from __future__ import annotations

import heapq
from collections.abc import Sequence
from dataclasses import dataclass, field

from pathgate.criteria.deadline import Deadline
from pathgate.criteria.verdict import are_separated
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import members

# Below this many statements, setting up lanes costs more than they save.
FEW = 8

Statement = tuple[int, int, int]
"""x, y and given as disjoint masks; x and y not empty."""


def separated_each(graph: CausalGraph, statements: Sequence[Statement], deadline: Deadline) -> list[bool]:
    """For each statement: does ``given`` separate x from y?

    Raises:
        OutOfTime: the deadline came first.

    >>> graph = CausalGraph.of(("rain", "delay"), ("promo", "delay"))
    >>> separated_each(graph, [(1, 4, 0), (1, 4, 2)], Deadline.never())
    [True, False]
    """
    if len(statements) < FEW:
        return [_alone(graph, statement, deadline) for statement in statements]
    starts, blocked = [0] * graph.size, [0] * graph.size
    for lane, (xs, _ys, given) in enumerate(statements):
        for node in members(xs):
            starts[node] |= 1 << lane
        for node in members(given):
            blocked[node] |= 1 << lane
    lanes = Lanes.of(graph, starts, blocked)
    lanes.run(deadline)
    return [
        not any(lanes.at(y) >> lane & 1 for y in members(ys))
        for lane, (_xs, ys, _given) in enumerate(statements)
    ]


def _alone(graph: CausalGraph, statement: Statement, deadline: Deadline) -> bool:
    deadline.poll()
    return are_separated(graph, *statement)


@dataclass(slots=True)
class Lanes:
    """The state of all lanes: for each node the lanes that hold there; to be made, run, and read.

    Attributes:
        starts: lanes that begin at the node.
        blocked: lanes in which the node is conditioned on.
        opened: lanes in which the node or a descendant of it is.
        by_tail, by_head: lanes that have reached the node against an arrow (or begin there), or by an arrowhead.
        upward, downward: lanes still to be passed on to parents and spouses, or to children.
        position: each node's place in the topological order.
        rising, falling: the nodes with lanes still to be passed on, as heaps in the order of passing.
    """

    graph: CausalGraph
    starts: list[int]
    blocked: list[int]
    opened: list[int]
    by_tail: list[int]
    by_head: list[int]
    upward: list[int]
    downward: list[int]
    position: list[int]
    rising: list[int] = field(default_factory=list)
    falling: list[int] = field(default_factory=list)

    @classmethod
    def of(cls, graph: CausalGraph, starts: list[int], blocked: list[int]) -> Lanes:
        """Lanes at their starts; both lists hold for each node the set of lanes."""
        opened = list(blocked)
        position = [0] * graph.size
        for place, node in enumerate(graph.topological_order):
            position[node] = place
        for node in reversed(graph.topological_order):
            if opened[node]:
                for parent in graph.parents(node):
                    opened[parent] |= opened[node]
        idle = [0] * graph.size
        return cls(graph, starts, blocked, opened, idle[:], idle[:], idle[:], idle[:], position)

    def at(self, node: int) -> int:
        """The lanes that have reached a node, blocked or not."""
        return self.by_tail[node] | self.by_head[node]

    def run(self, deadline: Deadline) -> None:
        """Move every lane as far as it goes.

        Raises:
            OutOfTime: the deadline came first.
        """
        for node, lanes in enumerate(self.starts):
            if lanes:
                self._enter_by_tail(node, lanes)
        while self.rising or self.falling:
            deadline.poll()
            self._rise()
            self._fall()

    def _rise(self) -> None:
        order, graph = self.graph.topological_order, self.graph
        while self.rising:
            node = order[-heapq.heappop(self.rising)]
            lanes, self.upward[node] = self.upward[node], 0
            for parent in graph.parents(node):
                self._enter_by_tail(parent, lanes)
            for spouse in graph.spouses(node):
                self._enter_by_head(spouse, lanes)

    def _fall(self) -> None:
        order, graph = self.graph.topological_order, self.graph
        while self.falling:
            node = order[heapq.heappop(self.falling)]
            lanes, self.downward[node] = self.downward[node], 0
            for child in graph.children(node):
                self._enter_by_head(child, lanes)

    def _enter_by_tail(self, node: int, lanes: int) -> None:
        new = lanes & ~self.by_tail[node]
        if new:
            self.by_tail[node] |= new
            passing = new & (~self.blocked[node] | self.starts[node])
            self._pass_up(node, passing)
            self._pass_down(node, passing)

    def _enter_by_head(self, node: int, lanes: int) -> None:
        new = lanes & ~self.by_head[node]
        if new:
            self.by_head[node] |= new
            self._pass_down(node, new & ~self.blocked[node])
            self._pass_up(node, new & self.opened[node])

    def _pass_up(self, node: int, lanes: int) -> None:
        if lanes:
            if not self.upward[node]:
                heapq.heappush(self.rising, -self.position[node])
            self.upward[node] |= lanes

    def _pass_down(self, node: int, lanes: int) -> None:
        if lanes:
            if not self.downward[node]:
                heapq.heappush(self.falling, self.position[node])
            self.downward[node] |= lanes
