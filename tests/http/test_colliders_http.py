"""Colliders over HTTP: by definition, page by page, what a cursor belongs to, faults and time."""

from __future__ import annotations

import base64
import json
from collections import Counter
from itertools import pairwise
from typing import Any

import pytest

from pathgate.web.endpoints import OPERATIONS
from tests.brute import (
    colliders,
    descendants,
    induced_pairs,
)
from tests.http.asking import Json, ask, asked_graph, chain, refusal, turned_round
from tests.http.conftest import Service, service_with
from tests.strategies import random_parts
from tests.values import as_set, is_adjacent, node_names

COLLIDERS = "/v1/colliders"


def test_colliders_and_induced_pairs_are_those_of_the_definitions(service):
    seen: Counter[str] = Counter()
    for seed in range(80):
        rng, value = asked_graph(seed)
        given = [name for name in node_names(value) if rng.random() < 0.2]
        parts: list[Any] = [
            *random_parts(rng, value, 2),
            *rng.sample(node_names(value), rng.choice([0, 0, 2])),
        ]
        found = ask(service, COLLIDERS, graph=value, given=given, selected_on=parts, limit=1000)
        assert found["complete"] is found["induced_complete"] is True
        listed = [(each["node"], frozenset(each["between"])) for each in found["colliders"]]
        assert Counter(listed) == Counter(colliders(value)), seed
        read = {
            name for part in parts for name in as_set(part["columns"] if isinstance(part, dict) else part)
        }
        for each in found["colliders"]:
            openers = descendants(value, each["node"]) & (set(given) | read)
            assert each["opened_by"] == [name for name in node_names(value) if name in openers], seed
            assert each["open"] is bool(openers)
            assert each["shielded"] is is_adjacent(value, *each["between"])
            seen["open" if openers else "shut"] += 1
        pairs = [frozenset((each["x"], each["y"])) for each in found["induced"]]
        assert Counter(pairs) == Counter(induced_pairs(value, given, parts)), seed
        seen["induced"] += len(pairs)
        assert all(set(each["through"]) <= set(node_names(value)) for each in found["induced"])
    assert min(seen.values()) > 20


def star(causes: int, *, given: bool = True) -> Json:
    """Many causes of one ticket: as many colliders as there are pairs of them, all opened."""
    names = [f"cause{k}" for k in range(causes)]
    graph = {"nodes": [*names, "ticket"], "edges": [{"source": name, "target": "ticket"} for name in names]}
    return {"graph": graph, "given": ["ticket"] if given else []}


