"""Where arrowheads meet, what opens those colliders, and which columns that makes dependent.

A collider is a node with arrowheads from two distinct neighbours; conditioning on it or on a descendant of
it opens it (Pearl 1988). A node with k neighbours above it has k(k-1)/2 of them, so they are generated one
by one. Induced pairs take two reachability searches a node and a search for paths where they find any:
O(nodes · (nodes + edges) log nodes).
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import combinations

from pathgate.criteria.deadline import Deadline
from pathgate.criteria.paths import Trail, find_open_paths
from pathgate.criteria.reachability import Conditions, connected
from pathgate.criteria.selection import Kept
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.kinship import descendants
from pathgate.graphs.masks import members


@dataclass(frozen=True, slots=True)
class Collider:
    """A node and two neighbours with arrowheads at it.

    Attributes:
        shielded: are the two neighbours adjacent?
        opened_by: the columns whose conditioning opens it, by value or because rows are kept by them;
            it is open when there are any.
    """

    node: str
    between: tuple[str, str]
    shielded: bool
    opened_by: tuple[str, ...]

    @property
    def open(self) -> bool:
        """Does a path pass here?"""
        return bool(self.opened_by)


@dataclass(frozen=True, slots=True)
class Induced:
    """Two columns that conditioning made dependent, and the opened colliders on a shortest path between them.

    ``through`` leaves out selection nodes; it is empty where keeping rows alone joins the two.
    """

    x: str
    y: str
    through: tuple[str, ...]


def colliders(kept: Kept, given: int, *, columns: int) -> Iterator[Collider]:
    """Every collider of the graph, by node and pair of neighbours in the graph's order.

    Args:
        kept: the graph and the rows kept.
        given: mask of the nodes conditioned on by value.
        columns: mask of the nodes of the graph itself; selection nodes are no colliders of their own.
    """
    graph = kept.graph
    for node in members(columns):
        above = sorted({*graph.parents(node), *graph.spouses(node)})
        if len(above) < 2:
            continue
        opened_by = graph.names_of(_openers(kept, given, node))
        for first, second in combinations(above, 2):
            pair = (graph.name(first), graph.name(second))
            yield Collider(graph.name(node), pair, _are_adjacent(graph, first, second), opened_by)


def induced(kept: Kept, given: int, *, deadline: Deadline) -> Iterator[Induced]:
    """The pairs of measured nodes that nothing joins until ``given`` and the kept rows are conditioned on.

    Raises:
        OutOfTime: the deadline came first.
    """
    graph, conditioned = kept.graph, given | kept.conditioned
    conditions = Conditions.on(graph, conditioned)
    candidates = graph.measured & ~conditioned if conditioned else 0
    for x in members(candidates):
        deadline.poll()
        later = candidates >> (x + 1) << (x + 1)
        now = connected(graph, 1 << x, conditions) & later
        joined = now & ~connected(graph, 1 << x, Conditions()) if now else 0
        if joined:
            through = {
                trail.nodes[-1]: _through(kept, trail)
                for trail in find_open_paths(graph, 1 << x, joined, conditions)
            }
            for y in members(joined):
                deadline.poll()
                yield Induced(graph.name(x), graph.name(y), through[y])


def _openers(kept: Kept, given: int, node: int) -> int:
    below = descendants(kept.graph, 1 << node)
    opening = below & given
    for selection_node in members(below & kept.conditioned):
        opening |= kept.part_of[selection_node].columns & below
    return opening


def _are_adjacent(graph: CausalGraph, first: int, second: int) -> bool:
    return second in graph.neighbour_lists[first]


def _through(kept: Kept, trail: Trail) -> tuple[str, ...]:
    named = (kept.graph.name(node) for node, role in trail.inner if role == "collider")
    return tuple(name for name in named if name)
