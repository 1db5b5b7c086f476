"""The graph over the measured nodes alone that says the same about them.

The latent projection (Verma & Pearl 1990): an arrow where a directed path leads from one measured node to
another past unmeasured ones only, a bidirected edge where two measured nodes lie below a common unmeasured
cause in that way. Separation among measured nodes is the same in both graphs. O(nodes · edges / word).
"""

from __future__ import annotations

from itertools import combinations

import numpy as np

from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import IntArray, members


def latent_projection(graph: CausalGraph) -> CausalGraph:
    """The graph over the measured nodes, in their order.

    >>> graph = CausalGraph.of(("habit", "ticket"), ("habit", "refund"), unmeasured=["habit"])
    >>> projected = latent_projection(graph)
    >>> projected.names, len(projected.sources), len(projected.lower_ends)
    (('ticket', 'refund'), 0, 1)
    """
    seen_below = _measured_below(graph)
    measured = list(members(graph.measured))
    place = {node: position for position, node in enumerate(measured)}
    arrows = [(place[node], place[child]) for node in measured for child in members(seen_below[node])]
    bows = {
        (place[first], place[second])
        for pairs in (_below_unmeasured(graph, seen_below), _across_bows(graph, seen_below))
        for first, second in pairs
    }
    sources, targets = _columns(sorted(arrows))
    lower_ends, upper_ends = _columns(sorted((min(pair), max(pair)) for pair in bows if pair[0] != pair[1]))
    return CausalGraph(
        names=tuple(map(graph.name, measured)),
        sources=sources,
        targets=targets,
        lower_ends=lower_ends,
        upper_ends=upper_ends,
        measured=(1 << len(measured)) - 1,
    )


def _measured_below(graph: CausalGraph) -> list[int]:
    """For each node the measured nodes that a directed path past unmeasured nodes leads to."""
    below = [0] * graph.size
    for node in reversed(graph.topological_order):
        for child in graph.children(node):
            below[node] |= 1 << child if graph.measured >> child & 1 else below[child]
    return below


def _below_unmeasured(graph: CausalGraph, below: list[int]) -> set[tuple[int, int]]:
    hidden = members(graph.everything & ~graph.measured)
    return {pair for node in hidden for pair in combinations(members(below[node]), 2)}


def _across_bows(graph: CausalGraph, below: list[int]) -> set[tuple[int, int]]:
    def seen(node: int) -> list[int]:
        return [node] if graph.measured >> node & 1 else list(members(below[node]))

    ends = zip(graph.lower_ends.tolist(), graph.upper_ends.tolist(), strict=True)
    pairs = ((first, second) for lower, upper in ends for first in seen(lower) for second in seen(upper))
    return {(min(pair), max(pair)) for pair in pairs}


def _columns(pairs: list[tuple[int, int]]) -> tuple[IntArray, IntArray]:
    columns = np.array(pairs, dtype=np.int64).reshape(-1, 2)
    return columns[:, 0], columns[:, 1]
