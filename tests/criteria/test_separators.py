"""Separating sets within bounds against all subsets."""

from __future__ import annotations

import random
from collections import Counter
from collections.abc import Iterator
from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property
from itertools import combinations, pairwise, product

import pytest

from pathgate.criteria import Deadline, Separators
from pathgate.graphs import CausalGraph, read_graph
from pathgate.graphs.graph import SMALL
from tests.brute import inclusion_minimal, separating_sets
from tests.strategies import Question, all_dags, random_graph, random_question, shuffled
from tests.values import Graph, graph_of, node_names

SEEDS = [
    pytest.param(range(250), id="250"),
    pytest.param(range(250, 4000), id="3750", marks=pytest.mark.slow),
]
# Thirds have no finite binary form; sums of tenths meet, or miss one another by a rounding.
COSTS = [0.1, 0.2, 0.3, 1 / 3, 0.5, 1, 1, 2.25, 1e-9, 1e12]


@dataclass(frozen=True)
class Bounded:
    """A question with bounds, by names: what is to be separated, and what sets must and may contain."""

    value: Graph
    x: frozenset[str]
    y: frozenset[str]
    required: frozenset[str]
    allowed: frozenset[str]

    @cached_property
    def graph(self) -> CausalGraph:
        return read_graph(self.value)

    def separators(self, graph: CausalGraph | None = None) -> Separators:
        """As the production code is asked."""
        graph = graph or self.graph
        return Separators(graph, *map(graph.mask, (self.x, self.y, self.required, self.allowed)))

    @cached_property
    def within(self) -> list[frozenset[str]]:
        """Every set within the bounds that separates, by definition; smaller ones first."""
        # The bounds say what may be used, measured or not.
        all_measured = {**self.value, "nodes": node_names(self.value)}
        found = separating_sets(all_measured, self.x, self.y, self.required)
        return [one | self.required for one in found if one <= self.allowed | self.required]

    def cost(self, names: frozenset[str]) -> Fraction:
        """The exact sum."""
        costs = {node["id"]: Fraction(node.get("cost", 1)) for node in self.value["nodes"]}
        return sum((costs[name] for name in names), Fraction(0))

    def names(self, mask: int | None) -> frozenset[str]:
        assert mask is not None
        return frozenset(self.graph.names_of(mask))


def random_bounds(seed: int, most_nodes: int = 8) -> Bounded:
    rng = random.Random(seed)
    arrow, bidirected = rng.choice([(0.2, 0.05), (0.3, 0.1), (0.4, 0.05), (0.25, 0.25)])
    value = random_graph(rng, rng.randint(2, most_nodes), arrow=arrow, bidirected=bidirected, unmeasured=0.2)
    asked = random_question(rng, value, single=rng.random() < 0.6)
    if rng.random() < 0.6:
        value, asked = far_apart(rng)
    required = rng.choice([(), asked.given[:1], asked.given])
    share = rng.choice([0.6, 0.9, 1])
    # Now and then the bounds overlap: what is required, and the two sides, do not count as allowed.
    allowed = frozenset(name for name in node_names(value) if rng.random() < share)
    costed = [{**node, "cost": rng.choice(COSTS)} for node in value["nodes"]]
    return Bounded({**value, "nodes": costed}, *map(frozenset, (asked.x, asked.y, required)), allowed)


def far_apart(rng: random.Random) -> tuple[Graph, Question]:
    """Eight nodes in three layers between x and y, which leaves many ways to separate the two."""
    layers = [["x"], ["a", "b"], ["c", "d"], ["e", "f"], ["y"]]
    names = [name for layer in layers for name in layer]
    # Most arrows point from x to y, and some nodes come out of line.
    rank = {name: depth + rng.choice([0, 0, 0, 2.5, -2.5]) for depth, name in enumerate(names)}
    arrows = [
        (min(pair, key=rank.__getitem__), max(pair, key=rank.__getitem__))
        for upper, lower in pairwise(layers)
        for pair in product(upper, lower)
        if rng.random() < 0.75
    ]
    bows = [pair for pair in (("a", "b"), ("b", "c"), ("d", "f")) if rng.random() < 0.1]
    unmeasured = [name for name in "abcdef" if rng.random() < 0.05]
    value = graph_of(*arrows, bidirected=bows, unmeasured=unmeasured, isolated=names)
    given = rng.sample("abcdef", rng.choice([0, 0, 0, 1]))
    return value, Question(("x",), ("y",), tuple(given))


