"""What to measure next, against every choice of unmeasured nodes and common causes, tried one by one."""

from __future__ import annotations

import random
from collections import Counter
from collections.abc import Iterator
from fractions import Fraction
from itertools import product

import pytest

from pathgate.criteria import Deadline, Effect, OutOfTime
from pathgate.criteria.adjustment import direct_effect
from pathgate.criteria.measuring import MeasureNext, measure_next
from pathgate.criteria.whole import is_weightable
from tests.brute import subsets, valid_sets, with_selection
from tests.criteria.asking import effect_of, kept_of
from tests.criteria.recovering import recovery_by_paths
from tests.strategies import Question, random_graph, random_parts, random_question, shuffled
from tests.values import Graph, bidirected_of, fresh_name, graph_of, measured_names, node_names

# Every choice of measuring is tried on every graph: not for a quick look.
pytestmark = pytest.mark.slow

MANY = [
    pytest.param(range(150), id="150"),
    pytest.param(range(150, 700), id="550", marks=pytest.mark.slow),
    pytest.param(range(700, 2500), id="1800", marks=pytest.mark.full),
]
Measuring = tuple[frozenset[str], frozenset[tuple[str, str]]]
"""Unmeasured nodes and bidirected edges."""


def measured(value: Graph, measuring: Measuring) -> Graph:
    """The graph in which these nodes and the causes behind these edges are measured."""
    nodes, edges = measuring
    taken = node_names(value)
    changed = [{**node, "measured": node["measured"] or node["id"] in nodes} for node in value["nodes"]]
    kept = []
    for edge in value["edges"]:
        if edge.get("kind") == "bidirected" and (edge["source"], edge["target"]) in edges:
            cause = fresh_name("common", taken)
            taken.append(cause)
            changed.append({"id": cause, "measured": True})
            kept += [{"source": cause, "target": edge["source"]}, {"source": cause, "target": edge["target"]}]
        else:
            kept.append(edge)
    return {"nodes": changed, "edges": kept}


def choices(value: Graph, ends: set[str], excluded: frozenset[str]) -> Iterator[tuple[Fraction, Measuring]]:
    """Everything that may be measured, cheapest first."""
    costs = {node["id"]: Fraction(node["cost"]) for node in value["nodes"]}
    hidden = [name for name in costs if name not in {*measured_names(value), *ends, *excluded}]
    every = [
        (sum((costs[name] for name in nodes), Fraction(len(edges))), (nodes, frozenset(edges)))
        for nodes, edges in product(subsets(hidden), subsets(bidirected_of(value)))
    ]
    yield from sorted(every, key=lambda choice: choice[0])


def answered(effect: Effect, found: MeasureNext) -> Measuring:
    """The production code's answer in names."""
    graph = effect.kept.graph
    edges = frozenset((graph.name(a), graph.name(b)) for a, b in found.causes_of)
    return frozenset(graph.names_of(found.nodes)), edges


def drawn(seed: int) -> tuple[random.Random, Graph, Question, list[dict]]:
    """Much is unmeasured here, and a filter rarely there."""
    rng = random.Random(seed)
    value = random_graph(
        rng,
        rng.randint(3, 6),
        arrow=rng.choice([0.3, 0.45]),
        bidirected=0.15,
        unmeasured=rng.choice([0.3, 0.5]),
    )
    # The lower index first, as the graph itself has it.
    names = node_names(value)
    for edge in value["edges"]:
        if edge.get("kind") == "bidirected":
            edge["source"], edge["target"] = sorted([edge["source"], edge["target"]], key=names.index)
    asked = random_question(rng, value, single=rng.random() < 0.7)
    for node in value["nodes"]:
        node["cost"] = rng.choice([0.25, 0.5, 1, 1.5, 3])
    parts = random_parts(rng, value, most=rng.choice([0, 0, 1]))
    return rng, value, asked, parts


def exists(
    value: Graph, asked: Question, parts: list[dict], bounds: tuple[frozenset[str], frozenset[str]], asks: str
) -> bool:
    """Is some set valid that holds the required and none of the excluded columns?"""
    required, excluded = bounds
    selected, conditioned = with_selection(value, parts)
    held = frozenset(conditioned)
    every = valid_sets(selected, asked.x, asked.y, conditioned, asks=asks)
    return any(required <= one | (held & required) and not one & (excluded - held) for one in every)


