"""Many configs in one request: as one document and line by line, and one config as a gate."""

from __future__ import annotations

import json
from typing import Any

import pytest

from pathgate.demo import demo_configs, demo_graph
from pathgate.web.app import create_app
from pathgate.web.endpoints import reviews
from pathgate.web.judging import judged
from pathgate.web.settings import Settings

LINES = "application/x-ndjson"
FAULTY = {"name": "misspelt", "treatment": "late_delivry", "outcome": "refund", "covariates": []}


def batch(*configs: Any, **more: Any) -> dict[str, Any]:
    return {"graph": demo_graph(), "configs": list(configs), **more}


def test_each_config_is_answered_as_it_would_be_alone(service):
    configs = demo_configs()
    told = service.post("/v1/reviews", batch(*configs, hinges=True)).json["reviews"]
    assert [(each["index"], each["count"], each["name"]) for each in told] == [
        (place, len(configs), config["name"]) for place, config in enumerate(configs)
    ]
    for each, config in zip(told, configs, strict=True):
        alone = service.post("/v1/review", {"graph": demo_graph(), "config": config})
        assert each["review"] == alone.json


def test_the_lines_are_the_items_of_the_document_byte_for_byte(service):
    body = batch(*demo_configs(), FAULTY, 7)
    whole = service.post("/v1/reviews", body)
    streamed = service.unchecked.post("/v1/reviews", json=body, headers={"Accept": LINES})
    assert streamed.headers["Content-Type"] == LINES
    lines = streamed.data.splitlines()
    assert b'{"reviews":[' + b",".join(lines) + b"]}" == whole.data


@pytest.mark.parametrize("accept", ["application/json", "*/*", f"application/json, {LINES};q=0.5"])
def test_one_document_is_sent_where_lines_are_not_preferred(service, accept: str):
    reply = service.post("/v1/reviews", batch(*demo_configs()), headers={"Accept": accept})
    assert reply.headers["Content-Type"] == "application/json"


def test_a_faulty_config_is_one_line_with_its_problem(service):
    good = demo_configs()[0]
    told = service.post("/v1/reviews", batch(FAULTY, 7, good, {"treatment": 3})).json["reviews"]
    assert ["review" in each for each in told] == [False, False, True, False]
    problem = told[0]["problem"]
    assert problem["type"] == "/problems/unknown-node"
    assert problem["errors"][0]["pointer"] == "#/configs/0/treatment"
    assert "late_delivery" in problem["errors"][0]["detail"]
    assert told[1]["problem"]["errors"][0]["pointer"] == "#/configs/1"
    assert {each["pointer"].split("/")[2] for each in told[3]["problem"]["errors"]} == {"3"}


def test_a_faulty_graph_and_a_faulty_request_refuse_the_whole(service):
    graph = {"nodes": ["a"], "edges": [{"source": "a", "target": "a"}]}
    for accept in ("application/json", LINES):
        reply = service.post("/v1/reviews", {"graph": graph, "configs": []}, headers={"Accept": accept})
        assert reply.status_code == 422
    assert service.post("/v1/reviews", {"graph": demo_graph(), "configs": {}}).status_code == 422
    assert service.post("/v1/reviews", batch() | {"config": {}}).status_code == 422


def test_no_config_is_no_line(service):
    assert service.post("/v1/reviews", batch()).json == {"reviews": []}
    empty = service.unchecked.post("/v1/reviews", json=batch(), headers={"Accept": LINES})
    assert (empty.status_code, empty.data) == (200, b"")


def test_the_time_budget_holds_for_each_config():
    client = create_app(Settings(time_budget_seconds=0.05)).test_client()
    body = json.dumps(batch(*[demo_configs()[0]] * 300))
    told = client.post("/v1/reviews", data=body, content_type="application/json").json["reviews"]
    assert all("review" in each for each in told)


def test_lines_come_before_the_last_config_is_judged(service):
    reply = service.unchecked.post(
        "/v1/reviews", json=batch(*demo_configs()), headers={"Accept": LINES}, buffered=False
    )
    first = next(iter(reply.response))
    assert json.loads(first)["index"] == 0
    reply.close()


def gate(**more: Any) -> dict[str, Any]:
    graph = {
        "nodes": ["weather", "late", "refund"],
        "edges": [
            {"source": "weather", "target": "late"},
            {"source": "weather", "target": "refund"},
            {"source": "late", "target": "refund"},
        ],
    }
    config = {"treatment": "late", "outcome": "refund", "covariates": [], **more}
    return {"graph": graph, "config": config, "as_gate": True}


def test_a_gate_answers_409_with_the_review_where_the_config_falls_short(service):
    reply = service.post("/v1/review", gate())
    assert reply.status_code == 409
    assert reply.json["type"] == "/problems/falls-short"
    assert reply.json["review"] == service.post("/v1/review", gate() | {"as_gate": False}).json
    assert reply.json["detail"] == reply.json["review"]["summary"]
    assert service.get("/problems/falls-short").status_code == 200


def test_a_gate_lets_sound_and_accepted_configs_through(service):
    assert service.post("/v1/review", gate(covariates=["weather"])).status_code == 200
    waiver = {"rule": "missing-covariate", "why": "a pilot run"}
    reply = service.post("/v1/review", gate(accept=[waiver]))
    assert (reply.status_code, reply.json["verdict"]) == (200, "biased")


def test_a_client_that_goes_away_ends_the_work(service, monkeypatch):
    judged_so_far: list[Any] = []

    def counting(config: Any, *more: Any, **said: Any) -> dict[str, Any]:
        judged_so_far.append(config)
        return judged(config, *more, **said)

    monkeypatch.setattr(reviews, "judged", counting)
    body = batch(*demo_configs() * 50)
    reply = service.unchecked.post("/v1/reviews", json=body, headers={"Accept": LINES}, buffered=False)
    lines = iter(reply.response)
    next(lines)
    next(lines)
    reply.close()
    with pytest.raises((StopIteration, ValueError)):
        next(lines)
    assert len(judged_so_far) == 2
