"""The oracles give every published answer, so that what they say of other graphs can be believed."""

from __future__ import annotations

from itertools import combinations
from typing import Any

import numpy as np
import pytest

from tests.brute import (
    Path,
    all_paths,
    inseparable_pairs,
    is_open,
    is_valid_adjustment,
    is_valid_direct,
    minimal_separators,
    separated,
    subsets,
    valid_sets,
    with_selection,
)
from tests.brute_classes import class_members, signature
from tests.linear_worlds import (
    adjustment_holds,
    direct_effect_holds,
    draw_world,
    estimate_variance,
)
from tests.published.cases import load_published, rows_of, selected_on
from tests.strategies import all_dags
from tests.values import (
    Graph,
    arrows_of,
    is_adjacent,
    measured_names,
    node_names,
)

Row = dict[str, Any]


def named(kind: str) -> list[Any]:
    rows = rows_of(kind)
    return [pytest.param(graph, row, id=f"{name}-{place}") for place, (name, graph, row) in enumerate(rows)]


def test_every_case_names_its_source():
    cases = load_published()["cases"]
    assert len(cases) == 35
    assert all(case["source"] for case in cases)
    assert len({case["name"] for case in cases}) == len(cases)


@pytest.mark.parametrize(("graph", "row"), named("separation"))
def test_separations_are_as_published(graph: Graph, row: list[Any]):
    x, y, given, expected = row
    assert separated(graph, x, y, given) is expected


@pytest.mark.parametrize(("graph", "row"), named("adjustment"))
def test_valid_and_invalid_sets_are_as_published(graph: Graph, row: Row):
    selected, conditioned = with_selection(graph, selected_on(row))
    asks = row.get("asks", "total")
    found = valid_sets(selected, row["treatment"], row["outcome"], conditioned, asks=asks)
    assert all(frozenset(columns) in found for columns in row.get("valid", []))
    assert not any(frozenset(columns) in found for columns in row.get("invalid", []))
    if "exists" in row:
        assert bool(found) is row["exists"]


@pytest.mark.parametrize(("graph", "row"), named("adjustment"))
def test_linear_worlds_agree_on_every_set_of_every_published_graph(graph: Graph, row: Row):
    selected, conditioned = with_selection(graph, selected_on(row))
    (treatment,), (outcome,) = row["treatment"], row["outcome"]
    is_direct = row.get("asks") == "direct"
    holds, is_valid = (
        (direct_effect_holds, is_valid_direct) if is_direct else (adjustment_holds, is_valid_adjustment)
    )
    free = [name for name in measured_names(graph) if name not in (treatment, outcome)]
    for chosen in subsets(free):
        question = (selected, treatment, outcome, chosen, conditioned)
        assert holds(*question) is is_valid(*question), sorted(chosen)


def test_the_set_published_as_most_precise_has_the_least_variance_in_linear_worlds():
    rows = [(graph, row) for _, graph, row in rows_of("adjustment") if "most_precise" in row]
    for graph, row in rows:
        (treatment,), (outcome,) = row["treatment"], row["outcome"]
        for seed in range(20):
            world = draw_world(graph, np.random.default_rng(seed))
            variance = {
                chosen: estimate_variance(world, treatment, outcome, chosen)
                for chosen in valid_sets(graph, treatment, outcome)
            }
            assert min(variance, key=variance.__getitem__) == frozenset(row["most_precise"])
    assert len(rows) == 1


@pytest.mark.parametrize(("graph", "pair"), named("inseparable"))
def test_pairs_published_as_inseparable_are_all_the_inseparable_ones(graph: Graph, pair: list[str]):
    assert inseparable_pairs(graph) == {frozenset(pair)}


def test_minimal_separations_are_exactly_those_published():
    by_case: dict[str, tuple[Graph, set[tuple[frozenset[str], frozenset[str]]]]] = {}
    for name, graph, row in rows_of("minimal_separations"):
        statement = (frozenset([row["x"], row["y"]]), frozenset(row["given"]))
        by_case.setdefault(name, (graph, set()))[1].add(statement)
    for graph, published in by_case.values():
        pairs = list(combinations(measured_names(graph), 2))
        found = {
            (frozenset(pair), given)
            for pair in pairs
            if not is_adjacent(graph, *pair)
            for given in minimal_separators(graph, *pair)
        }
        assert found == published
    assert len(by_case) == 1


