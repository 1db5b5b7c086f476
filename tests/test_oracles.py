"""The path oracles against answers worked out by hand and against networkx.

They are the ground truth of all other tests, so nothing here trusts one of them alone.
"""

from __future__ import annotations

import random
from itertools import combinations

import networkx as nx
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.brute import (
    Path,
    all_directed_paths,
    all_paths,
    ancestors,
    colliders,
    descendants,
    forbidden,
    induced_pairs,
    inseparable_pairs,
    is_open,
    is_valid_adjustment,
    is_valid_direct,
    minimal_separators,
    separated,
    separating_sets,
    shortest_open_length,
    valid_sets,
    with_selection,
)
from tests.strategies import (
    all_dags,
    questions,
    renamed,
    shuffled,
    small_graphs,
)
from tests.values import (
    Graph,
    arrows_of,
    graph_of,
    node_names,
    topological_names,
    with_explicit_causes,
)

CHAIN = graph_of(("weather", "delay"), ("delay", "refund"))
FORK = graph_of(("weather", "delay"), ("weather", "demand"))
# weather → delay ← courier, delay → ticket
COLLIDER = graph_of(("weather", "delay"), ("courier", "delay"), ("delay", "ticket"))
# x ← u1 → m ← u2 → y, x → y
M_SHAPE = graph_of(("u1", "x"), ("u1", "m"), ("u2", "m"), ("u2", "y"), ("x", "y"), unmeasured=["u1", "u2"])
# the same, all measured, and m a cause of x and y
BUTTERFLY = graph_of(("u1", "x"), ("u1", "m"), ("u2", "m"), ("u2", "y"), ("m", "x"), ("m", "y"), ("x", "y"))
FRONT_DOOR = graph_of(("x", "z"), ("z", "y"), bidirected=[("x", "y")])


def sets(*columns: str) -> set[frozenset[str]]:
    """Each word a set of one-letter columns, "" the empty one."""
    return {frozenset(word.split()) for word in columns}


@pytest.mark.parametrize(
    ("graph", "x", "y", "fixed", "expected"),
    [
        (CHAIN, "weather", "refund", [], False),
        (CHAIN, "weather", "refund", ["delay"], True),
        (FORK, "delay", "demand", [], False),
        (FORK, "delay", "demand", ["weather"], True),
        (COLLIDER, "weather", "courier", [], True),
        (COLLIDER, "weather", "courier", ["delay"], False),
        (COLLIDER, "weather", "courier", ["ticket"], False),
        (COLLIDER, "weather", "ticket", ["delay"], True),
        (FRONT_DOOR, "x", "y", ["z"], False),
        (graph_of(bidirected=[("x", "m"), ("m", "y")]), "x", "y", [], True),
        (graph_of(bidirected=[("x", "m"), ("m", "y")]), "x", "y", ["m"], False),
        (graph_of(("m", "y"), bidirected=[("x", "m")]), "x", "y", ["m"], True),
        (graph_of(isolated=["x", "y"]), "x", "y", [], True),
    ],
)
def test_separation_by_hand(graph: Graph, x: str, y: str, fixed: list[str], *, expected: bool):
    assert separated(graph, x, y, fixed) is expected


@pytest.mark.parametrize(
    ("graph", "valid"),
    [
        (M_SHAPE, sets("")),
        (BUTTERFLY, sets("m u1", "m u2", "m u1 u2")),
        (FRONT_DOOR, sets()),
        # a confounder, a mediator and a ticket that follows from it
        (graph_of(("c", "x"), ("c", "y"), ("x", "m"), ("m", "y"), ("m", "t")), sets("c")),
        # a descendant of the treatment off every causal path may be adjusted for
        (graph_of(("x", "y"), ("x", "d")), sets("", "d")),
        # no causal path at all: the effect is zero, and the outcome's child opens nothing
        (graph_of(("y", "d"), isolated=["x"]), sets("", "d")),
        # the outcome causes the treatment: nothing helps
        (graph_of(("y", "x"), isolated=["d"]), sets()),
        (graph_of(("x", "y"), bidirected=[("x", "m"), ("m", "y")]), sets("")),
    ],
)
def test_valid_adjustment_sets_by_hand(graph: Graph, valid: set[frozenset[str]]):
    assert set(valid_sets(graph, "x", "y")) == valid


