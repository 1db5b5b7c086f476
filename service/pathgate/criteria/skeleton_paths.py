"""The shortest paths between two sets of nodes, whether open or not, one after the other.

Yen's algorithm (1971) over the graph without its directions: every next path leaves an earlier one at some
node, by a step not yet taken from there. O(length · (nodes + edges)) a path. Where a pair is joined by an
arrow and a bidirected edge, these are two paths.
"""

from __future__ import annotations

import heapq
from collections import deque
from collections.abc import Iterator
from itertools import pairwise, product

from pathgate.criteria.paths import Arrow, Trail
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import members

_Nodes = tuple[int, ...]


def shortest_paths(graph: CausalGraph, xs: int, ys: int) -> Iterator[Trail]:
    """Every path from x to y that meets neither set in between, shortest first, in a fixed order.

    >>> graph = CausalGraph.of(("rain", "delay"), ("delay", "refund"), bidirected=[("rain", "delay")])
    >>> [trail.arrows for trail in shortest_paths(graph, graph.mask("rain"), graph.mask("refund"))]
    [('forward', 'forward'), ('both', 'forward')]
    """
    for nodes in _node_paths(graph, xs, ys):
        joints = [_arrows_between(graph, *pair) for pair in pairwise(nodes)]
        for arrows in product(*joints):
            yield Trail(nodes, arrows)


def _node_paths(graph: CausalGraph, xs: int, ys: int) -> Iterator[_Nodes]:
    # The path so far holds its first node only where that is settled: x may be a set.
    waiting: list[tuple[int, _Nodes]] = []
    seen: set[_Nodes] = set()
    found: list[_Nodes] = []
    for start in members(xs):
        _offer(waiting, seen, _shortest(graph, (start,), xs, ys, set()))
    while waiting:
        _length, nodes = heapq.heappop(waiting)
        yield nodes
        found.append(nodes)
        for place in range(len(nodes) - 1):
            root = nodes[: place + 1]
            taken = {other[place + 1] for other in found if other[: place + 1] == root}
            _offer(waiting, seen, _shortest(graph, root, xs, ys, taken))


def _offer(waiting: list[tuple[int, _Nodes]], seen: set[_Nodes], nodes: _Nodes | None) -> None:
    if nodes is not None and nodes not in seen:
        seen.add(nodes)
        heapq.heappush(waiting, (len(nodes), nodes))


def _shortest(graph: CausalGraph, root: _Nodes, xs: int, ys: int, taken: set[int]) -> _Nodes | None:
    """A shortest path that begins with ``root`` and does not go on to a node of ``taken``."""
    came_from: dict[int, int] = {}
    closed = {*members(xs), *root}
    queue = deque([root[-1]])
    while queue:
        node = queue.popleft()
        for neighbour in _neighbours(graph, node):
            if neighbour in closed or (node == root[-1] and neighbour in taken):
                continue
            closed.add(neighbour)
            came_from[neighbour] = node
            if ys >> neighbour & 1:
                return _through(came_from, root, neighbour)
            queue.append(neighbour)
    return None


def _through(came_from: dict[int, int], root: _Nodes, end: int) -> _Nodes:
    walked = [end]
    while walked[-1] != root[-1]:
        walked.append(came_from[walked[-1]])
    return root[:-1] + tuple(reversed(walked))


def _neighbours(graph: CausalGraph, node: int) -> list[int]:
    return sorted({*graph.parents(node), *graph.children(node), *graph.spouses(node)})


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
