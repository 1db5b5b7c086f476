"""POST /v1/changes: every entry as reviews give it, pages, faults with their places, and what is no graph or config."""

from __future__ import annotations

import json
from itertools import pairwise
from typing import Any

import pytest

from pathgate.criteria import Deadline, OutOfTime
from pathgate.demo import demo_configs, demo_graph
from pathgate.graphs import read_graph
from pathgate.review.graph_difference import Difference
from pathgate.web.changing import config_entry
from pathgate.web.endpoints import OPERATIONS
from pathgate.web.endpoints.changes import OPERATION
from pathgate.web.operations import envelope_shape, open_call
from pathgate.web.settings import Settings
from tests.http.asking import ask, faults
from tests.http.conftest import service_with
from tests.values import Graph, arrows_of, graph_of, node_names

PATH = "/v1/changes"
PARCELS = graph_of(("weather", "late"), ("weather", "refund"), ("late", "refund"), ("late", "ticket"))
CONFIG = {"name": "uplift", "treatment": "late", "outcome": "refund", "covariates": ["weather"]}
STORMS = graph_of(*arrows_of(PARCELS), ("storms", "late"), ("storms", "refund"), unmeasured=["storms"])


def asked(service: Any, old: Graph, new: Graph, *configs: Any, **more: Any) -> dict[str, Any]:
    return ask(service, PATH, graph=old, other=new, configs=list(configs), **more)


def test_verdicts_are_those_of_reviews_against_either_graph(service):
    request = OPERATION.examples[0].request
    told = asked(service, request["graph"], request["other"], *request["configs"])["configs"]
    sides = [
        service.post("/v1/reviews", {"graph": request[member], "configs": request["configs"]}).json["reviews"]
        for member in ("graph", "other")
    ]
    for entry, config, *reviews in zip(told, request["configs"], *sides, strict=True):
        assert entry["name"] == config["name"]
        assert [entry["before"], entry["after"]] == [each["review"]["verdict"] for each in reviews]
    first = told[0]
    assert first["change"] == "broken"
    arrow = {"source": "district", "target": "late_delivery", "kind": "directed", "change": "added"}
    assert (first["edges"], first["nodes"], first["complete"]) == ([arrow], [], True)
    assert first["summary"].startswith(
        "late-delivery-refunds: sound before, biased after: the new arrow district → late_delivery ("
    )


def test_culprits_applied_alone_do_it(service):
    """Two of four changes together break the config: the collider is opened only where both arrows are there."""
    old = graph_of(("late", "refund"), isolated=["ticket", "habit", "promo"])
    new = graph_of(
        ("late", "refund"), ("late", "ticket"), ("habit", "ticket"), ("habit", "refund"), ("promo", "late")
    )
    config = {**CONFIG, "covariates": ["ticket"]}
    (entry,) = asked(service, old, new, config)["configs"]
    assert entry["change"] == "broken"
    arrows = [(edge["source"], edge["target"]) for edge in entry["edges"]]
    partly = graph_of(("late", "refund"), *arrows, isolated=["ticket", "habit", "promo"])
    assert len(set(node_names(partly))) == len(node_names(partly))
    answer = service.post("/v1/review", {"graph": partly, "config": config}).json
    assert answer["verdict"] != "sound"
    for arrow in arrows:
        fewer = graph_of(
            ("late", "refund"), *[each for each in arrows if each != arrow], isolated=node_names(old)
        )
        fewer["nodes"] = [{"id": name} for name in dict.fromkeys(node_names(fewer))]
        assert service.post("/v1/review", {"graph": fewer, "config": config}).json["verdict"] == "sound"


def test_all_that_differs_is_listed(service):
    old = {
        "nodes": ["gone", {"id": "late", "recorded": 1}, "refund", "ticket"],
        "edges": [
            {"source": "gone", "target": "late"},
            {"source": "late", "target": "refund"},
            {"source": "refund", "target": "ticket"},
        ],
    }
    new = {
        "nodes": [
            "ticket",
            {"id": "refund", "measured": False},
            {"id": "late", "recorded": 2, "cost": 3},
            "come",
        ],
        "edges": [
            {"source": "ticket", "target": "refund"},
            {"source": "refund", "target": "late", "kind": "bidirected"},
            {"source": "come", "target": "late"},
        ],
    }
    answer = asked(service, old, new)
    assert answer["nodes"] == {
        "added": ["come"],
        "removed": ["gone"],
        "changed": [{"node": "refund", "members": ["measured"]}, {"node": "late", "members": ["recorded"]}],
    }
    turned = {"source": "ticket", "target": "refund", "kind": "directed"}
    assert answer["edges"] == {
        "added": [
            turned,
            {"source": "come", "target": "late", "kind": "directed"},
            {"source": "refund", "target": "late", "kind": "bidirected"},
        ],
        "removed": [
            {"source": "refund", "target": "ticket", "kind": "directed"},
            {"source": "late", "target": "refund", "kind": "directed"},
            {"source": "gone", "target": "late", "kind": "directed"},
        ],
        "turned": [turned],
    }


