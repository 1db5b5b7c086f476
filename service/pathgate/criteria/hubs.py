"""The augmented graph of an ancestral set, in linear size: nodes joined through hubs instead of cliques.

Among the ancestors of what is asked about, two nodes are adjacent in the augmented graph (moral graph:
Lauritzen et al. 1990; with bidirected edges: Richardson 2003) when a path of colliders only joins them. That
makes a clique of each district and its parents. One hub for each district, joined to all members of its
clique, says the same in O(nodes + edges) instead of O(nodes²). Taking nodes away from it shows which sets
separate, and separating sets are its vertex cuts.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from functools import cached_property

from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.kinship import ancestors
from pathgate.graphs.masks import mask_of, members, unpack

# What is in up to so many cliques is remembered, for so many sets of cliques at most.
_FEW = 16
_MOST_KNOWN = 10_000


@dataclass(frozen=True)
class Hubs:
    """A linear-size augmented graph.

    Attributes:
        graph: the causal graph.
        relevant: mask of the ancestral set.
        hub_members: for each hub its clique: a district and the parents of its nodes.
        hubs_of: for each node of the graph the hubs it is joined to; empty outside the relevant set.
    """

    graph: CausalGraph
    relevant: int
    hub_members: tuple[tuple[int, ...], ...]
    hubs_of: tuple[tuple[int, ...], ...]

    @classmethod
    def over(cls, graph: CausalGraph, nodes: int) -> Hubs:
        """The augmented graph of the ancestors of ``nodes``."""
        relevant = ancestors(graph, nodes)
        inside = unpack(relevant, graph.size)
        hub_members: list[tuple[int, ...]] = []
        hubs_of: list[list[int]] = [[] for _ in range(graph.size)]
        for district in _districts(graph, relevant, inside.tolist()):
            clique = dict.fromkeys(district)
            for node in district:
                clique.update(dict.fromkeys(graph.parents(node)))
            for node in clique:
                hubs_of[node].append(len(hub_members))
            hub_members.append(tuple(clique))
        return cls(graph, relevant, tuple(hub_members), tuple(map(tuple, hubs_of)))

    @cached_property
    def member_masks(self) -> tuple[int, ...]:
        """The cliques as masks."""
        return tuple(map(mask_of, self.hub_members))

    def spread(self, starts: int, stopping: int) -> tuple[int, int]:
        """What can be reached from ``starts`` without passing ``stopping``, and which of those it stops at.

        Starts are passed even where they are in ``stopping``.
        """
        if self.graph.is_small:
            return self._spread_masks(starts, stopping)
        return self._spread_lists(starts, stopping)

    def _spread_masks(self, starts: int, stopping: int) -> tuple[int, int]:
        masks, hubs_of = self.member_masks, self.hubs_of
        seen_hubs = set[int]()
        seen = frontier = starts
        while frontier:
            lowest = frontier & -frontier
            frontier ^= lowest
            for hub in hubs_of[lowest.bit_length() - 1]:
                if hub not in seen_hubs:
                    seen_hubs.add(hub)
                    new = masks[hub] & ~seen
                    seen |= new
                    frontier |= new & ~stopping
        stopped = seen & stopping & ~starts
        return seen & ~stopped, stopped

    def _spread_lists(self, starts: int, stopping: int) -> tuple[int, int]:
        stops = unpack(stopping, self.graph.size).tolist()
        seen = [False] * self.graph.size
        seen_hubs = [False] * len(self.hub_members)
        frontier = list(members(starts))
        inside, stopped = list(frontier), list[int]()
        for node in frontier:
            seen[node] = True
        while frontier:
            for hub in self.hubs_of[frontier.pop()]:
                if not seen_hubs[hub]:
                    seen_hubs[hub] = True
                    for node in self.hub_members[hub]:
                        if not seen[node]:
                            seen[node] = True
                            (stopped if stops[node] else inside).append(node)
                            if not stops[node]:
                                frontier.append(node)
        return mask_of(inside), mask_of(stopped)


@dataclass(slots=True)
class Cliques:
    """The augmented graph of an ancestral set of a small graph, as masks; a clique goes by a node of its district.

    Attributes:
        graph: the causal graph.
        relevant: mask of the ancestral set.
        district_of: for each node in a district of several its lowest node; others are their own.
        joint: for each such lowest node the clique: the district and the parents of its nodes.
        known: for sets of nodes whose cliques were looked at, all that are in these; where there are no
            districts, other ancestral sets of the graph may share it.
    """

    graph: CausalGraph
    relevant: int
    district_of: dict[int, int]
    joint: dict[int, int]
    known: dict[int, int]

    @classmethod
    def over(cls, graph: CausalGraph, nodes: int) -> Cliques:
        """The augmented graph of the ancestors of ``nodes``."""
        return cls.within(graph, ancestors(graph, nodes))

    @classmethod
    def within(cls, graph: CausalGraph, relevant: int, known: dict[int, int] | None = None) -> Cliques:
        """The augmented graph of a set that holds its own ancestors; ``known`` may come from another such set."""
        district_of: dict[int, int] = {}
        joint: dict[int, int] = {}
        if len(graph.lower_ends):
            for district in _districts(graph, relevant, unpack(relevant, graph.size).tolist()):
                if len(district) > 1:
                    first = min(district)
                    district_of.update(dict.fromkeys(district, first))
                    joint[first] = mask_of(district)
                    for node in district:
                        joint[first] |= graph.parent_masks[node]
        shared = known if known is not None and not district_of else {}
        return cls(graph, relevant, district_of, joint, shared)

    def together(self, cliques: int) -> int:
        """The nodes of some cliques."""
        found, parents, joint = cliques, self.graph.parent_masks, self.joint
        while cliques:
            lowest = cliques & -cliques
            cliques ^= lowest
            clique = lowest.bit_length() - 1
            found |= joint[clique] if clique in joint else parents[clique]
        return found

    def next_to(self, node: int, opened: int) -> tuple[int, int]:
        """The nodes in the cliques of a node, and the cliques opened by now.

        Nodes whose cliques are all in ``opened`` may be left out.
        """
        heads = self.graph.child_masks[node] & self.relevant | 1 << node
        found = self.known.get(heads)
        return (found, opened) if found is not None else self.look_at(heads, opened)

    def look_at(self, heads: int, opened: int) -> tuple[int, int]:
        """The same, for the cliques that hold these nodes together with their parents."""
        cliques = heads
        if self.district_of:
            cliques = mask_of(self.district_of.get(head, head) for head in members(heads))
        if cliques.bit_count() > _FEW:
            # Looked at together, the cliques of all nodes could take much longer than each clique once.
            unopened = cliques & ~opened
            return self.together(unopened), opened | unopened
        if len(self.known) >= _MOST_KNOWN:
            self.known.clear()
        found = self.known[heads] = self.together(cliques)
        return found, opened

    def spread(self, starts: int, stopping: int) -> tuple[int, int]:
        """What can be reached from ``starts`` without passing ``stopping``, and which of those it stops at."""
        seen, opened, leaving = starts, 0, starts
        while leaving:
            lowest = leaving & -leaving
            leaving ^= lowest
            near, opened = self.next_to(lowest.bit_length() - 1, opened)
            new = near & ~seen
            seen |= new
            leaving |= new & ~stopping
        stopped = seen & stopping & ~starts
        return seen & ~stopped, stopped


def _districts(graph: CausalGraph, relevant: int, inside: list[bool]) -> Iterable[list[int]]:
    """The sets of relevant nodes joined by bidirected edges between relevant nodes."""
    placed = [False] * graph.size
    for node in members(relevant):
        if placed[node]:
            continue
        placed[node] = True
        district = [node]
        for member in district:
            for spouse in graph.spouses(member):
                if inside[spouse] and not placed[spouse]:
                    placed[spouse] = True
                    district.append(spouse)
        yield district
