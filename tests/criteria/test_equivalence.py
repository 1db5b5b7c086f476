"""Classes of DAGs with the same independencies: counted, listed and told apart, against every DAG there is."""

from __future__ import annotations

import random
from collections.abc import Iterable, Iterator
from itertools import combinations, permutations
from math import factorial
from typing import Any

import pytest

from pathgate.criteria import (
    Deadline,
    DifferentNodes,
    Equivalence,
    OutOfTime,
    are_equivalent,
    distinguishing,
    equivalence,
)
from pathgate.graphs import CausalGraph, read_graph
from tests.brute import separated, subsets
from tests.brute_classes import (
    all_permutations_of,
    chordal_dag,
    class_members,
    count_by_sources,
    signature,
)
from tests.published.cases import load_published, rows_of
from tests.strategies import all_dags, random_graph, shuffled
from tests.values import Graph, arrows_of, graph_of, node_names, topological_names

# Classes are counted member by member: not for a quick look.
pytestmark = pytest.mark.slow

Arrows = frozenset[tuple[str, str]]
Times = dict[str, int]

NEVER = Deadline.never()
COUNTS = load_published()["counts"]
SEEDS = [
    pytest.param(range(300), id="300"),
    pytest.param(range(300, 2500), id="2200", marks=pytest.mark.slow),
]


def arrow_set(graph: CausalGraph) -> Arrows:
    pairs = zip(graph.sources.tolist(), graph.targets.tolist(), strict=True)
    return frozenset((graph.name(source), graph.name(target)) for source, target in pairs)


def with_times(graph: Graph, times: Times) -> Graph:
    nodes = [{"id": name, "recorded": times[name]} if name in times else name for name in node_names(graph)]
    return {**graph, "nodes": nodes}


def classes_of(size: int, *, by_skeleton: bool) -> list[list[CausalGraph]]:
    """All DAGs of a size, each with those that the function under test calls equivalent to the first of them."""
    shelves: dict[frozenset[Any], list[list[CausalGraph]]] = {}
    for graph in map(read_graph, all_dags(size)):
        shelf = shelves.setdefault(
            frozenset(map(frozenset, arrow_set(graph))) if by_skeleton else frozenset(), []
        )
        own = next((each for each in shelf if are_equivalent(each[0], graph, NEVER)), None)
        if own is None:
            shelf.append([graph])
        else:
            own.append(graph)
    return [each for shelf in shelves.values() for each in shelf]


@pytest.mark.parametrize("size", [1, 2, 3, 4, pytest.param(5, marks=pytest.mark.slow)])
def test_all_dags_fall_into_the_published_number_of_classes_each_counted_exactly(size: int):
    # On five nodes DAGs of different skeletons are not compared: that is 29,281 by 8,782 pairs.
    found = classes_of(size, by_skeleton=size == 5)
    assert len(found) == COUNTS["Markov equivalence classes on 1..5 nodes (OEIS A007984)"][size - 1]
    assert sum(map(len, found)) == COUNTS["labelled DAGs on 1..5 nodes (OEIS A003024)"][size - 1]
    for members in found:
        shared = frozenset.intersection(*map(arrow_set, members))
        for member in members:
            answer = equivalence(member, NEVER)
            assert answer.class_size == len(members)
            assert frozenset(answer.compelled) == shared
            assert frozenset(answer.reversible) == arrow_set(member) - shared
            assert answer.fixed_by_time == ()


@pytest.mark.parametrize(
    ("graph", "row"), [pytest.param(*row, id=name) for name, *row in rows_of("equivalence")]
)
def test_classes_are_as_published(graph: Graph, row: dict[str, Any]):
    answer = equivalence(read_graph(graph), NEVER)
    assert answer.class_size == row["class_size"]
    if "compelled" in row:
        assert set(answer.compelled) == {tuple(arrow) for arrow in row["compelled"]}


