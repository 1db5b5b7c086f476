"""What a covariate set hinges on, for the rows kept and for everybody, against making every single change."""

from __future__ import annotations

import random
from collections import Counter

import pytest

from pathgate.criteria import Part, keep_rows, recovers, total_effect
from pathgate.criteria.hinges import Hinges
from pathgate.criteria.whole_hinges import WholeHinges
from pathgate.graphs import CausalGraph
from pathgate.graphs.kinship import ancestors
from tests.brute import with_selection
from tests.criteria.recovering import recovery_by_paths
from tests.criteria.sound_sets import (
    Case,
    absent_arrows,
    absent_bidirected,
    needs_weighting,
    removals,
    sound_cases,
    turned_arrows,
)
from tests.strategies import Question
from tests.values import measured_names, node_names

SEEDS = [
    pytest.param(range(120), id="120"),
    pytest.param(range(120, 1200), id="1080", marks=pytest.mark.slow),
    pytest.param(range(1200, 6000), id="4800", marks=pytest.mark.full),
]
POPULATIONS = ["kept", "whole"]


def hinges_of(case: Case) -> Hinges | WholeHinges:
    effect = case.effect
    mask = effect.kept.graph.mask
    if case.known is None:
        return Hinges(effect, mask(case.covariates), case.is_direct)
    return WholeHinges(effect, mask(case.covariates), mask(case.known), case.is_direct)


@pytest.mark.parametrize("population", POPULATIONS)
@pytest.mark.parametrize("seeds", SEEDS)
def test_added_edges_that_end_a_verdict_are_those_found_one_by_one(seeds: range, population: str):
    seen: Counter[str] = Counter()
    for seed, case in sound_cases(seeds, population=population):
        hinges, graph = hinges_of(case), case.kept.graph
        for source, target, lost in absent_arrows(case):
            found = hinges.arrows_from(graph.index[source], graph.everything)
            assert bool(found & graph.mask(target)) is lost, (seed, source, target)
            seen["arrow", lost] += 1
        for first, second, lost in absent_bidirected(case):
            one, other = graph.index[first], graph.index[second]
            assert bool(hinges.bidirected_with(one) >> other & 1) is lost, (seed, first, second)
            assert bool(hinges.bidirected_with(other) >> one & 1) is lost, (seed, first, second)
            seen["bidirected", lost] += 1
        seen["unmeasured"] += bool(set(case.covariates) - set(measured_names(case.graph)))
        seen["by weighting"] += needs_weighting(case)
        seen["sound"] += 1
    assert seen["sound"] > len(seeds) / 2
    assert (
        min(seen[name] for name in seen if population == "whole" or name != "by weighting")
        > seen["sound"] / 25
    )


@pytest.mark.parametrize("population", POPULATIONS)
@pytest.mark.parametrize("seeds", SEEDS)
def test_turned_arrows_that_end_a_verdict_are_those_found_one_by_one(seeds: range, population: str):
    seen: Counter[bool] = Counter()
    for seed, case in sound_cases(seeds, population=population):
        hinges, graph = hinges_of(case), case.kept.graph
        for source, target, lost in turned_arrows(case):
            ends = graph.index[source], graph.index[target]
            assert hinges.does_turning_harm(*ends) is lost, (seed, source, target)
            assert hinges.may_turning_harm(*ends) or not lost, (seed, source, target)
            seen[lost] += 1
    assert min(seen.values()) > len(seeds) / 20


@pytest.mark.parametrize("population", POPULATIONS)
@pytest.mark.parametrize("seeds", SEEDS)
def test_no_verdict_is_ever_lost_by_an_edge_less(seeds: range, population: str):
    tried = 0
    for seed, case in sound_cases(seeds, population=population):
        for edge, lost in removals(case):
            assert not lost, (seed, edge)
            tried += 1
    assert tried > len(seeds) / 3


def judged_by_paths(case: Case) -> bool:
    """``Case.is_sound`` by listing paths."""
    selected, conditioned = with_selection(case.graph, case.parts)
    asked = Question(case.treatments, case.outcomes, ())
    recovers = recovery_by_paths(selected, conditioned, asked)
    return recovers(frozenset(case.covariates), frozenset(case.known or ()))


def test_what_a_recovered_effect_hinges_on_is_so_by_listing_paths(monkeypatch: pytest.MonkeyPatch):
    cases = [case for _seed, case in sound_cases(range(150), population="whole") if not case.is_direct]
    monkeypatch.setattr(Case, "is_sound", property(judged_by_paths))
    seen: Counter[bool] = Counter()
    for case in cases:
        hinges, graph = hinges_of(case), case.kept.graph
        for source, target, lost in absent_arrows(case):
            assert bool(hinges.arrows_from(graph.index[source], graph.mask(target))) is lost, case
            seen[lost] += 1
        for source, target, lost in turned_arrows(case):
            assert hinges.does_turning_harm(graph.index[source], graph.index[target]) is lost, case
            seen[lost] += 1
        assert not any(lost for _edge, lost in removals(case)), case
    assert min(seen.values()) > 100