def test_a_config_that_names_a_removed_node_carries_its_problem(service):
    new = graph_of(("late", "refund"), ("late", "ticket"))
    told = asked(service, PARCELS, new, CONFIG, {**CONFIG, "covariates": ["weather", "ticket", "refund"]})[
        "configs"
    ]
    assert [(each["before"], each["after"], each["change"]) for each in told] == [
        ("sound", None, "broken"),
        ("biased", None, "other-reason"),
    ]
    for index, each in enumerate(told):
        assert each["problem"]["type"] == "/problems/unknown-node"
        assert each["problem"]["errors"][0]["pointer"] == f"#/configs/{index}/covariates/0"
        assert "problem_before" not in each
    (back,) = asked(service, new, PARCELS, CONFIG)["configs"]
    assert (back["change"], "problem" in back, back["problem_before"]["status"]) == ("mended", False, 422)


def test_what_is_no_config_is_an_entry_and_never_the_end_of_the_others(service):
    told = asked(service, PARCELS, STORMS, 7, CONFIG, {"name": 3}, None)["configs"]
    assert [each["change"] for each in told] == ["same", "broken", "same", "same"]
    assert [each["name"] for each in told] == ["", "uplift", "", ""]
    for index in (0, 2, 3):
        assert told[index]["summary"].startswith(f"#/configs/{index}: not judged before and after")
        pointers = {each["pointer"] for each in told[index]["problem"]["errors"]}
        assert all(each.startswith(f"#/configs/{index}") for each in pointers)


def test_the_same_graph_changes_nothing(service):
    answer = asked(service, demo_graph(), demo_graph(), *demo_configs())
    assert {each["change"] for each in answer["configs"]} == {"same"}
    assert answer["nodes"] == {"added": [], "removed": [], "changed": []}
    assert answer["edges"] == {"added": [], "removed": [], "turned": []}
    assert answer["independencies"] == {"lost": [], "gained": []}
    assert answer["complete"] is True


def test_no_config_and_no_node_are_answers_too(service):
    nothing: Graph = {"nodes": [], "edges": []}
    assert asked(service, nothing, nothing)["configs"] == []
    emptied = asked(service, demo_graph(), nothing, *demo_configs(), limit=1000)
    assert {each["change"] for each in emptied["configs"]} == {"broken", "other-reason"}
    assert emptied["nodes"]["removed"] == node_names(demo_graph())
    basis = service.post("/v1/independencies", {"graph": demo_graph(), "form": "basis", "limit": 1000}).json
    plain = [{key: each[key] for key in ("x", "y", "given")} for each in basis["independencies"]]
    assert emptied["independencies"] == {"lost": plain, "gained": []}


def test_graphs_without_a_common_node_lose_all_and_gain_all(service):
    other = graph_of(("parcels", "locker_full"), ("promotion", "locker_full"))
    answer = asked(service, PARCELS, other, CONFIG)
    assert answer["configs"][0]["change"] == "broken"
    assert len(answer["independencies"]["lost"]) == 2
    assert answer["independencies"]["gained"] == [{"x": "parcels", "y": "promotion", "given": []}]


