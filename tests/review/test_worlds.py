"""Verdicts against exact worlds in which rows go missing silently: every unit listed, nothing sampled.

What keeps a row (a partner in a join, a value that is recorded) is a mechanism like any other, with chance in it.
"""

from __future__ import annotations

import random
from collections import Counter
from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from tests.discrete_worlds import (
    DiscreteWorld,
    FilterPart,
    draw_discrete_world,
    draw_filter,
    is_within_reach,
    without_chance,
)
from tests.review.brute_review import Question, selected_graph
from tests.review.random_configs import review_of
from tests.strategies import random_graph
from tests.test_oracle_worlds import reports_the_effect
from tests.values import graph_of, measured_names, node_names

SEEDS = [
    pytest.param(range(60), id="60"),
    pytest.param(range(60, 500), id="440", marks=pytest.mark.slow),
    pytest.param(range(500, 1200), id="700", marks=pytest.mark.full),
]
WORLDS = 5


def random_losses(seed: int) -> Question:
    """A config whose rows exist, or have a value, because of some nodes, measured or not."""
    rng = random.Random(f"losses {seed}")
    graph = random_graph(rng, rng.randint(3, 4), arrow=0.5)
    measured = measured_names(graph)
    if len(measured) < 2:
        return random_losses(seed + 100_000)
    treatment, outcome, *rest = rng.sample(measured, len(measured))
    names = node_names(graph)
    question = Question(graph, (treatment,), (outcome,), tuple(name for name in rest if rng.random() < 0.5))
    because = tuple(rng.sample(names, rng.randint(1, 2))) if rng.random() < 0.7 else ()
    about = rng.sample(measured, 1 if because else rng.randint(1, 2))
    missing = {name: tuple(rng.sample(names, rng.randint(0, 2))) for name in about}
    pinned = [{"columns": [name], "fixed": True} for name in rest if rng.random() < 0.25]
    return replace(question, rows_exist_because=because, missing_because=missing, parts=tuple(pinned[:1]))


def in_sql(question: Question, rng: random.Random) -> dict[str, Any]:
    """The config with its filter in SQL, which also keeps rows by whether a column is recorded."""
    conditions = [f"{part['columns'][0]} = 'locker'" for part in question.parts]
    conditions += [f"{name} IS NOT NULL" for name in question.missing_because]
    rng.shuffle(conditions)
    return {**question.config(), "row_filter": " AND ".join(conditions)}


def random_computing(seed: int) -> Question:
    """The same about configs that compute columns: treatments, outcomes, covariates and what losses depend on."""
    rng = random.Random(f"computing {seed}")
    graph = random_graph(rng, 3, arrow=0.6, unmeasured=0.1)
    names = node_names(graph)
    derived = {
        f"computed{k}": {"from": rng.sample(names, rng.randint(1, 2))} for k in range(rng.randint(1, 2))
    }
    columns = [*measured_names(graph), *derived]
    if len(columns) < 2:
        return random_computing(seed + 100_000)
    treatment, outcome, *rest = rng.sample(columns, len(columns))
    covariates = tuple(name for name in rest if rng.random() < 0.4)
    because = tuple(rng.sample([*names, *derived], rng.randint(0, 2)))
    question = Question(
        graph, (treatment,), (outcome,), covariates, derived=derived, rows_exist_because=because
    )
    return random_computing(seed + 100_000) if question.treated & question.results else question


def draw_kept(question: Question, numbers: np.random.Generator) -> tuple[DiscreteWorld, list[FilterPart]]:
    """A world with its selection nodes, and which of its units are kept: those with every selection node at one.

    What a config computes follows from its inputs and from nothing else.
    """
    selected, losses = selected_graph(question, ())
    world = draw_discrete_world(selected, numbers, values=2, responses=4)
    world = without_chance(world, question.columns.inputs)
    kept = [FilterPart((node,), frozenset({(1,)})) for node in losses]
    return world, [*kept, *draw_filter(question.parts, numbers, values=2)]


@pytest.mark.parametrize("seeds", SEEDS)
def test_a_config_is_sound_exactly_where_every_world_reports_the_effect_among_the_rows_left(seeds: range):
    seen: Counter[tuple[bool, bool]] = Counter()
    for seed in seeds:
        question, numbers = random_losses(seed), np.random.default_rng(seed)
        selected, losses = selected_graph(question, ())
        if not is_within_reach(selected, 30_000, values=2, responses=4):
            continue
        by_sql = seed % 2 == 1
        config = in_sql(question, random.Random(seed)) if by_sql else question.config()
        is_sound = review_of(question.graph, config)[1].verdict == "sound"
        told = told_by_worlds(question, numbers)
        if told:
            assert all(told) is is_sound, (seed, told)
            seen[is_sound, bool(losses)] += 1
    assert min(seen[True, True], seen[False, True]) > len(seeds) / 12


@pytest.mark.parametrize("seeds", SEEDS)
def test_a_sound_config_with_computed_columns_reports_the_effect_in_every_world(seeds: range):
    seen: Counter[tuple[str, bool]] = Counter()
    for seed in seeds:
        question, numbers = random_computing(seed), np.random.default_rng(seed)
        verdict = review_of(question.graph, question.config())[1].verdict
        told = told_by_worlds(question, numbers)
        # What is determined may be told apart by less than the graph asks for, so only soundness is a promise.
        assert all(told) or verdict != "sound", seed
        seen[verdict, bool(told) and all(told)] += 1
    assert seen["sound", True] > len(seeds) / 10
    assert seen["biased", False] > len(seeds) / 20


def told_by_worlds(question: Question, numbers: np.random.Generator) -> list[bool]:
    """Which worlds report the effect, up to the first that does not; those without enough rows say nothing."""
    told: list[bool] = []
    for _ in range(WORLDS):
        ends = (sorted(question.treated), question.covariates, *question.outcomes)
        report = reports_the_effect(*draw_kept(question, numbers), *ends)
        told += [] if report is None else [report]
        if report is False:
            break
    return told


def test_rows_lost_by_the_outcome_and_rows_lost_by_a_harmless_cause_in_worlds_of_their_own():
    # late → refund; in one team refunds decide which tickets are joined, in the other the region does
    value = graph_of(("late", "refund"), ("region", "refund"))
    for because, verdict in (("refund", "unanswerable"), ("region", "sound")):
        question = Question(value, ("late",), ("refund",), (), rows_exist_because=(because,))
        assert review_of(value, question.config())[1].verdict == verdict
        told = told_by_worlds(question, np.random.default_rng(0))
        assert told
        assert all(told) is (verdict == "sound")


def test_values_that_are_missing_are_no_condition_on_the_value():
    # weather → late, weather → refund, late → refund; the weather station fails at random, and by the weather
    value = graph_of(("weather", "late"), ("weather", "refund"), ("late", "refund"))
    for causes in ((), ("weather",)):
        question = Question(value, ("late",), ("refund",), (), missing_because={"weather": causes})
        config = {**question.config(), "row_filter": "weather IS NOT NULL"}
        assert review_of(value, config)[1].verdict == "biased"
        assert not all(told_by_worlds(question, np.random.default_rng(0)))
        adjusted = {**config, "covariates": ["weather"]}
        assert review_of(value, adjusted)[1].verdict == "sound"
        adjusting = replace(question, covariates=("weather",))
        assert told_by_worlds(adjusting, np.random.default_rng(0)) == [True] * WORLDS
