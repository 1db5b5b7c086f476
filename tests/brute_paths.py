"""Which paths does a small graph hold, and which are open?

By definition alone (Pearl 1988; Richardson 2003 for bidirected edges): every path is listed, parallel edges
apart, and judged node by node. Exponential on purpose, meant for up to eight nodes or so.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import combinations, pairwise

from tests.values import Graph, Names, arrows_of, as_set, bidirected_of, node_names


@dataclass(frozen=True, slots=True)
class Path:
    """Nodes in order, none twice, and the edge between each two: ``forward``, ``backward`` or ``both``."""

    nodes: tuple[str, ...]
    arrows: tuple[str, ...]

    @property
    def is_causal(self) -> bool:
        """Do all its arrows point from the first node towards the last?"""
        return all(arrow == "forward" for arrow in self.arrows)

    def inner(self) -> Iterator[tuple[str, bool]]:
        """Each node between the ends, with whether it is a collider (two arrowheads meet at it)."""
        for node, (before, after) in zip(self.nodes[1:-1], pairwise(self.arrows), strict=True):
            yield node, before != "backward" and after != "forward"


def ancestors(graph: Graph, nodes: Names) -> frozenset[str]:
    """The nodes themselves and everything from which a directed path leads to one of them."""
    return _closure(as_set(nodes), [(target, source) for source, target in arrows_of(graph)])


def descendants(graph: Graph, nodes: Names) -> frozenset[str]:
    """The nodes themselves and everything to which a directed path leads from one of them."""
    return _closure(as_set(nodes), arrows_of(graph))


def _closure(start: frozenset[str], steps: Sequence[tuple[str, str]]) -> frozenset[str]:
    reached = start
    while True:
        wider = reached | {end for begin, end in steps if begin in reached}
        if wider == reached:
            return reached
        reached = wider


def _steps(graph: Graph) -> dict[str, list[tuple[str, str]]]:
    """For each node: (arrow, neighbour) of every edge at it, parallel edges apart."""
    steps: dict[str, list[tuple[str, str]]] = {name: [] for name in node_names(graph)}
    for source, target in arrows_of(graph):
        steps[source].append(("forward", target))
        steps[target].append(("backward", source))
    for one, other in bidirected_of(graph):
        steps[one].append(("both", other))
        steps[other].append(("both", one))
    return steps


def all_paths(graph: Graph, start: str, end: str, *, avoiding: Names = ()) -> Iterator[Path]:
    """Every path from ``start`` to ``end`` that meets no node of ``avoiding`` after its first."""
    steps, barred = _steps(graph), as_set(avoiding)

    def extend(nodes: tuple[str, ...], arrows: tuple[str, ...]) -> Iterator[Path]:
        if nodes[-1] == end:
            yield Path(nodes, arrows)
            return
        for arrow, neighbour in steps[nodes[-1]]:
            if neighbour not in nodes and neighbour not in barred:
                yield from extend((*nodes, neighbour), (*arrows, arrow))

    return extend((start,), ())


def all_directed_paths(graph: Graph, *, ending_at: str) -> list[tuple[str, ...]]:
    """Every directed path that ends at the node, the one of a single node included."""
    found: list[tuple[str, ...]] = [(ending_at,)]
    for source, target in arrows_of(graph):
        if target == ending_at:
            found += [(*path, ending_at) for path in all_directed_paths(graph, ending_at=source)]
    return found


def is_open(graph: Graph, path: Path, given: Names) -> bool:
    """Definition: each collider or a descendant of it is given, and no other node between the ends is."""
    return is_open_given(path, as_set(given), ancestors(graph, given))


def is_open_given(path: Path, given: frozenset[str], opening: frozenset[str]) -> bool:
    """The same, where the caller has already found ``opening``: the given nodes and all their ancestors."""
    return all(node in opening if collides else node not in given for node, collides in path.inner())


def colliders(graph: Graph) -> set[tuple[str, frozenset[str]]]:
    """Every node with each pair of distinct neighbours whose edges have arrowheads at it."""
    heads: dict[str, set[str]] = {name: set() for name in node_names(graph)}
    both = bidirected_of(graph)
    for source, target in [*arrows_of(graph), *both, *((other, one) for one, other in both)]:
        heads[target].add(source)
    return {(node, frozenset(pair)) for node, tails in heads.items() for pair in combinations(tails, 2)}