@pytest.mark.parametrize("population", POPULATIONS)
def test_targets_left_out_beforehand_change_nothing_about_the_others(population: str):
    left_out = 0
    for seed, case in sound_cases(range(300), population=population):
        rng, everything, hinges = random.Random(seed), case.kept.graph.everything, hinges_of(case)
        for node in range(len(node_names(case.graph))):
            among = rng.getrandbits(8) & everything
            found = hinges.arrows_from(node, everything)
            assert hinges_of(case).arrows_from(node, among) == found & among, (seed, node)
            left_out += found & ~among != 0
    assert left_out > 300


#   late → refund ← age → answer; only who answered is kept
ANSWERED = CausalGraph.of(("late", "refund"), ("age", "refund"), ("age", "answer"), nodes=["region"])


def test_the_effect_in_everybody_hinges_on_more_than_that_among_the_rows_kept():
    mask, index = ANSWERED.mask, ANSWERED.index
    kept = keep_rows(ANSWERED, [Part(mask("answer"), fixed=False, written="answer")])
    effect = total_effect(kept, mask("late"), mask("refund"))
    among_kept = Hinges(effect, mask("age"))
    everybody = WholeHinges(effect, mask("age"), known=mask("age"))
    refund, answer = mask("refund"), index["answer"]
    assert not among_kept.bidirected_with(answer) & refund
    assert everybody.bidirected_with(answer) & refund
    assert not among_kept.arrows_from(answer, refund)
    assert everybody.arrows_from(answer, refund) == refund
    assert not everybody.arrows_from(index["region"], mask(["refund", "age"]))


def test_where_every_row_is_kept_nothing_more_is_hinged_on():
    mask = ANSWERED.mask
    effect = total_effect(keep_rows(ANSWERED), mask("late"), mask("refund"))
    everybody, among_kept = WholeHinges(effect, mask("age"), known=0), Hinges(effect, mask("age"))
    for node in range(ANSWERED.size):
        found = everybody.arrows_from(node, ANSWERED.everything)
        assert found == among_kept.arrows_from(node, ANSWERED.everything)
        assert everybody.bidirected_with(node) == among_kept.bidirected_with(node)
    assert among_kept.bidirected_with(ANSWERED.index["late"]) == mask("refund")


def lost_arrows(
    graph: CausalGraph, held: str, covariates: list[str], source: str, *, fixed: bool = False
) -> tuple[str, ...]:
    """Where an arrow from ``source`` must not lead, for the effect of x on y in everybody."""
    kept = keep_rows(graph, [Part(graph.mask(held), fixed=fixed, written=held)])
    effect, adjusted = total_effect(kept, graph.mask("x"), graph.mask("y")), graph.mask(covariates)
    assert recovers(effect, adjusted, graph.everything)
    among = graph.everything & ~ancestors(graph, graph.mask(source))
    return graph.names_of(
        WholeHinges(effect, adjusted, graph.everything).arrows_from(graph.index[source], among)
    )


def test_an_arrow_that_makes_a_new_causal_path_also_joins_the_outcome_to_what_keeps_rows():
    #   x → a ← q, y by itself; rows are kept by q
    graph = CausalGraph.of(("x", "a"), ("q", "a"), nodes=["x", "y"])
    assert lost_arrows(graph, "q", [], "a") == ("y",)
    #   the same without q → a: nothing but another effect
    assert lost_arrows(CausalGraph.of(("x", "a"), nodes=["q", "y"]), "q", [], "a") == ()


def test_an_arrow_opens_what_lies_above_its_source():
    #   y ↔ c ↔ b → y and c → n → a ← q with b and n adjusted for; rows are kept by q = one value. With a → b also
    #   b must weight; it opens b as a collider, and c with it.
    graph = CausalGraph.of(
        ("b", "y"), ("c", "n"), ("n", "a"), ("q", "a"), bidirected=[("y", "c"), ("c", "b")], nodes=["x"]
    )
    assert "b" in lost_arrows(graph, "q", ["b", "n"], "a", fixed=True)
    #   without y ↔ c weighting by b is enough
    less = CausalGraph.of(
        ("b", "y"), ("c", "n"), ("n", "a"), ("q", "a"), bidirected=[("c", "b")], nodes=["x"]
    )
    assert lost_arrows(less, "q", ["b", "n"], "a", fixed=True) == ("y",)
