"""Causal graphs to and from networkx, which draws, lays out and exports them.

A ``MultiDiGraph`` holds what a causal graph can hold: an edge's ``kind`` tells a bidirected edge (kept once,
from its lower end to its upper one) from an arrow. A plain ``DiGraph`` is taken as it is.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from pathgate.graphs.graph import CausalGraph, Edge
from pathgate.graphs.reading import read_graph

if TYPE_CHECKING:
    import networkx


def to_networkx(graph: CausalGraph) -> networkx.MultiDiGraph[str]:
    """The graph as a networkx ``MultiDiGraph`` whose attributes are the members of the JSON form.

    >>> to_networkx(CausalGraph.of(("rain", "delay"))).edges
    OutMultiEdgeView([('rain', 'delay', 0)])
    """
    import networkx  # noqa: PLC0415 - slow to import, and only this function needs it

    result: networkx.MultiDiGraph[str] = networkx.MultiDiGraph()
    for node, name in enumerate(graph.names):
        result.add_node(name, **_node_attributes(graph, node))
    for kind, first, second in edges_of(graph):
        result.add_edge(
            graph.name(first), graph.name(second), **_edge_attributes(graph, (kind, first, second))
        )
    return result


def from_networkx(graph: networkx.Graph[Any]) -> CausalGraph:
    """The causal graph that a networkx ``DiGraph`` or ``MultiDiGraph`` with names as nodes holds.

    Raises:
        InvalidGraph: it holds a cycle, an unknown member, a node that is not a string, or no directions.
    """
    import networkx  # noqa: PLC0415 - as above

    return read_graph(networkx.node_link_data(graph, edges="edges"))


def edges_of(graph: CausalGraph) -> list[Edge]:
    """All edges: the arrows by source and target, then the bidirected edges by their ends."""
    arrows = zip(graph.sources.tolist(), graph.targets.tolist(), strict=True)
    bows = zip(graph.lower_ends.tolist(), graph.upper_ends.tolist(), strict=True)
    return [("directed", *pair) for pair in arrows] + [("bidirected", *pair) for pair in bows]


def _node_attributes(graph: CausalGraph, node: int) -> dict[str, object]:
    said: dict[str, object] = {"measured": bool(graph.measured >> node & 1), "cost": graph.cost(node)}
    if node in graph.recorded:
        said["recorded"] = graph.recorded[node]
    if node in graph.constant_within:
        said["constant_within"] = [graph.name(other) for other in graph.constant_within[node]]
    aliases = [alias for alias, owner in graph.aliases.items() if owner == node]
    return said | ({"columns": aliases} if aliases else {})


def _edge_attributes(graph: CausalGraph, edge: Edge) -> dict[str, object]:
    said: dict[str, object] = {"kind": edge[0]}
    if edge in graph.doubtful:
        said["doubtful"] = True
    if edge in graph.notes:
        said["note"] = graph.notes[edge]
    return said
