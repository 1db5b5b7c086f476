"""What is blamed for a set that does not carry an effect, each witness recomputed by definition."""

from __future__ import annotations

import random
from collections import Counter

import pytest

from pathgate.criteria import Deadline, Effect, Missing, Opened, OutOfTime, forbidden_nodes, open_paths
from tests.brute import (
    _on_or_below_causal_paths,
    is_valid_adjustment,
    proper_paths,
    with_selection,
)
from tests.criteria.asking import (
    assert_is_open_path,
    edges_exist,
    effect_of,
    is_directed_path,
    name_of,
    path_of,
)
from tests.strategies import Question, random_graph, random_parts, random_question
from tests.values import Graph, as_set, graph_of, measured_names, node_names

SEEDS = [
    pytest.param(range(600), id="600"),
    pytest.param(range(600, 4000), id="3400", marks=pytest.mark.slow),
]
NEVER = Deadline.never()


def asked(seed: int) -> tuple[Graph, Question, list[dict]]:
    rng = random.Random(seed)
    value = random_graph(rng, rng.randint(2, 7), arrow=rng.choice([0.25, 0.4, 0.55]), bidirected=0.12)
    return value, random_question(rng, value), random_parts(rng, value, 2)


@pytest.mark.parametrize("seeds", SEEDS)
def test_forbidden_nodes_are_told_with_a_causal_path_and_the_way_down_from_it(seeds: range):
    told = 0
    for seed in seeds:
        value, question, parts = asked(seed)
        effect = effect_of(value, question.x, question.y, parts)
        selected, conditioned = with_selection(value, parts)
        names = node_names(selected)
        paths = proper_paths(selected, question.x, question.y)
        barred = _on_or_below_causal_paths(selected, paths) - set(question.x)
        given = effect.kept.graph.mask(question.given) | effect.kept.conditioned
        found = list(forbidden_nodes(effect, given))
        assert {names[one.node] for one in found} == barred & {*question.given, *conditioned}, seed
        assert len({one.node for one in found}) == len(found)
        on_paths = {node for path in paths if path.is_causal for node in path.nodes[1:]}
        for one in found:
            node, above = names[one.node], names[one.descends_from]
            assert one.is_on_path is (node in on_paths), seed
            assert (above == node) is one.is_on_path
            causal = path_of(one.causal_path, selected)
            assert causal in paths, seed
            assert causal.is_causal
            assert above in causal.nodes[1:]
            descent = path_of(one.descent, selected).nodes
            assert (descent[0], descent[-1]) == (above, node)
            assert is_directed_path(descent, selected)
            told += 1
    assert told > len(seeds) / 10


def without_the_forbidden(seed: int) -> tuple[Effect, Question, Graph, frozenset[str], frozenset[str]]:
    """A question less the covariates and parts that lie on or below causal paths, as callers leave them out."""
    value, question, parts = asked(seed)
    selected, _ = with_selection(value, parts)
    barred = _on_or_below_causal_paths(selected, proper_paths(selected, question.x, question.y))
    parts = [part for part in parts if not barred & as_set(part["columns"])]
    ends = {*question.x, *question.y}
    parts = [part for part in parts if not (part["fixed"] and as_set(part["columns"]) & ends)]
    selected, conditioned = with_selection(value, parts)
    covariates = frozenset(question.given) - barred
    effect = effect_of(value, question.x, question.y, parts)
    return effect, question, selected, covariates, frozenset(conditioned)


@pytest.mark.parametrize("seeds", SEEDS)
def test_every_path_blamed_is_open_and_something_is_blamed_exactly_where_the_set_is_invalid(seeds: range):
    seen: Counter[str] = Counter()
    for seed in seeds:
        effect, question, selected, covariates, conditioned = without_the_forbidden(seed)
        given = covariates | conditioned
        found = list(open_paths(effect, effect.kept.graph.mask(covariates), NEVER))
        valid = is_valid_adjustment(selected, question.x, question.y, covariates, conditioned)
        assert bool(found) is not valid, seed
        for one in found:
            path = path_of(one.trail, selected)
            assert_is_open_path(path, selected, given, question.x, question.y)
            assert not path.is_causal
            assert not set(path.nodes[1:]) & set(question.x)
            labels = tuple(name_of(label, effect.kept, selected) for label in one.path.nodes)
            assert (labels, one.path.arrows) == (path.nodes, path.arrows)
            if isinstance(one, Missing):
                assert_is_missing(one, effect, selected, given)
            else:
                assert_is_opened(one, effect, selected, given)
            seen[type(one).__name__] += 1
        seen["valid" if valid else "invalid"] += 1
        blamed = [(one.trail, getattr(one, "descents", ())) for one in found]
        assert len(set(blamed)) == len(blamed), seed
    assert min(seen.values()) > len(seeds) / 20, seen


