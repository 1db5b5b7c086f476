"""Adjustment sets against the definition by paths, against linear worlds and against discrete ones."""

from __future__ import annotations

import random
from collections import Counter

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from pathgate.criteria import is_valid, valid_set
from pathgate.graphs import read_graph
from tests.brute import (
    descendants,
    forbidden,
    inclusion_minimal,
    is_valid_adjustment,
    proper_paths,
    subsets,
    valid_sets,
    with_selection,
)
from tests.criteria.asking import effect_of
from tests.discrete_worlds import draw_discrete_world, draw_filter, is_within_reach
from tests.linear_worlds import adjustment_holds
from tests.strategies import random_graph, random_parts, random_question, shuffled, small_graphs
from tests.test_oracle_worlds import reports_the_effect
from tests.values import graph_of, measured_names, node_names

MANY = [
    pytest.param(range(600), id="600"),
    pytest.param(range(600, 3000), id="2400", marks=pytest.mark.slow),
]
WORLDS = [
    pytest.param(range(300), id="300"),
    pytest.param(range(300, 2500), id="2200", marks=pytest.mark.slow),
]
DISCRETE = [
    pytest.param(range(40), id="40"),
    pytest.param(range(40, 280), id="240", marks=pytest.mark.slow),
]


@pytest.mark.parametrize("seeds", MANY)
def test_a_set_is_valid_exactly_by_the_criterion(seeds: range):
    seen: Counter[bool] = Counter()
    for seed in seeds:
        rng = random.Random(seed)
        value = random_graph(rng, rng.randint(2, 7), arrow=rng.choice([0.25, 0.4, 0.6]))
        asked, parts = random_question(rng, value), random_parts(rng, value)
        effect = effect_of(value, asked.x, asked.y, parts)
        selected, conditioned = with_selection(value, parts)
        # given may hold unmeasured nodes, which a graph's theory may condition on
        valid = is_valid_adjustment(selected, asked.x, asked.y, asked.given, conditioned)
        assert is_valid(effect, effect.kept.graph.mask(asked.given)) is valid, seed
        seen[valid] += 1
    assert min(seen.values()) > len(seeds) / 8


@pytest.mark.parametrize("seeds", MANY)
def test_a_valid_set_is_found_exactly_where_there_is_one_and_is_minimal(seeds: range):
    seen: Counter[tuple[bool, bool]] = Counter()
    for seed in seeds:
        rng = random.Random(-1 - seed)
        value = random_graph(rng, rng.randint(2, 7), arrow=rng.choice([0.25, 0.4, 0.6]))
        asked, parts = random_question(rng, value, single=rng.random() < 0.5), random_parts(rng, value)
        effect = effect_of(value, asked.x, asked.y, parts)
        graph = effect.kept.graph
        selected, conditioned = with_selection(value, parts)
        every = valid_sets(selected, asked.x, asked.y, conditioned)
        required = frozenset(name for name in asked.given if rng.random() < 0.4 and name in measured(value))
        allowed = frozenset(name for name in measured(value) if rng.random() < 0.85) | required
        # A column held at one value is conditioned on already, listed or not.
        held = frozenset(conditioned) & measured(value)
        within = [one for one in every if required <= one <= allowed | held]
        found = valid_set(effect, required=graph.mask(required), allowed=graph.mask(allowed))
        assert (found is None) is (not within), seed
        if found is not None:
            names = frozenset(graph.names_of(found))
            assert names <= allowed, seed
            assert names in every, seed
            assert names - held in {one - held for one in inclusion_minimal(within)}, seed
        seen[found is not None, bool(parts)] += 1
    assert min(seen.values()) > len(seeds) / 12


def measured(value: dict) -> frozenset[str]:
    return frozenset(measured_names(value))


