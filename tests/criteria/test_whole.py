"""The effect in everybody, recovered from the rows kept: against discrete worlds and the criterion by paths."""

from __future__ import annotations

import random
from collections import Counter
from collections.abc import Iterator

import numpy as np
import pytest

from pathgate.criteria import Deadline, Effect, OutOfTime
from pathgate.criteria.whole import (
    is_weightable,
    least_recovering_set,
    recovering_set,
    recovering_sets,
    recovers,
    weighting,
)
from tests.brute import descendants, inclusion_minimal, subsets, with_selection
from tests.criteria.asking import effect_of
from tests.criteria.recovering import KeptWorld, draw_kept_world, is_right, recovery_by_paths
from tests.discrete_worlds import is_within_reach
from tests.strategies import Question, random_graph, random_parts, random_question
from tests.values import Graph, graph_of, measured_names, topological_names

# Worlds are enumerated exactly: not for a quick look.
pytestmark = pytest.mark.slow

WORLDS = [
    pytest.param(range(250), id="250"),
    pytest.param(range(250, 2000), id="1750", marks=pytest.mark.slow),
    pytest.param(range(2000, 6000), id="4000", marks=pytest.mark.full),
]
MANY = [
    pytest.param(range(500), id="500"),
    pytest.param(range(500, 2500), id="2000", marks=pytest.mark.slow),
    pytest.param(range(2500, 6000), id="3500", marks=pytest.mark.full),
]
# Enough for a set that is wrong in some world to be wrong in one of these.
DRAWS = 10


def drawn(seed: int, nodes: int) -> tuple[Graph, Question, list[dict]]:
    """A random graph, question and filter; the filter fixes neither treatment nor outcome."""
    rng = random.Random(seed)
    chances = {"arrow": rng.choice([0.3, 0.45, 0.6]), "bidirected": rng.choice([0.0, 0.1, 0.2])}
    value = random_graph(rng, rng.randint(2, nodes), unmeasured=0.1, **chances)
    asked = random_question(rng, value, single=rng.random() < 0.7)
    parts = random_parts(rng, value, fixed=0.25)
    ends = {*asked.x, *asked.y}
    return value, asked, [part for part in parts if not (part["fixed"] and ends & set(part["columns"]))]


def drawn_promising(seed: int) -> tuple[Graph, Question, list[dict]]:
    """One treatment, one outcome, and rows mostly kept by what neither leads to: much can be recovered."""
    rng = random.Random(seed)
    value = random_graph(
        rng, rng.randint(5, 8), arrow=rng.choice([0.3, 0.4]), bidirected=0.03, unmeasured=0.1
    )
    order = [name for name in topological_names(value) or [] if name in measured_names(value)]
    if len(order) < 2:
        return drawn(seed, 7)
    x, y = (order[place] for place in sorted(rng.sample(range(len(order)), 2)))
    causes = [name for name in order if name not in descendants(value, {x, y})]
    parts = [
        {"columns": rng.sample(causes, min(len(causes), rng.randint(1, 2))), "fixed": False}
        for _ in range(rng.randint(1, 2))
    ]
    return value, Question((x,), (y,), ()), [part for part in parts if part["columns"]]


def free_columns(value: Graph, asked: Question) -> list[str]:
    return [name for name in measured_names(value) if name not in (*asked.x, *asked.y)]


class Worlds:
    """Random worlds of a graph, drawn as they are asked for."""

    def __init__(self, selected: Graph, conditioned: list[str], asked: Question, seed: int) -> None:
        self._rng = np.random.default_rng(seed)
        self._make = lambda: draw_kept_world(selected, conditioned, asked, self._rng)
        self._drawn: list[KeptWorld] = []

    def __iter__(self) -> Iterator[KeptWorld]:
        for place in range(DRAWS):
            if place == len(self._drawn):
                self._drawn.append(self._make())
            yield self._drawn[place]


@pytest.mark.parametrize("seeds", WORLDS)
def test_a_set_recovers_exactly_where_some_weighting_gives_the_truth_in_every_world(seeds: range):
    seen: Counter[tuple[bool, bool]] = Counter()
    for seed in seeds:
        value, asked, parts = drawn(seed, 5)
        selected, conditioned = with_selection(value, parts)
        if not is_within_reach(selected, 80_000, values=2, responses=4):
            continue
        effect = effect_of(value, asked.x, asked.y, parts)
        graph = effect.kept.graph
        worlds = Worlds(selected, conditioned, asked, seed)
        free = free_columns(value, asked)
        for covariates in subsets(free):
            weights = list(subsets(sorted(covariates - set(conditioned))))
            right = [one for one in weights if is_right(worlds, asked, covariates, one)]
            for known in subsets(free):
                found = weighting(effect, graph.mask(covariates), graph.mask(known))
                place = (seed, covariates, known)
                assert (found is not None) is any(one <= known for one in right), place
                if found is not None:
                    assert set(graph.names_of(found)) in right, place
                    assert set(graph.names_of(found)) <= known, place
                seen[found is not None, bool(parts)] += 1
    assert min(seen.values()) > len(seeds) / 5


