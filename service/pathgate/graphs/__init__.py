"""What a causal graph is: the immutable graph, reading it, its faults."""

from pathgate.graphs.convert import edges_of, from_networkx, to_networkx
from pathgate.graphs.errors import Fault, GraphError, InvalidGraph, PathgateError, Place, UnknownNode
from pathgate.graphs.graph import CausalGraph, Edge
from pathgate.graphs.kinship import ancestors, descendants
from pathgate.graphs.names import did_you_mean, nearest_names, quoted
from pathgate.graphs.reading import Examined, examine_graph, read_graph

__all__ = [
    "CausalGraph",
    "Edge",
    "Examined",
    "Fault",
    "GraphError",
    "InvalidGraph",
    "PathgateError",
    "Place",
    "UnknownNode",
    "ancestors",
    "descendants",
    "did_you_mean",
    "edges_of",
    "examine_graph",
    "from_networkx",
    "nearest_names",
    "quoted",
    "read_graph",
    "to_networkx",
]
