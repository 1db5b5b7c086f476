"""The independency that an edge would break, on the rows kept: against trying every set of columns."""

from __future__ import annotations

import random
from collections import Counter
from itertools import permutations
from typing import Any

import pytest

from pathgate.criteria import Deadline, OutOfTime
from pathgate.criteria.exposing import Exposing
from pathgate.graphs.masks import mask_of
from tests.brute import separated, separating_sets, with_selection
from tests.criteria.asking import kept_of
from tests.review.brute_hinges import with_edge
from tests.strategies import random_graph, random_parts
from tests.values import (
    Graph,
    arrows_of,
    graph_of,
    is_adjacent,
    measured_names,
    node_names,
    topological_names,
)

SEEDS = [
    pytest.param(range(250), id="250"),
    pytest.param(range(250, 4_000), id="3750", marks=pytest.mark.slow),
]


def drawn(seed: int) -> tuple[Graph, list[dict[str, Any]]]:
    """A random graph, two times in five with nothing unmeasured, and a filter of up to three parts."""
    rng = random.Random(seed)
    hidden = {"bidirected": 0.0, "unmeasured": 0.0} if rng.random() < 0.4 else {}
    graph = random_graph(rng, rng.randint(2, 6), arrow=rng.choice([0.3, 0.5]), **hidden)
    return graph, random_parts(rng, graph, 3, fixed=0.35)


def exposing_of(value: Graph, parts: list[dict[str, Any]], hubs: int = 0) -> Exposing:
    kept = kept_of(value, parts)
    return Exposing(kept_of(value).graph, Deadline.never(), hubs=hubs, kept=kept)


@pytest.mark.parametrize("seeds", SEEDS)
def test_a_statement_stands_exactly_where_columns_separate_the_two_on_the_rows_kept(seeds: range):
    seen: Counter[tuple[bool, bool]] = Counter()
    for seed in seeds:
        value, parts = drawn(seed)
        selected, conditioned = with_selection(value, parts)
        exposing = exposing_of(value, parts, hubs=random.Random(seed).getrandbits(6))
        index = exposing.graph.index
        for one, other in permutations(node_names(value), 2):
            found = exposing.statements(index[one], 1 << index[other])[index[other]]
            varying = {one, other} <= set(measured_names(value)) - set(conditioned)
            can = varying and not is_adjacent(value, one, other)
            can = can and bool(separating_sets(selected, one, other, conditioned))
            assert (found is not None) is can, (seed, one, other)
            if found is not None:
                assert_is_broken_by_an_edge(value, parts, (one, other), exposing.graph.names_of(found.given))
                assert (found.x, found.y) == (
                    min(index[one], index[other]),
                    1 << max(index[one], index[other]),
                )
            seen[can, bool(parts)] += 1
    assert min(seen.values()) > len(seeds)


def assert_is_broken_by_an_edge(
    value: Graph, parts: list[dict[str, Any]], ends: tuple[str, str], given: tuple[str, ...]
) -> None:
    """It is about columns that vary, holds on the rows kept, and fails once any edge joins the two."""
    selected, conditioned = with_selection(value, parts)
    assert set(given) <= set(measured_names(value)) - set(conditioned) - set(ends)
    assert separated(selected, *ends, [*given, *conditioned])
    for edge in (("bidirected", *ends), ("directed", *ends), ("directed", *reversed(ends))):
        joined = with_edge(selected, edge)
        if topological_names(joined) is not None:
            assert not separated(joined, *ends, [*given, *conditioned])


def test_pairs_asked_for_in_bulk_are_told_as_those_asked_for_one_by_one(monkeypatch: pytest.MonkeyPatch):
    bulk = 0
    for seed in range(400):
        value, parts = drawn(seed)
        graph = kept_of(value).graph
        one_by_one = exposing_of(value, parts)
        with monkeypatch.context() as patched:
            patched.setattr("pathgate.criteria.exposing.FEW", 0)
            at_once = exposing_of(value, parts)
            for node in range(graph.size):
                others = graph.everything & ~(1 << node)
                listed = at_once.statements(node, others)
                each = (one_by_one.statements(node, 1 << other) for other in listed)
                assert listed == {other: told[other] for other, told in zip(listed, each, strict=True)}, seed
                bulk += sum(statement is not None for statement in listed.values())
    assert bulk > 1_000


