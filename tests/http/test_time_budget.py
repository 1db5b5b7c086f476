"""Where much is told the clock is looked at, and a listing that time cuts short is still an answer."""

from __future__ import annotations

import json
from itertools import pairwise

from pathgate.criteria.adjustment import total_effect
from pathgate.criteria.deadline import Deadline
from pathgate.criteria.selection import keep_rows
from pathgate.criteria.usability import unusable_columns
from pathgate.graphs import CausalGraph, read_graph
from pathgate.review.claims import Claim
from pathgate.review.config import read_config
from pathgate.review.warnings import warning_findings
from pathgate.web.endpoints import OPERATIONS
from tests.http.conftest import service_with

Edges = list[dict[str, str]]


def arrows(*pairs: tuple[str, str]) -> Edges:
    return [{"source": source, "target": target} for source, target in pairs]


def test_a_listing_that_time_cuts_short_is_answered_as_far_as_it_came():
    # Twenty back-door paths of three columns each: one of each must be held fixed, 3 ** 20 choices.
    service = service_with(OPERATIONS, time_budget_seconds=1, max_page=100_000)
    paths = [(f"a{number}", f"b{number}", f"c{number}") for number in range(20)]
    pairs = [pair for a, b, c in paths for pair in ((b, a), (a, "late_delivery"), (b, c), (c, "refund"))]
    nodes = ["late_delivery", "refund", *[name for path in paths for name in path]]
    body = {
        "graph": {"nodes": nodes, "edges": arrows(*pairs, ("late_delivery", "refund"))},
        "treatment": "late_delivery",
        "outcome": "refund",
        "limit": 100_000,
    }
    answer = json.loads(service.post("/v1/adjustment", body).data)
    assert answer["sets"]
    assert answer["complete"] is False
    assert answer["cursor"]


class Clock:
    """Counts how often it is looked at; no time ever passes."""

    looks = 0

    def __call__(self) -> float:
        self.looks += 1
        return 0.0


def test_the_clock_is_looked_at_for_every_treatment_with_a_warning():
    # c0 → c1 → c2 → … , the odd ones as treatments and the even ones as outcomes.
    names = [f"c{place}" for place in range(100)]
    graph = CausalGraph.of(*pairwise(names))
    config = read_config({"treatment": names[1::2], "outcome": names[::2], "covariates": []}, graph)
    clock = Clock()
    found = list(warning_findings(Claim.of(config), config, Deadline(1, clock)))
    assert len(found) > 50
    assert clock.looks > len(found)


def test_the_clock_is_looked_at_for_every_unusable_column():
    # Each m: late_delivery ↔ m ↔ refund, opened by adjusting for m and blocked by nothing else.
    names = [f"m{number}" for number in range(50)]
    ends = ("late_delivery", "refund")
    edges = [{"source": end, "target": name, "kind": "bidirected"} for end in ends for name in names]
    graph = read_graph({"nodes": [*ends, *names], "edges": edges})
    clock = Clock()
    effect = total_effect(keep_rows(graph), graph.mask("late_delivery"), graph.mask("refund"))
    assert len(unusable_columns(effect, Deadline(1, clock))) == 50
    assert clock.looks > 50
