"""What does a sound config hinge on? By making every change to the graph and judging the config anew.

An edge is added, turned or taken away alone; what leaves a graph with a cycle or an arrow back in time is no graph.
What a config computes keeps its inputs and gets no other cause.
"""

from __future__ import annotations

from collections.abc import Iterator
from itertools import combinations
from typing import Any

from tests.review.brute_review import Question, reviews_as_sound
from tests.values import Graph, arrows_of, bidirected_of, node_names, topological_names

Edge = tuple[str, str, str]
"""Kind, source, target."""


def absent_hinges(question: Question) -> set[Edge]:
    """The absent edges any one of which would make the config anything but sound."""
    grown = question.columns.graph
    return {edge for edge in _absent_edges(question) if _is_lost(question, with_edge(grown, edge))}


def reversed_hinges(question: Question) -> set[Edge]:
    """The arrows whose turning round would, named as they are in the graph."""
    grown = question.columns.graph
    turned = {("directed", *ends) for ends in arrows_of(question.graph)}
    return {edge for edge in turned if _is_lost(question, with_turned(grown, edge))}


def removed_hinges(question: Question) -> set[Edge]:
    """The edges whose absence would."""
    edges, grown = edges_of(question.graph), question.columns.graph
    return {edge for edge in edges if _is_lost(question, without_edges(grown, {edge}))}


def doubtful_verdict(question: Question, doubtful: list[Edge]) -> tuple[str, set[Edge]]:
    """Is the config sound with and without the doubtful edges, and which of them decide it in some company?"""
    sound = {}
    for count in range(len(doubtful) + 1):
        for absent in map(frozenset, combinations(doubtful, count)):
            sound[absent] = reviews_as_sound(question, without_edges(question.columns.graph, absent))
    verdict = "always" if all(sound.values()) else "depends" if any(sound.values()) else "never"
    return verdict, {edge for absent in sound for edge in absent if sound[absent] != sound[absent - {edge}]}


def edges_of(graph: Graph) -> set[Edge]:
    """Every edge of the graph, bidirected ones with their ends in the order of the nodes."""
    place = node_names(graph).index
    both = (sorted(ends, key=place) for ends in bidirected_of(graph))
    return {("directed", *ends) for ends in arrows_of(graph)} | {("bidirected", a, b) for a, b in both}


def with_edge(graph: Graph, edge: Edge) -> Graph:
    """The graph with one more edge."""
    kind, source, target = edge
    return {**graph, "edges": [*graph["edges"], {"source": source, "target": target, "kind": kind}]}


def without_edges(graph: Graph, absent: Any) -> Graph:
    """The graph less some edges."""
    kept = [edge for edge in graph["edges"] if not _names_of(edge, graph) & set(absent)]
    return {**graph, "edges": kept}


def with_turned(graph: Graph, edge: Edge) -> Graph:
    """The graph with one arrow the other way round."""
    kind, source, target = edge
    return with_edge(without_edges(graph, {edge}), (kind, target, source))


def is_faulty(graph: Graph) -> bool:
    """Does the graph have a cycle, or an arrow from what is recorded later to what is recorded earlier?"""
    recorded = {node["id"]: node["recorded"] for node in graph["nodes"] if "recorded" in node}
    is_back_in_time = any(
        a in recorded and b in recorded and recorded[a] > recorded[b] for a, b in arrows_of(graph)
    )
    return is_back_in_time or topological_names(graph) is None


def _absent_edges(question: Question) -> Iterator[Edge]:
    """All edges that might exist: what is computed from others has no other cause, measured or not."""
    grown = question.columns.graph
    names, present, computed = node_names(grown), edges_of(grown), set(question.columns.inputs)
    candidates = [("bidirected", a, b) for a, b in combinations(names, 2) if not {a, b} & computed]
    candidates += [("directed", a, b) for a in names for b in names if a != b and b not in computed]
    return (edge for edge in candidates if edge not in present)


def _is_lost(question: Question, grown: Graph) -> bool:
    return not is_faulty(grown) and not reviews_as_sound(question, grown)


def _names_of(edge: dict[str, Any], graph: Graph) -> set[Edge]:
    kind, ends = edge.get("kind", "directed"), (edge["source"], edge["target"])
    return {(kind, *ends)} if kind == "directed" else {(kind, *ends), (kind, *reversed(ends))}
