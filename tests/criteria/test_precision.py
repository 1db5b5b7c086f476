"""The most precise set against exact variances in linear worlds, and against the definition of dominance."""

from __future__ import annotations

import random
from collections import Counter

import numpy as np
import pytest

from pathgate.criteria import Deadline, is_valid
from pathgate.criteria.precision import BUDGET, MostPrecise, PrecisionNotes, most_precise, precision_notes
from tests.brute import descendants, forbidden, proper_paths, separated, subsets, valid_sets
from tests.criteria.asking import effect_of
from tests.criteria.precision_cases import Case, never_improved
from tests.linear_worlds import estimate_variance, residual_variance
from tests.many_worlds import draw_worlds, variances
from tests.published.cases import rows_of, selected_on
from tests.strategies import random_graph, shuffled
from tests.values import Graph, arrows_of, graph_of, node_names

# Variances are compared over many worlds: not for a quick look.
pytestmark = pytest.mark.slow

NEVER = Deadline.never()
TOLERANCE = 1e-9
# w → x → y, w ↔ m ↔ y
TRADE_OFF = graph_of(("w", "x"), ("x", "y"), bidirected=[("w", "m"), ("m", "y")])

DEFINED = [
    pytest.param(range(250), id="250"),
    pytest.param(range(250, 2000), id="1750", marks=pytest.mark.slow),
]
WORLDS = [
    pytest.param(range(700), id="700"),
    pytest.param(range(700, 4000), id="3300", marks=pytest.mark.slow),
]


@pytest.mark.parametrize("seeds", DEFINED)
def test_the_candidates_are_exactly_the_valid_sets_that_no_step_improves(seeds: range):
    seen: Counter[int] = Counter()
    for seed in seeds:
        case = Case.drawn(seed, most=6)
        answer, names = case.found()
        wanted = never_improved(case)
        assert sorted(map(sorted, names)) == sorted(map(sorted, wanted)), seed
        assert answer.complete, seed
        assert answer.uniform is (len(wanted) == 1), seed
        sizes = [(mask.bit_count(), tuple(case.effect.kept.graph.members(mask))) for mask in answer.sets]
        assert sizes == sorted(sizes), seed
        seen[len(wanted)] += 1
    assert seen[0] > len(seeds) / 10 < seen[1]
    assert seen[2] >= len(seeds) // 250


@pytest.mark.parametrize("seeds", WORLDS)
def test_in_no_linear_world_does_a_valid_set_beat_the_uniform_one_or_every_candidate(seeds: range):
    seen: Counter[str] = Counter()
    for seed in seeds:
        case = Case.drawn(seed)
        answer, names = case.found()
        if not case.valid:
            assert answer == MostPrecise(uniform=False, sets=(), complete=True), seed
            continue
        places = [case.valid.index(one) for one in names]
        for told in case.variances(20 if answer.uniform else 200).values():
            assert (told[places].min(axis=0) <= told.min(axis=0) * (1 + TOLERANCE)).all(), seed
        seen["uniform" if answer.uniform else "not uniform"] += len(case.valid) > 1
    assert seen["uniform"] > len(seeds) / 8
    assert seen["not uniform"] >= len(seeds) // 350


@pytest.mark.parametrize("seeds", WORLDS)
def test_where_no_set_is_uniformly_best_each_candidate_is_the_only_best_one_somewhere(seeds: range):
    # Nothing proves that this must be so; it is how sharp "not uniform" was found to be.
    tried = 0
    for seed in seeds:
        case = Case.drawn(seed)
        _answer, names = case.found()
        if len(names) < 2 or len(case.treatments) + len(case.outcomes) > 2:
            continue
        (told,) = case.variances(400).values()
        for name in names:
            own = case.valid.index(name)
            others = [case.valid.index(other) for other in names if other != name]
            assert (told[own] < told[others].min(axis=0) * (1 - TOLERANCE)).any(), (seed, name)
        tried += 1
    assert tried >= len(seeds) // 350


def test_which_set_is_best_can_depend_on_strengths_the_graph_does_not_tell():
    effect = effect_of(TRADE_OFF, "x", "y")
    graph = effect.kept.graph
    answer = most_precise(effect, NEVER)
    assert answer == MostPrecise(uniform=False, sets=(0, graph.mask(["w", "m"])), complete=True)
    sets = [frozenset(), frozenset({"w"}), frozenset({"w", "m"})]
    assert sets == valid_sets(TRADE_OFF, "x", "y")
    told = variances(draw_worlds(TRADE_OFF, np.random.default_rng(1), 100), ["x"], "y", sets)
    assert set(told.argmin(axis=0).tolist()) == {0, 2}


