"""Figures of promised independencies."""

from __future__ import annotations

import json
import random
import statistics
from collections.abc import Iterator
from dataclasses import replace
from itertools import islice
from typing import Any

import networkx as nx
from flask.testing import FlaskClient

from pathgate.criteria import Deadline, keep_rows
from pathgate.criteria.independencies import Independency, separable_pairs, smallest
from pathgate.criteria.separable import Pairs
from pathgate.graphs import read_graph
from pathgate.web.app import create_app
from pathgate.web.settings import Settings
from tests.bench.harness import Figure, seconds, times_slower
from tests.bench.worlds import body_of, graph_value, peer_graph, random_pairs

SAMPLE = 400
TURNS = 5


def smallest_for_all_pairs() -> Iterator[Figure]:
    """A smallest statement for every pair of a 150-node DAG through HTTP, against networkx looped over the pairs.

    The peer is asked about a sample of the pairs, in turn with our pages, and its time extrapolated.
    """
    arrows = random_pairs(150, 375)
    value, peer = graph_value(150, arrows), peer_graph(150, arrows)
    graph = read_graph(value)
    pairs = list(separable_pairs(Pairs(keep_rows(graph)), Deadline.never()))
    drawn = random.Random(5).sample(pairs, SAMPLE)
    sample = [(graph.name(first), graph.name(second)) for first, second in drawn]
    client = create_app(Settings()).test_client()

    def all_pages() -> None:
        if (listed := _all_pages(client, value)) != len(pairs):
            raise RuntimeError(f"{listed} statements for {len(pairs)} pairs")

    def peer_on_sample() -> None:
        for first, second in sample:
            nx.find_minimal_d_separator(peer, {first}, {second})

    turns = [(seconds(peer_on_sample) / SAMPLE * len(pairs), seconds(all_pages)) for _ in range(TURNS)]
    yield Figure(
        what=f"smallest for all {len(pairs):,} pairs of 150 nodes, all pages",
        peer="networkx's minimal separator, looped",
        seen=statistics.median(their / our for their, our in turns),
        wanted=">= 10",
        ours=statistics.median(our for _their, our in turns),
        theirs=statistics.median(their for their, _our in turns),
    )


def first_page_of_a_large_graph() -> Iterator[Figure]:
    """The first hundred statements of a 2,000-node graph through HTTP, against their separators in process.

    Ours holds all that a caller waits for: the body (some 160 kB) is read, the answer built and written. Theirs is
    the separators alone, for the same pairs, of a graph that is read already but has nothing worked out yet.
    """
    value = graph_value(2000, random_pairs(2000, 5000))
    body = body_of({"graph": value, "limit": 100})
    graph = read_graph(value)
    client = create_app(Settings()).test_client()
    pairs = list(islice(separable_pairs(Pairs(keep_rows(graph)), Deadline.never()), 100))

    def page() -> None:
        answer = client.post("/v1/independencies", data=body, content_type="application/json")
        listed = json.loads(answer.get_data())["independencies"]
        if [(each["x"], each["y"]) for each in listed] != [(graph.name(a), graph.name(b)) for a, b in pairs]:
            raise RuntimeError("the page holds other pairs")

    def separators() -> list[Independency]:
        fresh = Pairs(keep_rows(replace(graph)))
        return [smallest(fresh, *pair) for pair in pairs]

    yield times_slower(
        "first page (100 statements) of 2,000 nodes and 5,000 edges, body read",
        page,
        "its hundred separators, in process",
        separators,
        wanted="<= 2",
    )


def _all_pages(client: FlaskClient, value: dict[str, Any]) -> int:
    count = 0
    cursor: dict[str, str] = {}
    while True:
        body = body_of({"graph": value, "limit": 1000, **cursor})
        answer = client.post("/v1/independencies", data=body, content_type="application/json")
        document = json.loads(answer.get_data())
        count += len(document["independencies"])
        if document["complete"]:
            return count
        cursor = {"cursor": document["cursor"]}
