"""Figures of adjustment sets: listing many, the first of very many, and checking one."""

from __future__ import annotations

import random
from collections.abc import Iterator
from itertools import islice

import networkx as nx

from pathgate.criteria import Deadline, Effect, are_separated, is_valid, keep_rows, total_effect
from pathgate.criteria.adjustment import valid_sets
from pathgate.graphs import CausalGraph, read_graph
from tests.bench.harness import Figure, median_seconds, times_slower
from tests.bench.worlds import graph_value, peer_graph, random_pairs


def first_hundred_sets() -> Iterator[Figure]:
    """The first 100 minimal valid sets on 1,000 nodes and 3,000 edges against one networkx separation test."""
    pairs = random_pairs(1_000, 3_000)
    graph, peer = read_graph(graph_value(1_000, pairs)), peer_graph(1_000, pairs)
    effect = _effect_with_many_sets(graph)
    treatment, outcome = graph.names_of(effect.treatments)[0], graph.names_of(effect.outcomes)[0]
    parents = set(peer.predecessors(treatment))

    def ask_peer() -> None:
        nx.is_d_separator(peer, {treatment}, {outcome}, parents - {outcome})

    yield times_slower(
        "the first 100 minimal valid sets, 1,000 nodes",
        lambda: _listed(effect, 100),
        "one networkx separation test",
        ask_peer,
        wanted="<= 100",
    )


def first_set_of_very_many() -> Iterator[Figure]:
    """The first set of 2^10 against the first of 2^100, per node and edge of the graph."""
    few, many = _ladder(10), _ladder(100)
    few_seconds = median_seconds(lambda: _listed(_fresh(few), 1), 15) / (3 * 10)
    many_seconds = median_seconds(lambda: _listed(_fresh(many), 1), 15) / (3 * 100)
    yield Figure(
        what="the first of 2^100 minimal sets, per node",
        peer="the first of 2^10, per node",
        seen=many_seconds / few_seconds,
        wanted="<= 2",
        ours=many_seconds,
        theirs=few_seconds,
    )


def checking_a_set() -> Iterator[Figure]:
    """Is a set valid, the effect set up anew, against a separation test of our own."""
    graph = read_graph(graph_value(1_000, random_pairs(1_000, 3_000)))
    effect = _effect_with_many_sets(graph)
    (covariates,) = _listed(effect, 1)

    def check() -> None:
        for _ in range(50):
            is_valid(_fresh(effect), covariates)

    def separate() -> None:
        for _ in range(50):
            are_separated(graph, effect.treatments, effect.outcomes, covariates)

    yield times_slower(
        "checking a set, 1,000 nodes", check, "our own separation test", separate, wanted="<= 3"
    )


def _listed(effect: Effect, count: int) -> list[int]:
    found = valid_sets(effect)
    if found is None:
        raise RuntimeError("no set is valid here")
    return list(islice(found.every_minimal(Deadline.never()), count))


def _fresh(effect: Effect) -> Effect:
    return total_effect(keep_rows(effect.kept.graph), effect.treatments, effect.outcomes)


def _effect_with_many_sets(graph: CausalGraph) -> Effect:
    """The first random effect with at least 100 minimal valid sets."""
    rng = random.Random(3)
    for _ in range(10_000):
        treatment, outcome = rng.sample(range(graph.size), 2)
        effect = total_effect(keep_rows(graph), 1 << treatment, 1 << outcome)
        if effect.on_causal_paths and len(_listed(effect, 100)) == 100:
            return effect
    raise RuntimeError("no effect on this graph has a hundred minimal valid sets")


def _ladder(rungs: int) -> Effect:
    """A graph in which each rung offers two columns to choose from: 2^rungs minimal valid sets."""
    arrows = [("late", "refund")]
    for rung in range(rungs):
        arrows += [(f"a{rung}", f"b{rung}"), (f"a{rung}", "late"), (f"b{rung}", "refund")]
    graph = CausalGraph.of(*arrows)
    return total_effect(keep_rows(graph), graph.mask("late"), graph.mask("refund"))
