"""Small random graphs and questions about them: for hypothesis, for seeded loops, and all DAGs of a size.

Graphs come as plain JSON values, in no helpful order and some of the time with names that break careless
code. Nothing here decides anything; the oracles do.
"""

from __future__ import annotations

import random
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from itertools import combinations, product
from typing import Any

from hypothesis import strategies as st

from tests.values import Graph, measured_names, node_names, topological_names

PLAIN_NAMES = ("a", "b", "c", "d", "e", "f", "g", "h", "i", "j", "k", "l")
HOSTILE_NAMES = (
    '"',
    "it's",
    "two words",
    " ",
    "line\nbreak\ttab",
    "\u0000",
    "back\\slash",
    "$ref",
    "__proto__",
    "constructor",
    "~1/~0#",
    "<script>alert(1)</script>",
    "{{ locker }} %s ${x}",
    "-- ; DROP TABLE parcels",
    "null",
    "1",
    "selection:0",
    "cause:0",
    "🚚📦",
    "\u202egnol",
    "caf\u00e9",
    "cafe\u0301",
    "ß",
    "SS",
    "n" * 200,
)


@dataclass(frozen=True, slots=True)
class Question:
    """Three disjoint sets of nodes; x and y hold at least one each."""

    x: tuple[str, ...]
    y: tuple[str, ...]
    given: tuple[str, ...]


@st.composite
def small_graphs(
    draw: st.DrawFn,
    min_nodes: int = 2,
    max_nodes: int = 6,
    *,
    bidirected: bool = True,
    unmeasured: bool = True,
    hostile: bool = True,
) -> Graph:
    """Acyclic graph values of ``min_nodes`` to ``max_nodes`` nodes."""
    size = draw(st.integers(min_nodes, max_nodes))
    pool = PLAIN_NAMES + HOSTILE_NAMES if hostile and draw(st.booleans()) else PLAIN_NAMES
    names = draw(st.lists(st.sampled_from(pool), min_size=size, max_size=size, unique=True))
    kinds = st.sampled_from(["none", "arrow", "bidirected", "doubled"] if bidirected else ["none", "arrow"])
    edges: list[dict[str, Any]] = []
    for source, target in combinations(names, 2):
        edges += _edges_between(source, target, draw(kinds))
    is_measured = st.sampled_from([True, True, True, False] if unmeasured else [True])
    nodes = [_node(name, measured=draw(is_measured), short=draw(st.booleans())) for name in names]
    graph = {"nodes": nodes, "edges": edges}
    return shuffled(graph, draw(st.randoms(use_true_random=False)))


def _edges_between(source: str, target: str, kind: str) -> list[dict[str, Any]]:
    arrow = {"source": source, "target": target}
    both = {"source": source, "target": target, "kind": "bidirected"}
    return {"none": [], "arrow": [arrow], "bidirected": [both], "doubled": [arrow, both]}[kind]


def _node(name: str, *, measured: bool, short: bool) -> str | dict[str, Any]:
    if not measured:
        return {"id": name, "measured": False}
    return name if short else {"id": name, "measured": True}


@st.composite
def questions(draw: st.DrawFn, graph: Graph, *, single: bool = False) -> Question:
    """A question about the graph: each node goes to x, y, given or none of them."""
    names = draw(st.permutations(node_names(graph)))
    if len(names) < 2:
        raise ValueError("a question needs two nodes")
    places = st.sampled_from(["none", "given"] if single else ["none", "given", "x", "y"])
    drawn = ["x", "y", *(draw(places) for _ in names[2:])]
    return Question(*(_placed(names, drawn, place) for place in ("x", "y", "given")))


def _placed(names: list[str], places: list[str], wanted: str) -> tuple[str, ...]:
    return tuple(name for name, place in zip(names, places, strict=True) if place == wanted)


def shuffled(graph: Graph, rng: random.Random) -> Graph:
    """The same graph with its nodes, its edges and the ends of its bidirected edges in another order."""
    nodes, edges = list(graph["nodes"]), [dict(edge) for edge in graph["edges"]]
    rng.shuffle(nodes)
    rng.shuffle(edges)
    for edge in edges:
        if edge.get("kind") == "bidirected" and rng.random() < 0.5:
            edge["source"], edge["target"] = edge["target"], edge["source"]
    return {**graph, "nodes": nodes, "edges": edges}


def renamed(graph: Graph, names: Mapping[str, str]) -> Graph:
    """The same graph with each node under its new name, in the same order."""
    nodes = [
        names[node] if isinstance(node, str) else {**node, "id": names[node["id"]]} for node in graph["nodes"]
    ]
    edges = [{**edge, **{end: names[edge[end]] for end in ("source", "target")}} for edge in graph["edges"]]
    return {**graph, "nodes": nodes, "edges": edges}


def random_graph(
    rng: random.Random,
    nodes: int,
    *,
    arrow: float = 0.4,
    bidirected: float = 0.1,
    unmeasured: float = 0.15,
) -> Graph:
    """A random acyclic graph with plain names, for loops over thousands; the three are probabilities."""
    names = list(PLAIN_NAMES[:nodes])
    rng.shuffle(names)
    edges: list[dict[str, Any]] = []
    for source, target in combinations(names, 2):
        edges += _edges_between(source, target, "arrow" if rng.random() < arrow else "none")
        edges += _edges_between(source, target, "bidirected" if rng.random() < bidirected else "none")
    values = [_node(name, measured=rng.random() >= unmeasured, short=False) for name in names]
    return shuffled({"nodes": values, "edges": edges}, rng)


def random_question(rng: random.Random, graph: Graph, *, single: bool = False) -> Question:
    """As :func:`questions`, for seeded loops."""
    names = node_names(graph)
    rng.shuffle(names)
    places = ["none", "given"] if single else ["none", "none", "given", "given", "x", "y"]
    drawn = ["x", "y", *(rng.choice(places) for _ in names[2:])]
    return Question(*(_placed(names, drawn, place) for place in ("x", "y", "given")))


def random_parts(
    rng: random.Random, graph: Graph, most: int = 2, *, fixed: float = 0.2
) -> list[dict[str, Any]]:
    """Up to ``most`` parts of a row filter over measured columns, some of them fixing one column."""
    columns = measured_names(graph)
    parts = []
    for _ in range(rng.randint(0, most) if columns else 0):
        chosen = rng.sample(columns, rng.randint(1, min(2, len(columns))))
        parts.append({"columns": chosen, "fixed": len(chosen) == 1 and rng.random() < fixed})
    return parts


def all_dags(size: int) -> Iterator[Graph]:
    """Every labelled DAG on ``size`` nodes (1, 3, 25, 543, 29281 … of them: OEIS A003024)."""
    names = list(PLAIN_NAMES[:size])
    pairs = list(combinations(names, 2))
    for states in product((0, 1, 2), repeat=len(pairs)):
        chosen = [(pair, state) for pair, state in zip(pairs, states, strict=True) if state]
        ends = [(a, b) if state == 1 else (b, a) for (a, b), state in chosen]
        edges = [{"source": source, "target": target} for source, target in ends]
        graph: Graph = {"nodes": [{"id": name} for name in names], "edges": edges}
        if topological_names(graph) is not None:
            yield graph
