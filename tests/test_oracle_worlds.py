"""The path oracles against exact linear and discrete worlds, and the worlds against arithmetic by hand.

That a filter becomes a selection node, and that a set is valid exactly where regression or stratification
reports the effect, is shown here and not assumed.
"""

from __future__ import annotations

import random
from collections import Counter
from collections.abc import Sequence
from itertools import combinations

import numpy as np
import pytest

from tests.brute import is_valid_adjustment, is_valid_direct, separated, subsets, valid_sets, with_selection
from tests.discrete_worlds import (
    DiscreteWorld,
    FilterPart,
    Mechanism,
    adjusted_difference,
    draw_discrete_world,
    draw_filter,
    effect_among_kept,
    is_within_reach,
    joint_distribution,
    kept_rows,
)
from tests.linear_worlds import (
    adjustment_holds,
    direct_effect_holds,
    draw_world,
    estimate_variance,
    is_uncorrelated,
    joint_effect,
    regression_coefficients,
)
from tests.strategies import random_graph, random_parts, random_question, shuffled
from tests.values import Graph, arrows_of, graph_of, node_names, topological_names

# Worlds are enumerated exactly: not for a quick look.
pytestmark = pytest.mark.slow

MANY = [pytest.param(range(400), id="400"), pytest.param(range(400, 5000), id="4600", marks=pytest.mark.slow)]
SOME = [pytest.param(range(300), id="300"), pytest.param(range(300, 1500), id="1200", marks=pytest.mark.slow)]
CONFOUNDED = graph_of(("f", "x"), ("f", "y"), ("x", "y"))


def test_effects_in_a_linear_world_are_products_of_coefficients_along_paths():
    world = draw_world(graph_of(("a", "b"), ("b", "c"), ("a", "c")), np.random.default_rng(1))
    first, second, straight = world.arrow("a", "b"), world.arrow("b", "c"), world.arrow("a", "c")
    assert joint_effect(world, "a", "c")["a"] == pytest.approx(first * second + straight)
    assert joint_effect(world, ["a", "b"], "c") == pytest.approx({"a": straight, "b": second})


def test_a_confounded_coefficient_is_off_by_the_textbook_amount():
    world = draw_world(CONFOUNDED, np.random.default_rng(2))
    into, onto, effect = world.arrow("f", "x"), world.arrow("f", "y"), world.arrow("x", "y")
    f, x = (world.noise[world.place[name]] for name in ("f", "x"))
    omitted = into * onto * f / (into**2 * f + x)
    assert regression_coefficients(world, "y", "x")["x"] == pytest.approx(effect + omitted)
    assert regression_coefficients(world, "y", "x", "f")["x"] == pytest.approx(effect)


def test_a_seed_gives_the_same_worlds_however_the_graph_is_written():
    for seed in range(20):
        rng = random.Random(seed)
        graph = random_graph(rng, 4, bidirected=0.3)
        other = shuffled(graph, rng)
        one, two = (draw_world(g, np.random.default_rng(seed)) for g in (graph, other))
        assert np.array_equal(one.covariance, two.covariance)
        one, two = (draw_discrete_world(g, np.random.default_rng(seed), values=2) for g in (graph, other))
        assert np.array_equal(joint_distribution(one, "abcd"), joint_distribution(two, "abcd"))


@pytest.mark.parametrize("seeds", MANY)
def test_a_partial_correlation_is_zero_exactly_where_the_graph_separates(seeds: range):
    seen: Counter[bool] = Counter()
    for seed in seeds:
        rng = random.Random(seed)
        graph = random_graph(rng, rng.randint(2, 8), bidirected=rng.choice([0, 0.1, 0.25]))
        question = random_question(rng, graph, single=True)
        (x,), (y,) = question.x, question.y
        world = draw_world(graph, np.random.default_rng(seed))
        expected = separated(graph, x, y, question.given)
        assert is_uncorrelated(world, x, y, question.given) is expected, seed
        seen[expected] += 1
    assert min(seen[True], seen[False]) > len(seeds) / 8


