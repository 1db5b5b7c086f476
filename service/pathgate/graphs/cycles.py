"""Does a graph hold directed cycles, and which?

Strongly connected components (scipy, Pearce 2005) decide it in O(nodes + edges); each component of more
than one node yields one shortest cycle through its first node, by breadth-first search.
"""

from __future__ import annotations

from collections import deque

import numpy as np

from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import members


def cycles(graph: CausalGraph) -> tuple[tuple[str, ...], ...]:
    """One directed cycle for each cyclic component, its first node repeated at the end; empty for a DAG.

    Self-loops are not looked for: reading refuses them by themselves.
    """
    if not len(graph.sources) or (graph.is_small and _is_sorted_out(graph)):
        return ()
    from scipy.sparse import csr_array  # noqa: PLC0415 - slow to import, and only cycles need it
    from scipy.sparse.csgraph import connected_components  # noqa: PLC0415 - as above

    steps = csr_array((np.ones(len(graph.sources)), (graph.sources, graph.targets)), shape=(graph.size,) * 2)
    count, labels = connected_components(steps, directed=True, connection="strong")
    if count == graph.size:
        return ()
    sizes = np.bincount(labels, minlength=count)
    _labels, first_of = np.unique(labels, return_index=True)
    firsts = first_of[sizes > 1].tolist()
    component_of = labels.tolist()
    return tuple(_cycle_through(graph, first, component_of) for first in sorted(firsts))


def _is_sorted_out(graph: CausalGraph) -> bool:
    """Can every node be taken away after its parents (Kahn 1962)? Quicker than setting up arrays for a few."""
    waiting_for = [parents.bit_count() for parents in graph.parent_masks]
    taken = [node for node, parents in enumerate(waiting_for) if not parents]
    for node in taken:
        for child in members(graph.child_masks[node]):
            waiting_for[child] -= 1
            if not waiting_for[child]:
                taken.append(child)
    return len(taken) == graph.size


def _cycle_through(graph: CausalGraph, first: int, labels: list[int]) -> tuple[str, ...]:
    came_from = {first: first}
    queue = deque([first])
    while True:
        # Within a strong component the search must come back to its start, so the queue never runs dry.
        node = queue.popleft()
        for child in graph.children(node):
            if child == first:
                return _walk_back(graph, came_from, first, node)
            if labels[child] == labels[first] and child not in came_from:
                came_from[child] = node
                queue.append(child)


def _walk_back(graph: CausalGraph, came_from: dict[int, int], first: int, last: int) -> tuple[str, ...]:
    walked = [first, last] if last != first else [first]
    while walked[-1] != first:
        walked.append(came_from[walked[-1]])
    return tuple(graph.name(node) for node in reversed(walked))
