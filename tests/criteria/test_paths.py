"""Open paths from sets to sets, whatever blocks and opens: the nearest ones by definition, and which of several."""

from __future__ import annotations

import random
from collections import Counter

import pytest

from pathgate.criteria.paths import directed_path, find_open_path, find_open_paths, opened_by
from pathgate.criteria.reachability import Conditions
from pathgate.graphs import CausalGraph, read_graph
from tests.brute_paths import Path, all_directed_paths, all_paths, ancestors, is_open_given
from tests.criteria.asking import edges_exist, path_of
from tests.strategies import random_graph
from tests.values import Graph, node_names

SEEDS = [
    pytest.param(range(600), id="600"),
    pytest.param(range(600, 6000), id="5400", marks=pytest.mark.slow),
]
Names = frozenset[str]


def asked(seed: int) -> tuple[Graph, Names, Names, Names, Names]:
    """A graph, two sets that may meet, what blocks, and where colliders are open, which need not go together."""
    rng = random.Random(seed)
    value = random_graph(rng, rng.randint(3, 7), arrow=rng.choice([0.2, 0.35]), bidirected=0.15)
    starts, ends, blocking, other = (some(rng, value, share) for share in (0.2, 0.3, 0.3, 0.4))
    openers = rng.choice([blocking, other])
    return value, starts, ends, blocking, ancestors(value, openers)


def some(rng: random.Random, value: Graph, share: float) -> Names:
    return frozenset(name for name in node_names(value) if rng.random() < share)


def cost(path: Path, *, fewest_colliders: bool) -> tuple[int, int]:
    """What the search keeps small: the colliders first where they are asked about, then the length."""
    colliders = sum(is_collider for _node, is_collider in path.inner())
    return (colliders if fewest_colliders else 0), len(path.arrows)


@pytest.mark.parametrize("fewest_colliders", [False, True])
@pytest.mark.parametrize("seeds", SEEDS)
def test_each_end_is_found_once_by_a_nearest_open_path(seeds: range, *, fewest_colliders: bool):
    seen: Counter[bool] = Counter()
    for seed in seeds:
        value, starts, ends, blocking, opening = asked(seed)
        graph = read_graph(value)
        conditions = Conditions(graph.mask(blocking), graph.mask(opening))
        asking = (graph, graph.mask(starts), graph.mask(ends), conditions)
        trails = list(find_open_paths(*asking, fewest_colliders=fewest_colliders))
        paths = [path_of(trail, value) for trail in trails]
        for path in paths:
            assert path.nodes[0] in starts, seed
            assert edges_exist(path, value), seed
            assert len(set(path.nodes)) == len(path.nodes), seed
            assert is_open_given(path, blocking, opening), seed
        found = {path.nodes[-1]: cost(path, fewest_colliders=fewest_colliders) for path in paths}
        assert found == nearest(seed, fewest_colliders=fewest_colliders), seed
        assert len(found) == len(paths), seed
        assert list(found.values()) == sorted(found.values()), seed
        first = find_open_path(*asking, fewest_colliders=fewest_colliders)
        assert first == next(iter(trails), None), seed
        seen.update(is_collider for path in paths for _node, is_collider in path.inner())
    assert min(seen[True], seen[False]) > len(seeds) / 40, seen


def nearest(seed: int, *, fewest_colliders: bool) -> dict[str, tuple[int, int]]:
    """The least cost of an open path to each end, by listing them all."""
    value, starts, ends, blocking, opening = asked(seed)
    costs: dict[str, list[tuple[int, int]]] = {}
    for start in starts:
        for end in ends:
            for path in all_paths(value, start, end):
                if is_open_given(path, blocking, opening):
                    costs.setdefault(end, []).append(cost(path, fewest_colliders=fewest_colliders))
    return {end: min(found) for end, found in costs.items()}


@pytest.mark.parametrize("seeds", SEEDS)
def test_of_the_shortest_directed_paths_the_first_in_order_is_found(seeds: range):
    found = 0
    for seed in seeds:
        value, starts, ends, avoided, _opening = asked(seed)
        graph = read_graph(value)
        trail = directed_path(
            graph, graph.mask(starts), graph.mask(ends), avoiding=graph.mask(avoided) if seed % 2 else 0
        )
        barred = avoided if seed % 2 else frozenset()
        fitting = [
            tuple(graph.index[name] for name in nodes)
            for end in ends
            for nodes in all_directed_paths(value, ending_at=end)
            if nodes[0] in starts and not barred & set(nodes[1:])
        ]
        expected = min(fitting, key=lambda nodes: (len(nodes), nodes), default=None)
        assert (trail and trail.nodes) == expected, seed
        assert trail is None or trail.arrows == ("forward",) * (len(trail.nodes) - 1)
        found += expected is not None and len(expected) > 1
    assert found > len(seeds) / 20


def test_of_shortest_open_paths_the_one_with_the_lower_nodes_from_the_end_backwards_is_found():
    # late ← weather → refund, late ← strike → refund, late ← weather → ticket
    causes = [("weather", "late"), ("strike", "late"), ("strike", "refund"), ("weather", "refund")]
    graph = CausalGraph.of(*causes, ("weather", "ticket"), nodes=["strike"])
    late, ends = graph.mask("late"), graph.mask(["refund", "ticket"])
    trails = list(find_open_paths(graph, late, ends, Conditions()))
    told = [graph.names_of(1 << trail.nodes[1]) + graph.names_of(1 << trail.nodes[2]) for trail in trails]
    assert told == [("strike", "refund"), ("weather", "ticket")]


def test_a_longer_path_without_an_opened_collider_is_preferred_only_where_that_is_asked():
    # late → ticket ← refund with the ticket adjusted for; late ← weather → staff → refund
    graph = CausalGraph.of(
        ("late", "ticket"),
        ("refund", "ticket"),
        ("weather", "late"),
        ("weather", "staff"),
        ("staff", "refund"),
    )
    sides = graph.mask("late"), graph.mask("refund"), Conditions.on(graph, graph.mask("ticket"))
    shortest = find_open_path(graph, *sides)
    plainest = find_open_path(graph, *sides, fewest_colliders=True)
    assert shortest is not None
    assert plainest is not None
    assert [role for _node, role in shortest.inner] == ["collider"]
    assert [role for _node, role in plainest.inner] == ["fork", "chain"]


def test_a_collider_that_nothing_opens_has_no_way_down():
    graph = CausalGraph.of(("late", "ticket"), ("ticket", "refund"))
    with pytest.raises(AssertionError):
        opened_by(graph, graph.index["ticket"], graph.mask("late"))