@pytest.mark.parametrize("asks", ["total", "direct"])
@pytest.mark.parametrize("seeds", MANY)
def test_the_cheapest_measuring_is_found_exactly_where_some_measuring_helps(seeds: range, asks: str):
    seen: Counter[str] = Counter()
    for seed in seeds:
        rng, value, asked, parts = drawn(seed if asks == "total" else -1 - seed)
        if asks == "direct":
            asked = Question(asked.x[:1], asked.y[:1], ())
        ends = {*asked.x, *asked.y}
        free = [name for name in node_names(value) if name not in ends]
        excluded = frozenset(name for name in free if rng.random() < 0.15)
        columns = sorted(set(measured_names(value)) - ends - excluded)
        required = frozenset(name for name in columns if rng.random() < 0.1)
        effect = (
            direct_of(value, asked, parts) if asks == "direct" else effect_of(value, asked.x, asked.y, parts)
        )
        graph = effect.kept.graph
        bounds = (required, excluded)
        found = measure_next(
            effect, Deadline.never(), required=graph.mask(required), allowed=~graph.mask(excluded)
        )
        helps = (
            cost
            for cost, measuring in choices(value, ends, excluded)
            if exists(measured(value, measuring), asked, parts, bounds, asks)
        )
        assert (None if found is None else found.cost) == next(helps, None), seed
        if found is not None:
            measuring = answered(effect, found)
            assert exists(measured(value, measuring), asked, parts, bounds, asks), seed
            assert (found.cost, measuring) in choices(value, ends, excluded), seed
        seen["none" if found is None else "something" if found.cost else "nothing"] += 1
        seen["causes and nodes"] += found is not None and bool(found.nodes) and bool(found.causes_of)
    assert min(seen.values()) > len(seeds) / 100


def direct_of(value: Graph, asked: Question, parts: list[dict]) -> Effect:
    kept = kept_of(value, parts)
    return direct_effect(kept, kept.graph.mask(asked.x), kept.graph.mask(asked.y))


@pytest.mark.parametrize("seeds", MANY)
def test_measuring_recovers_the_effect_in_everybody_exactly_where_the_selection_can_be_undone(seeds: range):
    seen: Counter[str] = Counter()
    for seed in seeds:
        rng, value, asked, _ = drawn(seed)
        parts = random_parts(rng, value)
        known = frozenset(name for name in measured_names(value) if rng.random() < 0.6)
        effect = effect_of(value, asked.x, asked.y, parts)
        found = None
        if is_weightable(effect, effect.kept.graph.mask(known)):
            found = measure_next(effect, Deadline.never())
        ends = {*asked.x, *asked.y}
        helps = (
            cost
            for cost, measuring in choices(value, ends, frozenset())
            if recovered_by_some(measured(value, measuring), asked, parts, known)
        )
        assert (None if found is None else found.cost) == next(helps, None), seed
        seen["none" if found is None else "something" if found.cost else "nothing"] += 1
    assert min(seen.values()) > len(seeds) / 50


def recovered_by_some(value: Graph, asked: Question, parts: list[dict], known: frozenset[str]) -> bool:
    selected, conditioned = with_selection(value, parts)
    recovers = recovery_by_paths(selected, conditioned, asked)
    free = [name for name in measured_names(value) if name not in (*asked.x, *asked.y)]
    return any(recovers(one, known) for one in subsets(free))


#   u → x → y ← u, x ↔ y: both the node and the common cause are needed
BOTH = graph_of(("u", "x"), ("u", "y"), ("x", "y"), bidirected=[("x", "y")], unmeasured=["u"])


def test_a_node_and_a_common_cause_together():
    effect = effect_of(BOTH, "x", "y")
    found = measure_next(effect, Deadline.never())
    assert found is not None
    assert answered(effect, found) == ({"u"}, {("x", "y")})
    assert found.cost == 2


def test_what_is_excluded_is_not_to_be_measured():
    effect = effect_of(BOTH, "x", "y")
    assert measure_next(effect, Deadline.never(), allowed=~effect.kept.graph.mask("u")) is None


def test_a_filter_on_the_outcome_cannot_be_measured_away():
    effect = effect_of(BOTH, "x", "y", [{"columns": ["y"], "fixed": False}])
    assert measure_next(effect, Deadline.never()) is None


def test_nothing_is_to_be_measured_where_a_valid_set_exists():
    effect = effect_of(graph_of(("w", "x"), ("w", "y"), ("x", "y"), bidirected=[("x", "w")]), "x", "y")
    assert measure_next(effect, Deadline.never()) == MeasureNext(0, (), Fraction(0))


#   x ← a ← b → y: either of two equally cheap nodes would do
def test_of_equally_cheap_nodes_the_one_nearest_to_the_outcome_in_any_order_of_the_graph():
    value = graph_of(("b", "a"), ("a", "x"), ("b", "y"), ("x", "y"), unmeasured=["a", "b"])
    for seed in range(12):
        effect = effect_of(shuffled(value, random.Random(seed)), "x", "y")
        found = measure_next(effect, Deadline.never())
        assert found is not None
        assert answered(effect, found) == ({"b"}, set())


def test_the_deadline_is_polled():
    moments = iter([0.0, 2.0])
    with pytest.raises(OutOfTime):
        measure_next(effect_of(BOTH, "x", "y"), Deadline(1, clock=lambda: next(moments)))
