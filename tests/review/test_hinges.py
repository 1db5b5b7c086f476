"""Hinges against making every single change to the graph, and the sentences they are told in."""

from __future__ import annotations

import json
import random
from collections import Counter
from collections.abc import Callable, Iterator
from dataclasses import replace
from typing import Any

import pytest

from pathgate.criteria.deadline import Deadline
from pathgate.graphs import read_graph
from pathgate.review import hinges as hinges_module
from pathgate.review import read_config, review
from pathgate.review.hinge_document import whole_document
from tests.brute import separated, subsets
from tests.review.brute_hinges import (
    absent_hinges,
    is_faulty,
    removed_hinges,
    reversed_hinges,
    with_edge,
)
from tests.review.brute_review import Question, reviews_as_sound, selected_graph
from tests.review.random_configs import random_config
from tests.review.random_pipelines import random_pipeline
from tests.strategies import HOSTILE_NAMES, renamed
from tests.values import Graph, graph_of, node_names, topological_names

SEEDS = [
    pytest.param(range(300), id="300"),
    pytest.param(range(300, 2500), id="2200", marks=pytest.mark.slow),
    pytest.param(range(2500, 8000), id="5500", marks=pytest.mark.full),
]


def hinges_on(value: Any, config: Any, deadline: Deadline | None = None) -> dict[str, Any]:
    """What /v1/review answers as ``hinges_on``."""
    graph = read_graph(value)
    answer = review(graph, read_config(config, graph))
    document = whole_document(answer, deadline or Deadline.never(), hinges=True)
    assert document["verdict"] == answer.verdict
    return document["hinges_on"]


def with_moments(question: Question, seed: int) -> Question:
    """Half of the time, some nodes are recorded at moments that no arrow contradicts."""
    rng = random.Random(seed)
    if rng.random() < 0.5:
        return question
    order, moment, recorded = topological_names(question.graph) or [], 0, {}
    for name in order:
        moment += rng.randint(0, 1)
        if rng.random() < 0.7:
            recorded[name] = moment
    nodes = [
        {**node, "recorded": recorded[node["id"]]} if node["id"] in recorded else node
        for node in question.graph["nodes"]
    ]
    graph = {**question.graph, "nodes": nodes}
    assert not is_faulty(graph)
    return replace(question, graph=graph)


def with_its_moments(seed: int) -> Question:
    """A random config, some nodes recorded at moments half of the time."""
    return with_moments(random_config(seed), seed)


def sound_configs(
    seeds: range, configs: Callable[[int], Question] = with_its_moments
) -> Iterator[tuple[int, Question]]:
    """The sound ones among random configs."""
    for seed in seeds:
        question = configs(seed)
        if reviews_as_sound(question):
            yield seed, question


def edges(listed: list[dict[str, Any]]) -> list[tuple[str, str, str]]:
    return [(edge["kind"], edge["source"], edge["target"]) for edge in listed]


@pytest.mark.parametrize("seeds", SEEDS)
@pytest.mark.parametrize("configs", [with_its_moments, random_pipeline])
def test_the_three_lists_are_those_of_making_every_change(seeds: range, configs: Callable[[int], Question]):
    seen: Counter[str] = Counter()
    for seed, question in sound_configs(seeds, configs):
        found = hinges_on(question.graph, question.config())
        assert found["complete"]
        expected = (absent_hinges(question), reversed_hinges(question), removed_hinges(question))
        for member, brute in zip(("absent_edges", "reversed", "removed"), expected, strict=True):
            listed = edges(found[member])
            assert len(listed) == len(set(listed)), seed
            assert set(listed) == brute, (seed, member)
            seen[member] += len(brute)
        seen["sound"] += 1
    assert seen["sound"] > len(seeds) / 12
    assert seen["absent_edges"] > seen["sound"]
    assert seen["reversed"] > seen["sound"] / 10
    # with an edge less, none was ever lost
    assert seen["removed"] == 0


def test_only_a_sound_verdict_hinges_on_anything():
    nothing = {"absent_edges": [], "reversed": [], "removed": [], "complete": True}
    others = 0
    for seed in range(200):
        question = random_config(seed)
        if not reviews_as_sound(question):
            assert hinges_on(question.graph, question.config()) == nothing, seed
            others += 1
    assert others > 50


@pytest.mark.parametrize("configs", [with_its_moments, random_pipeline])
def test_an_absent_edge_is_exposed_by_an_independency_of_its_ends_that_it_breaks(
    configs: Callable[[int], Question],
):
    seen: Counter[bool] = Counter()
    for seed, question in sound_configs(range(800), configs):
        promised = _Promised(question)
        for edge in hinges_on(question.graph, question.config())["absent_edges"]:
            pair, statement = {edge["source"], edge["target"]}, edge["exposed_by"]
            seen[statement is None] += 1
            if statement is None:
                assert not promised.is_separable(*sorted(pair)), seed
                continue
            assert {statement["x"], statement["y"]} == pair
            ends = (statement["x"], statement["y"], frozenset(statement["given"]))
            assert promised.says_something(*ends), seed
            assert promised.separates(*ends), seed
            joined = with_edge(promised.selected, (edge["kind"], edge["source"], edge["target"]))
            assert not promised.separates(*ends, joined), seed
    assert min(seen[True], seen[False]) > 50


