"""Figures of the criteria and of whole requests, all in this process."""

from __future__ import annotations

import json
from collections.abc import Iterator
from typing import Any

import networkx as nx
from flask.testing import FlaskClient

from pathgate.criteria import is_separated
from pathgate.graphs import read_graph
from pathgate.web.app import create_app
from pathgate.web.settings import Settings
from tests.bench.harness import Figure, growth_exponent, median_seconds, times_faster, times_slower
from tests.bench.worlds import body_of, graph_value, peer_graph, random_pairs, random_statements

EDGES_A_NODE = 4


def whole_large_request() -> Iterator[Figure]:
    """One verdict on 10,000 nodes and 40,000 edges, the body read and checked, against json.loads of that body."""
    client = create_app(Settings()).test_client()
    pairs = random_pairs(10_000, 40_000)
    asked = {
        "graph": graph_value(10_000, pairs),
        "statements": random_statements(10_000, 1),
        "explain": False,
    }
    body = body_of(asked)
    yield times_slower(
        "/v1/separation, 10,000 nodes, whole request",
        lambda: _post(client, "/v1/separation", body),
        "json.loads of its body",
        lambda: json.loads(body),
        wanted="<= 4",
        rounds=15,
    )


def single_verdicts() -> Iterator[Figure]:
    """One verdict after another, in process, against networkx on the bare graph; then how time grows."""
    sizes = (10, 30, 100, 1_000, 10_000, 100_000)
    seconds = []
    for size in sizes:
        pairs = random_pairs(size, min(EDGES_A_NODE * size, size * (size - 1) // 4))
        ours, theirs = read_graph(graph_value(size, pairs)), peer_graph(size, pairs)
        asked = random_statements(size, max(3, min(100, 3_000 // size)))

        def ask_us(graph: Any = ours, statements: Any = asked) -> None:
            for one in statements:
                is_separated(graph, one["x"], one["y"], one["given"])

        def ask_peer(graph: Any = theirs, statements: Any = asked) -> None:
            for one in statements:
                nx.is_d_separator(graph, {one["x"]}, {one["y"]}, set(one["given"]))

        wanted = ">= 15" if size == 100_000 else ">= 10"
        rounds = 3 if size == 100_000 else 7
        what = f"one verdict, {size:,} nodes"
        figure = times_faster(what, ask_us, "networkx, in process", ask_peer, wanted=wanted, rounds=rounds)
        yield figure
        if size >= 1_000:
            seconds.append(median_seconds(ask_us, rounds) / len(asked))
    exponent = growth_exponent(sizes[-3:], seconds)
    what = "one verdict: growth exponent, 1,000 to 100,000 nodes"
    yield Figure(what, "linear", exponent, "<= 1.1", seconds[-1], seconds[0])


def many_statements() -> Iterator[Figure]:
    """2,000 statements about 300 nodes through the whole request, against networkx in process on the bare graph."""
    client = create_app(Settings()).test_client()
    pairs = random_pairs(300, 900)
    statements = random_statements(300, 2_000)
    body = body_of({"graph": graph_value(300, pairs), "statements": statements, "explain": False})
    theirs = peer_graph(300, pairs)

    def ask_peer() -> None:
        for one in statements:
            nx.is_d_separator(theirs, {one["x"]}, {one["y"]}, set(one["given"]))

    yield times_faster(
        "2,000 statements, 300 nodes, whole request",
        lambda: _post(client, "/v1/separation", body),
        "networkx, in process",
        ask_peer,
        wanted=">= 20",
        rounds=5,
    )


def _post(client: FlaskClient, path: str, body: bytes) -> None:
    answer = client.post(path, data=body, content_type="application/json")
    if answer.status_code != 200:
        raise RuntimeError(f"{path} answered {answer.status_code}: {answer.get_data(as_text=True)[:300]}")
