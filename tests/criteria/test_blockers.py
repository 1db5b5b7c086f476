"""Shortest paths and what blocks them: every listed path and blocker by definition, long graphs and the clock."""

from __future__ import annotations

import random
from collections import Counter
from itertools import islice, pairwise, product

import networkx
import pytest

from pathgate.criteria import Deadline, OutOfTime, Separation, Trail, separation
from pathgate.criteria.skeleton_paths import shortest_paths
from pathgate.graphs import CausalGraph, from_networkx, read_graph
from pathgate.graphs.graph import SMALL
from tests.brute import Path, separating_sets
from tests.brute_paths import all_paths, ancestors
from tests.criteria.asking import path_of
from tests.strategies import Question, all_dags, random_graph, random_question, shuffled
from tests.values import Graph, graph_of, node_names

SEEDS = [
    pytest.param(range(500), id="500"),
    pytest.param(range(500, 6000), id="5500", marks=pytest.mark.slow),
]


def asked_graph(seed: int, most_nodes: int = 7) -> tuple[Graph, Question]:
    rng = random.Random(seed)
    arrow, bidirected = rng.choice([(0.25, 0.05), (0.2, 0.2), (0.4, 0.1)])
    value = random_graph(rng, rng.randint(4, most_nodes), arrow=arrow, bidirected=bidirected)
    return value, random_question(rng, value, single=rng.random() < 0.4)


def paths_between(value: Graph, asked: Question) -> list[Path]:
    """All paths from x to y that meet neither set in between."""
    ends = set(asked.x + asked.y)
    paths = (path for x in asked.x for y in asked.y for path in all_paths(value, x, y))
    return [path for path in paths if not ends & set(path.nodes[1:-1])]


def listed(value: Graph, asked: Question) -> list[Path]:
    """The same as the production code lists them."""
    graph = read_graph(value)
    trails = shortest_paths(graph, graph.mask(asked.x), graph.mask(asked.y), Deadline.never())
    return [path_of(trail, value) for trail in trails]


@pytest.mark.parametrize("seeds", SEEDS)
def test_the_listing_holds_every_path_once_shorter_ones_first(seeds: range):
    doubled = several = 0
    for seed in seeds:
        value, asked = asked_graph(seed)
        found = listed(value, asked)
        assert Counter(found) == Counter(paths_between(value, asked)), seed
        lengths = [len(path.arrows) for path in found]
        assert lengths == sorted(lengths), seed
        doubled += len({path.nodes for path in found}) < len(found)
        several += len(asked.x) > 1 and len(found) > 5
    assert min(doubled, several) > len(seeds) / 50


def test_all_paths_of_all_dags_on_four_nodes_are_listed():
    for value in all_dags(4):
        for x, y in ("ab", "da"):
            asked = Question((x,), (y,), ())
            assert Counter(listed(value, asked)) == Counter(paths_between(value, asked))


def test_the_order_of_edges_does_not_change_the_order_of_paths():
    for seed in range(200):
        value, asked = asked_graph(seed)
        edges_moved = {**shuffled(value, random.Random(seed)), "nodes": value["nodes"]}
        assert listed(edges_moved, asked) == listed(value, asked), seed


@pytest.mark.parametrize("seeds", SEEDS)
def test_each_blocker_is_the_first_node_on_its_path_that_blocks_it(seeds: range):
    seen: Counter[tuple[str, str]] = Counter()
    for seed in seeds:
        value, asked = asked_graph(seed)
        answer = separation(read_graph(value), asked.x, asked.y, asked.given, paths=10_000)
        if not answer.separated:
            assert answer.blockers == (), seed
            continue
        told = {}
        for blocker in answer.blockers:
            path = path_of(blocker.path, value)
            told[path] = (node_names(value)[blocker.node], blocker.because)
            seen[blocker.role, blocker.because] += 1
            assert roles_on(path)[told[path][0]] == blocker.role, seed
        assert told == {path: first_block(value, path, asked) for path in paths_between(value, asked)}, seed
    assert set(seen) == {
        ("chain", "conditioned"),
        ("fork", "conditioned"),
        ("collider", "collider-not-conditioned"),
    }
    assert min(seen.values()) > len(seeds) / 50


def first_block(value: Graph, path: Path, asked: Question) -> tuple[str, str]:
    """By definition: a collider with no given descendant, or a given node that is no collider."""
    opening = ancestors(value, asked.given)
    for node, is_collider in path.inner():
        if is_collider and node not in opening:
            return node, "collider-not-conditioned"
        if not is_collider and node in asked.given:
            return node, "conditioned"
    raise AssertionError(path)


def roles_on(path: Path) -> dict[str, str]:
    """What each node between the ends is, from the two arrows beside it."""
    roles = {}
    for place, (node, is_collider) in enumerate(path.inner()):
        is_fork = path.arrows[place : place + 2] == ("backward", "forward")
        roles[node] = "collider" if is_collider else "fork" if is_fork else "chain"
    return roles


@pytest.mark.parametrize("wanted", [0, 1, 2, 5])
def test_as_many_paths_are_blocked_as_were_asked_for(wanted: int):
    # locker → van0 … van2 → refund: three paths of two steps
    vans = [f"van{k}" for k in range(3)]
    graph = CausalGraph.of(*(pair for van in vans for pair in (("locker", van), (van, "refund"))))
    answer = separation(graph, "locker", "refund", vans, paths=wanted)
    blocking = [graph.name(blocker.node) for blocker in answer.blockers]
    assert blocking == vans[:wanted]


