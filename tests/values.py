"""How do tests read and write a graph in the plain JSON form that callers send?

Everything here works on that value (``{"nodes": [...], "edges": [...]}``) and on nothing else, so that the
oracles built on it share no code with what they judge.
"""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

Graph = dict[str, Any]
Names = str | Iterable[str]


def graph_of(
    *arrows: tuple[str, str],
    bidirected: Iterable[tuple[str, str]] = (),
    unmeasured: Iterable[str] = (),
    isolated: Iterable[str] = (),
) -> Graph:
    """A graph value from its edges; nodes stand in the order in which the edges first name them."""
    pairs = [*arrows, *bidirected]
    names = list(dict.fromkeys([*(end for pair in pairs for end in pair), *isolated]))
    hidden = set(unmeasured)
    nodes = [{"id": name, "measured": False} if name in hidden else {"id": name} for name in names]
    edges = [{"source": source, "target": target} for source, target in arrows]
    both = [{"source": a, "target": b, "kind": "bidirected"} for a, b in bidirected]
    return {"nodes": nodes, "edges": edges + both}


def as_set(names: Names) -> frozenset[str]:
    """A name or several names, as a set."""
    return frozenset([names]) if isinstance(names, str) else frozenset(names)


def node_names(graph: Graph) -> list[str]:
    """Every node, in the order of the graph."""
    return [node if isinstance(node, str) else node["id"] for node in graph["nodes"]]


def measured_names(graph: Graph) -> list[str]:
    """The nodes the platform holds, in the order of the graph."""
    nodes = zip(node_names(graph), graph["nodes"], strict=True)
    return [name for name, node in nodes if isinstance(node, str) or node.get("measured", True)]


def arrows_of(graph: Graph) -> list[tuple[str, str]]:
    """(source, target) of every directed edge."""
    edges = graph["edges"]
    return [(edge["source"], edge["target"]) for edge in edges if not _is_bidirected(edge)]


def bidirected_of(graph: Graph) -> list[tuple[str, str]]:
    """Both ends of every bidirected edge."""
    edges = graph["edges"]
    return [(edge["source"], edge["target"]) for edge in edges if _is_bidirected(edge)]


def _is_bidirected(edge: dict[str, Any]) -> bool:
    return bool(edge.get("kind", "directed") == "bidirected")


def is_adjacent(graph: Graph, one: str, other: str) -> bool:
    """Does an edge of any kind join the two?"""
    return any({one, other} == {a, b} for a, b in arrows_of(graph) + bidirected_of(graph))


def without_arrow(graph: Graph, source: str, target: str) -> Graph:
    """The same graph less one directed edge (a bidirected edge between the two stays)."""
    kept = [
        edge
        for edge in graph["edges"]
        if _is_bidirected(edge) or (edge["source"], edge["target"]) != (source, target)
    ]
    return {**graph, "edges": kept}


def topological_names(graph: Graph) -> list[str] | None:
    """All nodes, parents before children and otherwise by name; None where there is a directed cycle."""
    waiting = sorted(node_names(graph))
    arrows = arrows_of(graph)
    ordered: list[str] = []
    while waiting:
        blocked = {target for source, target in arrows if source in waiting}
        free = next((name for name in waiting if name not in blocked), None)
        if free is None:
            return None
        waiting.remove(free)
        ordered.append(free)
    return ordered


def with_explicit_causes(graph: Graph) -> Graph:
    """The DAG in which an unmeasured node of its own stands for each bidirected edge."""
    taken = set(node_names(graph))
    nodes = list(graph["nodes"])
    edges = [edge for edge in graph["edges"] if not _is_bidirected(edge)]
    for ends in sorted(sorted(ends) for ends in bidirected_of(graph)):
        cause = fresh_name("cause", taken)
        taken.add(cause)
        nodes.append({"id": cause, "measured": False})
        edges += [{"source": cause, "target": end} for end in ends]
    return {"nodes": nodes, "edges": edges}


def fresh_name(stem: str, taken: Iterable[str]) -> str:
    """A name that is not taken yet."""
    used, number = set(taken), 0
    while f"{stem}:{number}" in used:
        number += 1
    return f"{stem}:{number}"
