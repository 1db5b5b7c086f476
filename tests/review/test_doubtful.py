"""Doubtful edges against judging the config with every choice of them."""

from __future__ import annotations

import random
from collections import Counter
from collections.abc import Callable
from typing import Any

import pytest

from pathgate.criteria.deadline import Deadline
from pathgate.graphs import read_graph
from pathgate.review import doubtful as doubtful_module
from pathgate.review import read_config, review
from pathgate.review.hinge_document import whole_document
from tests.review.brute_hinges import Edge, doubtful_verdict
from tests.review.brute_review import Question
from tests.review.random_configs import random_config
from tests.review.random_pipelines import random_pipeline
from tests.values import Graph, graph_of, node_names

SEEDS = [
    pytest.param(range(320), id="320"),
    pytest.param(range(320, 1200), id="880", marks=pytest.mark.slow),
    pytest.param(range(1200, 5000), id="3800", marks=pytest.mark.full),
]


def judged(value: Any, config: Any, deadline: Deadline | None = None) -> dict[str, Any]:
    """The answer of /v1/review."""
    graph = read_graph(value)
    return whole_document(
        review(graph, read_config(config, graph)), deadline or Deadline.never(), hinges=False
    )


def with_doubts(graph: Graph, rng: random.Random, most: int) -> tuple[Graph, list[Edge]]:
    """The graph with up to ``most`` of its edges in doubt, and which."""
    places = rng.sample(range(len(graph["edges"])), min(most, len(graph["edges"])))
    marked = [{**edge, "doubtful": place in places} for place, edge in enumerate(graph["edges"])]
    return {**graph, "edges": marked}, [told(graph, graph["edges"][place]) for place in places]


def told(graph: Graph, edge: dict[str, Any]) -> Edge:
    kind, ends = edge.get("kind", "directed"), [edge["source"], edge["target"]]
    if kind == "bidirected":
        ends.sort(key=node_names(graph).index)
    return kind, ends[0], ends[1]


@pytest.mark.parametrize("seeds", SEEDS)
@pytest.mark.parametrize("configs", [random_config, random_pipeline])
def test_verdict_and_edges_are_those_of_trying_every_choice(seeds: range, configs: Callable[[int], Question]):
    seen: Counter[str] = Counter()
    for seed in seeds:
        question = configs(seed)
        graph, doubtful = with_doubts(question.graph, random.Random(seed), 4)
        answer = judged(graph, question.config())
        if not doubtful:
            assert "doubtful" not in answer
            continue
        verdict, deciding = doubtful_verdict(question, doubtful)
        found = answer["doubtful"]
        listed = [(edge["kind"], edge["source"], edge["target"]) for edge in found["depends_on"]]
        assert (found["verdict"], set(listed), found["complete"]) == (verdict, deciding, True), seed
        assert len(listed) == len(deciding)
        seen[verdict] += 1
    assert min(seen["always"], seen["never"], seen["depends"]) > len(seeds) / 20


def test_past_what_is_tried_the_verdict_holds_and_every_edge_named_does_decide(
    monkeypatch: pytest.MonkeyPatch,
):
    monkeypatch.setattr(doubtful_module, "MOST_TRIED", 0)
    depending = 0
    for seed in range(400):
        question = random_config(seed)
        graph, doubtful = with_doubts(question.graph, random.Random(seed), 5)
        if doubtful:
            verdict, deciding = doubtful_verdict(question, doubtful)
            found = judged(graph, question.config())["doubtful"]
            listed = {(edge["kind"], edge["source"], edge["target"]) for edge in found["depends_on"]}
            assert found["verdict"] == verdict, seed
            assert listed <= deciding, seed
            assert found["complete"] is (verdict != "depends"), seed
            if verdict == "depends":
                assert listed, seed
                depending += 1
    assert depending > 40


def test_many_doubtful_edges_are_judged_with_the_ones_that_decide():
    # c0 … c19 each drive late and refund; that c3 drives refund, and that c4 drives late, are not the only doubts
    names = [f"c{k}" for k in range(20)]
    value = graph_of(("late", "refund"), *((name, end) for name in names for end in ("late", "refund")))
    doubted = [("c3", "refund"), ("c4", "late"), *((name, "late") for name in names[5:])]
    edges = [{**edge, "doubtful": (edge["source"], edge["target"]) in doubted} for edge in value["edges"]]
    config = {"treatment": "late", "outcome": "refund", "covariates": [*names[:3], *names[5:]]}
    found = judged({**value, "edges": edges}, config)["doubtful"]
    assert found == {
        "verdict": "depends",
        "depends_on": [
            {"source": "c3", "target": "refund", "kind": "directed"},
            {"source": "c4", "target": "late", "kind": "directed"},
        ],
        "complete": False,
    }


def test_when_the_time_is_up_the_verdict_stands_and_the_list_says_that_it_may_lack_some():
    value = graph_of(("late", "refund"), ("rain", "late"), ("rain", "refund"))
    doubts = [{**edge, "doubtful": edge["source"] == "rain"} for edge in value["edges"]]
    readings = iter([0.0, 0.0])
    deadline = Deadline(1, clock=lambda: next(readings, 2.0))
    found = judged(
        {**value, "edges": doubts}, {"treatment": "late", "outcome": "refund", "covariates": []}, deadline
    )
    assert found["doubtful"] == {"verdict": "depends", "depends_on": [], "complete": False}
