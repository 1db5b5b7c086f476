"""Figures of a change of graph in process: a team's configs against both graphs, with what did it and the promises."""

from __future__ import annotations

import random
from collections import Counter
from collections.abc import Iterator
from itertools import combinations, islice
from typing import Any

from pathgate.criteria import Deadline
from pathgate.graphs import CausalGraph, read_graph
from pathgate.review.changed_promises import lost_and_gained
from pathgate.review.changes import change_of
from pathgate.review.graph_difference import Difference
from tests.bench.harness import Figure, times_slower
from tests.bench.reviewing import random_configs, separation_tests
from tests.bench.worlds import graph_value, peer_graph, random_pairs

NODES, ARROWS = 100, 250
CONFIGS = 100


def change_of_graph() -> Iterator[Figure]:
    """A hundred configs where one arrow goes and two come; against a separation test for each config and graph."""
    pairs = random_pairs(NODES, ARROWS)
    graph = read_graph(graph_value(NODES, pairs))
    changed = read_graph(graph_value(NODES, _changed(pairs, graph)))
    peer = peer_graph(NODES, pairs)
    configs = list(islice(random_configs(graph), CONFIGS))

    def compare() -> Counter[str]:
        difference = Difference(graph, changed)
        for _statement in lost_and_gained(difference, Deadline.never()):
            pass
        return Counter(change_of(config, difference).outcome for config in configs)

    found = ", ".join(f"{count} {outcome}" for outcome, count in sorted(compare().items()))
    yield times_slower(
        f"100 configs where three arrows of 100 nodes change ({found})",
        compare,
        "networkx separation tests, two a config",
        separation_tests(peer, [*configs, *configs]),
        wanted="<= 20",
    )


def _changed(pairs: list[tuple[str, str]], graph: CausalGraph) -> list[tuple[str, str]]:
    """The arrows less one, and two more along the order in which they lead."""
    rng = random.Random(7)
    order = [graph.name(node) for node in graph.topological_order]
    absent: list[Any] = [pair for pair in combinations(order, 2) if pair not in set(pairs)]
    return [*pairs[1:], *rng.sample(absent, 2)]
