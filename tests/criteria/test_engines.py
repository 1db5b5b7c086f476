"""Masks on small graphs and arrays on large ones give the same answers, and networkx agrees with the latter."""

from __future__ import annotations

import random
from collections import Counter

import networkx
import pytest

from pathgate.criteria import (
    are_separated,
    find_open_path,
    is_valid,
    keep_rows,
    separation,
    total_effect,
    valid_set,
)
from pathgate.criteria.paths import directed_path, find_open_paths
from pathgate.criteria.reachability import Conditions, connected
from pathgate.graphs import CausalGraph, ancestors, descendants, from_networkx, read_graph
from pathgate.graphs.graph import SMALL
from tests.brute import Path
from tests.criteria.asking import edges_exist, parts_of
from tests.strategies import random_graph, random_parts, random_question, renamed
from tests.values import Graph, arrows_of, node_names


def random_mask(rng: random.Random, graph: CausalGraph, share: float) -> int:
    return sum(1 << node for node in range(graph.size) if rng.random() < share)


def both_sizes(value: Graph) -> tuple[CausalGraph, CausalGraph]:
    """The graph as it is, and with so many unlinked nodes after its own that masks are too wide for it."""
    small = read_graph(value)
    large = read_graph({**value, "nodes": [*value["nodes"], *(f"unlinked {k}" for k in range(SMALL))]})
    assert (small.is_small, large.is_small) == (True, False)
    return small, large


def test_both_engines_find_the_same_nodes_whatever_blocks_and_opens():
    for seed in range(150):
        rng = random.Random(seed)
        small, large = both_sizes(random_graph(rng, rng.randint(1, 10), arrow=0.3, bidirected=0.15))
        starts, blocking = random_mask(rng, small, 0.2), random_mask(rng, small, 0.3)
        conditions = Conditions(blocking, ancestors(small, random_mask(rng, small, 0.2)))
        assert connected(large, starts, conditions) == connected(small, starts, conditions), seed


def test_both_engines_name_the_same_kin():
    for seed in range(100):
        rng = random.Random(seed)
        small, large = both_sizes(random_graph(rng, rng.randint(1, 10), arrow=0.3))
        nodes, avoided = random_mask(rng, small, 0.3), rng.choice([0, random_mask(rng, small, 0.3)])
        for kin in (ancestors, descendants):
            assert kin(large, nodes, avoiding=avoided) == kin(small, nodes, avoiding=avoided), seed


@pytest.mark.parametrize("fewest_colliders", [False, True])
def test_both_engines_find_the_same_of_several_shortest_paths(*, fewest_colliders: bool):
    seen: Counter[int] = Counter()
    for seed in range(150):
        rng = random.Random(seed)
        small, large = both_sizes(random_graph(rng, rng.randint(5, 12), arrow=0.3, bidirected=0.15))
        starts, ends = random_mask(rng, small, 0.2), random_mask(rng, small, 0.3)
        conditions = Conditions(random_mask(rng, small, 0.3), ancestors(small, random_mask(rng, small, 0.2)))
        found, expected = (
            list(find_open_paths(graph, starts, ends, conditions, fewest_colliders=fewest_colliders))
            for graph in (small, large)
        )
        assert found == expected, seed
        seen.update(len(trail.arrows) for trail in found)
        assert directed_path(small, starts, ends) == directed_path(large, starts, ends), seed
    assert min(seen[1], seen[2], seen[3]) > 5, seen


def test_both_engines_explain_a_separation_alike():
    seen: Counter[bool] = Counter()
    for seed in range(100):
        rng = random.Random(seed)
        value = random_graph(rng, rng.randint(2, 8), arrow=0.3, bidirected=0.15)
        small, large = both_sizes(value)
        asked = random_question(rng, value)
        answer = separation(small, asked.x, asked.y, asked.given)
        assert separation(large, asked.x, asked.y, asked.given) == answer, seed
        sides = [small.mask(side) for side in (asked.x, asked.y, asked.given)]
        assert are_separated(large, *sides) is are_separated(small, *sides) is answer.separated, seed
        seen[answer.separated] += 1
    assert min(seen.values()) > 20


def test_both_engines_judge_adjustment_sets_alike():
    seen: Counter[bool] = Counter()
    for seed in range(100):
        rng = random.Random(seed)
        value = random_graph(rng, rng.randint(2, 8), arrow=0.3, bidirected=0.15)
        asked, parts = random_question(rng, value), random_parts(rng, value)
        verdicts = []
        for graph in both_sizes(value):
            kept = keep_rows(graph, parts_of(graph, parts))
            effect = total_effect(kept, graph.mask(asked.x), graph.mask(asked.y))
            verdicts.append((is_valid(effect, graph.mask(asked.given)), valid_set(effect)))
        assert verdicts[0] == verdicts[1], seed
        seen[verdicts[0][0]] += 1
    assert min(seen.values()) > 10


