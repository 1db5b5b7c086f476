"""Vanishing tetrads and their choke points, against treks enumerated by definition and against linear worlds."""

from __future__ import annotations

import random
import sys
from collections.abc import Iterator
from itertools import combinations, islice, product
from math import comb

import numpy as np
import pytest

from pathgate.criteria import Deadline, OutOfTime, Tetrad, tetrads
from pathgate.criteria.tetrads import tetrads_from
from pathgate.graphs import CausalGraph, read_graph
from tests.brute_paths import all_directed_paths
from tests.linear_worlds import TOLERANCE, Matrix, draw_world
from tests.strategies import random_graph, renamed
from tests.values import Graph, bidirected_of, graph_of, measured_names, node_names

# All minors and treks are listed: not for a quick look.
pytestmark = pytest.mark.slow

SEEDS = [
    pytest.param(range(500), id="500"),
    pytest.param(range(500, 1500), id="1000", marks=pytest.mark.slow),
    pytest.param(range(1500, 4000), id="2500", marks=pytest.mark.full),
]

Minor = tuple[tuple[str, str], tuple[str, str]]
Trek = tuple[frozenset[str], frozenset[str]]


def asked(seed: int) -> Graph:
    rng = random.Random(seed)
    return random_graph(
        rng,
        rng.choice([4, 5, 6, 7, 7]),
        arrow=rng.choice([0.2, 0.3, 0.45]),
        bidirected=rng.choice([0.0, 0.1, 0.3]),
        unmeasured=rng.choice([0.0, 0.2]),
    )


def listed(value: Graph) -> list[Tetrad]:
    return list(tetrads(read_graph(value), Deadline.never()))


def minors_of(found: list[Tetrad]) -> list[Minor]:
    return [(each.rows, each.columns) for each in found]


def all_minors(value: Graph) -> Iterator[Minor]:
    """Every tetrad of measured columns once: its first column is a row, and pairs keep the graph's order."""
    for four in combinations(measured_names(value), 4):
        for partner in four[1:]:
            one, other = (name for name in four[1:] if name != partner)
            yield (four[0], partner), (one, other)


def treks(value: Graph, row: str, column: str) -> Iterator[Trek]:
    """By definition: a directed path to each from one top, or from the two ends of a bidirected edge."""
    tops = {(name, name) for name in node_names(value)}
    tops |= {pair for a, b in bidirected_of(value) for pair in ((a, b), (b, a))}
    ways = product(all_directed_paths(value, ending_at=row), all_directed_paths(value, ending_at=column))
    for up, down in ways:
        if (up[0], down[0]) in tops:
            yield frozenset(up), frozenset(down)


def is_chosen_by_definition(value: Graph, minor: Minor) -> bool:
    """Every covariance in it has a trek, and one node on one side meets all the treks."""
    by_entry = [list(treks(value, row, column)) for row, column in product(*minor)]
    every = [trek for entry in by_entry for trek in entry]
    return all(by_entry) and any(
        all(name in trek[side] for trek in every) for name in node_names(value) for side in (0, 1)
    )


def vanishing(determinant: Matrix, size: Matrix) -> Matrix:
    return np.abs(determinant) <= TOLERANCE * (1 + size)


def vanishing_in_worlds(value: Graph, minors: list[Minor], draws: int = 4) -> tuple[set[Minor], set[Minor]]:
    """The minors that vanish in every world drawn, and those of them with no vanishing covariance in them."""
    names = node_names(value)
    rows, columns = (
        np.array([[names.index(name) for name in minor[side]] for minor in minors]) for side in (0, 1)
    )
    is_zero = np.ones(len(minors), dtype=bool)
    has_zero = np.ones((len(minors), 2, 2), dtype=bool)
    for seed in range(draws):
        world = draw_world(value, np.random.default_rng(seed))
        held = world.among(names, names)[rows[:, :, None], columns[:, None, :]]
        straight, crossed = held[:, 0, 0] * held[:, 1, 1], held[:, 0, 1] * held[:, 1, 0]
        is_zero &= vanishing(straight - crossed, np.abs(straight) + np.abs(crossed))
        has_zero &= vanishing(held, np.zeros_like(held))
    zero = {minor for minor, is_it in zip(minors, is_zero, strict=True) if is_it}
    whole = {minor for minor, entries in zip(minors, has_zero, strict=True) if not entries.any()}
    return zero, zero & whole


