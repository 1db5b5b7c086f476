"""Many statements at once against each alone, against the definition by paths, and where paths turn often."""

from __future__ import annotations

import random
from collections import Counter
from collections.abc import Sequence
from itertools import pairwise

import networkx
import pytest

from pathgate.criteria import Deadline, OutOfTime, are_separated, separated_each
from pathgate.criteria.batch import FEW, Statement
from pathgate.graphs import CausalGraph, read_graph
from pathgate.graphs.graph import SMALL
from tests.brute import separated
from tests.strategies import Question, random_graph, random_question, renamed, shuffled
from tests.values import Graph, arrows_of, node_names, with_explicit_causes

GRAPHS = [
    pytest.param(range(250), id="250"),
    pytest.param(range(250, 5000), id="4750", marks=pytest.mark.slow),
]


def masks_of(graph: CausalGraph, asked: Sequence[Question]) -> list[Statement]:
    return [(graph.mask(one.x), graph.mask(one.y), graph.mask(one.given)) for one in asked]


def together(value: Graph, asked: Sequence[Question]) -> list[bool]:
    """The verdicts on all statements, asked at once."""
    graph = read_graph(value)
    return separated_each(graph, masks_of(graph, asked), Deadline.never())


def mixed_graph(rng: random.Random, most_nodes: int) -> Graph:
    size = rng.randint(2, most_nodes)
    return random_graph(rng, size, arrow=rng.choice([0.2, 0.35, 0.5]), bidirected=rng.choice([0, 0.1, 0.3]))


@pytest.mark.parametrize("seeds", GRAPHS)
def test_each_of_many_verdicts_is_that_of_the_definition(seeds: range):
    seen: Counter[bool] = Counter()
    for seed in seeds:
        rng = random.Random(seed)
        value = mixed_graph(rng, 7)
        asked = [random_question(rng, value) for _ in range(FEW + 4)]
        expected = [separated(value, one.x, one.y, one.given) for one in asked]
        assert together(value, asked) == expected, seed
        seen.update(expected)
    assert min(seen.values()) > len(seeds)


@pytest.mark.parametrize("seeds", GRAPHS)
def test_each_of_many_verdicts_is_the_one_it_gets_alone(seeds: range):
    seen: Counter[bool] = Counter()
    for seed in seeds:
        rng = random.Random(seed)
        value = mixed_graph(rng, 12)
        graph = read_graph(value)
        # 64 and 128 lanes fill words of the machine.
        number = rng.choice([1, FEW - 1, FEW, FEW + 1, 63, 64, 65, 129])
        statements = masks_of(graph, [random_question(rng, value) for _ in range(number)])
        expected = [are_separated(graph, *statement) for statement in statements]
        assert separated_each(graph, statements, Deadline.never()) == expected, seed
        seen.update(expected)
    assert min(seen.values()) > len(seeds)


def test_below_and_above_few_every_number_of_statements_is_answered():
    rng = random.Random(5)
    value = random_graph(rng, 9, arrow=0.3, bidirected=0.1)
    asked = [random_question(rng, value) for _ in range(3 * FEW)]
    expected = [separated(value, one.x, one.y, one.given) for one in asked]
    assert len(set(expected)) == 2
    for number in range(3 * FEW + 1):
        assert together(value, asked[:number]) == expected[:number]


def test_the_two_sides_the_order_and_repeats_of_statements_do_not_matter():
    for seed in range(200):
        rng = random.Random(seed)
        value = mixed_graph(rng, 9)
        asked = [random_question(rng, value) for _ in range(20)]
        expected = together(value, asked)
        turned = [Question(one.y, one.x, one.given) for one in asked]
        assert together(value, turned) == expected, seed
        places = rng.choices(range(20), k=50)
        assert together(value, [asked[place] for place in places]) == [expected[place] for place in places]
        assert together(shuffled(value, rng), asked) == expected, seed


def test_other_names_in_another_order_get_the_same_verdicts():
    for seed in range(200):
        rng = random.Random(seed)
        value = mixed_graph(rng, 9)
        asked = [random_question(rng, value) for _ in range(20)]
        names = node_names(value)
        new_names = dict(zip(names, rng.sample(names, len(names)), strict=True))
        other = shuffled(renamed(value, new_names), rng)
        moved = [
            Question(*(tuple(map(new_names.__getitem__, side)) for side in (one.x, one.y, one.given)))
            for one in asked
        ]
        assert together(other, moved) == together(value, asked), seed


# Zigzags: paths that turn at every other node.


def zigzag(turns: int, rng: random.Random) -> CausalGraph:
    """r0 → k0 ← r1 → k1 ← r2 …: to get from r0 to r_n, n colliders must be open."""
    arrows = [(f"r{k + side}", f"k{k}") for k in range(turns) for side in (0, 1)]
    nodes = [f"r{k}" for k in range(turns + 1)] + [f"k{k}" for k in range(turns)]
    # In no helpful order: a pass in the order of the nodes gets no further than one turn.
    rng.shuffle(nodes)
    rng.shuffle(arrows)
    return CausalGraph.of(*arrows, nodes=nodes)


