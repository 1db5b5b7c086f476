"""Separating sets within bounds against all subsets, networkx on large graphs, and listings without end."""

from __future__ import annotations

import random
from collections import Counter
from collections.abc import Iterator
from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property
from itertools import combinations, islice, pairwise, product

import networkx
import pytest

from pathgate.criteria import Deadline, OutOfTime, Separators
from pathgate.graphs import CausalGraph, from_networkx, read_graph
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


# Large graphs.


def large_dag(seed: int, size: int) -> networkx.DiGraph:
    """Each node with up to three parents among those shortly before it, names in no helpful order."""
    rng = random.Random(seed)
    names = [f"column {place}" for place in range(size)]
    rng.shuffle(names)
    plain = networkx.DiGraph()
    plain.add_nodes_from(sorted(names))
    for late in range(1, size):
        early = {rng.randrange(max(0, late - 9), late) for _ in range(rng.randint(0, 4))}
        plain.add_edges_from((names[place], names[late]) for place in sorted(early))
    return plain


def moral_graph(plain: networkx.DiGraph, ends: set[str]) -> networkx.Graph:
    """The moral graph of the ancestors of both (Lauritzen et al. 1990)."""
    relevant = set.union(ends, *(networkx.ancestors(plain, end) for end in ends))
    return networkx.moral_graph(plain.subgraph(relevant))


def test_on_large_dags_networkx_agrees_on_existence_minimality_and_size():
    sizes: Counter[int | None] = Counter()
    plain = large_dag(1, SMALL + 200)
    graph = from_networkx(plain)
    assert not graph.is_small
    order, rng = list(networkx.topological_sort(plain)), random.Random(1)
    for _ in range(15):
        place = rng.randrange(20, len(order) - 20)
        x, y = order[place], order[min(place + rng.randint(1, 60), len(order) - 1)]
        found = Separators(graph, graph.mask(x), graph.mask(y), 0, graph.measured)
        assert found.exists is (not plain.has_edge(x, y))
        if not found.exists:
            sizes[None] += 1
            continue
        moral = moral_graph(plain, {x, y})
        smallest = set(graph.names_of(found.smallest() or 0))
        # Menger 1927: as many disjoint paths as the smallest set has nodes.
        assert len(smallest) == networkx.node_connectivity(moral, x, y)
        listed = [set(graph.names_of(mask)) for mask in islice(found.every_minimal(Deadline.never()), 4)]
        for one in (smallest, set(graph.names_of(found.minimal() or 0)), *listed):
            assert_minimal_cut(moral, x, y, one)
        assert len(set(map(frozenset, listed))) == len(listed)
        sizes[len(smallest)] += 1
    assert len(sizes) > 2


def assert_minimal_cut(moral: networkx.Graph, x: str, y: str, chosen: set[str]) -> None:
    """Without the nodes chosen nothing leads from x to y, and each of them touches both sides."""
    rest = moral.subgraph(moral.nodes - chosen)
    sides = [networkx.node_connected_component(rest, end) for end in (x, y)]
    assert y not in sides[0]
    assert all(set(moral[node]) & side for node in chosen for side in sides)


def test_networkx_finds_what_we_list_to_be_minimal_within_bounds():
    rng, seen = random.Random(4), Counter[bool]()
    for seed in range(25):
        value = random_graph(rng, 12, arrow=0.2, bidirected=0, unmeasured=0)
        graph = read_graph(value)
        plain = networkx.DiGraph([(edge["source"], edge["target"]) for edge in value["edges"]])
        plain.add_nodes_from(node_names(value))
        x, y, must, *rest = rng.sample(node_names(value), 12)
        allowed = set(rest[:7])
        found = Separators(graph, *map(graph.mask, ({x}, {y}, {must}, allowed)))
        listed = [set(graph.names_of(mask)) for mask in found.every_minimal(Deadline.never())]
        theirs = networkx.find_minimal_d_separator(plain, x, y, included={must}, restricted=allowed | {must})
        assert bool(listed) is (theirs is not None), seed
        assert theirs is None or theirs in listed, seed
        for one in listed:
            assert networkx.is_minimal_d_separator(
                plain, x, y, one, included={must}, restricted=allowed | {must}
            )
        seen[bool(listed)] += 1
    assert min(seen.values()) > 3


