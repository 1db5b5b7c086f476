"""What to measure next, where a config is unanswerable, against measuring everything there is, fewest first."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator
from dataclasses import replace
from itertools import combinations

import pytest

from pathgate.criteria.deadline import Deadline
from pathgate.review.measuring import measure_next_for
from tests.review.brute_review import Question, sound_choices, verdict
from tests.review.random_configs import review_of, reviewed
from tests.review.random_pipelines import random_pipeline
from tests.values import bidirected_of, graph_of, measured_names, node_names

SEEDS = [
    pytest.param(range(80), id="80"),
    pytest.param(range(80, 600), id="520", marks=pytest.mark.slow),
    pytest.param(range(600, 3000), id="2400", marks=pytest.mark.full),
]


def with_measured(question: Question, nodes: set[str], causes_of: set[frozenset[str]]) -> Question:
    """The config on a graph in which these nodes, and the common causes behind these edges, are measured."""
    values = [{**node, "measured": True} if node["id"] in nodes else node for node in question.graph["nodes"]]
    edges = []
    for edge in question.graph["edges"]:
        ends = frozenset((edge["source"], edge["target"]))
        if edge.get("kind") == "bidirected" and ends in causes_of:
            cause = " ".join(["cause of", *sorted(ends)])
            values.append({"id": cause, "measured": True})
            edges += [{"source": cause, "target": end} for end in sorted(ends)]
        else:
            edges.append(edge)
    return replace(question, graph={**question.graph, "nodes": values, "edges": edges})


def measurings(question: Question) -> Iterator[tuple[set[str], set[frozenset[str]]]]:
    """Everything that might be measured, fewest first."""
    hidden = set(node_names(question.graph)) - set(measured_names(question.graph))
    options: list[str | frozenset[str]] = [*sorted(hidden)]
    options += sorted({frozenset(ends) for ends in bidirected_of(question.graph)}, key=sorted)
    for count in range(len(options) + 1):
        for chosen in combinations(options, count):
            nodes = {each for each in chosen if isinstance(each, str)}
            yield nodes, {each for each in chosen if not isinstance(each, str)}


def fewest_to_measure(question: Question) -> int | None:
    """How many things have to be measured for some choice to be sound; None where nothing helps."""
    for nodes, causes_of in measurings(question):
        if next(sound_choices(with_measured(question, nodes, causes_of)), None) is not None:
            return len(nodes) + len(causes_of)
    return None


@pytest.mark.parametrize("seeds", SEEDS)
def test_what_to_measure_next_helps_and_nothing_less_would(seeds: range):
    seen: Counter[bool] = Counter()
    for seed in seeds:
        question = random_pipeline(seed)
        if verdict(question) != "unanswerable":
            continue
        graph, answer = reviewed(question)
        found = measure_next_for(answer.claim, Deadline.never())
        seen[found is None] += 1
        if found is None:
            assert fewest_to_measure(question) is None, seed
            continue
        nodes = set(answer.claim.graph.names_of(found.nodes))
        causes_of = {frozenset(map(graph.name, ends)) for ends in found.causes_of}
        assert len(nodes) + len(causes_of) == fewest_to_measure(question), seed
        measured = with_measured(question, nodes, causes_of)
        assert verdict(measured) in ("sound", "biased"), seed
        assert review_of(measured.graph, measured.config())[1].verdict != "unanswerable", seed
    assert min(seen[True], seen[False]) > len(seeds) / 8


def test_an_unmeasured_treatment_has_to_be_measured_with_what_confounds_it():
    # rain → delay → refund, rain → refund
    value = graph_of(("rain", "delay"), ("delay", "refund"), ("rain", "refund"), unmeasured=["rain", "delay"])
    _, answer = review_of(value, {"treatment": "delay", "outcome": "refund", "covariates": []})
    found = measure_next_for(answer.claim, Deadline.never())
    assert found is not None
    assert answer.claim.graph.names_of(found.nodes) == ("rain", "delay")
    assert found.cost == 2


def test_no_measuring_gives_a_treatment_variation():
    # late → score (computed), held at one value for good
    value = graph_of(("late", "refund"), ("mood", "refund"), unmeasured=["mood"])
    config = {
        "treatment": "late",
        "outcome": "refund",
        "covariates": ["score"],
        "derived": {"score": {"from": "late"}},
        "row_filter": [{"columns": "score", "fixed": True}],
        "row_filter_fixed": True,
    }
    _, answer = review_of(value, config)
    assert answer.verdict == "unanswerable"
    assert measure_next_for(answer.claim, Deadline.never()) is None
