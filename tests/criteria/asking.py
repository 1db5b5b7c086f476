"""Puts the oracles' plain JSON graphs and questions to the production code."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

from pathgate.criteria import Effect, Kept, Label, Part, Trail, keep_rows, total_effect
from pathgate.graphs import CausalGraph, read_graph
from tests.brute import Path, ancestors, is_open
from tests.values import Graph, Names, arrows_of, as_set, bidirected_of, node_names


def parts_of(graph: CausalGraph, selected_on: Iterable[dict[str, Any]]) -> list[Part]:
    """The parts of a request, each given as an object."""
    return [
        Part(graph.mask(as_set(part["columns"])), fixed=part.get("fixed", False), written=part)
        for part in selected_on
    ]


def kept_of(value: Graph, selected_on: Iterable[dict[str, Any]] = ()) -> Kept:
    """The graph as seen through the rows kept; its selection nodes stand where the oracle's stand."""
    graph = read_graph(value)
    return keep_rows(graph, parts_of(graph, selected_on))


def effect_of(
    value: Graph, treatments: Names, outcomes: Names, selected_on: Iterable[dict[str, Any]] = ()
) -> Effect:
    """The total effect as the production code understands it."""
    kept = kept_of(value, selected_on)
    return total_effect(kept, kept.graph.mask(as_set(treatments)), kept.graph.mask(as_set(outcomes)))


def path_of(trail: Trail, selected: Graph) -> Path:
    """The oracle's path for a trail by indices; ``selected`` has its selection nodes at the end, as the
    production code has."""
    names = node_names(selected)
    return Path(tuple(names[node] for node in trail.nodes), trail.arrows)


def assert_is_open_path(path: Path, selected: Graph, given: Names, starts: Names, ends: Names) -> None:
    """By definition: it joins the two sets, meets no node twice, its edges exist, and each step is open."""
    assert path.nodes[0] in as_set(starts)
    assert path.nodes[-1] in as_set(ends)
    assert len(set(path.nodes)) == len(path.nodes) == len(path.arrows) + 1
    assert edges_exist(path, selected)
    assert is_open(selected, path, given)


def edges_exist(path: Path, graph: Graph) -> bool:
    """Is there an edge of the kind it says between each two nodes of the path?"""
    arrows = set(arrows_of(graph))
    bows = {frozenset(ends) for ends in bidirected_of(graph)}
    steps = zip(path.nodes, path.arrows, path.nodes[1:], strict=False)
    there = {
        "forward": lambda one, other: (one, other) in arrows,
        "backward": lambda one, other: (other, one) in arrows,
        "both": lambda one, other: frozenset({one, other}) in bows,
    }
    return all(there[arrow](one, other) for one, arrow, other in steps)


def is_directed_path(nodes: tuple[str, ...], graph: Graph) -> bool:
    """Does an arrow lead from each node to the next?"""
    return edges_exist(Path(nodes, ("forward",) * (len(nodes) - 1)), graph)


def name_of(label: Label, kept: Kept, selected: Graph) -> str:
    """The oracle's name for what an answer calls a node."""
    if isinstance(label, str):
        return label
    (node,) = (node for node, part in kept.part_of.items() if part is label)
    return node_names(selected)[node]


def roles_of(path: Path, graph: Graph, given: Names) -> list[tuple[str, str, str]]:
    """(node, role, why it is open) for each node between the ends, by definition."""
    told = []
    for place, (node, is_collider) in enumerate(path.inner(), start=1):
        is_fork = path.arrows[place - 1] == "backward" and path.arrows[place] == "forward"
        if is_collider:
            assert node in ancestors(graph, given)
            because = "conditioned" if node in as_set(given) else "descendant-conditioned"
            told.append((node, "collider", because))
        else:
            told.append((node, "fork" if is_fork else "chain", "not-conditioned"))
    return told
