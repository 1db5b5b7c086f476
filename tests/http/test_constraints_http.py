"""Vanishing tetrads over HTTP: the answer's form, its pages, and what happens when the time is short."""

from __future__ import annotations

import json
from math import comb
from typing import Any

import pytest

from pathgate.criteria.deadline import Deadline
from pathgate.web.endpoints import OPERATIONS
from tests.http.conftest import Service, service_with
from tests.values import Graph, graph_of

PATH = "/v1/constraints"


def one_habit(columns: int) -> Graph:
    return graph_of(*(("haste", f"column{k}") for k in range(columns)), unmeasured=["haste"])


def pages(service: Service, body: dict[str, Any]) -> list[dict[str, Any]]:
    """Every page, following the cursors."""
    answers = [service.post(PATH, body).json]
    while not answers[-1]["complete"]:
        answers.append(service.post(PATH, {**body, "cursor": answers[-1]["cursor"]}).json)
    return answers


def test_one_unmeasured_habit_behind_four_columns_gives_three_tetrads(service):
    value = graph_of(
        *(("haste", sign) for sign in ("late", "ticket", "refund", "claim")), unmeasured=["haste"]
    )
    reply = service.post(PATH, {"graph": value})
    choke = {"rows_side": ["haste"], "columns_side": []}
    assert reply.json == {
        "tetrads": [
            {"rows": ["late", "ticket"], "columns": ["refund", "claim"], "choke": choke},
            {"rows": ["late", "refund"], "columns": ["ticket", "claim"], "choke": choke},
            {"rows": ["late", "claim"], "columns": ["ticket", "refund"], "choke": choke},
        ],
        "complete": True,
    }
    assert service.post(PATH, {"graph": value}).data == reply.data


def test_a_graph_without_tetrads_gives_an_empty_complete_page(service):
    assert service.post(PATH, {"graph": {"nodes": ["late"], "edges": []}}).json == {
        "tetrads": [],
        "complete": True,
    }


@pytest.mark.parametrize("limit", [1, 2, 7, 44, 45, 1000])
def test_pages_together_are_the_whole_listing(service, limit):
    graph = one_habit(6)
    whole = service.post(PATH, {"graph": graph, "limit": 1000}).json["tetrads"]
    assert len(whole) == 3 * comb(6, 4)
    found = pages(service, {"graph": graph, "limit": limit})
    assert [each for page in found for each in page["tetrads"]] == whole
    assert len(found) == -(-len(whole) // limit)


def test_a_cursor_of_another_request_is_refused(service):
    cursor = service.post(PATH, {"graph": one_habit(5), "limit": 1}).json["cursor"]
    for body in ({"graph": one_habit(6), "cursor": cursor}, {"graph": one_habit(5), "cursor": ""}):
        reply = service.post(PATH, body)
        assert (reply.status_code, reply.json["type"]) == (422, "/problems/bad-cursor")


def test_unknown_members_and_faulty_graphs_are_refused_together(service):
    reply = service.post(PATH, {"graph": {"nodes": ["a", "a"], "edges": []}, "limits": 3})
    assert reply.status_code == 422
    assert [error["pointer"] for error in reply.json["errors"]] == ["#/limits", "#/graph/nodes/1"]


def test_a_listing_cut_short_says_that_it_is_incomplete_and_can_go_on(service, monkeypatch):
    body = {"graph": one_habit(6), "limit": 1000}
    whole = service.post(PATH, body).json["tetrads"]
    with monkeypatch.context() as short:
        short.setattr("pathgate.web.answering.Deadline", lambda seconds: ticking(seconds, readings=40))
        cut = service.post(PATH, body).json
    assert cut["complete"] is False
    assert 0 < len(cut["tetrads"]) < len(whole)
    rest = service.post(PATH, {**body, "cursor": cut["cursor"]}).json
    assert cut["tetrads"] + rest["tetrads"] == whole


def test_a_search_that_finds_nothing_in_time_is_too_costly():
    short = service_with(OPERATIONS, time_budget_seconds=0.05)
    columns = [f"column{k}" for k in range(2000)]
    reply = short.post(PATH, {"graph": {"nodes": columns, "edges": []}})
    assert (reply.status_code, json.loads(reply.data)["type"]) == (422, "/problems/too-costly")


def ticking(seconds: float, readings: int) -> Deadline:
    """A deadline that comes after so many looks at the clock."""
    moments = iter([0.0] * readings)
    return Deadline(seconds, clock=lambda: next(moments, seconds + 1))
