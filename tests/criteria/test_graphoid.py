"""What separation must obey as a relation: graphoid axioms, vanishing correlations, counts of patterns, other names."""

from __future__ import annotations

import random
from collections import Counter
from collections.abc import Callable
from itertools import combinations

import numpy as np
import pytest

from pathgate.criteria import Deadline, Separators, is_separated, separated_each, separation
from pathgate.criteria.reachability import Conditions, connected
from pathgate.graphs import CausalGraph, read_graph
from tests.brute import subsets
from tests.linear_worlds import TOLERANCE, draw_world, partial_correlation
from tests.strategies import Question, all_dags, random_graph, random_question, renamed, shuffled
from tests.values import Graph, node_names

# Relations are listed whole: not for a quick look.
pytestmark = pytest.mark.slow

GRAPHS = [
    pytest.param(range(600), id="600"),
    pytest.param(range(600, 4_000), id="3400", marks=pytest.mark.slow),
]

Names = frozenset[str]


def mixed_graph(rng: random.Random, most_nodes: int = 9) -> Graph:
    size = rng.randint(4, most_nodes)
    return random_graph(rng, size, arrow=rng.choice([0.1, 0.2, 0.3]), bidirected=rng.choice([0, 0.05, 0.15]))


def drawn_sets(rng: random.Random, value: Graph) -> tuple[Names, Names, Names, Names]:
    """x, y, w and given: disjoint, none but the last empty."""
    names = rng.sample(node_names(value), len(node_names(value)))
    places = ["x", "y", "w", *(rng.choice(["given", "given", "none", *"xyw"]) for _ in names[3:])]
    x, y, w, fixed = (
        frozenset(name for name, at in zip(names, places, strict=True) if at == place)
        for place in ("x", "y", "w", "given")
    )
    return x, y, w, fixed


# Each axiom: what it says, as premises and conclusions over x, y, w and z (Pearl & Paz 1987; composition and
# intersection besides the semi-graphoid four hold of separation in any graph, Richardson 2003).
Apart = Callable[[Names, Names, Names], bool]
AXIOMS = {
    "symmetry": lambda apart, x, y, w, z: (apart(x, y | w, z), apart(y | w, x, z)),
    "decomposition": lambda apart, x, y, w, z: (apart(x, y | w, z), apart(x, y, z) and apart(x, w, z)),
    "weak union": lambda apart, x, y, w, z: (apart(x, y | w, z), apart(x, y, z | w)),
    "contraction": lambda apart, x, y, w, z: (apart(x, y, z) and apart(x, w, z | y), apart(x, y | w, z)),
    "intersection": lambda apart, x, y, w, z: (apart(x, y, z | w) and apart(x, w, z | y), apart(x, y | w, z)),
    "composition": lambda apart, x, y, w, z: (apart(x, y, z) and apart(x, w, z), apart(x, y | w, z)),
}


@pytest.mark.parametrize("seeds", GRAPHS)
@pytest.mark.parametrize("axiom", AXIOMS)
def test_separation_obeys_the_graphoid_axiom_of(axiom: str, seeds: range):
    held: Counter[bool] = Counter()
    for seed in seeds:
        rng = random.Random(seed)
        value = mixed_graph(rng)
        graph = read_graph(value)
        premise, conclusion = AXIOMS[axiom](apart_in(graph), *drawn_sets(rng, value))
        assert conclusion or not premise, (axiom, seed)
        held[premise] += 1
    assert min(held.values()) > len(seeds) / 12, held


def apart_in(graph: CausalGraph) -> Apart:
    return lambda x, y, given: is_separated(graph, x, y, given)


@pytest.mark.parametrize("seeds", GRAPHS)
def test_separation_of_two_single_nodes_is_weakly_transitive(seeds: range):
    # x ⊥ y given z, and given z and v too, only where v is separated from x or from y given z (Pearl 1988).
    held = 0
    for seed in seeds:
        rng = random.Random(seed)
        value = mixed_graph(rng)
        graph = read_graph(value)
        x, y, v, *rest = rng.sample(node_names(value), len(node_names(value)))
        fixed = [name for name in rest if rng.random() < 0.4]
        if is_separated(graph, x, y, fixed) and is_separated(graph, x, y, [*fixed, v]):
            held += 1
            assert is_separated(graph, x, v, fixed) or is_separated(graph, v, y, fixed), seed
    assert held > len(seeds) / 12


def test_sets_are_separated_where_each_pair_of_their_nodes_is():
    for seed in range(1000):
        rng = random.Random(seed)
        value = mixed_graph(rng)
        graph = read_graph(value)
        asked = random_question(rng, value)
        pairs = [is_separated(graph, x, y, asked.given) for x in asked.x for y in asked.y]
        assert is_separated(graph, asked.x, asked.y, asked.given) is all(pairs), seed


# Linear worlds: a correlation vanishes where the graph says so, and nowhere else.

