"""Who descends from whom: ancestors and descendants of a set of nodes, the set itself included.

Small graphs spread a bit mask; large ones run scipy's breadth-first search over compressed rows, so depth
costs nothing. O(nodes + edges) either way.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from scipy.sparse import csr_array
from scipy.sparse.csgraph import breadth_first_order

from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import BoolArray, IntArray, pack, unpack


def ancestors(graph: CausalGraph, nodes: int, *, avoiding: int = 0) -> int:
    """The nodes from which a directed path leads into ``nodes``, ``nodes`` themselves included.

    With ``avoiding``, only paths that do not enter that set count (a node of ``nodes`` stays a start even
    if it lies in it).

    >>> graph = CausalGraph.of(("rain", "delay"), ("delay", "refund"))
    >>> graph.names_of(ancestors(graph, graph.mask("delay")))
    ('rain', 'delay')
    """
    if graph.is_small:
        return _spread(graph.parent_masks, nodes, avoiding)
    return _reach(graph, graph.targets, graph.sources, nodes, avoiding)


def descendants(graph: CausalGraph, nodes: int, *, avoiding: int = 0) -> int:
    """The nodes to which a directed path leads from ``nodes``; the mirror image of ``ancestors``.

    >>> graph = CausalGraph.of(("rain", "delay"), ("delay", "refund"))
    >>> graph.names_of(descendants(graph, graph.mask("delay")))
    ('delay', 'refund')
    """
    if graph.is_small:
        return _spread(graph.child_masks, nodes, avoiding)
    return _reach(graph, graph.sources, graph.targets, nodes, avoiding)


def reached(size: int, starts: IntArray, ends: IntArray, seeds: IntArray) -> BoolArray:
    """Which of ``size`` states some chain of steps ``starts[i] → ends[i]`` reaches from the seeds."""
    # One more state that steps to every seed makes several seeds a single start.
    starts = np.concatenate([starts, np.full(len(seeds), size)])
    ends = np.concatenate([ends, seeds])
    steps = csr_array((np.ones(len(starts)), (starts, ends)), shape=(size + 1, size + 1))
    order = breadth_first_order(steps, size, directed=True, return_predecessors=False)
    flags = np.zeros(size + 1, dtype=np.bool_)
    flags[order] = True
    return flags[:size]


def _spread(neighbours: Sequence[int], nodes: int, avoiding: int) -> int:
    found = frontier = nodes
    while frontier:
        lowest = frontier & -frontier
        new = neighbours[lowest.bit_length() - 1] & ~(found | avoiding)
        found |= new
        frontier = (frontier ^ lowest) | new
    return found


def _reach(graph: CausalGraph, starts: IntArray, ends: IntArray, nodes: int, avoiding: int) -> int:
    if avoiding:
        allowed = ~unpack(avoiding, graph.size)[ends]
        starts, ends = starts[allowed], ends[allowed]
    return pack(reached(graph.size, starts, ends, np.flatnonzero(unpack(nodes, graph.size))))