@pytest.mark.parametrize("limit", [1, 4, 7, 44, 45])
def test_pages_of_colliders_make_up_the_whole_and_repeat_everything_else(service, limit):
    whole = ask(service, COLLIDERS, **star(10))
    assert (len(whole["colliders"]), len(whole["induced"]), whole["complete"]) == (45, 45, True)
    assert "cursor" not in whole
    body, listed, pages = {**star(10), "limit": limit}, [], 0
    while True:
        page = ask(service, COLLIDERS, **body)
        others = {member: said for member, said in page.items() if member not in PAGED}
        assert others == {member: said for member, said in whole.items() if member not in PAGED}
        listed += page["colliders"]
        pages += 1
        assert page["complete"] is (len(listed) == 45)
        if page["complete"]:
            break
        assert len(page["colliders"]) == limit
        body["cursor"] = page["cursor"]
    assert listed == whole["colliders"]
    assert pages == -(-45 // limit)
    assert "cursor" not in page


PAGED = ("colliders", "complete", "cursor")


def test_a_higher_limit_is_lowered_to_the_operators_and_so_is_the_list_of_pairs():
    service = service_with(OPERATIONS, max_page=6)
    page = ask(service, COLLIDERS, **star(5), limit=1_000_000)
    assert (len(page["colliders"]), page["complete"]) == (6, False)
    assert (len(page["induced"]), page["induced_complete"]) == (6, False)
    exact = ask(service, COLLIDERS, **star(4), limit=1_000_000)
    assert (len(exact["colliders"]), exact["complete"]) == (6, True)
    assert (len(exact["induced"]), exact["induced_complete"]) == (6, True)


@pytest.mark.parametrize("limit", [0, -1, 1.5, "10", None, True])
def test_a_limit_that_is_no_positive_number_is_refused(service, limit):
    assert refusal(service, COLLIDERS, **star(3), limit=limit) == ("invalid-request", ["#/limit"])


def cursor_of(service: Service, **body: Any) -> str:
    return str(ask(service, COLLIDERS, **{**star(6), "limit": 4, **body})["cursor"])


def is_bad_cursor(service: Service, cursor: str, **body: Any) -> bool:
    return refusal(service, COLLIDERS, **{**star(6), "limit": 4, "cursor": cursor, **body}) == (
        "bad-cursor",
        [],
    )


def test_a_cursor_belongs_to_the_request_it_was_given_for(service):
    cursor = cursor_of(service)
    assert ask(service, COLLIDERS, **star(6), limit=4, cursor=cursor)["colliders"]
    assert is_bad_cursor(service, cursor, **star(7))
    assert is_bad_cursor(service, cursor, **star(6, given=False))
    assert is_bad_cursor(service, cursor, selected_on=["ticket"])
    assert is_bad_cursor(service, cursor, given=["ticket", "cause0"])
    moved = star(6)
    moved["graph"]["nodes"].reverse()
    assert is_bad_cursor(service, cursor, **moved)


def test_a_page_may_be_of_another_size_than_the_one_before(service):
    whole = ask(service, COLLIDERS, **star(6))["colliders"]
    rest = ask(service, COLLIDERS, **star(6), limit=100, cursor=cursor_of(service))
    assert rest["complete"] is True
    assert rest["colliders"] == whole[4:]


def test_an_empty_cut_or_altered_cursor_is_refused(service):
    cursor = cursor_of(service)
    altered = [
        cursor[:place] + ("A" if cursor[place] != "A" else "B") + cursor[place + 1 :] for place in (0, 9, -1)
    ]
    for bad in (
        "",
        " ",
        "x",
        "é",
        "\u0000",
        cursor[:-1],
        cursor + "A",
        cursor + "=",
        cursor.swapcase(),
        *altered,
    ):
        assert is_bad_cursor(service, bad), bad


def test_a_cursor_with_another_place_under_the_same_seal_is_refused(service):
    cursor = cursor_of(service)
    held = base64.urlsafe_b64decode(cursor + "=" * (-len(cursor) % 4))
    assert held.endswith(b"4")
    for place in (b"3", b"40", b"-4", b"4 ", b"+4", b"04", b"", b"9" * 30, b"9" * 5000, "٤".encode()):
        forged = base64.urlsafe_b64encode(held[:-1] + place).decode().rstrip("=")
        assert is_bad_cursor(service, forged), place


@pytest.mark.parametrize("cursor", [3, None, True, [], {}])
def test_a_cursor_that_is_no_text_is_a_fault_of_the_request(service, cursor):
    assert refusal(service, COLLIDERS, **star(6), cursor=cursor) == ("invalid-request", ["#/cursor"])


def test_the_order_of_members_does_not_matter_to_a_cursor(service):
    body = star(6)
    nodes = [{"id": name, "measured": True, "cost": 2} for name in body["graph"]["nodes"]]
    first = {"graph": {"nodes": nodes, "edges": body["graph"]["edges"]}, "given": ["ticket"], "limit": 4}
    second = json.loads(json.dumps(turned_round(first)))
    page = ask(service, COLLIDERS, **first)
    assert ask(service, COLLIDERS, **second) == page
    rest = ask(service, COLLIDERS, **first, cursor=page["cursor"])
    assert ask(service, COLLIDERS, cursor=page["cursor"], **second) == rest


def test_all_faults_of_a_request_for_colliders_come_in_one_answer(service):
    found = refusal(
        service,
        COLLIDERS,
        graph=chain(),
        given=["nowhere", "weather"],
        selected_on=["elsewhere", {"columns": ["weather", "refund"], "fixed": True}, {"columns": "zz"}],
        limit=0,
    )
    assert found == (
        "invalid-request",
        [
            "#/limit",
            "#/given/0",
            "#/selected_on/0",
            "#/selected_on/1/fixed",
            "#/selected_on/2/columns",
        ],
    )


# Time.


def test_colliders_are_listed_even_where_time_is_too_short_for_all_induced_pairs():
    # Ten thousand nodes in one row, each to be searched from: no pair is induced before the time is over.
    service = service_with(OPERATIONS, time_budget_seconds=1.5)
    names = [f"c{k}" for k in range(10_000)]
    edges = [{"source": a, "target": b} for a, b in pairwise(names)]
    edges.append({"source": "c0", "target": "c9999"})
    found = ask(service, COLLIDERS, graph={"nodes": names, "edges": edges}, given=["c9999"])
    assert [each["node"] for each in found["colliders"]] == ["c9999"]
    assert (found["induced"], found["induced_complete"], found["complete"]) == ([], False, True)


def test_many_induced_pairs_of_a_large_graph_come_in_time():
    # 2,000 causes of one ticket, each far above it: a search for each pair alone would take minutes.
    service = service_with(OPERATIONS, time_budget_seconds=5)
    names = [f"cause{k}" for k in range(2000)]
    edges = [{"source": name, "target": f"after {name}"} for name in names]
    edges += [{"source": f"after {name}", "target": "ticket"} for name in names]
    graph = {"nodes": [*names, *(f"after {name}" for name in names), "ticket"], "edges": edges}
    found = ask(service, COLLIDERS, graph=graph, given=["ticket"], limit=1)
    assert len(found["induced"]) == 1000
    assert all(pair["through"] == ["ticket"] for pair in found["induced"])