@pytest.mark.parametrize("seeds", SEEDS)
def test_the_minors_that_vanish_in_linear_worlds_are_listed_and_no_others(seeds: range):
    total = 0
    for seed in seeds:
        value = asked(seed)
        minors = list(all_minors(value))
        found = minors_of(listed(value))
        assert len(set(found)) == len(found), seed
        assert found == [minor for minor in minors_in_order(value) if minor in set(found)], seed
        if minors:
            zero, wanted = vanishing_in_worlds(value, minors)
            assert set(found) == wanted, seed
            assert_the_rest_vanishes_by_a_row_or_column(value, zero - wanted)
        total += len(found)
    assert total > len(seeds)


def minors_in_order(value: Graph) -> list[Minor]:
    place = node_names(value).index
    return sorted(all_minors(value), key=lambda minor: [place(name) for pair in minor for name in pair])


def assert_the_rest_vanishes_by_a_row_or_column(value: Graph, minors: set[Minor]) -> None:
    """What is left out follows from vanishing covariances alone."""
    for rows, columns in minors:
        linked = [[any(treks(value, row, column)) for column in columns] for row in rows]
        lines = [*linked, *zip(*linked, strict=True)]
        assert any(not any(line) for line in lines)


@pytest.mark.parametrize("seeds", SEEDS)
def test_choke_points_meet_every_trek_on_their_side_and_exist_for_no_other_minor(seeds: range):
    sides = {"rows": 0, "columns": 0}
    for seed in seeds:
        value = asked(seed)
        found = listed(value)
        for each in found:
            assert len(each.rows_side) + len(each.columns_side) == 1
            sides["rows"] += len(each.rows_side)
            sides["columns"] += len(each.columns_side)
            for row, column in product(each.rows, each.columns):
                for up, down in treks(value, row, column):
                    assert up & set(each.rows_side) or down & set(each.columns_side), (seed, each)
        wanted = {minor for minor in all_minors(value) if is_chosen_by_definition(value, minor)}
        assert set(minors_of(found)) == wanted, seed
    assert min(sides.values()) > len(seeds) / 4


def test_one_factor_with_four_indicators_gives_spearmans_three():
    # haste, unmeasured, behind all four
    signs = ("late_pickup", "ticket_opened", "refund", "app_opens")
    found = listed(graph_of(*(("haste", sign) for sign in signs), unmeasured=["haste"]))
    assert minors_of(found) == [
        (("late_pickup", "ticket_opened"), ("refund", "app_opens")),
        (("late_pickup", "refund"), ("ticket_opened", "app_opens")),
        (("late_pickup", "app_opens"), ("ticket_opened", "refund")),
    ]
    assert {(each.rows_side, each.columns_side) for each in found} == {(("haste",), ())}


def test_two_joined_factors_keep_the_tetrad_between_them_only():
    # haste → late, calls; care → refund, claim; haste ↔ care
    arrows = [("haste", "late"), ("haste", "calls"), ("care", "refund"), ("care", "claim")]
    value = graph_of(*arrows, bidirected=[("haste", "care")], unmeasured=["haste", "care"])
    (only,) = listed(value)
    assert (only.rows, only.columns) == (("late", "calls"), ("refund", "claim"))
    assert (only.rows_side, only.columns_side) == (("haste",), ())


def test_an_end_of_a_bidirected_edge_stands_for_the_cause_behind_it():
    # late → reminder, ticket → refund, late ↔ ticket
    value = graph_of(("late", "reminder"), ("ticket", "refund"), bidirected=[("late", "ticket")])
    (only,) = listed(value)
    assert (only.rows, only.columns) == (("late", "reminder"), ("ticket", "refund"))
    assert (only.rows_side, only.columns_side) == (("late",), ())