#   rain → late ← promotion, late → ticket
LATE = graph_of(("rain", "late"), ("promotion", "late"), ("late", "ticket"))


def with_computed(value: Graph) -> tuple[Graph, str | None]:
    """The graph with one of its columns computed from its parents, so without unmeasured causes; None: no such."""
    above = {target for _, target in arrows_of(value)}
    computed = next((name for name in measured_names(value) if name in above), None)
    bows = [edge for edge in value["edges"] if edge.get("kind") == "bidirected"]
    gone = [edge for edge in bows if computed in (edge["source"], edge["target"])]
    return {**value, "edges": [edge for edge in value["edges"] if edge not in gone]}, computed


@pytest.mark.parametrize("seeds", SEEDS)
def test_a_statement_about_a_computed_column_leaves_it_some_variation(seeds: range):
    seen: Counter[bool] = Counter()
    for seed in seeds:
        value, computed = with_computed(drawn(seed)[0])
        parts = drawn(seed)[1]
        selected, conditioned = with_selection(value, parts)
        if computed is None or computed in conditioned:
            continue
        graph = kept_of(value).graph
        node, made_of = graph.index[computed], mask_of(graph.parents(graph.index[computed]))
        exposing = Exposing(graph, Deadline.never(), kept=kept_of(value, parts), inputs={node: made_of})
        found = exposing.statements(node, graph.everything & ~(1 << node))
        for other, statement in found.items():
            ends = computed, graph.name(other)
            can = False
            if ends[1] in set(measured_names(value)) - set(conditioned) and not is_adjacent(value, *ends):
                held = graph.mask(set(conditioned) & set(node_names(value)))
                every = separating_sets(selected, *ends, conditioned)
                can = any(made_of & ~(graph.mask(given) | held) for given in every)
            assert (statement is not None) is can, (seed, ends)
            if statement is not None:
                assert made_of & ~(statement.given | graph.mask(set(conditioned) & set(node_names(value)))), (
                    seed
                )
                assert_is_broken_by_an_edge(value, parts, ends, graph.names_of(statement.given))
            seen[can] += 1
    assert min(seen.values()) > len(seeds) / 5


def test_what_is_computed_from_a_computed_column_goes_with_it():
    #   wait → cost, cost → total ← fee; tickets by themselves
    value = graph_of(("wait", "cost"), ("cost", "total"), ("fee", "total"), isolated=["ticket"])
    graph = kept_of(value).graph
    cost, total, ticket = (graph.index[name] for name in ("cost", "total", "ticket"))
    inputs = {cost: graph.mask("wait"), total: graph.mask(["cost", "fee"])}
    told = Exposing(graph, Deadline.never(), inputs=inputs).statements(total, 1 << ticket)[ticket]
    assert told is not None
    assert graph.names_of(told.given) == ("fee",)
    assert graph.names_of(Exposing(graph, Deadline.never()).statements(total, 1 << ticket)[ticket].given) == (
        "cost",
        "fee",
    )


def test_what_the_filter_joins_has_no_statement():
    on_tickets = [{"columns": ["ticket"], "fixed": False}]
    for parts, expected in ([], True), (on_tickets, False), ([{"columns": ["ticket"], "fixed": True}], False):
        exposing = exposing_of(LATE, parts)
        rain, promotion = exposing.graph.index["rain"], exposing.graph.index["promotion"]
        told = exposing.statements(rain, 1 << promotion)[promotion]
        assert (told is not None) is expected


def test_a_column_held_at_one_value_is_in_no_statement():
    free, held = exposing_of(LATE, []), exposing_of(LATE, [{"columns": ["late"], "fixed": True}])
    index, mask = free.graph.index, free.graph.mask
    rain, late, ticket = (index[name] for name in ("rain", "late", "ticket"))
    assert free.statements(rain, 1 << ticket)[ticket].given & mask("late")
    assert not held.statements(rain, 1 << ticket)[ticket].given & mask("late")
    assert set(held.statements(late, mask(["rain", "promotion", "ticket"])).values()) == {None}
    assert held.statements(rain, 1 << late) == {late: None}


def test_asking_polls_its_deadline():
    graph = kept_of(graph_of(("a", "c"), bidirected=[("c", "b")])).graph
    moments = iter([0.0, 2.0])
    exposing = Exposing(graph, Deadline(1, clock=lambda: next(moments)))
    with pytest.raises(OutOfTime):
        exposing.statements(graph.index["a"], graph.mask("b"))
