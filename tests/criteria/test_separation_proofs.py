"""What comes with a separation: blockers of the shortest paths, smallest separating sets, many at once."""

from __future__ import annotations

import random

import pytest

from pathgate.criteria import Deadline, OutOfTime, Separators, separation
from pathgate.criteria.batch import separated_each
from pathgate.criteria.reachability import Conditions, connected
from pathgate.graphs import CausalGraph, read_graph
from tests.brute import (
    ancestors,
    inclusion_minimal,
    minimal_separators,
    separated,
    separating_sets,
    smallest_separators,
)
from tests.brute_paths import all_paths
from tests.criteria.asking import edges_exist, path_of
from tests.strategies import Question, random_graph, random_question
from tests.values import Graph, measured_names

MANY = [
    pytest.param(range(400), id="400"),
    pytest.param(range(400, 2500), id="2100", marks=pytest.mark.slow),
]


def asked_graph(seed: int, most_nodes: int = 7) -> tuple[random.Random, Graph, Question]:
    rng = random.Random(seed)
    value = random_graph(rng, rng.randint(2, most_nodes), arrow=rng.choice([0.25, 0.4]), bidirected=0.12)
    return rng, value, random_question(rng, value, single=rng.random() < 0.7)


@pytest.mark.parametrize("seeds", MANY)
def test_blockers_lie_on_the_shortest_paths_and_do_block_them(seeds: range):
    told = 0
    for seed in seeds:
        rng, value, asked = asked_graph(seed)
        graph, wanted = read_graph(value), rng.randint(0, 6)
        answer = separation(graph, asked.x, asked.y, asked.given, paths=wanted)
        if not answer.separated:
            assert answer.blockers == ()
            continue
        expected = shortest_lengths(value, asked)[:wanted]
        assert [len(blocker.path.arrows) for blocker in answer.blockers] == expected, seed
        assert len(set(answer.blockers)) == len(answer.blockers)
        for blocker in answer.blockers:
            path, node = path_of(blocker.path, value), graph.name(blocker.node)
            assert edges_exist(path, value)
            assert len(set(path.nodes)) == len(path.nodes)
            assert {path.nodes[0]} <= set(asked.x)
            assert {path.nodes[-1]} <= set(asked.y)
            is_collider = dict(path.inner())[node]
            assert (blocker.role == "collider") is is_collider
            if is_collider:
                assert blocker.because == "collider-not-conditioned"
                assert node not in ancestors(value, asked.given)
            else:
                assert (blocker.because, node in asked.given) == ("conditioned", True)
            told += 1
    assert told > len(seeds) / 8


def shortest_lengths(value: Graph, asked: Question) -> list[int]:
    """The lengths of all paths from x to y that meet neither set in between."""
    ends = set(asked.x + asked.y)
    paths = [path for x in asked.x for y in asked.y for path in all_paths(value, x, y)]
    return sorted(len(path.arrows) for path in paths if not ends & set(path.nodes[1:-1]))


@pytest.mark.parametrize("seeds", MANY)
def test_the_separator_is_a_smallest_set_of_measured_nodes_or_null_where_there_is_none(seeds: range):
    found = 0
    for seed in seeds:
        _, value, asked = asked_graph(seed)
        answer = separation(read_graph(value), asked.x, asked.y, asked.given)
        smallest = smallest_separators(value, asked.x, asked.y)
        if not smallest:
            assert answer.separator is None, seed
            continue
        assert answer.separator is not None, seed
        assert frozenset(answer.separator) in smallest, seed
        found += 1
    assert found > len(seeds) / 4