def assert_is_missing(found: Missing, effect: Effect, selected: Graph, given: frozenset[str]) -> None:
    path = path_of(found.trail, selected)
    assert not any(is_collider for _, is_collider in path.inner())
    usable = {node for node, _ in path.inner()} & set(effect.kept.graph.names_of(effect.usable))
    if found.blocker is None:
        assert not usable
    else:
        name = node_names(selected)[found.blocker]
        assert name in usable
        assert name not in given
        assert name in measured_names(selected)


def assert_is_opened(found: Opened, effect: Effect, selected: Graph, given: frozenset[str]) -> None:
    path, names = path_of(found.trail, selected), node_names(selected)
    passed = [node for node, is_collider in path.inner() if is_collider]
    assert passed
    assert [names[descent.nodes[0]] for descent in found.descents] == passed
    steps = [step for step in found.path.steps if step.role == "collider"]
    for step, descent in zip(steps, found.descents, strict=True):
        nodes = tuple(names[node] for node in descent.nodes)
        assert nodes[-1] in given
        assert is_directed_path(nodes, selected)
        assert step.node == effect.kept.label(descent.nodes[0])
        assert tuple(name_of(label, effect.kept, selected) for label in step.through) == nodes
        assert (step.because == "conditioned") is (len(nodes) == 1)


@pytest.mark.parametrize("seeds", SEEDS[:1])
def test_doing_what_is_said_of_every_path_leaves_none_open(seeds: range):
    """Blockers in, blamed openers out: where every missing path has a blocker, what is left is valid or
    some blamed node was needed to block another path, and then that path is named in its turn."""
    mended = 0
    for seed in seeds:
        effect, question, selected, covariates, conditioned = without_the_forbidden(seed)
        names = node_names(selected)
        for _round in range(20):
            found = list(open_paths(effect, effect.kept.graph.mask(covariates), NEVER))
            missing = [one for one in found if isinstance(one, Missing)]
            if not missing or any(one.blocker is None for one in missing):
                break
            covariates |= {names[one.blocker] for one in missing if one.blocker is not None}
        if not found:
            assert is_valid_adjustment(selected, question.x, question.y, covariates, conditioned), seed
            mended += 1
    assert mended > 60


def test_the_fork_is_named_as_what_is_missing():
    # weather → route → late, weather → staff → refund, late → refund
    value = graph_of(
        ("weather", "route"), ("route", "late"), ("weather", "staff"), ("staff", "refund"), ("late", "refund")
    )
    effect = effect_of(value, "late", "refund")
    (found,) = open_paths(effect, 0, NEVER)
    assert isinstance(found, Missing)
    assert found.blocker == effect.kept.graph.index["weather"]
    path = path_of(found.trail, value)
    assert path.nodes == ("late", "route", "weather", "staff", "refund")
    assert edges_exist(path, value)


def test_two_fractured_paths_are_each_found_and_each_blamed_on_its_own():
    # two colliders t1 and t2 between late and refund, both adjusted for
    arrows = [(cause, ticket) for ticket in ("t1", "t2") for cause in ("late", f"mood of {ticket}")]
    value = graph_of(*arrows, ("mood of t1", "refund"), ("mood of t2", "refund"), ("late", "refund"))
    effect = effect_of(value, "late", "refund")
    found = list(open_paths(effect, effect.kept.graph.mask(["t1", "t2"]), NEVER))
    assert [type(one) for one in found] == [Opened, Opened]
    assert {value["nodes"][one.trail.nodes[1]]["id"] for one in found} == {"t1", "t2"}


def test_the_diagnosis_is_cut_off_by_the_deadline():
    names = [f"c{k}" for k in range(20)]
    value = graph_of(*((name, end) for name in names for end in ("late", "refund")), ("late", "refund"))
    effect = effect_of(value, "late", "refund")
    assert len(list(open_paths(effect, 0, NEVER))) == 20
    moments = iter([0.0, 0.5, 0.6])
    listing = open_paths(effect, 0, Deadline(1, clock=lambda: next(moments, 2.0)))
    assert isinstance(next(listing), Missing)
    assert isinstance(next(listing), Missing)
    with pytest.raises(OutOfTime):
        next(listing)