def test_an_arrow_beside_a_bidirected_edge_makes_two_paths():
    # weather → van, weather ↔ van, van → refund, van ↔ refund; refund → ticket
    value = graph_of(
        ("weather", "van"),
        ("van", "refund"),
        ("refund", "ticket"),
        bidirected=[("weather", "van"), ("van", "refund")],
    )
    joined = separation(read_graph(value), "weather", "ticket", "van").open_path
    assert joined is not None
    assert joined.arrows in {("forward", "both", "forward"), ("both", "both", "forward")}
    answer = separation(read_graph(value), "weather", "ticket", ["van", "refund"], paths=20)
    told = {(blocker.path.arrows, node_names(value)[blocker.node]) for blocker in answer.blockers}
    assert told == {
        # Two arrowheads at van: it is open there, and refund blocks.
        (("forward", "both", "forward"), "refund"),
        (("both", "both", "forward"), "refund"),
        (("forward", "forward", "forward"), "van"),
        (("both", "forward", "forward"), "van"),
    }


def test_where_no_path_joins_the_two_there_is_nothing_to_block():
    graph = CausalGraph.of(("weather", "van"), ("promotion", "order"))
    answer = separation(graph, "weather", "order", "van", paths=20)
    assert (answer.separated, answer.blockers, answer.separator) == (True, (), ())


@pytest.mark.parametrize("seeds", SEEDS)
def test_a_separator_is_named_exactly_where_some_measured_set_separates(seeds: range):
    seen: Counter[str] = Counter()
    for seed in seeds:
        value, asked = asked_graph(seed)
        answer: Separation = separation(read_graph(value), asked.x, asked.y, asked.given)
        separating = separating_sets(value, asked.x, asked.y)
        if answer.separator is None:
            assert separating == [], seed
            seen["none"] += 1
            continue
        assert frozenset(answer.separator) in separating, seed
        assert len(answer.separator) == len(separating[0]), seed
        seen["empty" if answer.separator == () else "some"] += 1
    assert min(seen[kind] for kind in ("none", "empty", "some")) > len(seeds) / 40


def rails(rungs: int) -> list[tuple[str, str]]:
    """a0 → a1 → …, b0 → b1 → …, and a rung from each a to its b."""
    along = [(f"{rail}{k}", f"{rail}{k + 1}") for rail, k in product("ab", range(rungs - 1))]
    return along + [(f"a{k}", f"b{k}") for k in range(rungs)]


def names_on(graph: CausalGraph, trail: Trail) -> list[str]:
    return [graph.name(node) for node in trail.nodes]


def test_on_graphs_beyond_masks_the_lengths_are_those_of_networkx():
    rng = random.Random(8)
    plain = networkx.DiGraph(rails(SMALL))
    names = list(plain)
    plain.add_edges_from((f"a{k}", f"b{k + rng.randint(1, 3)}") for k in range(0, SMALL - 4, 7))
    graph = from_networkx(plain)
    assert not graph.is_small
    skeleton = plain.to_undirected()
    for _ in range(2):
        x, y = rng.sample(names[:200], 2)
        trails = shortest_paths(graph, graph.mask(x), graph.mask(y), Deadline.never())
        found = [names_on(graph, trail) for trail in islice(trails, 30)]
        expected = networkx.shortest_simple_paths(skeleton, x, y)
        assert [len(path) for path in found] == [len(path) for path in islice(expected, 30)]
        assert len(set(map(tuple, found))) == 30
        assert all(networkx.is_simple_path(skeleton, path) for path in found)


def counting_deadline(readings: int) -> tuple[Deadline, list[int]]:
    """A deadline that comes with that many readings of its clock, and a list as long as those so far."""
    read: list[int] = []

    def clock() -> float:
        read.append(1)
        return 0.0 if len(read) <= readings else 2.0

    return Deadline(1, clock=clock), read


def test_on_a_long_ladder_the_next_path_takes_few_searches():
    # Searching every place where a path may leave the one before would take 400 searches a path.
    graph = CausalGraph.of(*rails(400), ("promotion", "ticket"), ("b399", "ticket"))
    deadline, read = counting_deadline(1_000_000)
    answer = separation(graph, "a0", "promotion", paths=20, deadline=deadline)
    assert [len(blocker.path.arrows) for blocker in answer.blockers] == [402] * 20
    assert {graph.name(blocker.node) for blocker in answer.blockers} == {"ticket"}
    assert len(read) < 100


def test_leaving_one_set_for_another_is_a_search_for_each_set_and_not_for_each_node():
    xs, ys = [f"locker{k}" for k in range(150)], [f"order{k}" for k in range(150)]
    graph = CausalGraph.of(*((x, "depot") for x in xs), *(("depot", y) for y in ys))
    deadline, read = counting_deadline(1_000_000)
    answer = separation(graph, xs, ys, "depot", paths=20, deadline=deadline)
    assert {graph.name(blocker.node) for blocker in answer.blockers} == {"depot"}
    assert len(answer.blockers) == 20
    assert len(read) < 100


def test_a_search_for_a_path_that_is_not_there_is_cut_off_by_the_deadline():
    # weather → c0 → … → c199, and a dead end beside each: only one path, and 200 places to look for another
    chain = ["weather", *(f"c{k}" for k in range(200))]
    dead_ends = [(name, f"aside {name}") for name in chain]
    graph = CausalGraph.of(*pairwise(chain), *dead_ends)
    deadline, read = counting_deadline(50)
    listing = shortest_paths(graph, graph.mask("weather"), graph.mask("c199"), deadline)
    assert names_on(graph, next(listing)) == chain
    with pytest.raises(OutOfTime):
        next(listing)
    assert len(read) == 51
    patient = shortest_paths(graph, graph.mask("weather"), graph.mask("c199"), Deadline.never())
    assert len(list(patient)) == 1