WORLDS = [
    pytest.param(range(600), id="600"),
    pytest.param(range(600, 10_000), id="9400", marks=pytest.mark.slow),
]


@pytest.mark.parametrize("seeds", WORLDS)
def test_a_partial_correlation_vanishes_exactly_where_two_nodes_are_separated(seeds: range):
    seen: Counter[bool] = Counter()
    weakest = 1.0
    for seed in seeds:
        rng = random.Random(seed)
        value = mixed_graph(rng, 8)
        asked = random_question(rng, value, single=True)
        (x,), (y,) = asked.x, asked.y
        world = draw_world(value, np.random.default_rng(seed))
        apart = is_separated(read_graph(value), x, y, asked.given)
        size = abs(partial_correlation(world, x, y, asked.given))
        assert apart is (size < TOLERANCE), (seed, size)
        weakest = weakest if apart else min(weakest, size)
        seen[apart] += 1
    assert min(seen.values()) > len(seeds) / 4
    # Nothing was near the bound that tells the two apart.
    assert weakest > 100 * TOLERANCE


# Patterns: the statements that hold in a DAG are the same for all DAGs of a Markov equivalence class, and
# differ between classes (Verma & Pearl 1990). Numbers of classes: OEIS A007984.


def pattern_of(value: Graph) -> tuple[bool, ...]:
    """The verdict on every pair of nodes given every set of others."""
    graph, names = read_graph(value), sorted(node_names(value))
    statements = [
        (graph.mask(x), graph.mask(y), graph.mask(fixed))
        for x, y in combinations(names, 2)
        for fixed in subsets(name for name in names if name not in (x, y))
    ]
    return tuple(separated_each(graph, statements, Deadline.never()))


@pytest.mark.parametrize(
    ("size", "dags", "classes"),
    [
        (2, 3, 2),
        (3, 25, 11),
        (4, 543, 185),
        pytest.param(5, 29_281, 8_782, marks=pytest.mark.full),
    ],
)
def test_all_dags_fall_into_as_many_patterns_as_there_are_equivalence_classes(
    size: int, dags: int, classes: int
):
    seen = Counter(pattern_of(value) for value in all_dags(size))
    assert (seen.total(), len(seen)) == (dags, classes)


def test_equivalence_classes_of_four_nodes_are_told_apart_by_adjacencies_and_unshielded_colliders():
    # The same count by the other characterisation (Verma & Pearl 1990), and the same classes.
    seen: dict[object, set[object]] = {}
    for value in all_dags(4):
        seen.setdefault(pattern_of(value), set()).add(features_of(value))
    assert len(seen) == 185
    assert all(len(features) == 1 for features in seen.values())
    assert len(set.union(*seen.values())) == 185


def features_of(value: Graph) -> tuple[frozenset[object], frozenset[object]]:
    """Adjacent pairs, and colliders whose two neighbours are not adjacent."""
    arrows = {(edge["source"], edge["target"]) for edge in value["edges"]}
    adjacent = frozenset(frozenset(arrow) for arrow in arrows)
    colliders = frozenset(
        (node, frozenset({one, other}))
        for (one, node), (other, same) in combinations(sorted(arrows), 2)
        if node == same and frozenset({one, other}) not in adjacent
    )
    return adjacent, colliders


# Invariance: names and the order of edges and nodes mean nothing.


def test_answers_do_not_depend_on_names_or_on_the_order_of_anything():
    for seed in range(250):
        rng = random.Random(seed)
        value = mixed_graph(rng, 8)
        asked = random_question(rng, value)
        names = node_names(value)
        new_names = dict(zip(names, rng.sample(names, len(names)), strict=True))
        other = shuffled(renamed(value, new_names), rng)
        moved = Question(*(tuple(new_names[name] for name in side) for side in sides_of(asked)))
        old_names = {new: old for old, new in new_names.items()}
        unchanged = {name: name for name in names}
        assert facts(other, moved, old_names) == facts(value, asked, unchanged), seed


def sides_of(asked: Question) -> tuple[tuple[str, ...], ...]:
    return asked.x, asked.y, asked.given


def facts(value: Graph, asked: Question, back: dict[str, str]) -> tuple[object, ...]:
    """What can be said about a question whatever the graph's order, by the names the nodes had before."""
    graph = read_graph(value)
    x, y, given = (graph.mask(side) for side in sides_of(asked))
    answer = separation(graph, asked.x, asked.y, asked.given, paths=50)
    bounds = Separators(graph, x, y, given, graph.measured)

    def named(mask: int) -> Names:
        return frozenset(back[name] for name in graph.names_of(mask))

    return (
        answer.separated,
        answer.open_path and len(answer.open_path.arrows),
        [len(one.path.arrows) for one in answer.blockers],
        None if answer.separator is None else len(answer.separator),
        {named(mask) for mask in bounds.every_minimal(Deadline.never())},
        named(connected(graph, x, Conditions.on(graph, given))),
    )
