"""What a verdict rests on over HTTP: told unless it is not wanted, and the same as in the process."""

from __future__ import annotations

import json

from pathgate.criteria.deadline import Deadline
from pathgate.demo import demo_configs, demo_graph
from pathgate.graphs import read_graph
from pathgate.review import read_config, review
from pathgate.review.hinge_document import whole_document
from tests.http.conftest import Service


def test_a_review_over_http_says_what_it_hinges_on_as_in_the_process(service: Service):
    graph = read_graph(demo_graph())
    for config in demo_configs():
        reply = service.post("/v1/review", {"graph": demo_graph(), "config": config})
        answer = review(graph, read_config(config, graph))
        assert json.loads(reply.data) == whole_document(answer, Deadline.never(), hinges=True)
        assert bool(json.loads(reply.data)["hinges_on"]["absent_edges"]) is (answer.verdict == "sound")


def test_hinges_are_left_out_where_they_are_not_wanted(service: Service):
    body = {"graph": demo_graph(), "config": demo_configs()[0]}
    with_hinges = json.loads(service.post("/v1/review", {**body, "hinges": True}).data)
    without = json.loads(service.post("/v1/review", {**body, "hinges": False}).data)
    assert with_hinges.pop("hinges_on")["complete"]
    assert without == with_hinges


def test_hinges_that_are_neither_true_nor_false_are_refused_at_their_place(service: Service):
    reply = service.post("/v1/review", {"graph": demo_graph(), "config": demo_configs()[0], "hinges": "no"})
    assert reply.status_code == 422
    assert [error["pointer"] for error in json.loads(reply.data)["errors"]] == ["#/hinges"]


def test_doubtful_edges_are_judged_whether_or_not_hinges_are_wanted(service: Service):
    doubtful = {"source": "weather", "target": "refund", "doubtful": True}
    edges = [{"source": "weather", "target": "late"}, {"source": "late", "target": "refund"}, doubtful]
    graph = {"nodes": ["weather", "late", "refund"], "edges": edges}
    config = {"treatment": "late", "outcome": "refund", "covariates": []}
    answer = json.loads(service.post("/v1/review", {"graph": graph, "config": config, "hinges": False}).data)
    deciding = {"source": "weather", "target": "refund", "kind": "directed"}
    assert answer["verdict"] == "biased"
    assert answer["doubtful"] == {"verdict": "depends", "depends_on": [deciding], "complete": True}