def test_forbidden_by_hand():
    # x → m → y, m → t, y → d, x → s, c → y
    graph = graph_of(("x", "m"), ("m", "y"), ("m", "t"), ("y", "d"), ("x", "s"), ("c", "y"))
    assert forbidden(graph, "x", "y") == {"m", "t", "d"}
    # x1 → a → x2 → y: the path from x1 meets x2, so a lies on no proper causal path
    assert forbidden(graph_of(("x1", "a"), ("a", "x2"), ("x2", "y")), ["x1", "x2"], "y") == frozenset()
    # x ↔ y → d: no causal path, nothing forbidden
    assert forbidden(graph_of(("y", "d"), bidirected=[("x", "y")]), "x", "y") == frozenset()


def test_a_treatment_or_outcome_that_is_given_is_never_valid():
    graph = graph_of(("x", "y"), ("c", "x"))
    assert not is_valid_adjustment(graph, "x", "y", ["x"])
    assert not is_valid_adjustment(graph, "x", "y", [], ["y"])
    assert not is_valid_direct(graph, "x", "y", ["y"])


def test_direct_effects_by_hand():
    # x → m → y, x → y: the direct effect needs the mediator, the total effect forbids it
    mediated = graph_of(("x", "m"), ("m", "y"), ("x", "y"), ("y", "t"))
    assert set(valid_sets(mediated, "x", "y", asks="direct")) == sets("m")
    assert set(valid_sets(mediated, "x", "y")) == sets("")
    assert valid_sets(FRONT_DOOR, "x", "y", asks="direct") == []
    assert set(valid_sets(CHAIN, "weather", "refund", asks="direct")) == sets("delay")


def test_parallel_edges_make_paths_of_their_own():
    graph = graph_of(("x", "y"), ("y", "z"), bidirected=[("x", "y")])
    assert set(all_paths(graph, "x", "z")) == {
        Path(("x", "y", "z"), ("forward", "forward")),
        Path(("x", "y", "z"), ("both", "forward")),
    }


def test_colliders_by_hand():
    graph = graph_of(("a", "m"), ("b", "m"), bidirected=[("m", "b"), ("m", "c")])
    pairs = {frozenset("ab"), frozenset("ac"), frozenset("bc")}
    assert colliders(graph) == {("m", pair) for pair in pairs}


def test_separating_sets_by_hand():
    # x → a → b → y, x ← c → y, x → k ← y
    graph = graph_of(("x", "a"), ("a", "b"), ("b", "y"), ("c", "x"), ("c", "y"), ("x", "k"), ("y", "k"))
    assert set(minimal_separators(graph, "x", "y")) == sets("a c", "b c")
    assert set(separating_sets(graph, "x", "y")) == sets("a c", "b c", "a b c")
    assert inseparable_pairs(graph) == set()
    assert minimal_separators(M_SHAPE, "x", "m") == []
    assert inseparable_pairs(M_SHAPE) == {frozenset("xm"), frozenset("my")}


def test_shortest_open_paths_by_hand():
    assert shortest_open_length(CHAIN, "weather", "refund") == 2
    assert shortest_open_length(CHAIN, "weather", "refund", ["delay"]) is None
    assert shortest_open_length(M_SHAPE, ["x", "u1"], ["y"], ["m"]) == 1
    assert shortest_open_length(M_SHAPE, "u1", "u2", ["m"]) == 2


