"""Verdicts and remedies against a brute force that tries every choice of covariates and filter parts."""

from __future__ import annotations

from collections import Counter

import pytest

from pathgate.review import review_document
from tests.review.brute_review import Question, fewest_changes, is_sound, verdict
from tests.review.random_configs import random_config, review_of, reviewed
from tests.values import as_set, graph_of, measured_names

CONFIGS = [
    pytest.param(range(500), id="500"),
    pytest.param(range(500, 4500), id="4000", marks=pytest.mark.slow),
]
MEASURED = [
    pytest.param(range(250), id="250"),
    pytest.param(range(250, 1500), id="1250", marks=pytest.mark.slow),
]


@pytest.mark.parametrize("seeds", CONFIGS)
def test_verdicts_are_those_of_trying_everything(seeds: range):
    seen: Counter[str] = Counter()
    for seed in seeds:
        question = random_config(seed)
        _, answer = reviewed(question)
        assert answer.verdict == verdict(question), seed
        seen[answer.verdict] += 1
    assert min(seen["sound"], seen["biased"], seen["unanswerable"]) > len(seeds) / 20


@pytest.mark.parametrize("seeds", MEASURED)
def test_where_everything_is_measured_verdicts_and_fewest_changes_are_right_on_seven_nodes(seeds: range):
    seen: Counter[str] = Counter()
    for seed in seeds:
        question = random_config(-1 - seed, 7, unmeasured=0)
        _, answer = reviewed(question)
        fewest = fewest_changes(question)
        expected = "unanswerable" if fewest is None else "biased" if fewest else "sound"
        assert answer.verdict == expected, seed
        assert [remedy.changes for remedy in answer.remedies[:1]] == ([fewest] if fewest else []), seed
        seen[answer.verdict] += 1
    assert min(seen["sound"], seen["biased"], seen["unanswerable"]) > len(seeds) / 20


@pytest.mark.parametrize("seeds", CONFIGS)
def test_every_remedy_reviews_as_sound_and_the_first_is_a_smallest_one(seeds: range):
    tried = 0
    for seed in seeds:
        question = random_config(seed)
        _, answer = reviewed(question)
        assert bool(answer.remedies) is (answer.verdict == "biased"), seed
        for remedy, told in zip(answer.remedies, review_document(answer)["remedies"], strict=True):
            assert as_set(told["covariates"]) == (
                (as_set(question.covariates) | as_set(told["add"])) - as_set(told["drop"])
            ), seed
            assert not as_set(told["add"]) & as_set(question.covariates), seed
            applied = apply(question, told)
            assert is_sound(question, applied.covariates, applied.parts), seed
            assert review_of(question.graph, applied.config())[1].verdict == "sound", seed
            assert remedy.changes == len(told["add"]) + len(told["drop"]) + len(told["drop_filter_parts"])
            tried += 1
        changes = [remedy.changes for remedy in answer.remedies]
        assert changes == sorted(changes), seed
        assert changes[:1] == ([fewest_changes(question)] if changes else []), seed
        assert len({(r.covariates, tuple(map(id, r.drop_parts))) for r in answer.remedies}) == len(changes)
    assert tried > len(seeds) / 10


def apply(question: Question, told: dict) -> Question:
    """The config with one remedy, as answers show it, applied."""
    parts = list(question.parts)
    for dropped in told["drop_filter_parts"]:
        parts.remove(dropped)
    return Question(
        question.graph,
        question.treatments,
        question.outcomes,
        tuple(told["covariates"]),
        tuple(parts),
        question.row_filter_fixed,
        question.asks,
    )


def test_equal_changes_are_ordered_by_what_the_columns_cost():
    # depot → route → late, depot → refund, late → refund; one of depot and route will do
    value = graph_of(("depot", "route"), ("route", "late"), ("depot", "refund"), ("late", "refund"))
    for dear, cheap in (("depot", "route"), ("route", "depot")):
        priced = [{**node, "cost": 3} if node["id"] == dear else node for node in value["nodes"]]
        config = {"treatment": "late", "outcome": "refund", "covariates": []}
        graph, answer = review_of({**value, "nodes": priced}, config)
        assert graph.names_of(answer.remedies[0].covariates) == (cheap,)


def test_a_remedy_of_many_changes_is_found_under_a_filter_of_objects():
    # four confounders c0…c3 of late and refund; a harmless filter on weekday stays
    names = [f"c{k}" for k in range(4)]
    arrows = [(name, end) for name in names for end in ("late", "refund")]
    value = graph_of(*arrows, ("late", "refund"), isolated=["weekday"])
    config = {
        "treatment": "late",
        "outcome": "refund",
        "covariates": [],
        "row_filter": [{"columns": ["weekday"]}],
    }
    graph, answer = review_of(value, config)
    assert answer.verdict == "biased"
    assert graph.names_of(answer.remedies[0].add) == tuple(names)
    assert answer.remedies[0].drop_parts == ()


def test_a_remedy_past_what_can_be_tried_one_by_one_asks_for_nothing_needless():
    # 60 confounders to add, 60 harmless covariates that may stay
    needed, harmless = [f"c{k}" for k in range(60)], [f"h{k}" for k in range(60)]
    arrows = [(name, end) for name in needed for end in ("late", "refund")]
    value = graph_of(*arrows, *((name, "refund") for name in harmless), ("late", "refund"))
    config = {"treatment": "late", "outcome": "refund", "covariates": harmless}
    graph, answer = review_of(value, config)
    assert graph.names_of(answer.remedies[0].add) == tuple(needed)
    assert answer.remedies[0].changes == 60


def test_dropping_parts_alone_may_mend_a_filter_of_many_parts():
    # late → ticket ← mood → refund and so on, forty times over; every part is needless and harmful
    tickets = [f"ticket{k}" for k in range(40)]
    arrows = [("late", ticket) for ticket in tickets] + [("mood", ticket) for ticket in tickets]
    value = graph_of(*arrows, ("mood", "refund"), ("late", "refund"), unmeasured=["mood"])
    config = {
        "treatment": "late",
        "outcome": "refund",
        "covariates": [],
        "row_filter": [
            {"columns": [ticket], "fixed": place % 2 == 0} for place, ticket in enumerate(tickets)
        ],
    }
    _, answer = review_of(value, config)
    assert answer.verdict == "biased"
    assert len(answer.remedies[0].drop_parts) == 40
    assert not answer.remedies[0].keeps_rows
    assert "mood" not in measured_names(value)
