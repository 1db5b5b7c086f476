"""Figures of whole reviews in process: the verdict with all that goes with it, and what it hinges on."""

from __future__ import annotations

import random
from collections.abc import Callable, Iterator
from itertools import islice
from typing import Any

import networkx as nx

from pathgate.criteria import Deadline
from pathgate.graphs import CausalGraph, read_graph
from pathgate.graphs.kinship import descendants
from pathgate.graphs.masks import members
from pathgate.review import read_config, review
from pathgate.review.hinge_document import whole_document
from pathgate.review.provenance import graph_digest
from tests.bench.harness import Figure, times_slower
from tests.bench.worlds import graph_value, peer_graph, random_pairs

NODES, ARROWS = 100, 250
CONFIGS = 60


def one_review() -> Iterator[Figure]:
    """Configs of a team, the config read and the answer made into its document, against separation tests.

    A third adjusts for the treatment's causes, a third for some of them, a third for random columns; half of them
    filter rows. The graph is read and its digest taken before, as it is once for a folder of configs.
    """
    pairs = random_pairs(NODES, ARROWS)
    graph, peer = read_graph(graph_value(NODES, pairs)), peer_graph(NODES, pairs)
    configs = list(islice(random_configs(graph), CONFIGS))
    verdicts = [review(graph, read_config(config, graph)).verdict for config in configs]
    shown = ", ".join(f"{verdicts.count(verdict)} {verdict}" for verdict in sorted(set(verdicts)))
    for what, hinges, wanted in (
        (f"one review in process, 100 nodes ({shown})", False, "<= 5"),
        ("the same with what it hinges on", True, "<= 500"),
    ):
        yield times_slower(
            what,
            _reviewing(graph, configs, hinges=hinges),
            "networkx separation tests",
            separation_tests(peer, configs),
            wanted=wanted,
        )


def random_configs(graph: CausalGraph) -> Iterator[dict[str, Any]]:
    """Configs without end, the same ones each time."""
    rng = random.Random(11)
    columns = list(graph.names)
    while True:
        treatment = rng.randrange(graph.size)
        below = list(members(descendants(graph, 1 << treatment) & ~(1 << treatment)))
        if not below or not graph.parents(treatment):
            continue
        for kind in range(3):
            outcome = graph.name(rng.choice(below))
            causes = [graph.name(node) for node in graph.parents(treatment)]
            chosen = {0: causes, 1: causes[1:], 2: rng.sample(columns, 4)}[kind]
            ends = {graph.name(treatment), outcome}
            config = {
                "name": "bench",
                "treatment": graph.name(treatment),
                "outcome": outcome,
                "covariates": [name for name in chosen if name not in ends],
            }
            if rng.random() < 0.5:
                config["row_filter"] = [rng.choice(columns)]
            yield config


def _reviewing(graph: CausalGraph, configs: list[dict[str, Any]], *, hinges: bool) -> Callable[[], None]:
    digest = graph_digest(graph)

    def run() -> None:
        for config in configs:
            answer = review(graph, read_config(config, graph))
            whole_document(answer, Deadline.never(), hinges=hinges, known_digest=digest)

    return run


def separation_tests(peer: nx.DiGraph, configs: list[dict[str, Any]]) -> Callable[[], None]:
    """One of networkx's separation tests for each config: treatment and outcome given the covariates."""

    def run() -> None:
        for config in configs:
            nx.is_d_separator(peer, {config["treatment"]}, {config["outcome"]}, set(config["covariates"]))

    return run
