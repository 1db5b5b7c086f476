"""Verdicts and remedies of configs with all that pipelines do, against a brute force that tries every choice."""

from __future__ import annotations

from collections import Counter
from dataclasses import replace
from typing import Any

import pytest

from pathgate.review import review_document
from tests.review.brute_review import Question, fewest_changes, is_sound_choice, reviews_as_sound, verdict
from tests.review.random_configs import review_of, reviewed
from tests.review.random_pipelines import random_pipeline
from tests.values import as_set, graph_of

CONFIGS = [
    pytest.param(range(250), id="250"),
    pytest.param(range(250, 2500), id="2250", marks=pytest.mark.slow),
    pytest.param(range(2500, 8000), id="5500", marks=pytest.mark.full),
]
LARGER = [
    pytest.param(range(-1, -80, -1), id="80"),
    pytest.param(range(-80, -500, -1), id="420", marks=pytest.mark.slow),
    pytest.param(range(-500, -1500, -1), id="1000", marks=pytest.mark.full),
]


@pytest.mark.parametrize("seeds", CONFIGS)
def test_verdicts_are_those_of_trying_everything(seeds: range):
    seen: Counter[str] = Counter()
    for seed in seeds:
        question = random_pipeline(seed)
        _, answer = reviewed(question)
        assert answer.verdict == verdict(question), seed
        errors = [finding for finding in answer.findings if finding.severity == "error"]
        assert bool(errors) is not reviews_as_sound(question), seed
        seen[answer.verdict] += 1
    assert min(seen["sound"], seen["biased"], seen["unanswerable"]) > len(seeds) / 20


@pytest.mark.parametrize("seeds", LARGER)
def test_verdicts_and_fewest_changes_are_right_on_seven_nodes(seeds: range):
    for seed in seeds:
        question = random_pipeline(seed, 7, unmeasured=0.1)
        _, answer = reviewed(question)
        fewest = fewest_changes(question)
        assert answer.verdict == ("unanswerable" if fewest is None else "biased" if fewest else "sound"), seed
        assert [remedy.changes for remedy in answer.remedies[:1]] == ([fewest] if fewest else []), seed


@pytest.mark.parametrize("seeds", CONFIGS)
def test_every_remedy_reviews_as_sound_and_the_first_is_a_smallest_one(seeds: range):
    tried = 0
    for seed in seeds:
        question = random_pipeline(seed)
        _, answer = reviewed(question)
        assert bool(answer.remedies) is (answer.verdict == "biased"), seed
        for remedy, told in zip(answer.remedies, review_document(answer)["remedies"], strict=True):
            applied = apply(question, told)
            assert review_of(question.graph, applied.config())[1].verdict == "sound", seed
            assert is_sound_choice(question, applied.adjusted_for, applied.absorbing, applied.parts), seed
            assert told["population"] == question.population
            assert remedy.changes == len(told["add"]) + len(told["drop"]) + len(told["drop_filter_parts"])
            tried += 1
        changes = [remedy.changes for remedy in answer.remedies]
        assert changes == sorted(changes), seed
        assert changes[:1] == ([fewest_changes(question)] if changes else []), seed
    assert tried > len(seeds) / 10


def apply(question: Question, told: dict[str, Any]) -> Question:
    """The config with one remedy, as answers show it, applied: what is dropped leaves every member."""
    parts = list(question.parts)
    for dropped in told["drop_filter_parts"]:
        parts.remove(dropped)

    def less(names: tuple[str, ...]) -> tuple[str, ...]:
        return tuple(name for name in names if question.columns.node(name) not in as_set(told["drop"]))

    return replace(
        question,
        covariates=tuple(told["covariates"]),
        fixed_effects=less(question.fixed_effects),
        weighted_by=less(question.weighted_by),
        matched_on=less(question.matched_on),
        parts=tuple(parts),
    )


