"""A shortest open path between two sets of nodes, and why each of its steps is open.

On small graphs a search by masks (``path_masks``), O(nodes + edges); on large ones Dijkstra's (1959) over the
states of ``reachability``, O((nodes + edges) log nodes). Both break ties alike. A shortest open walk visits no
node twice: cutting a loop out of an open walk leaves an open walk (where the cut makes a collider, the loop
held an open collider below it), so a shortest one is a path. The same holds for a walk with the fewest
colliders, shortest among those.
"""

from __future__ import annotations

import heapq
from collections import deque
from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property
from typing import Literal

from pathgate.criteria.path_masks import Arrow, directed_walk, open_walks
from pathgate.criteria.reachability import Conditions
from pathgate.criteria.selection import Kept, Label
from pathgate.graphs.graph import CausalGraph, Edge
from pathgate.graphs.masks import members, unpack

Role = Literal["chain", "fork", "collider"]
Because = Literal["not-conditioned", "conditioned", "descendant-conditioned"]


@dataclass(frozen=True)
class Trail:
    """A path by indices: its nodes, and how each edge points when read from the first node to the last."""

    nodes: tuple[int, ...]
    arrows: tuple[Arrow, ...]

    def role(self, place: int) -> Role:
        """What the node at this place between the ends is on the path."""
        into_from_left = self.arrows[place - 1] != "backward"
        into_from_right = self.arrows[place] != "forward"
        if into_from_left and into_from_right:
            return "collider"
        return "chain" if into_from_left or into_from_right else "fork"

    def edge(self, place: int) -> Edge:
        """The edge that leads from the node at this place to the next."""
        first, second = self.nodes[place], self.nodes[place + 1]
        if self.arrows[place] == "both":
            return "bidirected", min(first, second), max(first, second)
        return ("directed", first, second) if self.arrows[place] == "forward" else ("directed", second, first)

    @cached_property
    def inner(self) -> tuple[tuple[int, Role], ...]:
        """The nodes between the ends with their roles."""
        return tuple((self.nodes[place], self.role(place)) for place in range(1, len(self.nodes) - 1))


@dataclass(frozen=True, slots=True)
class Step:
    """Why an open path passes a node; for a collider ``through`` leads down to the conditioned node."""

    node: Label
    role: Role
    because: Because
    through: tuple[Label, ...] = ()


@dataclass(frozen=True, slots=True)
class OpenPath:
    """A path with the reason why each node between its ends lets it through."""

    nodes: tuple[Label, ...]
    arrows: tuple[Arrow, ...]
    steps: tuple[Step, ...]


def find_open_path(
    graph: CausalGraph, starts: int, ends: int, conditions: Conditions, *, fewest_colliders: bool = False
) -> Trail | None:
    """A shortest path from ``starts`` to ``ends`` that is open, or None where there is none.

    With ``fewest_colliders`` one with the fewest opened colliders, a shortest among those. Of several the one
    whose end comes first in the graph's order; then, from the end backwards, the one whose node before comes
    first (with ``fewest_colliders`` an opened collider before any other); an arrow before a bidirected edge.
    """
    return next(find_open_paths(graph, starts, ends, conditions, fewest_colliders=fewest_colliders), None)


def find_open_paths(
    graph: CausalGraph, starts: int, ends: int, conditions: Conditions, *, fewest_colliders: bool = False
) -> Iterator[Trail]:
    """The same for each of ``ends`` that there is an open path to, nearest first; one search for all."""
    if graph.is_small:
        walks = open_walks(graph, starts, ends, conditions, fewest_colliders=fewest_colliders)
        return (Trail(tuple(nodes), tuple(arrows)) for nodes, arrows in walks)
    return _by_heap(graph, starts, ends, conditions, fewest_colliders=fewest_colliders)


def explain_path(kept: Kept, trail: Trail, openers: int) -> OpenPath:
    """The path by names, each step with the reason why it is open given ``openers``."""
    steps = tuple(_step(kept, node, role, openers) for node, role in trail.inner)
    return OpenPath(tuple(map(kept.label, trail.nodes)), trail.arrows, steps)