def test_bounds_decide_what_is_best_within_them():
    effect = effect_of(TRADE_OFF, "x", "y")
    w, m = effect.kept.graph.mask("w"), effect.kept.graph.mask("m")
    assert most_precise(effect, NEVER, allowed=w) == MostPrecise(uniform=True, sets=(0,), complete=True)
    assert most_precise(effect, NEVER, required=m) == MostPrecise(uniform=True, sets=(w | m,), complete=True)
    assert most_precise(effect, NEVER, required=m, allowed=m).sets == ()
    # Without m in sight w is wasted, but it stays where it is asked for; with m about, m makes up for it.
    kept = most_precise(effect, NEVER, required=w, allowed=w)
    assert kept == MostPrecise(uniform=True, sets=(w,), complete=True)
    assert most_precise(effect, NEVER, required=w) == MostPrecise(uniform=True, sets=(w | m,), complete=True)


@pytest.mark.parametrize(
    ("name", "graph", "row"), [case for case in rows_of("adjustment") if "most_precise" in case[2]]
)
def test_published_sets_of_least_variance(name: str, graph: Graph, row: dict):
    effect = effect_of(graph, row["treatment"], row["outcome"], selected_on(row))
    answer = most_precise(effect, NEVER)
    assert (answer.uniform, answer.sets) == (True, (effect.kept.graph.mask(row["most_precise"]),))


def test_with_every_node_measured_the_parents_of_causal_paths_are_best_and_found_at_once():
    tried = 0
    for seed in range(700):
        rng = random.Random(seed)
        value = random_graph(rng, rng.randint(3, 9), arrow=0.4, bidirected=0.0, unmeasured=0.0)
        x, y, second = rng.sample(node_names(value), 3)
        treatments = [x, second][: rng.choice([1, 2])]
        if y not in descendants(value, {x}) or not valid_sets(value, treatments, y):
            continue
        paths = [path for path in proper_paths(value, treatments, y) if path.is_causal]
        on_paths = {node for path in paths for node in path.nodes[1:]}
        parents = {source for source, target in arrows_of(value) if target in on_paths}
        best = parents - on_paths - forbidden(value, treatments, y) - set(treatments)
        if not on_paths:
            continue
        effect = effect_of(value, treatments, y)
        # A budget of one region: nothing is left to be decided by parting the valid sets.
        answer = most_precise(effect, NEVER, budget=1)
        wanted = MostPrecise(uniform=True, sets=(effect.kept.graph.mask(best),), complete=True)
        assert answer == wanted, seed
        tried += 1
    assert tried > 100


def test_a_column_that_only_some_valid_sets_join_to_the_treatment_is_not_free_to_add_to_all():
    # x → y, x ↔ o → d ↔ y, o ↔ c ↔ y: c is free to add to {} and makes {o, d} invalid
    bows = [("x", "o"), ("d", "y"), ("o", "c"), ("c", "y")]
    value = graph_of(("x", "y"), ("o", "d"), bidirected=bows)
    effect = effect_of(value, "x", "y")
    sets = (effect.kept.graph.mask("c"), effect.kept.graph.mask(["o", "d"]))
    assert most_precise(effect, NEVER) == MostPrecise(uniform=False, sets=sets, complete=True)


@pytest.mark.parametrize(
    ("value", "required", "best"),
    [
        # x ← app ← region → y, x → y: region takes the place of app
        (graph_of(("app", "x"), ("region", "app"), ("region", "y"), ("x", "y")), [], ["region"]),
        # with w held anyway, m is free to add
        (TRADE_OFF, ["w"], ["w", "m"]),
        # i → x → y ← p: neither more nor less than p
        (graph_of(("i", "x"), ("x", "y"), ("p", "y")), [], ["p"]),
    ],
)
def test_without_time_to_search_the_set_named_is_still_one_that_no_step_improves(
    value: Graph, required: list[str], best: list[str]
):
    effect = effect_of(value, "x", "y")
    graph = effect.kept.graph
    answer = most_precise(effect, Deadline(0), required=graph.mask(required))
    assert answer == MostPrecise(uniform=False, sets=(graph.mask(best),), complete=False)


def test_a_search_cut_short_says_so_and_names_a_valid_set_all_the_same():
    effect = effect_of(TRADE_OFF, "x", "y")
    late = most_precise(effect, Deadline(0))
    assert late == MostPrecise(uniform=False, sets=(0,), complete=False)
    for budget in range(1, 100, 7):
        answer = most_precise(effect, NEVER, budget=budget)
        assert answer.sets
        assert all(is_valid(effect, mask) for mask in answer.sets)
        assert not answer.uniform
        assert answer.complete is (len(answer.sets) == 2)
    assert most_precise(effect, NEVER, budget=BUDGET).complete