@given(value=small_graphs(min_nodes=2, max_nodes=6), data=st.data())
def test_forbidden_nodes_are_those_on_or_below_proper_causal_paths(value: dict, data: st.DataObject):
    names = data.draw(st.permutations(node_names(value)))
    split = data.draw(st.integers(1, max(1, len(names) - 1)))
    treatments, outcomes = names[: max(1, split // 2)], names[split : split + 2]
    effect = effect_of(value, treatments, outcomes)
    ends = {*treatments, *outcomes}
    known = set(effect.kept.graph.names_of(effect.forbidden)) - ends
    assert known == forbidden(value, treatments, outcomes)
    on_paths = {
        node
        for path in proper_paths(value, treatments, outcomes)
        if path.is_causal
        for node in path.nodes[1:]
    }
    assert set(effect.kept.graph.names_of(effect.on_causal_paths)) == on_paths
    assert set(effect.kept.graph.names_of(effect.usable)) == (
        measured(value) - ends - descendants(value, on_paths)
    )


@pytest.mark.parametrize("seeds", WORLDS)
def test_valid_means_that_regression_reports_the_effect_filters_included(seeds: range):
    seen: Counter[bool] = Counter()
    for seed in seeds:
        rng = random.Random(seed)
        value = random_graph(rng, rng.randint(2, 8), arrow=rng.choice([0.25, 0.4]))
        asked, parts = random_question(rng, value), random_parts(rng, value)
        effect = effect_of(value, asked.x, asked.y, parts)
        selected, conditioned = with_selection(value, parts)
        valid = is_valid(effect, effect.kept.graph.mask(asked.given))
        assert adjustment_holds(selected, asked.x, asked.y, asked.given, conditioned, seed=seed) is valid
        seen[valid] += 1
        found = valid_set(effect)
        if found is not None:
            names = effect.kept.graph.names_of(found)
            assert adjustment_holds(selected, asked.x, asked.y, names, conditioned, seed=seed), seed
    assert min(seen.values()) > len(seeds) / 8


@pytest.mark.slow
def test_where_none_is_found_no_set_reports_the_effect_in_linear_worlds():
    none = 0
    for seed in range(250):
        rng = random.Random(seed)
        value = random_graph(rng, rng.randint(3, 6), arrow=0.4, bidirected=0.2)
        asked, parts = random_question(rng, value, single=True), random_parts(rng, value, 1)
        selected, conditioned = with_selection(value, parts)
        if valid_set(effect_of(value, asked.x, asked.y, parts)) is None:
            free = [name for name in measured_names(value) if name not in asked.x + asked.y]
            for chosen in subsets(free):
                assert not adjustment_holds(selected, asked.x, asked.y, chosen, conditioned, seed=seed), seed
            none += 1
    assert none > 60


@pytest.mark.parametrize("seeds", DISCRETE)
def test_a_filter_means_what_it_does_in_discrete_worlds(seeds: range):
    seen: Counter[tuple[bool, bool]] = Counter()
    for seed in seeds:
        rng, numbers = random.Random(seed), np.random.default_rng(seed)
        value = random_graph(rng, rng.randint(3, 5), arrow=0.5)
        if not is_within_reach(value, 20_000):
            continue
        outcome, *others = rng.sample(node_names(value), len(node_names(value)))
        treatments = others[: rng.choice([1, 1, 2])]
        covariates = [name for name in others[len(treatments) :] if rng.random() < 0.4]
        ends = {outcome, *treatments}
        drawn = random_parts(rng, value, fixed=0.3)
        parts = [part for part in drawn if not (part["fixed"] and ends & set(part["columns"]))]
        effect = effect_of(value, treatments, outcome, parts)
        valid = is_valid(effect, effect.kept.graph.mask(covariates))
        worlds = [(draw_discrete_world(value, numbers), draw_filter(parts, numbers)) for _ in range(5)]
        verdicts = [reports_the_effect(*world, treatments, covariates, outcome) for world in worlds]
        told = [verdict for verdict in verdicts if verdict is not None]
        if told:
            assert all(told) is valid, (seed, told)
            seen[valid, bool(parts)] += 1
    assert min(seen.values()) > len(seeds) / 12


def test_order_of_the_graph_does_not_decide_what_is_valid():
    for seed in range(200):
        rng = random.Random(seed)
        value = random_graph(rng, 7, arrow=0.35)
        asked, parts = random_question(rng, value), random_parts(rng, value)
        answers = []
        for version in (value, shuffled(value, rng)):
            effect = effect_of(version, asked.x, asked.y, parts)
            graph = effect.kept.graph
            answers.append(
                (
                    is_valid(effect, graph.mask(asked.given)),
                    valid_set(effect) is None,
                    set(graph.names_of(effect.usable)),
                )
            )
        assert answers[0] == answers[1], seed


def test_a_filter_on_the_confounder_does_not_deal_with_it_but_holding_it_at_one_value_does():
    # region → late, region → refund, late → refund
    value = graph_of(("region", "late"), ("region", "refund"), ("late", "refund"))
    narrowed = effect_of(value, "late", "refund", [{"columns": ["region"]}])
    pinned = effect_of(value, "late", "refund", [{"columns": ["region"], "fixed": True}])
    assert (is_valid(narrowed, 0), is_valid(pinned, 0)) == (False, True)
    assert is_valid(narrowed, read_graph(value).mask("region"))
    assert (valid_set(narrowed), valid_set(pinned)) == (read_graph(value).mask("region"), 0)


def test_a_treatment_or_outcome_among_the_covariates_or_fixed_is_never_valid():
    value = graph_of(("late", "refund"))
    for parts in ([{"columns": ["late"], "fixed": True}], [{"columns": ["refund"], "fixed": True}]):
        effect = effect_of(value, "late", "refund", parts)
        assert not is_valid(effect, 0)
        assert valid_set(effect) is None
    effect = effect_of(value, "late", "refund")
    assert not is_valid(effect, effect.treatments)
    assert not is_valid(effect, effect.outcomes)