def assert_exact(asked: Bounded, context: object) -> None:
    """Every question about the bounds is answered as all subsets answer it."""
    found = asked.separators()
    within, minimal = asked.within, inclusion_minimal(asked.within)
    listed = [asked.names(mask) for mask in found.every_minimal(Deadline.never())]
    assert found.exists is bool(within), context
    assert Counter(listed) == Counter(minimal), context
    if not within:
        assert (found.minimal(), found.smallest(), found.cheapest()) == (None, None, None), context
        return
    assert asked.names(found.minimal()) in minimal, context
    smallest, cheapest = asked.names(found.smallest()), asked.names(found.cheapest())
    assert smallest in within, context
    assert len(smallest) == len(within[0]), context
    assert cheapest in minimal, context
    assert asked.cost(cheapest) == min(map(asked.cost, within)), context


@pytest.mark.parametrize("seeds", SEEDS)
def test_sets_within_bounds_are_those_that_trying_all_subsets_finds(seeds: range):
    seen: Counter[str] = Counter()
    for seed in seeds:
        asked = random_bounds(seed)
        assert_exact(asked, seed)
        minimal = inclusion_minimal(asked.within)
        seen["none"] += not minimal
        seen["several"] += len(minimal) > 1
        seen["more than one alike"] += sum(len(one) == len(minimal[0]) for one in minimal) > 1
        seen["needs an unmeasured one"] += bool(minimal) and all(one & hidden(asked) for one in minimal)
        seen["required"] += bool(minimal) and bool(asked.required)
        cheap = [one for one in minimal if asked.cost(one) == min(map(asked.cost, minimal))]
        seen["cheapest is not smallest"] += bool(minimal) and len(cheap[0]) > len(minimal[0])
    assert min(seen.values()) >= len(seeds) / 100, seen


def hidden(asked: Bounded) -> frozenset[str]:
    return frozenset(node["id"] for node in asked.value["nodes"] if not node.get("measured", True))


def all_bounds(value: Graph, x: str, y: str) -> Iterator[Bounded]:
    """Each other node required, allowed or neither."""
    others = [name for name in node_names(value) if name not in (x, y)]
    for states in product(("required", "allowed", "neither"), repeat=len(others)):
        sets = [
            frozenset(n for n, at in zip(others, states, strict=True) if at == s)
            for s in ("required", "allowed")
        ]
        yield Bounded(value, frozenset({x}), frozenset({y}), *sets)


def test_every_mixed_graph_on_three_nodes_within_all_bounds():
    pairs = list(combinations("abc", 2))
    for value in all_dags(3):
        for chosen in product((False, True), repeat=3):
            bows = [pair for pair, there in zip(pairs, chosen, strict=True) if there]
            both = [{"source": a, "target": b, "kind": "bidirected"} for a, b in bows]
            mixed = {**value, "edges": value["edges"] + both}
            # Whatever the pair, some other graph of these differs from this one in names alone.
            for asked in all_bounds(mixed, "a", "b"):
                assert_exact(asked, asked)


@pytest.mark.slow
def test_every_dag_on_four_nodes_within_all_bounds():
    for value in all_dags(4):
        for asked in all_bounds(value, "a", "b"):
            assert_exact(asked, asked)


def test_sides_edges_and_nodes_may_change_places():
    for seed in range(150):
        asked = random_bounds(seed)
        listed = {asked.names(mask) for mask in asked.separators().every_minimal(Deadline.never())}
        turned = Bounded(asked.value, asked.y, asked.x, asked.required, asked.allowed)
        moved = Bounded(
            shuffled(asked.value, random.Random(seed)), asked.x, asked.y, asked.required, asked.allowed
        )
        for other in (turned, moved):
            found = other.separators()
            assert {other.names(mask) for mask in found.every_minimal(Deadline.never())} == listed, seed
            if not listed:
                continue
            assert len(other.names(found.smallest())) == min(map(len, listed)), seed
            assert asked.cost(other.names(found.cheapest())) == min(map(asked.cost, listed)), seed


def test_masks_and_lists_answer_alike_and_in_the_same_order():
    several = 0
    for seed in range(150):
        asked = random_bounds(seed)
        unlinked = [f"unlinked {k}" for k in range(SMALL)]
        large = read_graph({**asked.value, "nodes": [*asked.value["nodes"], *unlinked]})
        assert not large.is_small
        small_answers, large_answers = asked.separators(), asked.separators(large)
        assert large_answers.exists is small_answers.exists, seed
        assert large_answers.minimal() == small_answers.minimal(), seed
        assert large_answers.smallest() == small_answers.smallest(), seed
        assert large_answers.cheapest() == small_answers.cheapest(), seed
        listed = list(small_answers.every_minimal(Deadline.never()))
        assert list(large_answers.every_minimal(Deadline.never())) == listed, seed
        several += len(listed) > 2
    assert several > 10


