"""Separation against the definition by paths, networkx, and all DAGs on four nodes; open paths step by step."""

from __future__ import annotations

import random
from collections import Counter
from itertools import combinations, product

import networkx
import pytest
from hypothesis import given
from hypothesis import strategies as st

from pathgate.criteria import Deadline, OutOfTime, is_separated, separation
from pathgate.criteria.reachability import Conditions, connected
from pathgate.graphs import CausalGraph, read_graph
from tests.brute import Path, separated, shortest_open_length, subsets
from tests.criteria.asking import assert_is_open_path, is_directed_path, roles_of
from tests.strategies import (
    Question,
    all_dags,
    questions,
    random_graph,
    random_question,
    renamed,
    shuffled,
    small_graphs,
)
from tests.values import Graph, arrows_of, node_names, with_explicit_causes

MANY = [
    pytest.param(range(600), id="600"),
    pytest.param(range(600, 6600), id="6000", marks=pytest.mark.slow),
]


def test_conditioning_on_a_link_of_a_chain_blocks_it(parcel_chain):
    assert not separation(parcel_chain, "weather", "refund").separated
    assert separation(parcel_chain, "weather", "refund", ["late_van"]).separated


def test_all_543_dags_on_four_nodes_every_pair_and_every_given_set():
    asked = 0
    dags = list(all_dags(4))
    for value in dags:
        graph, names = read_graph(value), node_names(value)
        for x, y in combinations(names, 2):
            for fixed in subsets(name for name in names if name not in (x, y)):
                assert is_separated(graph, x, y, fixed) is separated(value, x, y, fixed), (value, x, y, fixed)
                asked += 1
    assert (len(dags), asked) == (543, 543 * 6 * 4)


@pytest.mark.slow
def test_all_543_dags_on_four_nodes_every_pair_of_sets():
    for value in all_dags(4):
        graph, names = read_graph(value), node_names(value)
        for places in product("xyg-", repeat=4):
            x, y, fixed = (
                [name for name, at in zip(names, places, strict=True) if at == place] for place in "xyg"
            )
            # Separation is symmetric, which another test shows: one order of the two sets will do.
            if x and y and x[0] < y[0]:
                assert is_separated(graph, x, y, fixed) is separated(value, x, y, fixed)


@pytest.mark.parametrize("seeds", MANY)
def test_sets_bidirected_edges_and_unmeasured_nodes_agree_with_the_paths(seeds: range):
    seen: Counter[bool] = Counter()
    for seed in seeds:
        rng = random.Random(seed)
        value = random_graph(rng, rng.randint(2, 7), arrow=rng.choice([0.2, 0.35, 0.5]), bidirected=0.15)
        asked = random_question(rng, value)
        answer = separation(read_graph(value), asked.x, asked.y, asked.given)
        length = shortest_open_length(value, asked.x, asked.y, asked.given)
        assert answer.separated is (length is None), seed
        assert (answer.open_path is None) is answer.separated
        if answer.open_path is not None:
            assert len(answer.open_path.arrows) == length, seed
        seen[answer.separated] += 1
    assert min(seen.values()) > len(seeds) / 8


def test_networkx_agrees_on_larger_dags_and_on_explicit_common_causes():
    seen: Counter[bool] = Counter()
    for seed in range(250):
        rng = random.Random(seed)
        size = rng.randint(5, 12)
        value = random_graph(rng, size, arrow=1.6 / size, bidirected=rng.choice([0, 0.05]))
        asked = random_question(rng, value)
        plain = networkx.DiGraph(arrows_of(with_explicit_causes(value)))
        plain.add_nodes_from(node_names(value))
        expected = networkx.is_d_separator(plain, set(asked.x), set(asked.y), set(asked.given))
        assert is_separated(read_graph(value), asked.x, asked.y, asked.given) is expected, seed
        seen[expected] += 1
    assert min(seen.values()) > 30


def test_one_search_sorts_all_nodes_as_asking_about_each_would():
    seen: Counter[bool] = Counter()
    for seed in range(300):
        rng = random.Random(seed)
        value = random_graph(rng, rng.randint(2, 7), arrow=rng.choice([0.25, 0.4]), bidirected=0.12)
        asked = random_question(rng, value)
        graph = read_graph(value)
        found = connected(graph, graph.mask(asked.x), Conditions.on(graph, graph.mask(asked.given)))
        for name in set(graph.names) - set(asked.x + asked.given):
            is_joined = not separated(value, asked.x, name, asked.given)
            assert bool(found >> graph.index[name] & 1) is is_joined, (seed, name)
            seen[is_joined] += 1
    assert min(seen.values()) > 100


@st.composite
def asked_graphs(draw: st.DrawFn) -> tuple[Graph, Question]:
    value = draw(small_graphs(max_nodes=6))
    return value, draw(questions(value))


