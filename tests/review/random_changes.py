"""Random changes of a graph, and what a graph with some of the changes is, both on plain values alone."""

from __future__ import annotations

import random
from collections.abc import Iterable
from itertools import count
from typing import Any

from pathgate.review.graph_difference import Change, EdgeChange
from tests.values import Graph, arrows_of, node_names, topological_names

Edge = tuple[str, str, str]


def changed_graph(rng: random.Random, graph: Graph, most: int = 4) -> Graph:
    """The graph after one to ``most`` random edits, still a causal graph; nodes keep their order."""
    for _ in range(rng.randint(1, most)):
        for _attempt in range(20):
            edited = rng.choice(_EDITS)(rng, graph)
            if edited is not None and is_causal(edited):
                graph = edited
                break
    return graph


def is_causal(graph: Graph) -> bool:
    """No cycle, no arrow back in time, no edge twice."""
    edges = [_named(edge) for edge in graph["edges"]]
    recorded = {node["id"]: node["recorded"] for node in graph["nodes"] if "recorded" in node}
    in_time = all(
        recorded.get(source, -99) <= recorded.get(target, 99) or target not in recorded
        for source, target in arrows_of(graph)
    )
    return topological_names(graph) is not None and len(set(edges)) == len(edges) and in_time


def graph_with(old: Graph, new: Graph, changes: Iterable[Change]) -> Graph:
    """The old graph after some changes on the way to the new one, nodes in the new one's order."""
    nodes = {node["id"]: node for node in old["nodes"]}
    told = {node["id"]: node for node in new["nodes"]}
    edges = {_named(edge) for edge in old["edges"]}
    for each in changes:
        if isinstance(each, EdgeChange):
            edges -= {_canonical(each.was or each.edge)}
            if each.change != "removed":
                edges.add(_canonical(each.edge))
        elif each.change == "removed":
            del nodes[each.node]
        else:
            nodes[each.node] = told[each.node]
            if each.change == "added":
                edges |= {edge for edge in map(_named, new["edges"]) if each.node in edge[1:]}
    order = [*told, *(name for name in nodes if name not in told)]
    kept = [_without_missing(nodes[name], nodes) for name in order if name in nodes]
    return {
        "nodes": kept,
        "edges": [
            {"kind": kind, "source": source, "target": target}
            for kind, source, target in sorted(edges)
            if source in nodes and target in nodes
        ],
    }


def _without_missing(node: dict[str, Any], nodes: Iterable[str]) -> dict[str, Any]:
    if "constant_within" not in node:
        return node
    return {**node, "constant_within": [name for name in node["constant_within"] if name in nodes]}


def edges_of(graph: Graph) -> set[Edge]:
    """All edges as kind and ends; those of a bidirected one sorted."""
    return {_named(edge) for edge in graph["edges"]}


def _named(edge: dict[str, Any]) -> Edge:
    return _canonical((edge.get("kind", "directed"), edge["source"], edge["target"]))


def _canonical(edge: Edge) -> Edge:
    kind, source, target = edge
    return edge if kind == "directed" else (kind, *sorted((source, target)))  # type: ignore[return-value]


def _edge_added(rng: random.Random, graph: Graph) -> Graph | None:
    names = node_names(graph)
    if len(names) < 2:
        return None
    source, target = rng.sample(names, 2)
    kind = rng.choice(["directed", "directed", "bidirected"])
    return {**graph, "edges": [*graph["edges"], {"source": source, "target": target, "kind": kind}]}


def _edge_removed(rng: random.Random, graph: Graph) -> Graph | None:
    edges = list(graph["edges"])
    if not edges:
        return None
    edges.pop(rng.randrange(len(edges)))
    return {**graph, "edges": edges}


def _edge_turned(rng: random.Random, graph: Graph) -> Graph | None:
    edges = list(graph["edges"])
    if not edges:
        return None
    place = rng.randrange(len(edges))
    edges[place] = {**edges[place], "source": edges[place]["target"], "target": edges[place]["source"]}
    return {**graph, "edges": edges}


def _kind_changed(rng: random.Random, graph: Graph) -> Graph | None:
    edges = list(graph["edges"])
    if not edges:
        return None
    place = rng.randrange(len(edges))
    kind = "directed" if edges[place].get("kind") == "bidirected" else "bidirected"
    edges[place] = {**edges[place], "kind": kind}
    return {**graph, "edges": edges}


def _node_changed(rng: random.Random, graph: Graph) -> Graph:
    nodes = list(graph["nodes"])
    place = rng.randrange(len(nodes))
    node = dict(nodes[place])
    match rng.choice(["measured", "measured", "recorded", "constant_within", "columns"]):
        case "measured":
            node["measured"] = not node.get("measured", True)
        case "recorded":
            node["recorded"] = rng.randint(0, 3)
        case "constant_within":
            node["constant_within"] = rng.sample(node_names(graph), 1)
        case _:
            node["columns"] = [f"warehouse.{node['id']}"]
    nodes[place] = node
    return {**graph, "nodes": nodes}


def _node_added(rng: random.Random, graph: Graph) -> Graph | None:
    name = next(name for place in count() if (name := f"new{place}") not in node_names(graph))
    chosen = rng.sample(node_names(graph), min(2, len(graph["nodes"])))
    added = [
        {"source": name, "target": other} if rng.random() < 0.7 else {"source": other, "target": name}
        for other in chosen
    ]
    nodes = list(graph["nodes"])
    nodes.insert(rng.randint(0, len(nodes)), {"id": name, "measured": rng.random() < 0.5})
    return {"nodes": nodes, "edges": [*graph["edges"], *added]}


def _node_removed(rng: random.Random, graph: Graph) -> Graph | None:
    if len(graph["nodes"]) < 3:
        return None
    gone = rng.choice(node_names(graph))
    nodes = [node for node in graph["nodes"] if node["id"] != gone]
    held = {node["id"]: node for node in nodes}
    kept = [edge for edge in graph["edges"] if gone not in (edge["source"], edge["target"])]
    return {"nodes": [_without_missing(node, held) for node in nodes], "edges": kept}


_EDITS = (
    _edge_added,
    _edge_added,
    _edge_removed,
    _edge_turned,
    _kind_changed,
    _node_changed,
    _node_added,
    _node_removed,
)