def large_value(seed: int, *, size: int = SMALL + 500) -> Graph:
    """More nodes than masks are made for, in many loosely joined groups, in no helpful order."""
    rng = random.Random(seed)
    names = [f"column {place}" for place in range(size)]
    rng.shuffle(names)
    pairs = {(rng.randrange(max(0, late - 12), late), late) for late in range(1, size) for _ in range(2)}
    edges = [{"source": names[early], "target": names[late]} for early, late in sorted(pairs)]
    rng.shuffle(edges)
    return {"nodes": sorted(names), "edges": edges}


@pytest.fixture(scope="module")
def large() -> tuple[CausalGraph, networkx.DiGraph]:
    value = large_value(1)
    plain = networkx.DiGraph(arrows_of(value))
    plain.add_nodes_from(node_names(value))
    return read_graph(value), plain


def test_on_a_graph_of_many_groups_networkx_agrees_on_separation():
    # networkx visits nodes over and over where there are many ways to them, so the groups are small.
    rng = random.Random(3)
    plain, groups = networkx.DiGraph(), []
    for group in range(SMALL // 8 + 10):
        value = random_graph(rng, 8, arrow=0.3, bidirected=0)
        value = renamed(value, {name: f"{name} of {group}" for name in node_names(value)})
        plain.add_nodes_from(node_names(value))
        plain.add_edges_from(arrows_of(value))
        groups.append(value)
    graph = from_networkx(plain)
    assert not graph.is_small
    seen: Counter[bool] = Counter()
    for value in groups:
        asked = random_question(rng, value)
        expected = networkx.is_d_separator(plain, set(asked.x), set(asked.y), set(asked.given))
        assert separation(graph, asked.x, asked.y, asked.given).separated is expected
        seen[expected] += 1
    assert min(seen.values()) > 20


def test_on_a_large_graph_open_paths_exist_and_no_shorter_one_does(
    large: tuple[CausalGraph, networkx.DiGraph],
):
    graph, plain = large
    undirected = plain.to_undirected()
    value = {"nodes": list(plain), "edges": [{"source": s, "target": t} for s, t in plain.edges]}
    joined = 0
    for seed in range(8):
        rng = random.Random(seed)
        x, y = rng.sample(list(plain), 2)
        path = separation(graph, x, y).open_path
        if path is None:
            continue
        assert edges_exist(Path(path.nodes, path.arrows), value)
        assert all(step.role != "collider" for step in path.steps)
        shared = networkx.ancestors(plain, x) | {x}, networkx.ancestors(plain, y) | {y}
        # Unconditionally a path is open when it goes up from x to a common ancestor and down to y.
        up = networkx.single_source_shortest_path_length(plain.reverse(), x)
        down = networkx.single_source_shortest_path_length(plain.reverse(), y)
        assert len(path.arrows) == min(up[node] + down[node] for node in shared[0] & shared[1])
        assert len(path.arrows) >= networkx.shortest_path_length(undirected, x, y)
        joined += 1
    assert joined > 3


def test_on_a_large_graph_kin_and_neighbours_are_those_of_networkx(
    large: tuple[CausalGraph, networkx.DiGraph],
):
    graph, plain = large
    for name in random.Random(5).sample(list(plain), 40):
        node = graph.index[name]
        assert set(graph.names_of(ancestors(graph, 1 << node))) == networkx.ancestors(plain, name) | {name}
        assert set(graph.names_of(descendants(graph, 1 << node))) == (
            networkx.descendants(plain, name) | {name}
        )
        assert [graph.name(other) for other in graph.children(node)] == sorted(plain.successors(name))
        assert [graph.name(other) for other in graph.parents(node)] == sorted(plain.predecessors(name))


def test_a_path_with_the_fewest_colliders_is_preferred_to_a_shorter_one():
    # x → c ← y with c conditioned on, and x ← a ← b → y
    graph = CausalGraph.of(("x", "c"), ("y", "c"), ("a", "x"), ("b", "a"), ("b", "y"))
    x, y, c = (graph.mask(name) for name in "xyc")
    shortest = find_open_path(graph, x, y, Conditions.on(graph, c))
    plainest = find_open_path(graph, x, y, Conditions.on(graph, c), fewest_colliders=True)
    assert shortest is not None
    assert plainest is not None
    assert graph.name(shortest.nodes[1]) == "c"
    assert [graph.name(node) for node in plainest.nodes] == ["x", "a", "b", "y"]