def dag_with_times(rng: random.Random) -> tuple[Graph, Times]:
    """A DAG of up to nine edges, and times of some of its nodes that no arrow contradicts."""
    while True:
        nodes = rng.randint(3, 7)
        is_chordal = rng.random() < 0.7
        graph = (
            chordal_dag(rng, nodes, rng.randint(1, 3))
            if is_chordal
            else random_graph(rng, nodes, bidirected=0, unmeasured=0)
        )
        if len(arrows_of(graph)) <= 9:
            order = topological_names(graph) or []
            told = {name for name in order if rng.random() < 0.2}
            told.update(rng.choice(arrows_of(graph) or [()]))
            days = rng.choice([1, 2])
            return graph, {name: place // days for place, name in enumerate(order) if name in told}


def respects(arrows: Iterable[tuple[str, str]], times: Times) -> bool:
    return not any(times[a] > times[b] for a, b in arrows if a in times and b in times)


@pytest.mark.parametrize("seeds", SEEDS)
def test_arrows_are_told_apart_as_the_members_of_the_class_and_the_times_have_it(seeds: range):
    seen = {"compelled": 0, "reversible": 0, "forced": 0}
    for seed in seeds:
        graph, times = dag_with_times(random.Random(seed))
        answer = equivalence(read_graph(with_times(graph, times)), NEVER)
        members = [frozenset(arrows_of(member)) for member in class_members(graph)]
        compelled = frozenset.intersection(*members)
        known = frozenset.intersection(*(member for member in members if respects(member, times)))
        assert frozenset(answer.compelled) == compelled, seed
        assert frozenset(answer.fixed_by_time) == known - compelled, seed
        assert frozenset(answer.reversible) == frozenset(arrows_of(graph)) - known, seed
        assert answer.class_size == len(members), seed
        seen["compelled"] += len(compelled)
        seen["reversible"] += len(answer.reversible)
        seen["forced"] += sum(
            times.get(a) == times.get(b) or not {a, b} <= times.keys() for a, b in answer.fixed_by_time
        )
    assert all(number > len(seeds) / 10 for number in seen.values()), seen


def test_every_arrow_stands_in_one_list_in_the_order_of_the_nodes():
    for seed in range(100):
        graph, times = dag_with_times(random.Random(seed))
        answer = equivalence(read_graph(with_times(graph, times)), NEVER)
        lists = (answer.compelled, answer.reversible, answer.fixed_by_time)
        assert sorted(arrow for each in lists for arrow in each) == sorted(arrows_of(graph))
        place = node_names(graph).index
        for each in lists:
            assert list(each) == sorted(each, key=lambda arrow: tuple(map(place, arrow)))


def test_times_force_arrows_beyond_those_they_fix():
    # promotion (1) → parcels (2), so parcels → locker
    chain = graph_of(("promotion", "parcels"), ("parcels", "locker"))
    assert fixed(chain, {"promotion": 1, "parcels": 2}) == {("promotion", "parcels"), ("parcels", "locker")}
    triangle = graph_of(("a", "b"), ("b", "c"), ("a", "c"))
    assert fixed(triangle, {"a": 1, "b": 2}) == {("a", "b")}
    assert fixed(triangle, {"a": 1, "c": 2}) == {("a", "c")}
    # d and a (1) → b (2), so b → c, which d is not joined to, and a → c past b
    kite = graph_of(("a", "d"), ("a", "b"), ("d", "b"), ("b", "c"), ("a", "c"))
    assert fixed(kite, {"a": 1, "d": 1, "b": 2}) == {("a", "b"), ("d", "b"), ("b", "c"), ("a", "c")}
    # d → c → b with d, b apart; a joined to all three: a → b is forced, a – c and a – d are not
    diamond = graph_of(("d", "a"), ("d", "c"), ("a", "c"), ("c", "b"), ("a", "b"))
    assert fixed(diamond, {"d": 1, "c": 2}) == {("d", "c"), ("c", "b"), ("a", "b")}


def fixed(graph: Graph, times: Times) -> set[tuple[str, str]]:
    return set(equivalence(read_graph(with_times(graph, times)), NEVER).fixed_by_time)


@pytest.mark.parametrize("seeds", SEEDS)
def test_chordal_graphs_are_counted_as_by_their_sources(seeds: range):
    sizes = set()
    for seed in seeds:
        rng = random.Random(seed)
        graph = chordal_dag(rng, rng.randint(2, 10), rng.randint(1, 5))
        counted = equivalence(read_graph(shuffled(graph, rng)), NEVER).class_size
        assert counted == count_by_sources(graph), seed
        if len(node_names(graph)) <= 6:
            assert counted == len(all_permutations_of(graph)), seed
        sizes.add(counted)
    assert len(sizes) > 50


def test_unlinked_parts_multiply():
    parts = [graph_of(("a", "b")), graph_of(("c", "d"), ("d", "e")), graph_of(isolated=["f"])]
    arrows = [arrow for part in parts for arrow in arrows_of(part)]
    assert equivalence(read_graph(graph_of(*arrows, isolated=["f"])), NEVER).class_size == 2 * 3
    assert equivalence(CausalGraph.of(), NEVER) == Equivalence((), (), (), 1)


class Looks:
    """A clock that stands still and counts how often it is looked at, and strikes after ``allowed`` looks."""

    def __init__(self, allowed: float = float("inf")) -> None:
        self.taken, self.allowed = 0, allowed

    def __call__(self) -> float:
        self.taken += 1
        return 0.0 if self.taken <= self.allowed else 2.0


def test_the_class_of_a_complete_graph_of_100_nodes_is_all_their_orders():
    names = [f"n{number}" for number in range(100)]
    complete = CausalGraph.of(*combinations(names, 2))
    assert equivalence(complete, NEVER).class_size == factorial(100)


@pytest.mark.parametrize("shape", ["random", "path", "star"])
def test_a_tree_of_10_000_nodes_takes_steps_in_proportion(shape: str):
    rng = random.Random(1)
    above = {"random": rng.randrange, "path": lambda node: node - 1, "star": lambda _: 0}[shape]
    tree = CausalGraph.of(*((f"n{above(node)}", f"n{node}") for node in range(1, 10_000)))
    looks = Looks()
    answer = equivalence(tree, Deadline(1, looks))
    # Each node of a tree can be its only source.
    assert answer.class_size == 10_000
    assert looks.taken < 100_000


@pytest.mark.parametrize("question", ["arrows", "distinction"])
def test_any_look_at_the_clock_can_be_the_last(question: str):
    value = chordal_dag(random.Random(7), 10)
    first = arrows_of(value)[0]
    graph = read_graph(with_times(value, {first[0]: 1, first[1]: 2}))
    other = graph.without_edge(("directed", int(graph.sources[-1]), int(graph.targets[-1])))

    def ask(deadline: Deadline) -> None:
        if question == "arrows":
            equivalence(graph, deadline)
        else:
            distinguishing(graph, other, deadline)

    looks = Looks()
    ask(Deadline(1, looks))
    assert looks.taken > 1
    for allowed in range(1, looks.taken):
        with pytest.raises(OutOfTime):
            ask(Deadline(1, Looks(allowed)))


def pairs_of_dags(seeds: range) -> Iterator[tuple[Graph, Graph]]:
    """Two DAGs over the same nodes: often one change apart, now and then of one class, their nodes shuffled."""
    for seed in seeds:
        rng = random.Random(seed)
        graph = random_graph(rng, rng.randint(2, 5), arrow=rng.choice([0.4, 0.7]), bidirected=0, unmeasured=0)
        kind = rng.choice(["any", "reversed", "class"])
        if kind == "class":
            other = rng.choice(class_members(graph))
        elif kind == "reversed":
            other = turned(rng, graph)
        else:
            names = rng.sample(node_names(graph), len(node_names(graph)))
            arrows = [pair for pair in combinations(names, 2) if rng.random() < 0.5]
            other = graph_of(*arrows, isolated=names)
        yield graph, shuffled(other, rng)


def turned(rng: random.Random, graph: Graph) -> Graph:
    """The same edges along another order of the nodes."""
    joined = set(map(frozenset, arrows_of(graph)))
    names = rng.sample(node_names(graph), len(node_names(graph)))
    return graph_of(*(pair for pair in combinations(names, 2) if frozenset(pair) in joined), isolated=names)


def statements(graph: Graph) -> set[tuple[frozenset[str], frozenset[str]]]:
    """Every separation of a pair, by definition."""
    names = node_names(graph)
    return {
        (frozenset(pair), given)
        for pair in combinations(names, 2)
        for given in subsets(name for name in names if name not in pair)
        if separated(graph, *pair, given)
    }


@pytest.mark.parametrize("seeds", SEEDS)
def test_dags_are_told_apart_exactly_where_their_separations_differ_and_by_one_that_does(seeds: range):
    told = {"graph": 0, "other": 0, None: 0}
    for graph, other in pairs_of_dags(seeds):
        holds = {"graph": statements(graph), "other": statements(other)}
        read = read_graph(graph), read_graph(other)
        found = distinguishing(*read, NEVER)
        assert (found is None) == (holds["graph"] == holds["other"]) == (signature(graph) == signature(other))
        assert are_equivalent(*read, NEVER) is (found is None)
        told[found.holds_in if found else None] += 1
        if found is None:
            continue
        statement = (frozenset([found.x, found.y]), frozenset(found.given))
        assert [side for side in holds if statement in holds[side]] == [found.holds_in]
        # No column of it is to spare.
        assert not any(
            (statement[0], fewer) in holds[found.holds_in]
            for fewer in subsets(found.given)
            if fewer < statement[1]
        )
        place = node_names(graph).index
        assert place(found.x) < place(found.y)
        assert list(found.given) == sorted(found.given, key=place)
    assert all(number > len(seeds) / 8 for number in told.values()), told


def test_the_statement_names_the_first_pair_that_lacks_an_edge_in_one():
    graph = CausalGraph.of(("a", "b"), ("b", "c"), ("c", "d"))
    other = CausalGraph.of(("d", "c"), ("c", "b"), nodes=["d", "c", "b", "a"])
    found = distinguishing(graph, other, NEVER)
    assert (found.x, found.y, found.given, found.holds_in) == ("a", "b", (), "other")
    found = distinguishing(other, graph, NEVER)
    assert (found.x, found.y, found.given, found.holds_in) == ("b", "a", (), "graph")


def test_of_two_answers_about_a_collider_the_shorter_is_given():
    # promotion → parcels ← weather, and the same turned: promotion ← parcels → weather
    collider = CausalGraph.of(("promotion", "parcels"), ("weather", "parcels"))
    fork = CausalGraph.of(("parcels", "promotion"), ("parcels", "weather"), nodes=["promotion"])
    found = distinguishing(fork, collider, NEVER)
    assert (found.x, found.y, found.given, found.holds_in) == ("promotion", "weather", (), "other")


def test_every_two_members_of_a_class_are_equivalent_whatever_their_order():
    members = class_members(graph_of(("a", "b"), ("b", "c"), ("c", "d"), ("b", "d"), ("d", "e")))
    assert len(members) > 5
    for one, other in permutations(map(read_graph, members), 2):
        assert are_equivalent(one, other, NEVER)


def test_graphs_over_different_nodes_are_not_compared(raises_problem):
    graph, other = CausalGraph.of(("a", "b")), CausalGraph.of(("b", "c"))
    for question in (distinguishing, are_equivalent):
        with raises_problem("invalid-request", columns=["a", "c"]):
            question(graph, other, NEVER)
        with pytest.raises(DifferentNodes):
            question(other, graph, NEVER)
