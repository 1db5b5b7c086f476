"""Can independencies tell two DAGs apart, and by which statement?

Two DAGs over the same measured nodes have the same independencies exactly when they join the same pairs and
have the same unshielded colliders (Verma & Pearl 1990). Where they differ, so does a statement: a pair without
an edge in one of them is separated there and cannot be in the other; and of two nodes beside an unshielded
collider, every set that separates them leaves the collider out, while in the other DAG every such set holds it.
Finding the difference takes O(edges · largest number of neighbours), the statement two passes over a DAG.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal, NamedTuple

from pathgate.criteria.deadline import Deadline
from pathgate.criteria.errors import DifferentNodes
from pathgate.criteria.separators import Separators
from pathgate.graphs.graph import CausalGraph

Side = Literal["graph", "other"]


@dataclass(frozen=True, slots=True)
class Distinction:
    """A statement of independence that holds in one of two DAGs alone.

    Attributes:
        x, y: two nodes, in the order of the first graph.
        given: what separates them in ``holds_in``, no node too many.
        holds_in: the DAG in which it holds.
    """

    x: str
    y: str
    given: tuple[str, ...]
    holds_in: Side


def are_equivalent(graph: CausalGraph, other: CausalGraph, deadline: Deadline) -> bool:
    """Have two DAGs the same independencies? For arguments and errors see ``distinguishing``."""
    return _difference(graph, other, deadline) is None


def distinguishing(graph: CausalGraph, other: CausalGraph, deadline: Deadline) -> Distinction | None:
    """A statement that holds in one of two DAGs and not in the other; None where they are equivalent.

    Where an edge is missing in one, it is about the first such pair in the order of ``graph``; else about
    nodes beside a collider, given the fewer columns of the two DAGs' answers.

    Args:
        graph, other: every node measured, no bidirected edge, the same nodes in any order.
        deadline: how long it may take.

    Raises:
        DifferentNodes: the two are not over the same nodes.
        OutOfTime: the deadline came first.

    >>> graph = CausalGraph.of(("rain", "delay"), ("delay", "refund"))
    >>> other = CausalGraph.of(("rain", "delay"), ("refund", "delay"))
    >>> distinguishing(graph, other, Deadline.never())
    Distinction(x='rain', y='refund', given=(), holds_in='other')
    """
    difference = _difference(graph, other, deadline)
    if difference is None:
        return None
    sides: dict[Side, CausalGraph] = {"graph": graph, "other": other}
    if difference.separable_in is not None:
        sides = {difference.separable_in: sides[difference.separable_in]}
    x, y = (graph.name(node) for node in sorted(difference.pair))
    found: list[Distinction] = []
    for side, where in sides.items():
        deadline.poll()
        given = graph.mask(where.names_of(_separator(where, x, y)))
        found.append(Distinction(x, y, graph.names_of(given), side))
    return min(found, key=lambda each: len(each.given))


class _Difference(NamedTuple):
    """A pair of nodes, and the DAG in which alone they are not adjacent; None where they are in neither."""

    pair: tuple[int, int]
    separable_in: Side | None


def _difference(graph: CausalGraph, other: CausalGraph, deadline: Deadline) -> _Difference | None:
    _check_nodes(graph, other)
    parents = [frozenset(each) for each in graph.parent_lists]
    other_parents = _renumbered_parents(other, graph)
    adjacent, other_adjacent = _adjacent(parents), _adjacent(other_parents)
    return (
        _missing_edge(adjacent, other_adjacent)
        or _collider_of_one(parents, other_parents, adjacent, deadline)
        or _collider_of_one(other_parents, parents, adjacent, deadline)
    )


def _check_nodes(graph: CausalGraph, other: CausalGraph) -> None:
    different = [name for name in graph.names if name not in other.index]
    different += [name for name in other.names if name not in graph.index]
    if different:
        raise DifferentNodes(tuple(different))


def _renumbered_parents(other: CausalGraph, graph: CausalGraph) -> list[frozenset[int]]:
    """The parents of each node in ``other``, all nodes by their numbers in ``graph``."""
    number = [graph.index[name] for name in other.names]
    parents: list[frozenset[int]] = [frozenset()] * graph.size
    for node, above in zip(number, other.parent_lists, strict=True):
        parents[node] = frozenset(number[each] for each in above)
    return parents


def _adjacent(parents: Sequence[frozenset[int]]) -> list[set[int]]:
    adjacent = [set(above) for above in parents]
    for node, above in enumerate(parents):
        for parent in above:
            adjacent[parent].add(node)
    return adjacent


def _missing_edge(adjacent: Sequence[set[int]], other_adjacent: Sequence[set[int]]) -> _Difference | None:
    """The first pair that only one of the two joins."""
    for node, (here, there) in enumerate(zip(adjacent, other_adjacent, strict=True)):
        if here != there:
            end = min(here ^ there)
            return _Difference((node, end), "other" if end in here else "graph")
    return None


def _collider_of_one(
    parents: Sequence[frozenset[int]],
    other_parents: Sequence[frozenset[int]],
    adjacent: Sequence[set[int]],
    deadline: Deadline,
) -> _Difference | None:
    """Two parents of a node that are not adjacent and are not both its parents in the other DAG."""
    for above, other_above in zip(parents, other_parents, strict=True):
        deadline.poll()
        for one in sorted(above - other_above):
            apart = above - adjacent[one] - {one}
            if apart:
                return _Difference((one, min(apart)), None)
    return None


def _separator(graph: CausalGraph, x: str, y: str) -> int:
    """A minimal set that separates two nodes of a DAG between which there is no edge; there always is one."""
    bounds = Separators(graph, graph.mask(x), graph.mask(y), required=0, allowed=graph.everything)
    return bounds.minimal() or 0
