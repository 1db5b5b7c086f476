"""Separating sets on large graphs: networkx on their size, and listings without end."""

from __future__ import annotations

import random
from collections import Counter
from collections.abc import Iterator
from itertools import islice, pairwise, product

import networkx
import pytest

from pathgate.criteria import Deadline, OutOfTime, Separators
from pathgate.graphs import CausalGraph, from_networkx, read_graph
from pathgate.graphs.graph import SMALL
from tests.strategies import random_graph
from tests.values import node_names


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
