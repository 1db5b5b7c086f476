"""Random graphs for the benchmarks, as requests and as networkx graphs."""

from __future__ import annotations

import json
import random
from typing import Any

import networkx as nx


def random_pairs(nodes: int, edges: int, seed: int = 1) -> list[tuple[str, str]]:
    """Arrows of an acyclic graph, in random order, no pair twice."""
    rng = random.Random(seed)
    pairs: set[tuple[int, int]] = set()
    while len(pairs) < edges:
        first, second = rng.randrange(nodes), rng.randrange(nodes)
        if first != second:
            pairs.add((min(first, second), max(first, second)))
    # Names are dealt at random, so that no order of names helps anybody.
    names = [f"column_{place}" for place in range(nodes)]
    rng.shuffle(names)
    listed = [(names[first], names[second]) for first, second in sorted(pairs)]
    rng.shuffle(listed)
    return listed


def graph_value(nodes: int, pairs: list[tuple[str, str]]) -> dict[str, Any]:
    """The graph as a request holds it."""
    return {
        "nodes": [{"id": f"column_{place}"} for place in range(nodes)],
        "edges": [{"source": source, "target": target} for source, target in pairs],
    }


def peer_graph(nodes: int, pairs: list[tuple[str, str]]) -> nx.DiGraph[str]:
    """The same graph as networkx holds it."""
    graph: nx.DiGraph[str] = nx.DiGraph()
    graph.add_nodes_from(f"column_{place}" for place in range(nodes))
    graph.add_edges_from(pairs)
    return graph


def random_statements(nodes: int, count: int, most_given: int = 6, seed: int = 2) -> list[dict[str, Any]]:
    """Statements about single columns, each with up to ``most_given`` columns given."""
    rng = random.Random(seed)
    statements = []
    for _ in range(count):
        chosen = [f"column_{place}" for place in rng.sample(range(nodes), rng.randint(2, 2 + most_given))]
        statements.append({"x": chosen[0], "y": chosen[1], "given": chosen[2:]})
    return statements


def body_of(value: dict[str, Any]) -> bytes:
    """A request's body."""
    return json.dumps(value).encode()
