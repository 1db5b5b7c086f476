"""Who descends from whom: ancestors and descendants of a set of nodes, the set itself included.

Small graphs work on bit masks (``closures``), large ones search compressed rows; O(nodes + edges) either way.
"""

from __future__ import annotations

import numpy as np

from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import pack, unpack
from pathgate.graphs.rows import Rows


def ancestors(graph: CausalGraph, nodes: int, *, avoiding: int = 0) -> int:
    """The nodes from which a directed path leads into ``nodes``, ``nodes`` themselves included.

    With ``avoiding``, only paths that do not enter that set count (a node of ``nodes`` stays a start even
    if it lies in it).

    >>> graph = CausalGraph.of(("rain", "delay"), ("delay", "refund"))
    >>> graph.names_of(ancestors(graph, graph.mask("delay")))
    ('rain', 'delay')
    """
    if graph.is_small:
        return graph.ancestor_closures.reached(nodes, avoiding)
    return _reach(graph.parent_rows, nodes, avoiding)


def descendants(graph: CausalGraph, nodes: int, *, avoiding: int = 0) -> int:
    """The nodes to which a directed path leads from ``nodes``; the mirror image of ``ancestors``.

    >>> graph = CausalGraph.of(("rain", "delay"), ("delay", "refund"))
    >>> graph.names_of(descendants(graph, graph.mask("delay")))
    ('delay', 'refund')
    """
    if graph.is_small:
        return graph.descendant_closures.reached(nodes, avoiding)
    return _reach(graph.child_rows, nodes, avoiding)


def _reach(rows: Rows, nodes: int, avoiding: int) -> int:
    if avoiding:
        allowed = ~unpack(avoiding, rows.size)[rows.ends]
        starts = np.repeat(np.arange(rows.size), np.diff(rows.begins))
        rows = Rows.of(rows.size, starts[allowed], rows.ends[allowed])
    return pack(rows.reached_from(np.flatnonzero(unpack(nodes, rows.size))))