# Named cases.


def sets_of(graph: CausalGraph, x: str, y: str, required: str = "") -> list[str]:
    """All minimal sets of measured nodes, each as its names in one word; names are single letters."""
    sides = (graph.mask(list(side)) for side in (x, y, required))
    found = Separators(graph, *sides, graph.measured)
    listed = sorted("".join(graph.names_of(mask)) for mask in found.every_minimal(Deadline.never()))
    assert found.exists is bool(listed)
    return listed


def test_the_empty_set_separates_what_no_open_path_joins():
    assert sets_of(CausalGraph.of(("a", "b"), ("c", "b")), "a", "c") == [""]
    assert sets_of(CausalGraph.of(nodes="ac"), "a", "c") == [""]


def test_no_set_separates_neighbours_however_they_are_joined():
    # an arrow; a bidirected edge; neighbours among the sets
    assert sets_of(CausalGraph.of(("a", "b"), ("c", "a")), "a", "b") == []
    assert sets_of(CausalGraph.of(("c", "a"), bidirected=[("a", "b")]), "b", "a") == []
    graph = CausalGraph.of(("a", "b"), ("b", "c"), ("c", "d"))
    assert sets_of(graph, "ab", "cd") == []
    assert sets_of(graph, "a", "d") == ["b", "c"]


def test_no_set_separates_the_ends_of_a_path_whose_every_collider_leads_to_an_end():
    # a ↔ b ↔ c with b → c: b blocks as a link and opens as a collider
    graph = CausalGraph.of(("b", "c"), bidirected=[("a", "b"), ("b", "c")])
    assert sets_of(graph, "a", "c") == []


def test_a_required_collider_asks_for_more_and_may_leave_nothing():
    # a → c ← b, a → d → c: with c required only a neighbour could help, and there is none between a and b
    graph = CausalGraph.of(("a", "c"), ("b", "c"), ("a", "d"), ("d", "c"))
    assert sets_of(graph, "a", "b") == [""]
    assert sets_of(graph, "a", "b", required="c") == []
    # a → e → c ← b: the one that opens is made up for by a link
    graph = CausalGraph.of(("a", "e"), ("e", "c"), ("b", "c"))
    assert sets_of(graph, "a", "b", required="c") == ["ec"]


def test_an_unmeasured_link_can_be_required_and_is_not_chosen():
    graph = CausalGraph.of(("a", "u"), ("u", "b"), unmeasured="u")
    assert sets_of(graph, "a", "b") == []
    assert sets_of(graph, "a", "b", required="u") == ["u"]


def test_of_equally_good_sets_the_smallest_is_the_one_nearest_to_x_and_the_cheapest_to_y():
    # a → p → q → b: each of the two is enough
    value = graph_of(("a", "p"), ("p", "q"), ("q", "b"))
    for costs, expected in (({"p": 0.3, "q": 0.3}, "q"), ({"p": 0.29, "q": 0.3}, "p"), ({}, "q")):
        priced = [{**node, "cost": costs.get(node["id"], 1)} for node in value["nodes"]]
        graph = read_graph({**value, "nodes": priced})
        found = Separators(graph, graph.mask("a"), graph.mask("b"), 0, graph.measured)
        assert graph.names_of(found.cheapest() or 0) == (expected,)
        assert graph.names_of(found.smallest() or 0) == ("p",)


def test_costs_are_added_up_exactly():
    # Either layer separates a from b. In floats the two cost the same, and the layer nearest to b would be taken.
    for near_a, near_b in (((1e16,), (1e16, 1.0)), ((1e-9, 1e12), (1e-9, 1e-30, 1e12))):
        layers = [[f"{side}{k}" for k in range(len(costs))] for side, costs in (("l", near_a), ("r", near_b))]
        left, right = layers
        arrows = [*product("a", left), *product(left, right), *product(right, "b")]
        costs = dict(zip(left + right, near_a + near_b, strict=True))
        value = graph_of(*arrows)
        graph = read_graph({**value, "nodes": [{**n, "cost": costs.get(n["id"], 1)} for n in value["nodes"]]})
        found = Separators(graph, graph.mask("a"), graph.mask("b"), 0, graph.measured)
        assert set(graph.names_of(found.cheapest() or 0)) == set(left)
