"""Asks the service and reads what it answers, for the tests of several operations."""

from __future__ import annotations

import json
import random
from itertools import pairwise
from typing import Any

from tests.http.conftest import Service
from tests.strategies import random_graph
from tests.values import Graph

Json = dict[str, Any]


def chain() -> Graph:
    # weather → late_van → full_locker → refund
    names = ["weather", "late_van", "full_locker", "refund"]
    return {
        "nodes": names,
        "edges": [{"source": a, "target": b} for a, b in pairwise(names)],
    }


def ask(service: Service, path: str, **body: Any) -> Json:
    reply = service.post(path, body)
    assert reply.status_code == 200, reply.text
    return json.loads(reply.data)


def refusal(service: Service, path: str, **body: Any) -> tuple[str, list[str]]:
    """The problem's slug, and the pointers of all faults."""
    reply = service.post(path, body)
    document = json.loads(reply.data)
    assert (reply.status_code, document["status"]) == (422, 422), document
    pointers = [error["pointer"] for error in document.get("errors", [])]
    return document["type"].removeprefix("/problems/"), pointers


def faults(service: Service, path: str, **body: Any) -> dict[str, str]:
    """From pointer to detail, for a request that is refused."""
    reply = service.post(path, body)
    assert reply.status_code == 422, reply.text
    return {fault["pointer"]: fault["detail"] for fault in json.loads(reply.data)["errors"]}


def asked_graph(seed: int, most_nodes: int = 7) -> tuple[random.Random, Graph]:
    rng = random.Random(seed)
    arrow, bidirected = rng.choice([(0.2, 0.05), (0.3, 0.15), (0.45, 0.1)])
    return rng, random_graph(rng, rng.randint(3, most_nodes), arrow=arrow, bidirected=bidirected)


def turned_round(value: Any) -> Any:
    """The same with the members of every object in the opposite order; lists stay as they are."""
    if isinstance(value, dict):
        return {member: turned_round(held) for member, held in reversed(value.items())}
    return [turned_round(item) for item in value] if isinstance(value, list) else value
