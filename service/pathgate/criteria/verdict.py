"""Does a set of nodes separate two others? The verdict alone, as fast as it can be had.

Only the ancestors of the three sets matter, and among them only whether the two are joined when the arrows
out of the given nodes are taken away and all directions ignored: that is connection in the augmented graph of
the ancestors (Lauritzen et al. 1990; Richardson 2003), seen through its hubs (``hubs``), where each node
stands for the clique of itself and its parents. One search without states, O(nodes + edges).
"""

from __future__ import annotations

import numpy as np

from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.kinship import ancestors
from pathgate.graphs.masks import unpack


def are_separated(graph: CausalGraph, xs: int, ys: int, given: int) -> bool:
    """Is every path between two sets blocked by a third? Over masks known to be disjoint, x and y not empty.

    >>> graph = CausalGraph.of(("rain", "delay"), ("promo", "delay"))
    >>> are_separated(graph, 1, 4, 0), are_separated(graph, 1, 4, 2)
    (True, False)
    """
    return are_apart(graph, xs, ys, given, ancestors(graph, xs | ys | given))


def are_apart(
    graph: CausalGraph, xs: int, ys: int, given: int, relevant: int, *, lacking: tuple[int, int] = (0, 0)
) -> bool:
    """The same where ``relevant``, the ancestors of the three sets, is at hand already.

    Arrows from the first of two sets into the second, ``lacking``, count as not there.
    """
    if graph.is_small:
        return _are_apart_by_masks(graph, xs, ys, given, relevant, lacking)
    return _are_apart_by_arrays(graph, xs, ys, given, relevant, lacking)


def _are_apart_by_masks(
    graph: CausalGraph, xs: int, ys: int, given: int, relevant: int, lacking: tuple[int, int]
) -> bool:
    parents, children, spouses = graph.parent_masks, graph.child_masks, graph.spouse_masks
    sources, targets = lacking
    seen = frontier = xs
    free = ~given
    while frontier:
        lowest = frontier & -frontier
        node = lowest.bit_length() - 1
        above, below = parents[node], children[node]
        if lowest & targets:
            above &= ~sources
        if lowest & sources:
            below &= ~targets
        near = above & free | spouses[node]
        if lowest & free:
            near |= below
        near &= relevant & ~seen
        if near & ys:
            return False
        seen |= near
        frontier = frontier ^ lowest | near
    return True


def _are_apart_by_arrays(
    graph: CausalGraph, xs: int, ys: int, given: int, relevant: int, lacking: tuple[int, int]
) -> bool:
    from scipy.sparse import csr_array  # noqa: PLC0415 - slow to import, and small graphs do without
    from scipy.sparse.csgraph import connected_components  # noqa: PLC0415 - as above

    size = graph.size
    inside, leaves = unpack(relevant, size), ~unpack(given, size)
    # An arrow into a relevant node comes from one.
    arrows = inside[graph.targets] & leaves[graph.sources]
    if lacking[0] and lacking[1]:
        arrows &= ~(unpack(lacking[0], size)[graph.sources] & unpack(lacking[1], size)[graph.targets])
    bows = inside[graph.lower_ends] & inside[graph.upper_ends]
    firsts = np.concatenate([graph.sources[arrows], graph.lower_ends[bows]])
    seconds = np.concatenate([graph.targets[arrows], graph.upper_ends[bows]])
    joints = csr_array((np.ones(len(firsts)), (firsts, seconds)), shape=(size, size))
    _count, component = connected_components(joints, directed=False)
    at_x = component[unpack(xs, size)]
    at_y = component[unpack(ys, size)]
    return not np.isin(at_x, at_y).any()