# Listings without end.


def counting_deadline(readings: float) -> tuple[Deadline, list[int]]:
    """A deadline that comes with that many readings of its clock, and a list as long as those so far."""
    read: list[int] = []

    def clock() -> float:
        read.append(1)
        return 0.0 if len(read) <= readings else 2.0

    return Deadline(1, clock=clock), read


def lanes(count: int) -> CausalGraph:
    """x → a0 → b0 → y, x → a1 → b1 → y …: each lane is cut at either of its two nodes, 2 ** count sets."""
    return CausalGraph.of(
        *(pair for k in range(count) for pair in (("x", f"a{k}"), (f"a{k}", f"b{k}"), (f"b{k}", "y")))
    )


def ladder(rungs: int) -> CausalGraph:
    """x → a0 → a1 → …, x → b0 → b1 → …, rungs from each a to its b, and both ends lead to y."""
    rails = [pair for rail in "ab" for pair in pairwise(["x", *(f"{rail}{k}" for k in range(rungs)), "y"])]
    return CausalGraph.of(*rails, *((f"a{k}", f"b{k}") for k in range(rungs)))


def listing(graph: CausalGraph, deadline: Deadline) -> Iterator[int]:
    found = Separators(graph, graph.mask("x"), graph.mask("y"), 0, graph.measured)
    return found.every_minimal(deadline)


@pytest.mark.parametrize("graph", [lanes(40), lanes(600)], ids=["40 lanes", "600 lanes, beyond masks"])
def test_of_more_sets_than_can_be_listed_the_first_hundred_come_at_once(graph: CausalGraph):
    count = (graph.size - 2) // 2
    wanted = 100 if graph.is_small else 3
    deadline, read = counting_deadline(10_000_000)
    found = [graph.names_of(mask) for mask in islice(listing(graph, deadline), wanted)]
    assert len(set(found)) == wanted
    for names in found:
        assert sorted(int(name[1:]) for name in names) == list(range(count))
    # One search a node of the set before, and one look at the clock each.
    assert len(read) <= wanted * (count + 2)


def test_a_ladder_of_forty_rungs_is_listed_to_the_end():
    graph = ladder(40)
    found = [graph.names_of(mask) for mask in listing(graph, Deadline.never())]
    # One node of each rail is cut, at heights so near to each other that no rung leads around them.
    moral = networkx.moral_graph(networkx.DiGraph(edges_of(graph)))
    expected = {
        (f"a{i}", f"b{j}") for i, j in product(range(40), repeat=2) if is_cut(moral, f"a{i}", f"b{j}")
    }
    assert {tuple(sorted(names)) for names in found} == expected
    assert len(found) == len(expected) > 40


def edges_of(graph: CausalGraph) -> list[tuple[str, str]]:
    return [
        (graph.name(node), graph.name(child)) for node in range(graph.size) for child in graph.children(node)
    ]


def is_cut(moral: networkx.Graph, *chosen: str) -> bool:
    return not networkx.has_path(moral.subgraph(moral.nodes - set(chosen)), "x", "y")


def test_between_one_set_and_the_next_lie_polynomially_many_steps():
    for seed in range(60):
        rng = random.Random(seed)
        value = random_graph(rng, 12, arrow=0.25, bidirected=0.05, unmeasured=0.1)
        graph = read_graph(value)
        x, y = rng.sample(node_names(value), 2)
        deadline, read = counting_deadline(10_000_000)
        found = Separators(graph, graph.mask(x), graph.mask(y), 0, graph.measured)
        before = len(read)
        for _ in found.every_minimal(deadline):
            assert len(read) - before <= graph.size**2
            before = len(read)
        assert len(read) - before <= graph.size**2


def test_the_deadline_ends_a_listing_between_two_sets_and_within_the_search_for_one():
    graph = lanes(40)
    for readings in (1, 2, 45, 200, 1000):
        deadline, read = counting_deadline(readings)
        found = []
        with pytest.raises(OutOfTime):
            found.extend(listing(graph, deadline))
        assert len(read) == readings + 1
        assert len(found) < readings
    deadline, _ = counting_deadline(5)
    in_time = listing(graph, deadline)
    next(in_time)
    with pytest.raises(OutOfTime):
        next(in_time)
