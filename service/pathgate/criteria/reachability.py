"""Which nodes does some open path join to a set of nodes?

Reachability over pairs (node, how it was entered), after Shachter 1998; with bidirected edges it decides
m-separation (Richardson 2003). An edge entered against its arrow arrives by the tail, otherwise by an
arrowhead; a node entered and left by arrowheads is a collider. O(nodes + edges) a question: bit masks on
small graphs, scipy's breadth-first search over compressed rows on large ones.

Blocking and opening are separate sets, so that one can ask which path a conditioned node opens while it
goes on blocking others. For plain separation both are the conditioned nodes.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.kinship import ancestors
from pathgate.graphs.masks import BoolArray, IntArray, pack, unpack
from pathgate.graphs.rows import Rows


@dataclass(frozen=True, slots=True)
class Conditions:
    """What lets paths through.

    Attributes:
        blocking: nodes that stop a path at a chain or a fork.
        opening: nodes at which a collider is open: those that open it and all their ancestors.
        relevant: nodes outside which no open path between the ends in question leads; a search for one may use it.
    """

    blocking: int = 0
    opening: int = 0
    relevant: int = -1

    @classmethod
    def on(cls, graph: CausalGraph, conditioned: int) -> Conditions:
        """Plain conditioning on a set of nodes."""
        return cls(conditioned, ancestors(graph, conditioned))


def connected(graph: CausalGraph, starts: int, conditions: Conditions) -> int:
    """The nodes joined to ``starts`` by an open path, the starts and blocked ends of such paths included.

    Args:
        graph: the graph.
        starts: where paths begin; passed freely.
        conditions: what blocks and what opens.
    """
    by_tail, by_head = entered(graph, starts, conditions)
    return by_tail | by_head


def entered(graph: CausalGraph, starts: int, conditions: Conditions) -> tuple[int, int]:
    """The same told apart: nodes entered by the tail of an edge (and the starts), nodes entered by an arrowhead."""
    if graph.is_small:
        return _by_masks(graph, starts, conditions)
    return _by_arrays(graph, starts, conditions)


def _by_masks(graph: CausalGraph, starts: int, conditions: Conditions) -> tuple[int, int]:
    blocking, opening = conditions.blocking, conditions.opening
    parents, children, spouses = graph.parent_masks, graph.child_masks, graph.spouse_masks
    by_tail = starts
    by_head = 0
    fresh_by_tail, fresh_by_head = starts, 0
    while fresh_by_tail or fresh_by_head:
        up = down = 0
        if fresh_by_tail:
            lowest = fresh_by_tail & -fresh_by_tail
            fresh_by_tail ^= lowest
            if lowest & (starts | ~blocking):
                node = lowest.bit_length() - 1
                up, down = parents[node], children[node] | spouses[node]
        else:
            lowest = fresh_by_head & -fresh_by_head
            fresh_by_head ^= lowest
            node = lowest.bit_length() - 1
            if lowest & ~blocking:
                down = children[node]
            if lowest & opening:
                up = parents[node]
                down |= spouses[node]
        up &= ~by_tail
        down &= ~by_head
        by_tail |= up
        by_head |= down
        fresh_by_tail |= up
        fresh_by_head |= down
    return by_tail, by_head


def _by_arrays(graph: CausalGraph, starts: int, conditions: Conditions) -> tuple[int, int]:
    size = graph.size
    begins, opens = unpack(starts, size), unpack(conditions.opening, size)
    passes = ~unpack(conditions.blocking, size)
    tails, heads = graph.sources, graph.targets
    ends = np.concatenate([graph.lower_ends, graph.upper_ends])
    others = np.concatenate([graph.upper_ends, graph.lower_ends])
    # State v: node v entered by the tail, or a start. State size + v: node v entered by an arrowhead.
    steps = [
        _steps(passes | begins, heads, tails, 0, 0),
        _steps(passes | begins, tails, heads, 0, size),
        _steps(passes | begins, ends, others, 0, size),
        _steps(passes, tails, heads, size, size),
        _steps(opens, heads, tails, size, 0),
        _steps(opens, ends, others, size, size),
    ]
    starting = np.concatenate([step[0] for step in steps])
    ending = np.concatenate([step[1] for step in steps])
    order = np.argsort(starting, kind="stable")
    rows = Rows.of(2 * size, starting[order], ending[order])
    flags = rows.reached_from(np.flatnonzero(begins))
    return pack(flags[:size]), pack(flags[size:])


def _steps(
    may_leave: BoolArray, froms: IntArray, tos: IntArray, from_offset: int, to_offset: int
) -> tuple[IntArray, IntArray]:
    allowed = may_leave[froms]
    return froms[allowed] + from_offset, tos[allowed] + to_offset