@given(asked=asked_graphs())
def test_an_open_path_is_one_by_definition_and_says_why_each_step_is_open(asked: tuple[Graph, Question]):
    value, question = asked
    answer = separation(read_graph(value), question.x, question.y, question.given)
    assert answer.separated is separated(value, question.x, question.y, question.given)
    if answer.open_path is None:
        return
    path = Path(answer.open_path.nodes, answer.open_path.arrows)
    assert_is_open_path(path, value, question.given, question.x, question.y)
    told = [(step.node, step.role, step.because) for step in answer.open_path.steps]
    assert told == roles_of(path, value, question.given)
    for step in answer.open_path.steps:
        if step.role != "collider":
            assert step.through == ()
            continue
        assert step.through[0] == step.node
        assert step.through[-1] in question.given
        assert not set(step.through[:-1]) & set(question.given)
        assert is_directed_path(step.through, value)


@given(asked=asked_graphs(), data=st.data())
def test_order_names_and_sides_do_not_matter(asked: tuple[Graph, Question], data: st.DataObject):
    value, question = asked
    graph = read_graph(value)
    answer = separation(graph, question.x, question.y, question.given)
    assert separation(graph, question.y, question.x, question.given).separated is answer.separated
    rng = data.draw(st.randoms(use_true_random=False))
    edges_moved = {**value, "edges": rng.sample(value["edges"], len(value["edges"]))}
    assert separation(read_graph(edges_moved), question.x, question.y, question.given) == answer
    other = separation(read_graph(shuffled(value, rng)), question.x, question.y, question.given)
    assert (other.separated, set(other.x)) == (answer.separated, set(answer.x))
    names = {name: f"column {place}" for place, name in enumerate(node_names(value))}
    x, y, fixed = ([names[name] for name in side] for side in (question.x, question.y, question.given))
    assert separation(read_graph(renamed(value, names)), x, y, fixed).separated is answer.separated


def test_a_shortest_path_through_a_far_descendant_of_a_collider_names_the_way_down():
    # van → depot ← locker, depot → scan → report
    graph = CausalGraph.of(("van", "depot"), ("locker", "depot"), ("depot", "scan"), ("scan", "report"))
    path = separation(graph, "van", "locker", "report").open_path
    assert path is not None
    assert (path.nodes, path.arrows) == (("van", "depot", "locker"), ("forward", "backward"))
    assert path.steps[0].because == "descendant-conditioned"
    assert path.steps[0].through == ("depot", "scan", "report")


def test_parallel_edges_open_and_close_apart():
    # a → b and a ↔ b, b → c: given b, the bidirected edge makes b no collider towards c
    graph = CausalGraph.of(("a", "b"), ("b", "c"), bidirected=[("a", "b")])
    assert separation(graph, "a", "c", "b").separated
    joined = separation(CausalGraph.of(("b", "c"), bidirected=[("a", "b"), ("b", "c")]), "a", "c", "b")
    assert joined.open_path is not None
    assert joined.open_path.arrows == ("both", "both")


@pytest.mark.parametrize(
    ("x", "y", "fixed", "columns"),
    [
        ("weather", "weather", [], ["weather"]),
        ("weather", "refund", ["refund"], ["refund"]),
        (["weather", "late_van"], "refund", ["late_van"], ["late_van"]),
        ([], "refund", [], []),
        ("weather", [], [], []),
    ],
)
def test_sets_that_meet_or_are_empty_mean_nothing(parcel_chain, raises_problem, x, y, fixed, columns):
    with raises_problem("invalid-request", columns=columns):
        separation(parcel_chain, x, y, fixed)


def test_unknown_names_come_all_at_once_with_the_nearest_known_ones(parcel_chain, raises_problem):
    with raises_problem("unknown-node", nodes=["wether", "zzzzzz"], nearest={"wether": "weather"}):
        separation(parcel_chain, ["wether", "zzzzzz"], "refund")


def test_a_question_is_cut_off_by_its_deadline_wherever_it_comes(parcel_chain):
    answer = separation(parcel_chain, "weather", "refund", deadline=ending_after(1_000))
    assert not answer.separated
    for readings in (0, 1):
        with pytest.raises(OutOfTime) as caught:
            separation(parcel_chain, "weather", "refund", deadline=ending_after(readings))
        assert (caught.value.slug, caught.value.details) == ("too-costly", {"seconds": 1})


def ending_after(readings: int) -> Deadline:
    """A deadline that comes once the clock has been read that often."""
    left = iter(range(readings))
    # The first reading is the deadline's own.
    return Deadline(1, clock=lambda: 0 if next(left, None) is not None else 1) if readings else late()


def late() -> Deadline:
    moments = iter([0.0])
    return Deadline(1, clock=lambda: next(moments, 1.0))