def test_a_selection_node_is_a_child_of_what_its_part_reads_and_a_fixed_part_is_the_column():
    parts = ["weather", "courier", {"columns": ["delay"]}, {"columns": ["ticket"], "fixed": True}]
    graph, conditioned = with_selection(COLLIDER, parts)
    named, single, fixed = sorted(conditioned)[0], sorted(conditioned)[1], conditioned[-1]
    assert fixed == "ticket"
    assert set(arrows_of(graph)) - set(arrows_of(COLLIDER)) == {
        ("weather", named),
        ("courier", named),
        ("delay", single),
    }
    assert len(node_names(graph)) == 6


def test_induced_pairs_by_hand():
    pair = {frozenset(["weather", "courier"])}
    assert induced_pairs(COLLIDER) == set()
    assert induced_pairs(COLLIDER, ["ticket"]) == pair
    assert induced_pairs(COLLIDER, [], ["ticket"]) == pair
    assert induced_pairs(graph_of(isolated=["a", "b"]), [], ["a", "b"]) == {frozenset("ab")}


def peer_separated(graph: Graph, x: set[str], y: set[str], fixed: set[str]) -> bool:
    explicit = with_explicit_causes(graph)
    peer = nx.DiGraph(arrows_of(explicit))
    peer.add_nodes_from(node_names(explicit))
    return bool(nx.is_d_separator(peer, x, y, fixed))


def test_networkx_agrees_on_every_question_about_every_dag_of_three_nodes():
    for graph in all_dags(3):
        for x, y in combinations(node_names(graph), 2):
            (other,) = set(node_names(graph)) - {x, y}
            for fixed in (set[str](), {other}):
                assert separated(graph, x, y, fixed) is peer_separated(graph, {x}, {y}, fixed)


@settings(deadline=None)
@given(data=st.data(), graph=small_graphs(max_nodes=7))
def test_networkx_agrees_once_bidirected_edges_have_nodes_of_their_own(data: st.DataObject, graph: Graph):
    question = data.draw(questions(graph))
    asked = set(question.x), set(question.y), set(question.given)
    assert separated(graph, *asked) is peer_separated(graph, *asked)


@settings(deadline=None)
@given(graph=small_graphs(max_nodes=7), rng=st.randoms(use_true_random=False))
def test_ancestors_and_directed_paths_are_those_of_networkx(graph: Graph, rng: random.Random):
    peer = nx.DiGraph(arrows_of(graph))
    peer.add_nodes_from(node_names(graph))
    node = rng.choice(node_names(graph))
    assert topological_names(graph) is not None
    assert ancestors(graph, node) == nx.ancestors(peer, node) | {node}
    assert descendants(graph, node) == nx.descendants(peer, node) | {node}
    assert {path[0] for path in all_directed_paths(graph, ending_at=node)} == ancestors(graph, node)


@settings(deadline=None)
@given(data=st.data(), graph=small_graphs(max_nodes=6), rng=st.randoms(use_true_random=False))
def test_order_and_names_change_no_answer(data: st.DataObject, graph: Graph, rng: random.Random):
    question = data.draw(questions(graph))
    names = {name: f"column {place}" for place, name in enumerate(node_names(graph))}
    asked = [[names[name] for name in group] for group in (question.x, question.y, question.given)]
    other = shuffled(renamed(graph, names), rng)
    assert separated(graph, question.x, question.y, question.given) is separated(other, *asked)
    assert separated(other, asked[1], asked[0], asked[2]) is separated(other, *asked)
    original = is_valid_adjustment(graph, question.x, question.y, question.given)
    assert is_valid_adjustment(other, *asked) is original


@settings(deadline=None)
@given(data=st.data(), graph=small_graphs(max_nodes=6))
def test_an_open_path_is_one_of_all_paths_and_separation_means_there_is_none(
    data: st.DataObject, graph: Graph
):
    question = data.draw(questions(graph, single=True))
    paths = all_paths(graph, question.x[0], question.y[0])
    lengths = [len(path.arrows) for path in paths if is_open(graph, path, question.given)]
    asked = (question.x, question.y, question.given)
    assert shortest_open_length(graph, *asked) == min(lengths, default=None)
    assert separated(graph, *asked) is not bool(lengths)