@pytest.mark.parametrize(
    ("fixed_effects", "verdict_then"),
    [(["depot"], "sound"), (["city"], "sound"), (["month"], "unanswerable"), ([], "unanswerable")],
)
def test_what_is_constant_within_something_constant_is_absorbed_too(
    fixed_effects: list[str], verdict_then: str
):
    # habits → late, habits → refund; habits are those of a depot, a depot lies in a city
    value = graph_of(
        ("habits", "late"),
        ("habits", "refund"),
        ("late", "refund"),
        unmeasured=["habits"],
        isolated=["depot", "city", "month"],
    )
    within = {"habits": ["city"], "city": ["depot"]}
    nodes = [
        {**node, "constant_within": within[node["id"]]} if node["id"] in within else node
        for node in value["nodes"]
    ]
    config = {"treatment": "late", "outcome": "refund", "covariates": [], "fixed_effects": fixed_effects}
    assert review_of({**value, "nodes": nodes}, config)[1].verdict == verdict_then


def test_another_choice_is_found_where_the_first_would_leave_the_treatment_no_variation():
    # late → score → (kept) ← depot → refund, late → refund: adjusting for score or for depot closes it
    value = graph_of(("depot", "refund"), ("late", "refund"))
    config = {
        "treatment": "late",
        "outcome": "refund",
        "covariates": [],
        "derived": {"score": {"from": "late"}},
        "rows_exist_because": ["score", "depot"],
    }
    graph, answer = review_of(value, config)
    assert answer.verdict == "biased"
    assert [answer.claim.graph.names_of(remedy.covariates) for remedy in answer.remedies] == [("depot",)]
    assert "score" not in graph.index


def test_a_filter_that_holds_a_value_computed_from_the_treatment_leaves_it_no_variation():
    value = graph_of(("late", "refund"), isolated=["depot"])
    config = {
        "treatment": "late",
        "outcome": "refund",
        "covariates": ["depot"],
        "derived": {"score": {"from": ["late", "depot"]}},
        "row_filter": [{"columns": "score", "fixed": True}],
    }
    _, answer = review_of(value, config)
    (error,) = [finding for finding in answer.findings if finding.severity == "error"]
    assert (error.rule, error.columns, error.place) == ("no-variation-left", ("score",), ("row_filter", 0))
    # Either the filter or the covariate may go.
    assert [remedy.changes for remedy in answer.remedies] == [1, 1]


def test_a_thousand_columns_computed_one_from_the_next_are_judged():
    # late → refund, weather → late, weather → refund; score0 is computed from weather, and so on
    value = graph_of(("weather", "late"), ("weather", "refund"), ("late", "refund"))
    derived = {f"score{k}": {"from": [f"score{k - 1}", "weather"] if k else ["weather"]} for k in range(1000)}
    config = {"treatment": "late", "outcome": "refund", "covariates": ["score999"], "derived": derived}
    _, answer = review_of(value, config)
    assert answer.verdict == "biased"
    assert answer.claim.graph.names_of(answer.remedies[0].add) == ("weather",)
    treated = config | {"treatment": "score999", "covariates": []}
    assert [each.reads_as for each in review_of(value, treated)[1].coefficients] == ["total"]


def test_columns_that_share_their_inputs_over_and_over_are_judged():
    # each level of two columns is computed from both of the level before: 2 ** 200 ways down to late and weather
    value = graph_of(("weather", "late"), ("weather", "refund"), ("late", "refund"))
    derived, before = {}, ["late", "weather"]
    for level in range(200):
        derived |= {f"{side}{level}": {"from": before} for side in ("left", "right")}
        before = [f"left{level}", f"right{level}"]
    config = {"treatment": before[0], "outcome": "refund", "covariates": [], "derived": derived}
    _, answer = review_of(value, config)
    assert answer.verdict == "sound"
    assert [
        finding.columns for finding in answer.findings if finding.rule == "treatment-of-several-columns"
    ] == [("weather", "late")]