def test_columns_alike_in_every_way_are_left_out():
    # late → refund, sent → stamp: whatever is adjusted for beyond nothing makes no difference
    value = graph_of(("late", "refund"), ("sent", "stamp"))
    assert most_precise(effect_of(value, "late", "refund"), NEVER).sets == (0,)


def test_where_nothing_leads_to_the_outcome_its_consequences_lower_the_variance():
    # late → ticket, refund → bonus: no effect of late on refund
    value = graph_of(("late", "ticket"), ("refund", "bonus"))
    effect = effect_of(value, "late", "refund")
    best = MostPrecise(uniform=True, sets=(effect.kept.graph.mask("bonus"),), complete=True)
    assert most_precise(effect, NEVER) == best


def test_order_of_the_graph_does_not_decide_what_is_best():
    for seed in range(300):
        case = Case.drawn(seed)
        version = shuffled(case.value, random.Random(seed))
        other = Case(seed, version, case.treatments, case.outcomes, case.parts, case.required, case.allowed)
        (one, names), (two, others) = case.found(), other.found()
        assert (one.uniform, set(names)) == (two.uniform, set(others)), seed


@pytest.mark.parametrize("seeds", DEFINED)
def test_notes_say_what_each_column_does_to_the_variance(seeds: range):
    seen: Counter[str] = Counter()
    for seed in seeds:
        case = Case.drawn(seed, most=6).unbound()
        told = case.variances(6) if case.valid else {}
        for smaller in subsets(case.allowed - {*case.treatments, *case.outcomes, *case.selected[1]}):
            for column in sorted(case.allowed - smaller):
                pair = smaller, smaller | {column}
                note = notes_on(case, pair, column)
                if not set(pair) <= set(case.valid):
                    # The column is needed, or not to be had: it is not there for precision.
                    assert note == "none", (seed, pair)
                    seen[note] += any(one in case.valid for one in pair)
                    continue
                assert note == defined_note(case, smaller, column), (seed, pair)
                without, having = (case.valid.index(one) for one in pair)
                for each in told.values():
                    ratio = each[having] / each[without]
                    assert note != "wasted" or (ratio >= 1 - TOLERANCE).all(), (seed, pair)
                    assert note != "lowers" or (ratio <= 1 + TOLERANCE).all(), (seed, pair)
                    assert note != "lowers" or len(told) > 1 or (ratio < 1).any(), (seed, pair)
                seen[note] += 1
    assert min(seen[kind] for kind in ("wasted", "lowers", "none")) > len(seeds) / 20


def notes_on(case: Case, pair: tuple[frozenset[str], frozenset[str]], column: str) -> str:
    """What the notes on the two sets, as far as they are valid, say of the column in which they differ."""
    graph = case.effect.kept.graph
    bit = graph.mask(column)
    smaller, larger = (
        precision_notes(case.effect, graph.mask(one)) if one in case.valid else PrecisionNotes(0, 0, 0)
        for one in pair
    )
    assert not (smaller.wasted | smaller.helpful | larger.missed) & bit
    assert not larger.wasted & larger.helpful
    if set(pair) <= set(case.valid):
        assert smaller.missed & bit == larger.helpful & bit
    if larger.wasted & bit:
        return "wasted"
    return "lowers" if (larger.helpful | smaller.missed) & bit else "none"


def defined_note(case: Case, smaller: frozenset[str], column: str) -> str:
    """By separation alone, each path looked at."""
    selected, conditioned = case.selected
    given = smaller | frozenset(conditioned)
    if separated(selected, column, case.outcomes, given | set(case.treatments)):
        return "wasted"
    return "lowers" if separated(selected, column, case.treatments, given) else "none"


def test_the_worlds_drawn_together_have_the_variances_of_worlds_one_by_one():
    worlds = draw_worlds(TRADE_OFF, np.random.default_rng(2), 10)
    (told,) = variances(worlds, ["x"], "y", [frozenset({"w", "m"})])
    alone = [estimate_variance(world, "x", "y", ["w", "m"]) for world in worlds]
    assert told == pytest.approx(alone, rel=1e-9)
    (told,) = variances(worlds, ["x", "w"], "y", [frozenset({"m"})])
    alone = [
        residual_variance(world, "y", ["x", "w", "m"]) / residual_variance(world, "x", ["w", "m"])
        for world in worlds
    ]
    assert told == pytest.approx(alone, rel=1e-9)