class _Promised:
    """What a config's graph promises of pairs of columns on the rows that it keeps, by definition."""

    def __init__(self, question: Question) -> None:
        self.selected, self._conditioned = selected_graph(question, question.parts)
        self._columns = question.columns
        self._varying = question.measured - set(self._conditioned)

    def is_separable(self, one: str, other: str) -> bool:
        """Does some set of columns separate the two, and leave them both some variation?"""
        pool = sorted(self._varying - {one, other})
        return any(
            self.says_something(one, other, given) and self.separates(one, other, given)
            for given in subsets(pool)
        )

    def says_something(self, one: str, other: str, given: frozenset[str]) -> bool:
        """Are these columns, and do both ends vary once the rest is given?"""
        settled = self._columns.determined(given | set(self._conditioned))
        return {one, other} | given <= self._varying and not {one, other} & settled

    def separates(self, one: str, other: str, given: frozenset[str], graph: Graph | None = None) -> bool:
        return separated(graph or self.selected, one, other, given | set(self._conditioned))


def test_renaming_the_nodes_renames_the_hinges_and_changes_nothing_else():
    for seed, question in sound_configs(range(200)):
        names = dict(
            zip(node_names(question.graph), random.Random(seed).sample(HOSTILE_NAMES, 12), strict=False)
        )
        config = question.config()
        told = {
            **config,
            **{
                member: [names[name] for name in config[member]]
                for member in ("treatment", "outcome", "covariates")
            },
            "row_filter": [
                {**part, "columns": [names[name] for name in part["columns"]]}
                for part in config["row_filter"]
            ],
        }
        before = hinges_on(question.graph, config)
        after = hinges_on(renamed(question.graph, names), told)
        for member in ("absent_edges", "reversed"):
            there = [(kind, names[a], names[b]) for kind, a, b in edges(before[member])]
            assert edges(after[member]) == there, seed


def test_the_same_input_gives_the_same_bytes_whatever_the_order_of_the_edges():
    for seed, question in sound_configs(range(100)):
        shuffled = list(question.graph["edges"])
        random.Random(seed).shuffle(shuffled)
        first = hinges_on(question.graph, question.config())
        assert json.dumps(first) == json.dumps(
            hinges_on({**question.graph, "edges": shuffled}, question.config())
        )


def test_questions_can_be_answered_yes_or_no():
    # weather → late → refund, weather → refund, "late pickup" by itself
    value = graph_of(("weather", "late"), ("late", "refund"), ("weather", "refund"), isolated=["late pickup"])
    found = hinges_on(value, {"treatment": "late", "outcome": "refund", "covariates": ["weather"]})
    absent = {edge["question"]: edge["exposed_by"] for edge in found["absent_edges"]}
    assert absent["Nothing unmeasured drives both late and refund"] is None
    assert 'late does not influence "late pickup"' not in absent
    assert [edge["question"] for edge in found["reversed"]] == [
        "weather drives late and not the other way round",
        "late drives refund and not the other way round",
    ]
    # depot → late → refund: depot must not move refunds by another way
    chain = graph_of(("depot", "late"), ("late", "refund"))
    found = hinges_on(chain, {"treatment": "late", "outcome": "refund", "covariates": []})
    by_question = {edge["question"]: edge["exposed_by"] for edge in found["absent_edges"]}
    assert by_question["depot does not influence refund"] == {"x": "depot", "y": "refund", "given": ["late"]}
    assert by_question["Nothing unmeasured drives both depot and refund"] is not None


def test_when_the_time_is_up_the_lists_are_cut_short_and_say_so():
    value = graph_of(("depot", "late"), ("late", "refund"))
    moments = iter([0.0, 2.0, 2.0, 2.0, 2.0, 2.0])
    graph = read_graph(value)
    answer = review(graph, read_config({"treatment": "late", "outcome": "refund", "covariates": []}, graph))
    found = whole_document(answer, Deadline(1, clock=lambda: next(moments, 2.0)), hinges=True)["hinges_on"]
    assert not found["complete"]
    assert found["absent_edges"] == []


def test_lists_past_the_stated_room_are_cut_short_and_say_so(monkeypatch: pytest.MonkeyPatch):
    value = graph_of(("depot", "late"), ("late", "refund"))
    config = {"treatment": "late", "outcome": "refund", "covariates": []}
    whole = hinges_on(value, config)["absent_edges"]
    monkeypatch.setattr(hinges_module, "MOST_NAMES", 4)
    cut = hinges_on(value, config)
    assert not cut["complete"]
    assert cut["absent_edges"] == whole[: len(cut["absent_edges"])]
    assert 0 < len(cut["absent_edges"]) < len(whole)


def test_a_graph_past_the_stated_size_is_not_looked_into_and_says_so(monkeypatch: pytest.MonkeyPatch):
    monkeypatch.setattr(hinges_module, "MOST_NODES", 2)
    value = graph_of(("depot", "late"), ("late", "refund"))
    found = hinges_on(value, {"treatment": "late", "outcome": "refund", "covariates": []})
    assert found == {"absent_edges": [], "reversed": [], "removed": [], "complete": False}


def test_pairs_asked_for_in_bulk_are_told_as_those_asked_for_one_by_one(monkeypatch: pytest.MonkeyPatch):
    for seed, question in sound_configs(range(600)):
        one_by_one = hinges_on(question.graph, question.config())
        with monkeypatch.context() as patched:
            patched.setattr("pathgate.criteria.exposing.FEW", 0)
            assert hinges_on(question.graph, question.config()) == one_by_one, seed
