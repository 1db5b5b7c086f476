"""The shortest paths between two sets of nodes, whether open or not, one after the other.

Yen's algorithm (1971) over the graph without its directions, as Lawler divides it (1972): a path not listed
yet leaves a listed one at some node by a step that no listed one takes there, so every such place is a
branch. A branch is searched only once no shorter path can come from elsewhere, so on long thin graphs the
next path mostly takes one search, O(nodes + edges); at worst one for every node of the path before. Where a
pair is joined by an arrow and a bidirected edge, these are two paths.
"""

from __future__ import annotations

import heapq
from collections import deque
from collections.abc import Iterator
from dataclasses import dataclass, replace
from itertools import count, pairwise, product

from pathgate.criteria.deadline import Deadline
from pathgate.criteria.path_masks import Arrow
from pathgate.criteria.paths import Trail
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import members

_Nodes = tuple[int, ...]

# Stands before the first node of every path, so that leaving x by another of its nodes is a step like any other.
_BEFORE = -1


def shortest_paths(graph: CausalGraph, xs: int, ys: int, deadline: Deadline) -> Iterator[Trail]:
    """Every path from x to y that meets neither set in between, shortest first, in a fixed order.

    Raises:
        OutOfTime: the deadline came first.

    >>> graph = CausalGraph.of(("rain", "delay"), ("delay", "refund"), bidirected=[("rain", "delay")])
    >>> found = shortest_paths(graph, graph.mask("rain"), graph.mask("refund"), Deadline.never())
    >>> [trail.arrows for trail in found]
    [('forward', 'forward'), ('both', 'forward')]
    """
    for nodes in _node_paths(_Skeleton.of(graph, xs, ys), deadline):
        joints = [_arrows_between(graph, *pair) for pair in pairwise(nodes)]
        for arrows in product(*joints):
            yield Trail(nodes, arrows)


@dataclass(frozen=True, slots=True, order=True)
class _Branch:
    """The paths that begin like ``nodes`` up to ``place`` and go on by a step not in ``taken``.

    Attributes:
        length: none of them is shorter.
        is_waiting: not searched yet; else ``nodes`` is the shortest of them.
        number: which of equals comes first.
    """

    length: int
    is_waiting: bool
    number: int
    nodes: _Nodes
    place: int
    taken: frozenset[int]


def _node_paths(skeleton: _Skeleton, deadline: Deadline) -> Iterator[_Nodes]:
    numbers = count()
    waiting = [_branch(0, next(numbers), (_BEFORE,), 0, frozenset())]
    while waiting:
        deadline.poll()
        branch = heapq.heappop(waiting)
        if branch.is_waiting:
            nodes = skeleton.shortest(branch.nodes[: branch.place + 1], branch.taken)
            if nodes:
                heapq.heappush(waiting, replace(branch, length=len(nodes), is_waiting=False, nodes=nodes))
            continue
        yield branch.nodes[1:]
        for place, taken, length in skeleton.ways_off(branch.nodes, branch.place, branch.taken):
            heapq.heappush(waiting, _branch(length, next(numbers), branch.nodes, place, taken))


def _branch(length: int, number: int, nodes: _Nodes, place: int, taken: frozenset[int]) -> _Branch:
    return _Branch(length, is_waiting=True, number=number, nodes=nodes, place=place, taken=taken)


@dataclass(frozen=True, slots=True)
class _Skeleton:
    """The graph without its directions, entered at x and left at y.

    Attributes:
        ahead: for each node from which y can be reached without meeting x, how many steps that takes.
    """

    graph: CausalGraph
    xs: frozenset[int]
    ys: frozenset[int]
    ahead: dict[int, int]

    @classmethod
    def of(cls, graph: CausalGraph, xs: int, ys: int) -> _Skeleton:
        starts, ends = frozenset(members(xs)), frozenset(members(ys))
        ahead = dict.fromkeys(sorted(ends), 0)
        queue = deque(ahead)
        while queue:
            node = queue.popleft()
            for neighbour in graph.neighbour_lists[node]:
                if neighbour not in ahead:
                    ahead[neighbour] = ahead[node] + 1
                    if neighbour not in starts:
                        queue.append(neighbour)
        return cls(graph, starts, ends, ahead)

    def steps_from(self, node: int) -> list[int]:
        """Where a path can go on from a node, as far as y can be reached from there."""
        if node == _BEFORE:
            return sorted(self.xs & self.ahead.keys())
        near = self.graph.neighbour_lists[node]
        return [step for step in near if step in self.ahead and step not in self.xs]

    def shortest(self, root: _Nodes, taken: frozenset[int]) -> _Nodes | None:
        """A shortest path that begins with ``root`` and does not go on to a node of ``taken``."""
        came_from: dict[int, int] = {}
        closed, queue = set(root), deque([root[-1]])
        while queue:
            node = queue.popleft()
            for neighbour in self.steps_from(node):
                if neighbour in closed or (node == root[-1] and neighbour in taken):
                    continue
                closed.add(neighbour)
                came_from[neighbour] = node
                if neighbour in self.ys:
                    return _through(came_from, root, neighbour)
                queue.append(neighbour)
        return None

    def ways_off(
        self, nodes: _Nodes, first: int, taken: frozenset[int]
    ) -> Iterator[tuple[int, frozenset[int], int]]:
        """Each place from ``first`` on at which another path may leave this one.

        With the steps taken there already, and a bound from below on the nodes of any path that leaves there.
        """
        walked = set(nodes[: first + 1])
        for place in range(first, len(nodes) - 1):
            walked.add(nodes[place])
            gone = taken | {nodes[place + 1]} if place == first else frozenset({nodes[place + 1]})
            others = set(self.steps_from(nodes[place])) - walked - gone
            nearest = min((self.ahead[step] for step in others), default=None)
            if nearest is not None:
                yield place, gone, place + 2 + nearest


def _through(came_from: dict[int, int], root: _Nodes, end: int) -> _Nodes:
    walked = [end]
    while walked[-1] != root[-1]:
        walked.append(came_from[walked[-1]])
    return root[:-1] + tuple(reversed(walked))


def _arrows_between(graph: CausalGraph, first: int, second: int) -> list[Arrow]:
    """How the edges between two adjacent nodes point, read from the first to the second."""
    arrows = list[Arrow]()
    if second in graph.children(first):
        arrows.append("forward")
    if second in graph.parents(first):
        arrows.append("backward")
    if second in graph.spouses(first):
        arrows.append("both")
    return arrows
