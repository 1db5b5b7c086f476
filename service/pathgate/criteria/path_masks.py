"""Shortest walks through a small graph by bit masks: open ones between two sets, and directed ones.

Breadth-first over the states of ``reachability``, a whole level at a time: each level is the nodes first
entered by a tail and those first entered by an arrowhead. The level that meets an end is traced back to the
start, always to the lowest node, so that no step needs noting on the way. O(nodes + edges) a search.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Literal

from pathgate.criteria.reachability import Conditions
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import members

Arrow = Literal["forward", "backward", "both"]
Walk = tuple[list[int], list[Arrow]]
"""The nodes in order, and how the edge after each but the last points."""

_Level = tuple[int, int]
"""The nodes entered by a tail (or started from), and those entered by an arrowhead."""

_NOTHING: _Level = (0, 0)


def open_walks(
    graph: CausalGraph, starts: int, ends: int, conditions: Conditions, *, fewest_colliders: bool
) -> Iterator[Walk]:
    """For each of ``ends`` that an open walk leads to a shortest one, the nearest end first."""
    ways = _Ways.of(graph, starts, conditions, are_turns_dear=fewest_colliders)
    levels: dict[tuple[int, int], _Level] = {}
    seen_by_tail = seen_by_head = colliders = 0
    # What one more opened collider leads to, by the length of the walk there.
    seeds, later = {0: (starts, 0)}, dict[int, _Level]()
    while seeds:
        length, (by_tail, by_head) = min(seeds), _NOTHING
        while by_tail or by_head or seeds:
            seeded_by_tail, seeded_by_head = seeds.pop(length, _NOTHING)
            by_tail = (by_tail | seeded_by_tail) & ~seen_by_tail
            by_head = (by_head | seeded_by_head) & ~seen_by_head
            seen_by_tail |= by_tail
            seen_by_head |= by_head
            levels[colliders, length] = by_tail, by_head
            for end in members((by_tail | by_head) & ends):
                yield ways.back(levels, (colliders, length), end, by_head=not by_tail >> end & 1)
            ends &= ~(by_tail | by_head)
            if not ends:
                return
            length += 1
            if fewest_colliders and by_head & ways.opens:
                later[length] = ways.after_turning(by_head)
            by_tail, by_head = ways.after(by_tail, by_head)
        seeds, later, colliders = later, {}, colliders + 1


def directed_walk(graph: CausalGraph, starts: int, ends: int, avoiding: int) -> list[int] | None:
    """The first in order of the shortest directed walks from one set into another that enter nothing avoided."""
    if starts & ends:
        return [next(members(starts & ends))]
    parents, children = graph.parent_masks, graph.child_masks
    levels = [ends & ~avoiding]
    closed = ends | avoiding
    while levels[-1]:
        above = _union(parents, levels[-1])
        if above & starts:
            nodes = [next(members(above & starts))]
            for level in reversed(levels):
                nodes.append(next(members(children[nodes[-1]] & level)))
            return nodes
        levels.append(above & ~closed)
        closed |= above
    return None


@dataclass(frozen=True, slots=True)
class _Ways:
    """Where one can go on from a node, and where one can have come from.

    Attributes:
        leaves: nodes that may be left by any edge where they were entered by a tail or started from.
        passes: nodes that may be left along an arrow where they were entered by an arrowhead.
        opens: nodes that may be left against an arrowhead where they were entered by one.
        turns: those of them for which this costs no more than any other step.
        relevant: nodes outside which nothing is worth entering.
    """

    parents: list[int]
    children: list[int]
    spouses: list[int]
    leaves: int
    passes: int
    opens: int
    turns: int
    relevant: int

    @classmethod
    def of(cls, graph: CausalGraph, starts: int, conditions: Conditions, *, are_turns_dear: bool) -> _Ways:
        """The ways through the graph under these conditions."""
        passes, opens = ~conditions.blocking, conditions.opening
        turns = 0 if are_turns_dear else opens
        masks = graph.parent_masks, graph.child_masks, graph.spouse_masks
        return cls(*masks, passes | starts, passes, opens, turns, conditions.relevant)

    def after(self, by_tail: int, by_head: int) -> _Level:
        """What one step leads to that is no dear turn."""
        leaving = by_tail & self.leaves
        turning = leaving | by_head & self.turns
        below = _union(self.children, leaving | by_head & self.passes)
        by_head = below | _union(self.spouses, turning)
        return _union(self.parents, turning), by_head & self.relevant

    def after_turning(self, by_head: int) -> _Level:
        """What one step against an arrowhead leads to, from nodes entered by one."""
        turning = by_head & self.opens
        return _union(self.parents, turning), _union(self.spouses, turning) & self.relevant

    def back(
        self, levels: dict[tuple[int, int], _Level], at: tuple[int, int], node: int, *, by_head: bool
    ) -> Walk:
        """The walk to a node first entered so with so many dear turns and so many steps.

        Of the nodes before it a dear turn comes first, then the lowest, then one entered by a tail.
        """
        nodes, arrows = [node], list[Arrow]()
        colliders, length = at
        while length:
            length -= 1
            _, turned = levels.get((colliders - 1, length), _NOTHING)
            turned &= self.opens & (self.spouses if by_head else self.children)[node]
            if turned:
                colliders -= 1
                before, arrow, entered_by_head = turned & -turned, self._turn(by_head=by_head), True
            else:
                before, arrow, entered_by_head = self._before(
                    levels[colliders, length], node, by_head=by_head
                )
            node, by_head = before.bit_length() - 1, entered_by_head
            nodes.append(node)
            arrows.append(arrow)
        return nodes[::-1], arrows[::-1]

    @staticmethod
    def _turn(*, by_head: bool) -> Arrow:
        return "both" if by_head else "backward"

    def _before(self, level: _Level, node: int, *, by_head: bool) -> tuple[int, Arrow, bool]:
        """The lowest node of a level from which a step leads here: itself as a mask, the arrow, how it was entered."""
        parents, beside = self.parents[node], self.spouses[node] if by_head else self.children[node]
        leaving, passing, turning = level[0] & self.leaves, level[1] & self.passes, level[1] & self.turns
        if not by_head:
            parents = 0
        from_tail = leaving & (parents | beside)
        from_head = passing & parents | turning & beside
        lowest = (from_tail | from_head) & -(from_tail | from_head)
        entered_by_head = not from_tail & lowest
        along = (passing if entered_by_head else leaving) & parents & lowest
        return lowest, "forward" if along else self._turn(by_head=by_head), entered_by_head


def _union(masks: list[int], nodes: int) -> int:
    """All that the nodes are joined to."""
    found = 0
    while nodes:
        lowest = nodes & -nodes
        found |= masks[lowest.bit_length() - 1]
        nodes ^= lowest
    return found
