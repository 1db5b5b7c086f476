"""Random graphs are ones a caller may send, and the list of all DAGs is complete."""

from __future__ import annotations

import random

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.strategies import (
    HOSTILE_NAMES,
    all_dags,
    questions,
    random_graph,
    random_parts,
    random_question,
    small_graphs,
)
from tests.values import (
    Graph,
    arrows_of,
    bidirected_of,
    measured_names,
    node_names,
    topological_names,
    without_arrow,
)


@pytest.mark.parametrize(("size", "count"), [(1, 1), (2, 3), (3, 25), (4, 543)])
def test_all_labelled_dags_are_listed_once(size: int, count: int):
    listed = [frozenset(arrows_of(graph)) for graph in all_dags(size)]
    assert (len(listed), len(set(listed))) == (count, count)


@settings(deadline=None)
@given(data=st.data(), graph=small_graphs(min_nodes=3))
def test_drawn_graphs_and_questions_are_ones_a_caller_may_send(data: st.DataObject, graph: Graph):
    names = node_names(graph)
    pairs = [(a, b, "") for a, b in arrows_of(graph)] + [(*sorted(e), "both") for e in bidirected_of(graph)]
    assert all(0 < len(name) <= 200 for name in names)
    assert len(set(names)) == len(names) >= 3
    assert len(set(pairs)) == len(pairs) == len(graph["edges"])
    assert all({a, b} <= set(names) and a != b for a, b, _ in pairs)
    question = data.draw(questions(graph))
    asked = [*question.x, *question.y, *question.given]
    assert len(set(asked)) == len(asked)
    assert min(len(question.x), len(question.y)) >= 1


def test_seeded_graphs_questions_and_parts_are_well_formed_and_repeat():
    for seed in range(200):
        rng = random.Random(seed)
        graph = random_graph(rng, 6, bidirected=0.3)
        assert random_graph(random.Random(seed), 6, bidirected=0.3) == graph
        assert topological_names(graph) is not None
        question = random_question(rng, graph)
        asked = [*question.x, *question.y, *question.given]
        assert len(set(asked)) == len(asked)
        for part in random_parts(rng, graph, fixed=0.5):
            assert set(part["columns"]) <= set(measured_names(graph))
            assert len(part["columns"]) == 1 or not part["fixed"]


def test_hostile_names_differ_from_one_another_and_are_valid_unicode():
    assert len(set(HOSTILE_NAMES)) == len(HOSTILE_NAMES)
    assert all(name.encode("utf-8").decode("utf-8") == name for name in HOSTILE_NAMES)


def test_removing_an_arrow_leaves_a_bidirected_edge_between_the_same_two():
    edges = [{"source": "a", "target": "b"}, {"source": "a", "target": "b", "kind": "bidirected"}]
    left = without_arrow({"nodes": ["a", "b"], "edges": edges}, "a", "b")
    assert (arrows_of(left), bidirected_of(left)) == ([], [("a", "b")])