@pytest.mark.parametrize("seeds", MANY)
def test_a_set_is_valid_exactly_where_regression_reports_the_effect_filters_included(seeds: range):
    seen: Counter[bool] = Counter()
    for seed in seeds:
        rng = random.Random(seed)
        plain = random_graph(rng, rng.randint(2, 7), arrow=rng.choice([0.25, 0.4, 0.6]))
        question = random_question(rng, plain)
        graph, conditioned = with_selection(plain, random_parts(rng, plain))
        asked = (graph, question.x, question.y, question.given, conditioned)
        valid = is_valid_adjustment(*asked)
        assert adjustment_holds(*asked, seed=seed) is valid, seed
        direct = (graph, question.x[0], question.y[0], question.given, conditioned)
        assert direct_effect_holds(*direct, seed=seed) is is_valid_direct(*direct), seed
        seen[valid] += 1
    assert min(seen[True], seen[False]) > len(seeds) / 8


def test_which_valid_set_is_most_precise_may_depend_on_strengths():
    # w → x → y, w ↔ m ↔ y
    graph = graph_of(("w", "x"), ("x", "y"), bidirected=[("w", "m"), ("m", "y")])
    best = set()
    for seed in range(200):
        world = draw_world(graph, np.random.default_rng(seed))
        variance = {z: estimate_variance(world, "x", "y", z) for z in valid_sets(graph, "x", "y")}
        best.add(min(variance, key=variance.__getitem__))
    assert best == {frozenset(), frozenset({"w", "m"})}


def test_an_effect_among_kept_rows_by_hand():
    # y is x, turned over in one unit of ten; rows with y = 1 are kept
    mechanisms = (
        Mechanism("x", (), np.array([0, 1]), np.array([0.25, 0.75])),
        Mechanism("y", ("x",), np.array([[0, 1], [1, 0]]), np.array([0.9, 0.1])),
    )
    noises = tuple(np.indices((2, 2)).reshape(2, -1))
    world = DiscreteWorld(mechanisms, 2, noises, np.array([0.225, 0.025, 0.675, 0.075]))
    kept = [FilterPart(("y",), frozenset({(1,)}))]
    contrast = {"setting": {"x": 1}, "other": {"x": 0}}
    assert effect_among_kept(world, [], "y", **contrast) == pytest.approx(0.8)
    assert effect_among_kept(world, kept, "y", **contrast) == pytest.approx((0.675 - 0.025) / 0.7)
    assert adjusted_difference(world, [], "y", **contrast) == pytest.approx(0.8)
    assert adjusted_difference(world, kept, "y", **contrast) == pytest.approx(0.0)
    assert adjusted_difference(world, kept, "y", **contrast, covariates=["y"]) == pytest.approx(0.0)


def test_a_distribution_under_intervention_is_the_truncated_factorisation():
    for seed in range(20):
        graph = random_graph(random.Random(seed), 4, arrow=0.6, bidirected=0)
        world = draw_discrete_world(graph, np.random.default_rng(seed))
        order = topological_names(graph) or []
        joint = joint_distribution(world, order)
        setting = {order[1]: 2}
        truncated = np.zeros_like(joint)
        for cell in np.ndindex(joint.shape):
            row = dict(zip(order, cell, strict=True))
            if row[order[1]] == 2:
                others = [name for name in order if name not in setting]
                truncated[cell] = np.prod([conditional(world, graph, name, row) for name in others])
        assert np.allclose(truncated, joint_distribution(world, order, setting), atol=1e-12)


def conditional(world: DiscreteWorld, graph: Graph, node: str, row: dict[str, int]) -> float:
    """P(node | its parents) at one row, from the observed distribution alone."""
    parents = sorted(source for source, target in arrows_of(graph) if target == node)
    shares = joint_distribution(world, [node, *parents])[(slice(None), *(row[name] for name in parents))]
    return float(shares[row[node]] / shares.sum())


def depends(world: DiscreteWorld, x: str, y: str, fixed: list[str]) -> bool:
    """Are x and y dependent given the others: is P(x,y,z) P(z) anywhere unlike P(x,z) P(y,z)?"""
    joint = joint_distribution(world, [x, y, *fixed])
    of_x, of_y = joint.sum(axis=1, keepdims=True), joint.sum(axis=0, keepdims=True)
    rest = joint.sum(axis=(0, 1), keepdims=True)
    return bool(np.abs(joint * rest - of_x * of_y).max() > 1e-13)