@pytest.mark.parametrize("limit", [1, 2, 3, 5, 100])
def test_pages_together_are_the_whole_listing_and_repeat_the_rest(service, limit):
    old = demo_graph()
    new = {**old, "edges": [*old["edges"][4:], {"source": "promotion", "target": "refund"}]}
    body = {"graph": old, "other": new, "configs": demo_configs()[:2], "limit": limit}
    whole = asked(service, old, new, *demo_configs()[:2], limit=1000)
    lost, gained, pages = [], [], 0
    while True:
        page = json.loads(service.post(PATH, body).data)
        for member in ("configs", "nodes", "edges"):
            assert page[member] == whole[member]
        found = page["independencies"]
        assert len(found["lost"]) + len(found["gained"]) <= limit
        assert not (gained and found["lost"])
        lost += found["lost"]
        gained += found["gained"]
        pages += 1
        if page["complete"]:
            break
        body["cursor"] = page["cursor"]
    assert {"lost": lost, "gained": gained} == whole["independencies"]
    assert lost
    assert gained
    assert pages == -(-(len(lost) + len(gained)) // limit)


def test_a_cursor_of_another_request_is_refused(service):
    body = {"graph": PARCELS, "other": graph_of(("a", "b")), "configs": [], "limit": 1}
    cursor = service.post(PATH, body).json["cursor"]
    for other in ({"configs": [CONFIG]}, {"other": STORMS}, {"cursor": ""}):
        reply = service.post(PATH, {**body, "cursor": cursor, **other})
        assert (reply.status_code, reply.json["type"]) == (422, "/problems/bad-cursor")


def test_a_cycle_in_the_other_graph_is_shown_at_its_place(service):
    other = graph_of(("weather", "late"), ("late", "refund"), ("refund", "weather"))
    reply = service.post(PATH, {"graph": PARCELS, "other": other, "configs": [CONFIG]})
    problem = json.loads(reply.data)
    assert (reply.status_code, problem["type"]) == (422, "/problems/cycle")
    assert [fault["pointer"] for fault in problem["errors"]] == ["#/other/edges"]
    assert len(problem["cycle"]) == 4


def test_all_that_is_wrong_comes_in_one_answer(service):
    found = faults(
        service,
        PATH,
        graph={"nodes": ["weather"], "edges": [{"source": "weather", "target": "wether"}]},
        other={"nodes": ["weather", 3], "edges": {}},
        configs={},
        limit=0,
    )
    assert set(found) == {
        "#/graph/edges/0/target",
        "#/other/nodes/1",
        "#/other/edges",
        "#/configs",
        "#/limit",
    }
    assert set(faults(service, PATH, graph=PARCELS)) == {"#"}


def test_the_limits_hold_for_both_graphs():
    small = service_with(OPERATIONS, max_nodes=4)
    assert list(faults(small, PATH, graph=PARCELS, other=STORMS, configs=[])) == ["#/other/nodes"]


def test_equal_requests_get_equal_bytes_whatever_the_order_of_edges(service):
    request = dict(OPERATION.examples[0].request)
    first = service.post(PATH, request).data
    request["other"] = {**request["other"], "edges": request["other"]["edges"][::-1]}
    assert service.post(PATH, request).data == first


def test_a_config_that_takes_too_long_says_so_and_is_not_sound():
    names = [f"c{place}" for place in range(3_000)]
    graph = read_graph(graph_of(*pairwise(names)))
    config = {"treatment": names[1::2], "outcome": names[::2], "covariates": []}
    hasty = Settings(time_budget_seconds=0.05)
    entry = config_entry(config, "many", Difference(graph, graph), hasty, Deadline.never(), ("configs", 0))
    assert (entry["before"], entry["after"]) == (None, None)
    for member in ("problem_before", "problem"):
        assert entry[member]["type"] == "/problems/too-costly"
        assert "instance" not in entry[member]


class Clock:
    """A second passes with each look at it."""

    looks = 0

    def __call__(self) -> float:
        self.looks += 1
        return float(self.looks)


def test_promises_that_take_too_long_do_not_take_the_verdicts_with_them():
    request = OPERATION.examples[0].request
    shape = envelope_shape(OPERATION)
    # One look for either graph, and one for the first node whose promises are looked at.
    call = open_call(OPERATION, shape, request, Settings(), Deadline(2.5, Clock()))
    answer = OPERATION.answer(call)
    assert answer["configs"][0]["change"] == "broken"
    assert answer["independencies"] == {"lost": [], "gained": []}
    assert answer["complete"] is False
    body = {**request, "cursor": answer["cursor"]}
    rest = OPERATION.answer(open_call(OPERATION, shape, body, Settings(), Deadline.never()))
    assert rest == OPERATION.answer(open_call(OPERATION, shape, request, Settings(), Deadline.never()))
    with pytest.raises(OutOfTime):
        OPERATION.answer(open_call(OPERATION, shape, body, Settings(), Deadline(2.5, Clock())))
