"""Promised independencies over HTTP: pages of every form, alone and cut short, are together the whole listing."""

from __future__ import annotations

import random
from typing import Any

import pytest

from pathgate.criteria.deadline import Deadline
from pathgate.web.endpoints.independencies import FORMS
from tests.http.conftest import Service
from tests.strategies import random_graph
from tests.values import Graph

PATH = "/v1/independencies"


def world(form: str, seed: int) -> Graph:
    """A graph of ten columns, with unmeasured nodes and bidirected edges where the form takes them."""
    hidden = 0.0 if form == "sequential" else 0.15
    return random_graph(random.Random(seed), 10, arrow=0.2, bidirected=hidden / 2, unmeasured=hidden)


def following(service: Service, body: dict[str, Any]) -> list[dict[str, Any]]:
    """Every page, following the cursors."""
    answers = [service.post(PATH, body).json]
    while not answers[-1]["complete"]:
        answers.append(service.post(PATH, {**body, "cursor": answers[-1]["cursor"]}).json)
    return answers


def statements(pages: list[dict[str, Any]]) -> list[dict[str, Any]]:
    return [each for page in pages for each in page["independencies"]]


@pytest.mark.parametrize("form", FORMS)
@pytest.mark.parametrize("most_given", [None, 1])
def test_pages_together_are_the_whole_listing(service: Service, form: str, most_given: int | None):
    longest = 0
    for seed in range(6):
        body: dict[str, Any] = {"graph": world(form, seed), "form": form}
        if most_given is not None:
            body["max_given"] = most_given
        [whole] = following(service, {**body, "limit": 1000})
        count = len(whole["independencies"])
        for limit in (1, 3, max(1, count - 1), max(1, count)):
            pages = following(service, {**body, "limit": limit})
            assert statements(pages) == whole["independencies"]
            assert len(pages) == max(1, -(-count // limit))
            assert pages[-1]["inseparable"] == whole["inseparable"]
        longest = max(longest, count)
    assert longest > 3


@pytest.mark.parametrize("form", FORMS)
def test_a_listing_cut_short_anywhere_can_go_on(service: Service, form: str, monkeypatch: pytest.MonkeyPatch):
    body = {"graph": world(form, 3), "form": form, "limit": 1000}
    [whole] = following(service, body)
    cut_at = set[int]()
    for readings in range(20, 90, 3):
        with monkeypatch.context() as short:
            short.setattr("pathgate.web.answering.Deadline", lambda seconds, n=readings: ticking(seconds, n))
            reply = service.post(PATH, body)
        if reply.status_code == 200 and not reply.json["complete"]:
            rest = following(service, {**body, "cursor": reply.json["cursor"]})
            assert statements([reply.json, *rest]) == whole["independencies"]
            cut_at.add(len(reply.json["independencies"]))
    assert len(cut_at) > 1


def ticking(seconds: float, readings: int) -> Deadline:
    """A deadline that comes after so many looks at the clock."""
    moments = iter([0.0] * readings)
    return Deadline(seconds, clock=lambda: next(moments, seconds + 1))