def test_a_choke_point_on_the_columns_side_is_found():
    # two causes of late, which leads to the columns: the columns hang on late, the rows do not
    value = graph_of(("rain", "late"), ("van", "late"), ("late", "ticket"), ("late", "refund"))
    found = {(each.rows, each.columns): each for each in listed(value)}
    across = found[("rain", "van"), ("ticket", "refund")]
    assert (across.rows_side, across.columns_side) == ((), ("late",))
    assert (("rain", "ticket"), ("van", "refund")) not in found


def test_four_columns_joined_pairwise_by_bidirected_edges_keep_none():
    assert listed(graph_of(bidirected=combinations("abcd", 2))) == []


def test_unlinked_columns_and_graphs_of_few_columns_give_none():
    assert listed({"nodes": [], "edges": []}) == []
    assert listed({"nodes": list("abcdef"), "edges": []}) == []
    assert listed(graph_of(("f", "a"), ("f", "b"), ("f", "c"), unmeasured=["f"])) == []


def test_names_do_not_matter_and_the_order_of_edges_does_not_either():
    for seed in range(100):
        value = asked(seed)
        names = {name: f"column {place}" for place, name in enumerate(node_names(value))}
        turned = renamed(value, names) | {"edges": renamed(value, names)["edges"][::-1]}
        assert minors_of(listed(turned)) == [
            (tuple(names[n] for n in rows), tuple(names[n] for n in columns))
            for rows, columns in minors_of(listed(value))
        ]


def one_factor(indicators: int) -> CausalGraph:
    return CausalGraph.of(*(("haste", f"sign{k}") for k in range(indicators)), unmeasured=["haste"])


def test_a_listing_begins_where_it_is_told_to():
    graph = one_factor(7)
    everything = list(tetrads_from(graph, 0, Deadline.never()))
    assert [tetrad for _place, tetrad in everything] == list(tetrads(graph, Deadline.never()))
    places = [place for place, _tetrad in everything]
    assert len(places) == 3 * comb(7, 4)
    assert places == sorted(set(places))
    for start in range(places[-1] + 2):
        assert list(tetrads_from(graph, start, Deadline.never())) == [e for e in everything if e[0] >= start]


@pytest.mark.parametrize("at_once", [1, 2, 5])
def test_the_number_of_pairs_gone_through_at_once_does_not_matter(
    at_once: int, monkeypatch: pytest.MonkeyPatch
):
    values = [asked(seed) for seed in range(60)]
    before = [listed(value) for value in values]
    monkeypatch.setattr(sys.modules["pathgate.criteria.tetrads"], "_MOST_PAIRS", at_once)
    assert [listed(value) for value in values] == before


class Counted(Deadline):
    """A deadline that never comes and knows how often it was looked at."""

    looks = 0

    def poll(self) -> None:
        self.looks += 1


def test_the_first_page_of_a_hundred_columns_takes_one_block_of_pairs():
    """Of 4,950 pairs of rows the first 1,024 are gone through, and nothing is made that is not asked for."""
    deadline = Counted(1.0)
    graph = one_factor(100)
    page = list(islice(tetrads(graph, deadline), 100))
    assert len(page) == 100
    assert deadline.looks == 2 * graph.size + 1


def test_a_late_page_of_fifty_columns_comes_without_those_before():
    """Of 1,225 pairs of rows those from the page's place on are gone through, one block instead of two."""
    graph = one_factor(50)
    place = next(
        place for place, found in tetrads_from(graph, 0, Deadline.never()) if found.rows[0] == "sign40"
    )
    deadline = Counted(1.0)
    page = list(islice(tetrads_from(graph, place, deadline), 100))
    assert {found.rows[0] for _place, found in page} == {"sign40"}
    assert deadline.looks <= 2 * graph.size + len(page)


def test_the_search_is_cut_off_by_the_deadline():
    # a hundred unlinked columns: nothing to list, and many pairs to look at
    graph = CausalGraph.of(nodes=[f"column{k}" for k in range(100)])
    assert list(tetrads(graph, Deadline.never())) == []
    readings = iter([0.0] * 300)
    with pytest.raises(OutOfTime):
        list(tetrads(graph, Deadline(1, clock=lambda: next(readings, 2.0))))