@pytest.mark.parametrize("turns", [30, 300, SMALL])
def test_paths_that_turn_at_many_opened_colliders_reach_as_far_as_those_are_open(turns: int):
    rng = random.Random(turns)
    graph = zigzag(turns, rng)
    colliders = graph.mask([f"k{k}" for k in range(turns)])
    statements, expected = [], []
    for _ in range(60):
        start, end = sorted(rng.sample(range(turns + 1), 2))
        shut = rng.randrange(turns)
        ends = [graph.mask(f"r{place}") for place in rng.sample([start, end], 2)]
        statements.append((ends[0], ends[1], colliders & ~graph.mask(f"k{shut}")))
        expected.append(start <= shut < end)
    assert separated_each(graph, statements, Deadline.never()) == expected
    assert [are_separated(graph, *statement) for statement in statements] == expected
    assert min(Counter(expected).values()) > 10


def test_bidirected_edges_in_a_row_join_as_far_as_every_node_between_is_opened():
    # k0 ↔ k1 ↔ … with k_n → below_n: conditioning on what lies below opens a node without blocking it
    length, rng = 200, random.Random(6)
    row = [f"k{k}" for k in range(length)]
    below = [(name, f"below {name}") for name in row]
    graph = CausalGraph.of(*below, bidirected=pairwise(row))
    statements, expected = [], []
    for _ in range(80):
        start, end = sorted(rng.sample(range(length), 2))
        shut, onward = rng.randrange(length), rng.random() < 0.5
        given = {f"below k{k}" if onward else f"k{k}" for k in range(start + 1, end) if k != shut}
        statements.append((graph.mask(f"k{start}"), graph.mask(f"k{end}"), graph.mask(given)))
        expected.append(start < shut < end)
    assert separated_each(graph, statements, Deadline.never()) == expected
    assert [are_separated(graph, *statement) for statement in statements] == expected
    assert min(Counter(expected).values()) > 15


def test_lanes_do_not_leak_into_each_other():
    # One long chain; lane k is blocked at its k-th node and asks about everything before or after.
    length = 150
    chain = [f"c{k:03}" for k in range(length)]
    graph = CausalGraph.of(*pairwise(chain))
    first, last = graph.mask(chain[0]), graph.mask(chain[-1])
    statements = [(first, last, graph.mask(name)) for name in chain[1:-1]]
    assert separated_each(graph, statements, Deadline.never()) == [True] * (length - 2)
    joined = [(first, graph.mask(chain[place - 1]), graph.mask(chain[place])) for place in range(2, length)]
    assert separated_each(graph, joined, Deadline.never()) == [False] * (length - 2)
    assert separated_each(graph, statements + joined, Deadline.never()) == [True] * 148 + [False] * 148


def test_on_a_graph_beyond_masks_networkx_agrees():
    rng = random.Random(2)
    groups = []
    for group in range(SMALL // 10 + 5):
        value = random_graph(rng, 10, arrow=0.15, bidirected=0.15)
        groups.append(renamed(value, {name: f"{name} of {group}" for name in node_names(value)}))
    whole: Graph = {
        "nodes": [node for value in groups for node in value["nodes"]],
        "edges": [edge for value in groups for edge in value["edges"]],
    }
    graph = read_graph(whole)
    assert not graph.is_small
    asked = [random_question(rng, value, single=True) for value in groups]
    plain = [networkx.DiGraph(arrows_of(with_explicit_causes(value))) for value in groups]
    for value, each in zip(groups, plain, strict=True):
        each.add_nodes_from(node_names(value))
    expected = [
        networkx.is_d_separator(each, set(one.x), set(one.y), set(one.given))
        for each, one in zip(plain, asked, strict=True)
    ]
    statements = masks_of(graph, asked)
    assert separated_each(graph, statements, Deadline.never()) == expected
    assert [are_separated(graph, *statement) for statement in statements] == expected
    assert min(Counter(expected).values()) > 20


def test_many_statements_are_cut_off_by_the_deadline_between_two_turns():
    graph = zigzag(300, random.Random(1))
    colliders = graph.mask([f"k{k}" for k in range(300)])
    statements = [(graph.mask("r0"), graph.mask("r300"), colliders)] * (FEW + 1)
    read: list[int] = []

    def clock() -> float:
        read.append(1)
        return 0.0 if len(read) <= 20 else 2.0

    with pytest.raises(OutOfTime):
        separated_each(graph, statements, Deadline(1, clock=clock))
    assert len(read) == 21


def test_few_statements_are_cut_off_by_the_deadline_between_two_of_them():
    graph = zigzag(3, random.Random(1))
    statements = [(graph.mask("r0"), graph.mask("r3"), 0)] * 2
    assert separated_each(graph, statements, Deadline.never()) == [True, True]
    moments = iter([0.0])
    with pytest.raises(OutOfTime):
        separated_each(graph, statements, Deadline(1, clock=lambda: next(moments, 2.0)))