@pytest.mark.parametrize("seeds", MANY)
def test_minimal_recovering_sets_are_those_of_the_criterion_by_paths(seeds: range):
    seen: Counter[str] = Counter()
    for seed in seeds:
        value, asked, parts = drawn_promising(-1 - seed) if seed % 4 else drawn(-1 - seed, 7)
        selected, conditioned = with_selection(value, parts)
        rng = random.Random(seed)
        effect = effect_of(priced(value, rng), asked.x, asked.y, parts)
        held, free = frozenset(conditioned), free_columns(value, asked)
        known, allowed = chosen(rng, free, 0.85), chosen(rng, free, 0.95)
        required = chosen(rng, sorted(allowed), rng.choice([0, 0, 0.3]))
        recovers_by_paths = recovery_by_paths(selected, conditioned, asked)
        every = [one for one in subsets(sorted(allowed - held | required)) if recovers_by_paths(one, known)]
        within = [one for one in every if required <= one]
        wanted = inclusion_minimal(within)
        assert_found(effect, (known, required, allowed), wanted, seed)
        seen["none" if not wanted else "many" if len(wanted) > 1 else "one"] += 1
        seen["weighted"] += any(not recovers_by_paths(one, frozenset()) for one in wanted)
    assert min(seen.values()) > len(seeds) / 40


def assert_found(
    effect: Effect, bounds: tuple[frozenset[str], ...], wanted: list[frozenset[str]], seed: int
) -> None:
    """Listed exactly, one found exactly where there is one, the smallest and cheapest among them."""
    graph = effect.kept.graph
    known, required, allowed = map(graph.mask, bounds)
    within = {"required": required, "allowed": allowed}
    masks = [graph.mask(one) for one in wanted]
    listed = list(recovering_sets(effect, known, Deadline.never(), **within))
    assert sorted(listed) == sorted(masks), seed
    one = recovering_set(effect, known, **within)
    assert one in masks if masks else one is None, seed
    for prefer, amount in [
        ("smallest", int.bit_count),
        ("cheapest", lambda mask: sum(map(graph.cost, graph.members(mask)))),
    ]:
        least = least_recovering_set(effect, known, Deadline.never(), prefer=prefer, **within)
        assert (least is None) is (not masks), seed
        if least is not None:
            assert least in masks, seed
            assert amount(least) == min(map(amount, masks)), seed


def chosen(rng: random.Random, names: list[str], chance: float) -> frozenset[str]:
    return frozenset(name for name in names if rng.random() < chance)


def priced(value: Graph, rng: random.Random) -> Graph:
    """The same graph with costs that binary fractions hold exactly."""
    return {**value, "nodes": [{**node, "cost": rng.randint(1, 12) / 4} for node in value["nodes"]]}


def recovered(value: Graph, selected_on: list[dict], covariates: list[str], known: list[str]) -> bool:
    effect = effect_of(value, "x", "y", selected_on)
    return recovers(effect, effect.kept.graph.mask(covariates), effect.kept.graph.mask(known))


#   x → y ← a; who answers the survey depends on a, the age
SURVEY = graph_of(("x", "y"), ("a", "y"))
ON_AGE = [{"columns": ["a"], "fixed": False}]


def test_a_survey_answered_by_age_is_weighted_by_the_census():
    assert not recovered(SURVEY, ON_AGE, [], ["a"])
    assert not recovered(SURVEY, ON_AGE, ["a"], [])
    assert recovered(SURVEY, ON_AGE, ["a"], ["a"])


def test_a_column_held_at_one_value_never_weights():
    held = [{"columns": ["a"], "fixed": True}]
    assert not recovered(SURVEY, held, ["a"], ["a"])
    assert recovered(graph_of(("x", "y"), ("a", "x")), held, [], [])


#   s ← c → m ← b → y with m → x: m must be adjusted for, and weighting by m would open c → m ← b
SIDEWAYS = graph_of(("c", "m"), ("b", "m"), ("b", "y"), ("m", "x"), ("x", "y"))


def test_knowing_more_of_everybody_never_hurts():
    effect = effect_of(SIDEWAYS, "x", "y", [{"columns": ["c"], "fixed": False}])
    m = effect.kept.graph.mask("m")
    assert weighting(effect, m, m) == weighting(effect, m, 0) == 0


def test_the_outcome_among_what_decides_who_is_kept_is_past_recovering():
    effect = effect_of(graph_of(("x", "y"), ("z", "y")), "x", "y", [{"columns": ["y"], "fixed": False}])
    everything = effect.kept.graph.measured
    assert recovering_set(effect, everything) is None
    assert not list(recovering_sets(effect, everything, Deadline.never()))
    assert not is_weightable(effect, everything)


def test_listing_polls_its_deadline():
    moments = iter([0.0, 2.0])
    deadline = Deadline(1, clock=lambda: next(moments))
    effect = effect_of(SURVEY, "x", "y", ON_AGE)
    with pytest.raises(OutOfTime):
        list(recovering_sets(effect, effect.kept.graph.mask("a"), deadline))