@pytest.mark.parametrize("seeds", MANY)
def test_separating_sets_within_bounds_are_found_where_there_are_any(seeds: range):
    for seed in seeds:
        rng, value, asked = asked_graph(seed)
        graph = read_graph({**value, "nodes": with_costs(value, rng)})
        measured = measured_names(value)
        allowed = {name for name in measured if rng.random() < 0.8}
        bounds = Separators(
            graph, graph.mask(asked.x), graph.mask(asked.y), graph.mask(asked.given), graph.mask(allowed)
        )
        within = [
            one | frozenset(asked.given)
            for one in separating_sets(value, asked.x, asked.y, asked.given)
            if one <= allowed
        ]
        assert bounds.exists is bool(within), seed
        minimal = [frozenset(graph.names_of(mask)) for mask in bounds.every_minimal(Deadline.never())]
        assert len(set(minimal)) == len(minimal), seed
        assert set(minimal) == set(inclusion_minimal(within)), seed
        chosen = [bounds.minimal(), bounds.smallest(), bounds.cheapest()]
        if not within:
            assert chosen == [None, None, None], seed
            continue
        one, smallest, cheapest = (frozenset(graph.names_of(mask or 0)) for mask in chosen)
        assert one in minimal, seed
        assert smallest in minimal, seed
        assert len(smallest) == min(map(len, within)), seed

        def cost(names: frozenset[str], graph: CausalGraph = graph) -> float:
            return sum(graph.cost(graph.index[name]) for name in names)

        assert cost(cheapest) == pytest.approx(min(map(cost, within))), seed
        assert cheapest in within, seed


def with_costs(value: Graph, rng: random.Random) -> list[dict]:
    return [{**node, "cost": rng.choice([0.5, 1, 2.25, 7])} for node in value["nodes"]]


def test_all_minimal_separating_sets_of_a_pair_in_larger_graphs():
    for seed in range(25):
        rng = random.Random(seed)
        value = random_graph(rng, 9, arrow=0.3, bidirected=0.05)
        x, y = rng.sample(measured_names(value), 2)
        graph = read_graph(value)
        bounds = Separators(graph, graph.mask(x), graph.mask(y), 0, graph.measured)
        listed = {frozenset(graph.names_of(mask)) for mask in bounds.every_minimal(Deadline.never())}
        assert listed == set(minimal_separators(value, x, y)), seed


@pytest.mark.parametrize("statements", [1, 7, 70])
def test_many_statements_at_once_get_the_verdicts_of_each_alone(statements: int):
    for seed in range(60):
        rng = random.Random(seed)
        value = random_graph(rng, rng.randint(2, 7), arrow=0.35, bidirected=rng.choice([0, 0.15]))
        graph = read_graph(value)
        asked = [random_question(rng, value) for _ in range(statements)]
        masks = [(graph.mask(one.x), graph.mask(one.y), graph.mask(one.given)) for one in asked]
        expected = [separated(value, one.x, one.y, one.given) for one in asked]
        assert list(separated_each(graph, masks, Deadline.never())) == expected, seed


def test_one_search_sorts_all_nodes_as_asking_about_each_would():
    for seed in range(300):
        _, value, asked = asked_graph(seed)
        graph = read_graph(value)
        xs, given = graph.mask(asked.x), graph.mask(asked.given)
        found = connected(graph, xs, Conditions.on(graph, given))
        for name in set(graph.names) - set(asked.x + asked.given):
            joined = not separated(value, asked.x, name, asked.given)
            assert bool(found >> graph.index[name] & 1) is joined, (seed, name)


def test_a_long_question_is_cut_off_in_the_midst_of_its_answer():
    names = [f"c{k}" for k in range(9)]
    arrows = [(one, other) for place, one in enumerate(names) for other in names[place + 1 :]]
    graph = CausalGraph.of(("x", "a"), ("y", "a"), *((name, "a") for name in names), *arrows)
    bounds = Separators(graph, graph.mask("x"), graph.mask("y"), 0, graph.measured)
    statements = [(graph.mask("x"), graph.mask("y"), graph.mask(name)) for name in names]
    for ask in (
        lambda deadline: list(bounds.every_minimal(deadline)),
        lambda deadline: separated_each(graph, statements, deadline),
        lambda deadline: separated_each(graph, statements[:2], deadline),
        lambda deadline: separation(graph, "x", "y", deadline=deadline),
    ):
        ask(Deadline.never())
        moments = iter([0.0])
        with pytest.raises(OutOfTime):
            ask(Deadline(1, clock=lambda moments=moments: next(moments, 2.0)))