def directed_path(graph: CausalGraph, starts: int, ends: int, *, avoiding: int = 0) -> Trail | None:
    """A shortest directed path from one set into another that enters nothing to be avoided, or None.

    Of several the one whose first node comes first in the graph's order, then its second, and so on.
    """
    if graph.is_small:
        nodes = directed_walk(graph, starts, ends, avoiding)
    else:
        nodes = _directed_by_queue(graph, starts, ends, avoiding)
    if nodes is None:
        return None
    arrows: list[Arrow] = ["forward"] * (len(nodes) - 1)
    return Trail(tuple(nodes), tuple(arrows))


def opened_by(graph: CausalGraph, collider: int, openers: int) -> Trail:
    """The shortest directed path from an open collider to the conditioned node that opens it."""
    trail = directed_path(graph, 1 << collider, openers)
    if trail is None:
        message = "an open collider is conditioned on or leads into a conditioned node"
        raise AssertionError(message)
    return trail


def _by_heap(
    graph: CausalGraph, starts: int, ends: int, conditions: Conditions, *, fewest_colliders: bool
) -> Iterator[Trail]:
    per_collider = 2 * graph.size + 1 if fewest_colliders else 0
    passes, opens = _flags(graph, ~conditions.blocking), _flags(graph, conditions.opening)
    starting, awaited = _flags(graph, starts), bytearray(_flags(graph, ends))
    came_from: dict[int, tuple[int, Arrow]] = {}
    best = {2 * node: 0 for node in members(starts)}
    queue = [(0, state) for state in best]
    while queue:
        length, state = heapq.heappop(queue)
        if length > best[state]:
            continue
        node, by_head = state >> 1, bool(state & 1)
        if awaited[node]:
            awaited[node] = False
            yield _trail(came_from, state)
        may_pass = passes[node] or (starting[node] and not by_head)
        # Entered by an arrowhead and left against one, the node is a collider.
        may_turn = opens[node] if by_head else may_pass
        for reached, arrow, is_turn in _moves(graph, node, may_pass=bool(may_pass), may_turn=bool(may_turn)):
            total = length + 1 + (per_collider if is_turn and by_head else 0)
            if total < best.get(reached, total + 1):
                best[reached] = total
                came_from[reached] = (state, arrow)
                heapq.heappush(queue, (total, reached))


def _directed_by_queue(graph: CausalGraph, starts: int, ends: int, avoiding: int) -> list[int] | None:
    came_from: dict[int, int] = {}
    queue = deque(members(starts))
    seen = {*members(starts), *members(avoiding)}
    ending = _flags(graph, ends)
    while queue:
        node = queue.popleft()
        if ending[node]:
            nodes = [node]
            while nodes[-1] in came_from:
                nodes.append(came_from[nodes[-1]])
            return nodes[::-1]
        for child in graph.children(node):
            if child not in seen:
                seen.add(child)
                came_from[child] = node
                queue.append(child)
    return None


def _flags(graph: CausalGraph, mask: int) -> bytes:
    """A mask as one byte a node: looking up a bit of a wide mask would copy the mask."""
    return unpack(mask & graph.everything, graph.size).tobytes()


def _moves(
    graph: CausalGraph, node: int, *, may_pass: bool, may_turn: bool
) -> Iterator[tuple[int, Arrow, bool]]:
    """Where one can go on from a node: the next state, by which arrow, and leaving against an arrowhead or not."""
    if may_pass:
        for child in graph.children(node):
            yield 2 * child + 1, "forward", False
    if may_turn:
        for parent in graph.parents(node):
            yield 2 * parent, "backward", True
        for spouse in graph.spouses(node):
            yield 2 * spouse + 1, "both", True


def _trail(came_from: dict[int, tuple[int, Arrow]], state: int) -> Trail:
    states, arrows = [state], list[Arrow]()
    while states[-1] in came_from:
        before, arrow = came_from[states[-1]]
        states.append(before)
        arrows.append(arrow)
    return Trail(tuple(visited >> 1 for visited in reversed(states)), tuple(reversed(arrows)))


def _step(kept: Kept, node: int, role: Role, openers: int) -> Step:
    if role != "collider":
        return Step(kept.label(node), role, "not-conditioned")
    through = opened_by(kept.graph, node, openers).nodes
    because: Because = "conditioned" if len(through) == 1 else "descendant-conditioned"
    return Step(kept.label(node), role, because, tuple(map(kept.label, through)))
