"""Cycles: one is shown for each part of the graph that has some, and each shown is one."""

from __future__ import annotations

import random
from itertools import pairwise

import networkx
import pytest

from pathgate.graphs import examine_graph
from tests.strategies import HOSTILE_NAMES, PLAIN_NAMES


def value_of(arrows: list[tuple[str, str]], names: list[str]) -> dict:
    return {"nodes": names, "edges": [{"source": one, "target": other} for one, other in arrows]}


def assert_shows_its_cycles(arrows: list[tuple[str, str]], names: list[str]) -> int:
    examined = examine_graph(value_of(arrows, names))
    plain = networkx.DiGraph(arrows)
    plain.add_nodes_from(names)
    components = [part for part in networkx.strongly_connected_components(plain) if len(part) > 1]
    shown = [fault.cycle for fault in examined.faults]
    assert all((fault.slug, fault.place) == ("cycle", ("edges",)) for fault in examined.faults)
    assert examined.is_acyclic is not bool(components)
    assert sorted(map(sorted, [next(p for p in components if cycle[0] in p) for cycle in shown])) == sorted(
        map(sorted, components)
    )
    for cycle in shown:
        assert cycle[0] == cycle[-1]
        assert len(set(cycle)) == len(cycle) - 1 >= 2
        assert all(plain.has_edge(*step) for step in pairwise(cycle))
        # No shorter one goes through its first node.
        back = networkx.shortest_path_length(plain, cycle[1], cycle[0])
        assert len(cycle) - 1 <= 1 + back
    return len(shown)


def test_random_digraphs_show_one_cycle_for_each_cyclic_component():
    counts = set()
    for seed in range(1500):
        rng = random.Random(seed)
        names = rng.sample(PLAIN_NAMES, rng.randint(2, 10))
        chance = rng.choice([0.08, 0.15, 0.3])
        arrows = [(one, other) for one in names for other in names if one != other and rng.random() < chance]
        counts.add(assert_shows_its_cycles(arrows, names))
    assert counts >= {0, 1, 2}


def test_a_cycle_in_a_large_graph_is_found():
    rng = random.Random(1)
    names = [f"n{k}" for k in range(3000)]
    arrows = {(names[rng.randrange(k)], names[k]) for k in range(1, 3000) for _ in range(2)}
    assert assert_shows_its_cycles(sorted(arrows), names) == 0
    assert assert_shows_its_cycles([*sorted(arrows), (names[2999], names[0])], names) == 1
    ring = [*zip(names, names[1:] + names[:1], strict=True)]
    assert assert_shows_its_cycles(ring, names) == 1
    (fault,) = examine_graph(value_of(ring, names)).faults
    assert len(fault.cycle) == 3001
    assert len(fault.detail) < 400


@pytest.mark.parametrize("size", [2, 3, 25])
def test_hostile_names_are_shown_in_a_cycle_as_they_are(size: int):
    names = list(HOSTILE_NAMES[:size])
    assert assert_shows_its_cycles([*pairwise(names), (names[-1], names[0])], names) == 1


def test_a_self_loop_counts_as_a_cycle_and_a_bidirected_one_does_not():
    value = value_of([("a", "a")], ["a"])
    assert not examine_graph(value).is_acyclic
    value["edges"][0]["kind"] = "bidirected"
    assert examine_graph(value).is_acyclic
    assert [fault.rule for fault in examine_graph(value).faults] == ["self-loop"]


def test_which_cycle_is_shown_does_not_depend_on_the_order_of_the_edges():
    for seed in range(300):
        rng = random.Random(seed)
        names = list(PLAIN_NAMES[:7])
        arrows = [(one, other) for one in names for other in names if one != other and rng.random() < 0.3]
        moved = rng.sample(arrows, len(arrows))
        shown, other = (
            [f.cycle for f in examine_graph(value_of(each, names)).faults] for each in (arrows, moved)
        )
        assert shown == other
