"""Promised independencies: all of them true, none missing, and what follows from each form by which rules."""

from __future__ import annotations

import random
from collections.abc import Iterable, Iterator
from itertools import combinations, product

import pytest

from pathgate.criteria import Deadline, Part, keep_rows
from pathgate.criteria.independencies import (
    basis,
    basis_sets,
    every_minimal,
    separable_pairs,
    sequential,
    smallest,
)
from pathgate.criteria.separable import Pairs, is_fully_measured
from pathgate.graphs import CausalGraph, read_graph
from tests.brute import minimal_separators, separated, separating_sets, with_selection
from tests.published.cases import load_published
from tests.strategies import all_dags, random_graph, random_parts
from tests.values import Graph, is_adjacent, measured_names

# What follows is derived by closure: not for a quick look.
pytestmark = pytest.mark.slow

NEVER = Deadline.never()
Statement = tuple[int, int, int]


def random_world(seed: int, most: int = 6) -> tuple[Graph, list[dict]]:
    rng = random.Random(seed)
    graph = random_graph(
        rng,
        rng.randint(2, most),
        arrow=rng.choice([0.25, 0.4]),
        bidirected=rng.choice([0, 0.1, 0.25]),
        unmeasured=rng.choice([0, 0.2]),
    )
    return graph, random_parts(rng, graph) if rng.random() < 0.4 else []


def pairs_of(value: Graph, parts: Iterable[dict]) -> Pairs:
    graph = read_graph(value)
    return Pairs(keep_rows(graph, [Part(graph.mask(p["columns"]), p["fixed"], p) for p in parts]))


@pytest.mark.parametrize(
    "seeds", [range(300), pytest.param(range(300, 2500), marks=pytest.mark.slow)], ids=["300", "2200"]
)
def test_pairs_sizes_and_minimal_sets_are_those_of_brute_force(seeds: range):
    for seed in seeds:
        value, parts = random_world(seed)
        pairs = pairs_of(value, parts)
        graph = pairs.kept.graph
        selected, conditioned = with_selection(value, parts)
        columns = [name for name in measured_names(value) if name not in conditioned]
        found = {(graph.name(a), graph.name(b)) for a, b in separable_pairs(pairs, NEVER)}
        stuck = {(graph.name(a), graph.name(b)) for a, b in pairs.inseparable(NEVER)}
        expected_minimal = set()
        for a, b in combinations(sorted(columns, key=graph.index.__getitem__), 2):
            if is_adjacent(value, a, b):
                assert (a, b) not in found | stuck
                continue
            every = separating_sets(selected, a, b, conditioned)
            assert ((a, b) in found, (a, b) in stuck) == (bool(every), not every), seed
            if every:
                first, second = graph.index[a], graph.index[b]
                least = smallest(pairs, first, second)
                assert least.given.bit_count() == min(map(len, every)), seed
                for statement in (least, basis(pairs, first, second)):
                    assert frozenset(graph.names_of(statement.given)) in every, seed
            expected_minimal |= {(a, b, one) for one in minimal_separators(selected, a, b, conditioned)}
        listed = [
            (graph.name(s.x), *graph.names_of(s.y), frozenset(graph.names_of(s.given)))
            for s in every_minimal(pairs, NEVER)
        ]
        assert len(listed) == len(set(listed))
        assert set(listed) == expected_minimal, seed


def test_an_inseparable_pair_is_joined_by_a_path_that_no_columns_block():
    for seed in range(400):
        value, parts = random_world(seed)
        pairs = pairs_of(value, parts)
        graph = pairs.kept.graph
        for first, second in pairs.inseparable(NEVER):
            trail = pairs.inducing_path(first, second)
            above = {first, second, *graph.members(pairs.kept.conditioned)}
            reach = {node for node in range(graph.size) if descends(graph, node) & above}
            assert (trail.nodes[0], trail.nodes[-1]) == (first, second)
            for node, role in trail.inner:
                assert node in reach if role == "collider" else not graph.measured >> node & 1, seed


def descends(graph: CausalGraph, node: int) -> set[int]:
    found, waiting = {node}, [node]
    while waiting:
        new = set(graph.children(waiting.pop())) - found
        found |= new
        waiting += new
    return found


def test_a_fully_measured_dag_has_one_basis_statement_a_missing_arrow():
    for value in all_dags(4):
        graph = read_graph(value)
        pairs = Pairs(keep_rows(graph))
        missing = 6 - len(value["edges"])
        assert len(list(separable_pairs(pairs, NEVER))) == missing
        assert len(list(sequential(graph))) == missing
        for statement in (*sequential(graph), *basis_sets(graph, NEVER)):
            names = graph.names_of
            assert separated(value, graph.name(statement.x), names(statement.y), names(statement.given))