def test_the_published_basis_holds_with_one_statement_for_each_pair_without_an_edge():
    rows = rows_of("basis")
    graph = rows[0][1]
    pairs = [pair for pair in combinations(node_names(graph), 2) if not is_adjacent(graph, *pair)]
    assert sorted(sorted([row["x"], row["y"]]) for _, _, row in rows) == sorted(map(sorted, pairs))
    for _, _, row in rows:
        parents = {s for s, target in arrows_of(graph) if target in (row["x"], row["y"])}
        assert set(row["given"]) == parents - {row["x"], row["y"]}
        assert separated(graph, row["x"], row["y"], row["given"])


@pytest.mark.parametrize(("graph", "row"), named("equivalence"))
def test_classes_have_the_published_size_and_compelled_arrows(graph: Graph, row: Row):
    members = class_members(graph)
    assert len(members) == row["class_size"]
    shared = set.intersection(*(set(arrows_of(member)) for member in members))
    if "compelled" in row:
        assert shared == {tuple(arrow) for arrow in row["compelled"]}


@pytest.mark.parametrize("size", [1, 2, 3, 4])
def test_dags_fall_into_the_published_number_of_classes_by_their_separations(size: int):
    """By separations, not by the rule of skeleton and colliders: the two must give the same classes."""
    classes: dict[frozenset[Any], set[Any]] = {}
    for graph in all_dags(size):
        names = node_names(graph)
        holds = frozenset(
            (pair, given)
            for pair in combinations(names, 2)
            for given in subsets(name for name in names if name not in pair)
            if separated(graph, *pair, given)
        )
        classes.setdefault(holds, set()).add(signature(graph))
    counts = load_published()["counts"]
    assert len(classes) == counts["Markov equivalence classes on 1..5 nodes (OEIS A007984)"][size - 1]
    assert all(len(signatures) == 1 for signatures in classes.values())


@pytest.mark.parametrize(("graph", "row"), named("tetrads"))
def test_published_tetrads_vanish_in_linear_worlds(graph: Graph, row: list[list[str]]):
    world = draw_world(graph, np.random.default_rng(1))
    covariances = world.among(*row)
    assert np.abs(covariances).min() > 0.01
    assert abs(np.linalg.det(covariances)) < 1e-10


def test_the_front_door_numbers_follow_from_the_published_table():
    (case,) = [case for case in load_published()["cases"] if "numbers" in case]
    share, given = case["numbers"]["share"], case["numbers"]["p(y=1|x,z)"]
    of_x = {x: share[f"x={x},z=0"] + share[f"x={x},z=1"] for x in (0, 1)}
    inner = {z: sum(of_x[x] * given[f"x={x},z={z}"] for x in (0, 1)) for z in (0, 1)}
    for x in (0, 1):
        effect = sum(share[f"x={x},z={z}"] / of_x[x] * inner[z] for z in (0, 1))
        assert effect == pytest.approx(case["numbers"][f"p(y=1|do(x={x}))"], abs=1e-12)


def test_published_front_doors_meet_the_definition():
    """Pearl 1995: every causal path passes the set; its own back-door paths are blocked, first and last."""
    rows = [(graph, row) for _, graph, row in rows_of("identification") if "front_door" in row]
    for graph, row in rows:
        (treatment,), (outcome,), (column,) = row["treatment"], row["outcome"], row["front_door"]
        causal = [path for path in all_paths(graph, treatment, outcome) if path.is_causal]
        assert all(column in path.nodes for path in causal)
        assert not any(is_open(graph, path, []) for path in back_door_paths(graph, treatment, column))
        assert not any(is_open(graph, path, [treatment]) for path in back_door_paths(graph, column, outcome))
    assert len(rows) == 1


def back_door_paths(graph: Graph, start: str, end: str) -> list[Path]:
    """The paths that begin with an arrowhead at ``start``."""
    return [path for path in all_paths(graph, start, end) if path.arrows[0] != "forward"]
