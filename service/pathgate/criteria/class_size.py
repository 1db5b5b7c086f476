"""How many ways are there to direct a chordal graph without a cycle and without an unshielded collider?

The share of each maximal clique is the orientations that it begins, and no clique nearer to the root does: the
permutations of its nodes that no smaller separator begins, times the orientations of what the clique leaves
undirected (Wienöbst, Bannach & Liśkiewicz 2021). What it leaves behind a link of the clique tree depends on
that link and its direction alone, so each part is counted once, the innermost first, and the product for a
clique follows from that of the clique beside it. At worst O(cliques²) operations on big integers; a tree takes
as many as it has nodes.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from math import factorial, prod

from pathgate.criteria.deadline import Deadline

Nodes = frozenset[int]

Link = tuple[int, int]
"""Two neighbouring cliques of a tree, by number: from the one into the other."""

_Beginnings = tuple[tuple[Nodes, int, int], ...]
"""Sets that a clique's permutation must not begin with, each within the next: the set, how many of its nodes
are still undirected, and how many permutations of these begin with none of the sets before."""


def count_orientations(order: Sequence[int], parents: Sequence[Nodes], deadline: Deadline) -> int:
    """The number of acyclic orientations without an unshielded collider.

    Args:
        order: all nodes, parents before children.
        parents: for each node its parents in one such orientation of the graph.
        deadline: polled at every clique.

    Raises:
        OutOfTime: the deadline came first.

    >>> none = frozenset[int]()
    >>> count_orientations((0, 1, 2), (none, frozenset({0}), frozenset({1})), Deadline.never())
    3
    """
    return _Counting(clique_forest(order, parents, deadline), deadline).all_orientations()


@dataclass(frozen=True, slots=True)
class Forest:
    """The maximal cliques of a chordal graph, joined to one tree for each connected part.

    Attributes:
        cliques: the nodes of each.
        links: for each clique its links, as (what the two share, the other clique), the largest first.
        roots: one clique of each tree.
    """

    cliques: Sequence[Nodes]
    links: Sequence[Sequence[tuple[Nodes, int]]]
    roots: Sequence[int]

    def links_by_separator(self) -> list[tuple[Nodes, list[Link]]]:
        """Each set that two neighbouring cliques share, the largest first, with the links that share it."""
        found: dict[Nodes, list[Link]] = {}
        for clique, links in enumerate(self.links):
            for shared, other in links:
                if clique < other:
                    found.setdefault(shared, []).append((clique, other))
        return sorted(found.items(), key=lambda item: -len(item[0]))

    def links_within(self, clique: int, directed: Nodes, origin: int) -> Iterator[tuple[Nodes, int]]:
        """The links but the one to ``origin`` that share all of ``directed`` and more."""
        for shared, other in self.links[clique]:
            if len(shared) <= len(directed):
                return
            if other != origin and shared > directed:
                yield shared, other


def clique_forest(order: Sequence[int], parents: Sequence[Nodes], deadline: Deadline) -> Forest:
    """The clique trees, from an orientation in which any two parents of a node are adjacent.

    Raises:
        OutOfTime: the deadline came first.
    """
    rank = {node: place for place, node in enumerate(order)}
    cliques: list[set[int]] = []
    links: list[list[tuple[Nodes, int]]] = []
    # The clique that each node came into when it was added.
    home: dict[int, int] = {}
    for node in order:
        deadline.poll()
        above = parents[node]
        beside = home[max(above, key=rank.__getitem__)] if above else None
        if beside is not None and len(above) == len(cliques[beside]):
            # The parents are the whole clique, which therefore was not maximal.
            cliques[beside].add(node)
            home[node] = beside
            continue
        home[node] = len(cliques)
        cliques.append({node, *above})
        links.append([] if beside is None else [(above, beside)])
        if beside is not None:
            links[beside].append((above, home[node]))
    roots = sorted({home[node] for node in order if not parents[node]})
    ordered = [sorted(each, key=lambda link: -len(link[0])) for each in links]
    return Forest([frozenset(each) for each in cliques], ordered, roots)


@dataclass(frozen=True, slots=True)
class _Behind:
    """What lies behind a link and stays undirected when everything is directed from before it.

    Attributes:
        orientations: how many this part has.
        rest: how many are left in this part once its clique at the link comes first.
    """

    orientations: int
    rest: int


class _Counting:
    """One count over one forest; ``_behind`` grows from the largest separators to the smallest."""

    def __init__(self, forest: Forest, deadline: Deadline) -> None:
        self._forest = forest
        self._deadline = deadline
        self._behind: dict[Link, _Behind] = {}

    def all_orientations(self) -> int:
        for shared, links in self._forest.links_by_separator():
            self._count_behind(shared, links)
        return prod(self._part(root, frozenset())[0] for root in self._forest.roots)

    def _count_behind(self, shared: Nodes, links: list[Link]) -> None:
        """Count what lies behind each link with this separator: once for each part, not for each link."""
        ends = sorted({end for link in links for end in link})
        counted: dict[int, _Behind] = {}
        for end in ends:
            if end not in counted:
                orientations, rests = self._part(end, shared)
                counted.update((clique, _Behind(orientations, rest)) for clique, rest in rests.items())
        for one, other in links:
            self._behind[one, other] = counted[other]
            self._behind[other, one] = counted[one]

    def _part(self, root: int, directed: Nodes) -> tuple[int, dict[int, int]]:
        """The part around ``root`` in which neighbours share more than ``directed``, which comes before it.

        Returns:
            Its orientations, and for each of its cliques those left once that clique comes first.
        """
        orientations = 0
        rests: dict[int, int] = {}
        waiting: list[tuple[int, int, int, _Beginnings]] = [(root, -1, self._rest(root, directed), ())]
        while waiting:
            self._deadline.poll()
            clique, origin, rest, beginnings = waiting.pop()
            rests[clique] = rest
            free = len(self._forest.cliques[clique]) - len(directed)
            orientations += rest * _permutations(free, beginnings)
            for shared, other in self._forest.links_within(clique, directed, origin):
                moved = self._moved(rest, clique, other)
                longer = _longer(beginnings, shared, len(shared) - len(directed))
                waiting.append((other, clique, moved, longer))
        return orientations, rests

    def _rest(self, root: int, directed: Nodes) -> int:
        """How many orientations the part around ``root`` has left once ``root`` comes first."""
        found = 1
        waiting = [(root, -1, self._forest.cliques[root])]
        while waiting:
            self._deadline.poll()
            clique, origin, before = waiting.pop()
            for shared, other in self._forest.links_within(clique, directed, origin):
                if shared > before:
                    # Still the same undirected part: what comes before it is shared by all its cliques.
                    waiting.append((other, clique, before))
                else:
                    found *= self._behind[clique, other].orientations
                    waiting.append((other, clique, shared))
        return found

    def _moved(self, rest: int, clique: int, other: int) -> int:
        """What ``rest`` becomes when the neighbouring clique comes first instead; the division is exact."""
        ahead, back = self._behind[clique, other], self._behind[other, clique]
        gained, lost = back.orientations * ahead.rest, ahead.orientations * back.rest
        return rest if gained == lost else rest * gained // lost


def _permutations(free: int, beginnings: _Beginnings) -> int:
    """The permutations of ``free`` nodes that begin with none of the sets."""
    barred = sum(factorial(free - size) * permutations for _, size, permutations in beginnings)
    return factorial(free) - barred


def _longer(beginnings: _Beginnings, shared: Nodes, free: int) -> _Beginnings:
    """The sets that lie within the next clique, which are those within what it shares, and that itself."""
    kept = tuple(each for each in beginnings if each[0] <= shared)
    if kept and kept[-1][0] == shared:
        return kept
    return (*kept, (shared, free, _permutations(free, kept)))