def test_published_bases_and_inseparable_pairs():
    seen = 0
    for case in load_published()["cases"]:
        pairs = pairs_of(case["graph"], [])
        graph = pairs.kept.graph
        if "basis" in case:
            found = {
                (graph.name(a), graph.name(b), frozenset(graph.names_of(basis(pairs, a, b).given)))
                for a, b in separable_pairs(pairs, NEVER)
            }
            assert found == {(row["x"], row["y"], frozenset(row["given"])) for row in case["basis"]}
            seen += 1
        if "inseparable" in case:
            stuck = {frozenset((graph.name(a), graph.name(b))) for a, b in pairs.inseparable(NEVER)}
            assert stuck == {frozenset(pair) for pair in case["inseparable"]}
            seen += 1
        if "minimal_separations" in case:
            listed = {
                (graph.name(s.x), *graph.names_of(s.y), frozenset(graph.names_of(s.given)))
                for s in every_minimal(pairs, NEVER)
            }
            rows = {(row["x"], row["y"], frozenset(row["given"])) for row in case["minimal_separations"]}
            assert {(frozenset(one[:2]), one[2]) for one in listed} == {
                (frozenset(one[:2]), one[2]) for one in rows
            }
            seen += 1
    assert seen == 4


def test_all_independencies_follow_from_the_basis_by_the_graphoid_rules_with_composition():
    for value in worlds_of_four():
        pairs = pairs_of(value, [])
        if not is_fully_measured(pairs.kept.graph):
            continue
        stated = [(1 << s.x, s.y, s.given) for s in (basis(pairs, *p) for p in separable_pairs(pairs, NEVER))]
        assert closure(stated, is_graphoid=True) == all_true(value)


def test_all_independencies_follow_from_the_sets_by_the_semigraphoid_rules_alone():
    for value in worlds_of_four():
        graph = read_graph(value)
        place = {graph.index[name]: k for k, name in enumerate(measured_names(value))}

        def small(mask: int, place: dict[int, int] = place, graph: CausalGraph = graph) -> int:
            return sum(1 << place[node] for node in graph.members(mask))

        stated = [(small(1 << s.x), small(s.y), small(s.given)) for s in basis_sets(graph, NEVER)]
        assert closure(stated, is_graphoid=False) == all_true(value), value


def test_three_columns_of_which_each_is_the_exclusive_or_of_the_others_keep_the_basis_and_break_a_statement():
    rows = [(a, b, a ^ b) for a, b in product((0, 1), repeat=2)]
    pairs = Pairs(keep_rows(CausalGraph.of(nodes=["a", "b", "c"])))
    stated = [basis(pairs, *pair) for pair in separable_pairs(pairs, NEVER)]
    assert [(s.x, s.y, s.given) for s in stated] == [(0, 2, 0), (0, 4, 0), (1, 4, 0)]
    assert all(is_independent(rows, [s.x], [s.y.bit_length() - 1]) for s in stated)
    assert not is_independent(rows, [2], [0, 1])
    assert any(s.y.bit_count() == 2 for s in basis_sets(pairs.kept.graph, NEVER))


def is_independent(rows: list[tuple[int, ...]], xs: list[int], ys: list[int]) -> bool:
    def share(columns: list[int], values: tuple[int, ...]) -> float:
        return sum(tuple(row[c] for c in columns) == values for row in rows) / len(rows)

    values = list(product((0, 1), repeat=len(xs) + len(ys)))
    cut = len(xs)
    return all(share(xs + ys, v) == share(xs, v[:cut]) * share(ys, v[cut:]) for v in values)


def worlds_of_four() -> Iterator[Graph]:
    yield from list(all_dags(4))[::6]
    rng = random.Random(11)
    for _ in range(60):
        yield random_graph(rng, 4, arrow=0.4, bidirected=0.3, unmeasured=0)
        yield random_graph(rng, 5, arrow=0.4, bidirected=0.15, unmeasured=0.25)


def triples(size: int) -> Iterator[Statement]:
    """All (x, y, given) of disjoint sets, x and y not empty."""
    for placed in product(range(4), repeat=size):
        x, y, given = (sum(1 << k for k in range(size) if placed[k] == side) for side in (1, 2, 3))
        if x and y:
            yield x, y, given


def all_true(value: Graph) -> set[Statement]:
    names = measured_names(value)

    def named(mask: int) -> list[str]:
        return [name for k, name in enumerate(names) if mask >> k & 1]

    return {one for one in triples(len(names)) if separated(value, *map(named, one))}


def closure(stated: Iterable[Statement], *, is_graphoid: bool) -> set[Statement]:
    """What follows by symmetry, decomposition, weak union and contraction; as a graphoid also by intersection
    and composition."""
    known = set(stated)
    while True:
        new = {(y, x, z) for x, y, z in known}
        new |= {
            one
            for x, y, z in known
            for part in subsets_of(y)
            for one in ((x, part, z), (x, part, z | y & ~part))
        }
        new |= {one for pair in product(known, repeat=2) for one in joined(*pair, is_graphoid=is_graphoid)}
        if new <= known:
            return known
        known |= new


def joined(one: Statement, other: Statement, *, is_graphoid: bool) -> Iterator[Statement]:
    """What follows from two statements about the same x."""
    (x, y, z), (x2, w, z2) = one, other
    if x != x2 or y & w:
        return
    is_contraction = z2 == z | y and not w & z
    is_composition = is_graphoid and z == z2
    if is_contraction or is_composition:
        yield x, y | w, z
    if is_graphoid and z2 & y == y and z & w == w and z2 & ~y == z & ~w:
        yield x, y | w, z & ~w


def subsets_of(mask: int) -> Iterator[int]:
    part = mask
    while part:
        yield part
        part = (part - 1) & mask