def test_discrete_columns_are_independent_exactly_where_the_graph_separates():
    for seed in range(60):
        graph = random_graph(random.Random(seed), 4, bidirected=0.15)
        rng = np.random.default_rng(seed)
        worlds = [draw_discrete_world(graph, rng) for _ in range(3)]
        for x, y in combinations(node_names(graph), 2):
            for fixed in subsets(name for name in node_names(graph) if name not in (x, y)):
                found = any(depends(world, x, y, sorted(fixed)) for world in worlds)
                assert found is not separated(graph, x, y, fixed), (seed, x, y, fixed)


def test_rows_with_f_in_1_and_2_are_still_confounded_by_f():
    selected, conditioned = with_selection(CONFOUNDED, ["f"])
    assert not is_valid_adjustment(selected, "x", "y", [], conditioned)
    assert is_valid_adjustment(selected, "x", "y", ["f"], conditioned)
    # What the tempting reading would say, wrongly: that the filter has dealt with f.
    assert is_valid_adjustment(CONFOUNDED, "x", "y", [], ["f"])
    narrowed, pinned = ([FilterPart(("f",), frozenset(kept))] for kept in ({(1,), (2,)}, {(1,)}))
    for seed in range(30):
        world = draw_discrete_world(CONFOUNDED, np.random.default_rng(seed))
        assert not reports_the_effect(world, narrowed, ["x"], [])
        assert reports_the_effect(world, narrowed, ["x"], ["f"])
        assert reports_the_effect(world, pinned, ["x"], [])


def reports_the_effect(
    world: DiscreteWorld,
    parts: list[FilterPart],
    treatments: Sequence[str],
    covariates: Sequence[str],
    outcome: str = "y",
) -> bool | None:
    """Does adjusting give the effect among the kept rows? None where some stratum lacks a setting.

    The two settings differ in every treatment; the last such pair that the kept rows hold is compared.
    """
    rows = world.rows()
    kept = kept_rows(rows, parts)
    seen = sorted(set(zip(*(rows[name][kept].tolist() for name in treatments), strict=True)))
    pairs = [pair for pair in combinations(seen, 2) if all(a != b for a, b in zip(*pair, strict=True))]
    if not pairs:
        return None
    other, setting = (dict(zip(treatments, values, strict=True)) for values in pairs[-1])
    contrast = {"setting": setting, "other": other}
    found = adjusted_difference(world, parts, outcome, **contrast, covariates=covariates)
    if found is None:
        return None
    return abs(found - effect_among_kept(world, parts, outcome, **contrast)) < 1e-10


@pytest.mark.parametrize("seeds", SOME)
def test_a_filter_is_a_selection_node_in_random_discrete_worlds(seeds: range):
    """Valid: the effect among the kept rows in every world drawn. Invalid: something else in some world."""
    seen: Counter[tuple[bool, bool]] = Counter()
    for seed in seeds:
        rng, numbers = random.Random(seed), np.random.default_rng(seed)
        graph = random_graph(rng, rng.randint(3, 5), arrow=0.5)
        if not is_within_reach(graph, 20_000):
            continue
        outcome, *others = rng.sample(node_names(graph), len(node_names(graph)))
        treatments = others[: rng.choice([1, 1, 2])]
        covariates = [name for name in others[len(treatments) :] if rng.random() < 0.4]
        ends = {outcome, *treatments}
        drawn = random_parts(rng, graph, fixed=0.3)
        parts = [part for part in drawn if not (part["fixed"] and ends & set(part["columns"]))]
        selected, conditioned = with_selection(graph, parts)
        valid = is_valid_adjustment(selected, treatments, outcome, covariates, conditioned)
        worlds = [(draw_discrete_world(graph, numbers), draw_filter(parts, numbers)) for _ in range(5)]
        verdicts = [reports_the_effect(*world, treatments, covariates, outcome) for world in worlds]
        told = [verdict for verdict in verdicts if verdict is not None]
        if told:
            assert all(told) is valid, (seed, told)
            seen[valid, bool(parts)] += 1
    assert (
        min(seen[valid, filtered] for valid in (True, False) for filtered in (True, False)) > len(seeds) / 12
    )
