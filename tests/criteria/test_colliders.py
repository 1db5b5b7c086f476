"""Colliders, what opens them, and the pairs that conditioning joins, against the definitions."""

from __future__ import annotations

import random
from collections.abc import Sequence

import pytest

from pathgate.criteria import Collider, Deadline, OutOfTime, colliders, induced
from pathgate.graphs import CausalGraph
from tests import brute
from tests.brute import descendants, induced_pairs, with_selection
from tests.criteria.asking import kept_of
from tests.strategies import random_graph, random_parts
from tests.values import Graph, arrows_of, as_set, is_adjacent, node_names

SEEDS = [
    pytest.param(range(500), id="500"),
    pytest.param(range(500, 3000), id="2500", marks=pytest.mark.slow),
]


def asked(seed: int) -> tuple[Graph, list[str], list[dict]]:
    """A graph, what is given, and parts of a filter, unmeasured columns among what both name."""
    rng = random.Random(seed)
    value = random_graph(rng, rng.randint(2, 7), arrow=rng.choice([0.25, 0.45]), bidirected=0.12)
    given = [name for name in node_names(value) if rng.random() < 0.2]
    parts = random_parts(rng, value, 2)
    if rng.random() < 0.3:
        parts.append({"columns": rng.sample(node_names(value), rng.randint(1, 2)), "fixed": False})
    return value, given, parts


def found_colliders(value: Graph, given: Sequence[str], parts: list[dict]) -> list[Collider]:
    kept = kept_of(value, parts)
    columns = kept.graph.mask(node_names(value))
    return list(colliders(kept, kept.graph.mask(given), columns=columns))


@pytest.mark.parametrize("seeds", SEEDS)
def test_every_collider_comes_once_with_what_opens_it(seeds: range):
    opened = 0
    for seed in seeds:
        value, given, parts = asked(seed)
        found = found_colliders(value, given, parts)
        listed = [(each.node, frozenset(each.between)) for each in found]
        assert len(set(listed)) == len(listed)
        assert set(listed) == brute.colliders(value), seed
        places = [tuple(map(node_names(value).index, (each.node, *each.between))) for each in found]
        assert places == sorted(places), seed
        for each in found:
            assert each.shielded is is_adjacent(value, *each.between)
            assert set(each.opened_by) == columns_that_open(value, each.node, given, parts), seed
            assert each.open is bool(each.opened_by)
            opened += each.open
    assert opened > len(seeds)


def columns_that_open(value: Graph, node: str, given: Sequence[str], parts: list[dict]) -> set[str]:
    """The node's descendants, itself included, that are given or that some part of the filter reads."""
    read = {column for part in parts for column in as_set(part["columns"])}
    return set(descendants(value, node)) & (set(given) | read)


@pytest.mark.parametrize("seeds", SEEDS)
def test_induced_pairs_are_those_that_conditioning_joins(seeds: range):
    total = 0
    for seed in seeds:
        value, given, parts = asked(seed)
        kept = kept_of(value, parts)
        found = list(induced(kept, kept.graph.mask(given), deadline=Deadline.never()))
        pairs = [(each.x, each.y) for each in found]
        expected = induced_pairs(value, given, parts)
        assert set(map(frozenset, pairs)) == expected, seed
        assert len(pairs) == len(expected), seed
        places = [tuple(map(node_names(value).index, pair)) for pair in pairs]
        assert places == sorted(places)
        assert all(x < y for x, y in places)
        for each in found:
            assert_goes_through(value, given, parts, each.x, each.y, each.through)
        total += len(found)
    assert total > len(seeds) / 4


def assert_goes_through(
    value: Graph, given: list[str], parts: list[dict], x: str, y: str, through: tuple[str, ...]
) -> None:
    """Some shortest open path passes exactly these colliders, selection nodes aside, in this order."""
    selected, conditioned = with_selection(value, parts)
    columns = set(node_names(value))
    paths = list(brute.open_paths(selected, x, y, {*given, *conditioned}))
    shortest = min(len(path.arrows) for path in paths)
    passed = [
        tuple(node for node, is_collider in path.inner() if is_collider and node in columns)
        for path in paths
        if len(path.arrows) == shortest
    ]
    assert through in passed


def test_a_filter_on_two_columns_joins_them_through_no_column():
    # weather and promo are unlinked; rows are kept by both together
    value: Graph = {"nodes": ["weather", "promo"], "edges": []}
    kept = kept_of(value, [{"columns": ["weather", "promo"]}])
    (pair,) = induced(kept, 0, deadline=Deadline.never())
    assert (pair.x, pair.y, pair.through) == ("weather", "promo", ())
    assert list(colliders(kept, 0, columns=kept.graph.mask(["weather", "promo"]))) == []


def test_nothing_is_induced_where_nothing_is_conditioned_on(ticket_graph: CausalGraph):
    value = {
        "nodes": list(ticket_graph.names),
        "edges": [{"source": s, "target": t} for s, t in (("order_value", "refund"),)],
    }
    assert list(induced(kept_of(value), 0, deadline=Deadline.never())) == []


def test_a_bidirected_edge_beside_an_arrow_makes_no_pair_of_its_own():
    # van → late, van ↔ late: one neighbour with arrowheads at late, hence no collider
    value: Graph = {
        "nodes": ["van", "late"],
        "edges": [
            {"source": "van", "target": "late"},
            {"source": "late", "target": "van", "kind": "bidirected"},
        ],
    }
    assert len(arrows_of(value)) == 1
    assert found_colliders(value, ["late"], []) == []


def test_the_search_for_induced_pairs_is_cut_off_by_the_deadline():
    # many causes of one ticket, which is given
    names = [f"cause{k}" for k in range(30)]
    value: Graph = {
        "nodes": [*names, "ticket"],
        "edges": [{"source": name, "target": "ticket"} for name in names],
    }
    kept = kept_of(value)
    given = kept.graph.mask("ticket")
    assert len(list(induced(kept, given, deadline=Deadline.never()))) == 30 * 29 // 2
    readings = iter([0.0] * 40)
    listing = induced(kept, given, deadline=Deadline(1, clock=lambda: next(readings, 2.0)))
    assert next(listing).x == "cause0"
    with pytest.raises(OutOfTime):
        list(listing)
