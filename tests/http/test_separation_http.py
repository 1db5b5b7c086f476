"""Separation and colliders over HTTP: many at once, proofs, faults, limits and pages."""

from __future__ import annotations

import base64
import json
import random
from collections import Counter
from itertools import pairwise
from typing import Any

import pytest

from pathgate.web.endpoints import OPERATIONS
from tests.brute import (
    Path,
    colliders,
    descendants,
    inclusion_minimal,
    induced_pairs,
    is_open,
    separated,
    separating_sets,
    shortest_open_length,
)
from tests.criteria.asking import edges_exist
from tests.http.conftest import Service, service_with
from tests.strategies import Question, random_graph, random_parts, random_question
from tests.values import Graph, as_set, is_adjacent, measured_names, node_names

Json = dict[str, Any]
SEPARATION, COLLIDERS = "/v1/separation", "/v1/colliders"


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


def written(asked: Question) -> Json:
    return {"x": list(asked.x), "y": list(asked.y), "given": list(asked.given)}


def asked_graph(seed: int, most_nodes: int = 7) -> tuple[random.Random, Graph]:
    rng = random.Random(seed)
    arrow, bidirected = rng.choice([(0.2, 0.05), (0.3, 0.15), (0.45, 0.1)])
    return rng, random_graph(rng, rng.randint(3, most_nodes), arrow=arrow, bidirected=bidirected)


# Verdicts, proofs and sweeps.


def test_explained_or_not_alone_or_together_every_statement_gets_the_verdict_of_the_definition(service):
    seen: Counter[bool] = Counter()
    for seed in range(40):
        rng, value = asked_graph(seed)
        asked = [random_question(rng, value) for _ in range(rng.choice([1, 7, 8, 20]))]
        statements = [written(one) for one in asked]
        explained = ask(service, SEPARATION, graph=value, statements=statements)["verdicts"]
        bare = ask(service, SEPARATION, graph=value, statements=statements, explain=False)["verdicts"]
        assert [each["separated"] for each in bare] == [
            separated(value, one.x, one.y, one.given) for one in asked
        ]
        for one, short, full in zip(asked, bare, explained, strict=True):
            assert list(short) == ["x", "y", "given", "separated"]
            assert {member: full[member] for member in short} == short
            for side in ("x", "y", "given"):
                assert short[side] == [name for name in node_names(value) if name in getattr(one, side)]
            seen[short["separated"]] += 1
    assert min(seen.values()) > 60


def test_every_proof_in_an_answer_holds_by_definition(service):
    seen: Counter[str] = Counter()
    for seed in range(250):
        rng, value = asked_graph(seed)
        asked = random_question(rng, value, single=rng.random() < 0.8)
        (found,) = ask(service, SEPARATION, graph=value, statements=[written(asked)], paths=20)["verdicts"]
        if found["open_path"] is not None:
            assert_open(found["open_path"], value, asked)
            assert found["blockers"] == []
            seen["open"] += 1
        for blocker in found["blockers"]:
            path = Path(tuple(blocker["path"]["nodes"]), tuple(blocker["path"]["arrows"]))
            assert edges_exist(path, value)
            is_collider = dict(path.inner())[blocker["node"]]
            opened = bool(descendants(value, blocker["node"]) & set(asked.given))
            blocks = not opened if is_collider else blocker["node"] in asked.given
            assert blocks, seed
            reason = "collider-not-conditioned" if is_collider else "conditioned"
            assert blocker["because"] == reason
            seen[reason] += 1
        separating = separating_sets(value, asked.x, asked.y)
        if found["separator"] is None:
            assert separating == []
            continue
        assert frozenset(found["separator"]) in inclusion_minimal(separating)
        assert len(found["separator"]) == len(separating[0])
        seen["separator"] += 1
    assert set(seen) == {"open", "conditioned", "collider-not-conditioned", "separator"}
    assert min(seen.values()) > 5


def assert_open(said: Json, value: Graph, asked: Question) -> None:
    path = Path(tuple(said["nodes"]), tuple(said["arrows"]))
    assert path.nodes[0] in asked.x
    assert path.nodes[-1] in asked.y
    assert edges_exist(path, value)
    assert is_open(value, path, asked.given)
    assert len(path.arrows) == shortest_open_length(value, asked.x, asked.y, asked.given)
    assert [step["node"] for step in said["steps"]] == list(path.nodes[1:-1])
    for step, (_, is_collider) in zip(said["steps"], path.inner(), strict=True):
        assert step["open"] is True
        assert (step["role"] == "collider") is is_collider is ("through" in step)
        if is_collider:
            assert step["through"][0] == step["node"]
            assert step["through"][-1] in asked.given
            assert edges_exist(Path(tuple(step["through"]), ("forward",) * (len(step["through"]) - 1)), value)


def test_a_sweep_gives_every_other_measured_node_the_verdict_it_gets_alone(service):
    for seed in range(60):
        rng, value = asked_graph(seed)
        sweeps = [{"x": list(one.x), "given": list(one.given)} for one in questions(rng, value, 3)]
        found = ask(service, SEPARATION, graph=value, sweeps=sweeps)
        assert found["verdicts"] == []
        for sweep, answer in zip(sweeps, found["sweeps"], strict=True):
            others = [n for n in measured_names(value) if n not in sweep["x"] + sweep["given"]]
            statements = [{**sweep, "y": name} for name in others]
            alone = ask(service, SEPARATION, graph=value, statements=statements, explain=False)["verdicts"]
            apart = [name for name, one in zip(others, alone, strict=True) if one["separated"]]
            assert answer["separated_from"] == apart, seed
            assert answer["connected_to"] == [name for name in others if name not in apart]
            assert set(answer["x"]) == set(sweep["x"])
            assert set(answer["given"]) == set(sweep["given"])


def questions(rng: random.Random, value: Graph, count: int) -> list[Question]:
    return [random_question(rng, value) for _ in range(count)]


def test_a_request_without_statements_is_answered_without_verdicts(service):
    assert ask(service, SEPARATION, graph=chain()) == {"verdicts": []}
    assert ask(service, SEPARATION, graph=chain(), statements=[], sweeps=[]) == {"verdicts": [], "sweeps": []}


def test_a_name_stands_for_the_list_of_it_and_repeats_change_nothing(service):
    short = [{"x": "weather", "y": "refund", "given": "late_van"}, {"x": "weather", "y": "refund"}]
    long = [
        {"x": ["weather"] * 2, "y": ["refund"], "given": ["late_van", "late_van"]},
        {"x": ["weather"], "y": ["refund"], "given": []},
    ]
    for explain in (True, False):
        answers = [
            service.post(SEPARATION, {"graph": chain(), "statements": said, "explain": explain}).data
            for said in (short, long)
        ]
        assert answers[0] == answers[1]


@pytest.mark.parametrize("paths", range(21))
def test_up_to_twenty_of_the_shortest_paths_get_a_blocker(service, paths):
    # weather → van_k → refund for 25 vans, all given
    vans = [f"van{k}" for k in range(25)]
    edges = [{"source": a, "target": b} for van in vans for a, b in (("weather", van), (van, "refund"))]
    graph = {"nodes": ["weather", "refund", *vans], "edges": edges}
    statement = {"x": "weather", "y": "refund", "given": vans}
    (found,) = ask(service, SEPARATION, graph=graph, statements=[statement], paths=paths)["verdicts"]
    assert [blocker["node"] for blocker in found["blockers"]] == vans[:paths]
    if paths == 3:
        assert ask(service, SEPARATION, graph=graph, statements=[statement])["verdicts"] == [found]


@pytest.mark.parametrize("paths", [-1, 21, 1.5, "3", True, None])
def test_any_other_number_of_paths_is_refused(service, paths):
    statements = [{"x": "weather", "y": "refund"}]
    assert refusal(service, SEPARATION, graph=chain(), statements=statements, paths=paths) == (
        "invalid-request",
        ["#/paths"],
    )


# Limits and faults.


@pytest.mark.parametrize(("statements", "sweeps", "pointer"), [(6, 0, "statements"), (3, 3, "statements")])
def test_statements_and_sweeps_are_counted_together(statements, sweeps, pointer):
    service = service_with(OPERATIONS, max_statements=5)
    one = {"x": "weather", "y": "refund"}
    body = {
        "graph": chain(),
        "statements": [one] * statements,
        "sweeps": [{"x": "weather"}] * sweeps,
        "explain": False,
    }
    assert refusal(service, SEPARATION, **body) == ("over-limit", [f"#/{pointer}"])
    body["statements"] = [one] * (5 - sweeps)
    assert len(ask(service, SEPARATION, **body)["verdicts"]) == 5 - sweeps


def test_sweeps_alone_are_counted_too():
    service = service_with(OPERATIONS, max_statements=5)
    body: Json = {"graph": chain(), "sweeps": [{"x": "weather"}] * 6}
    assert refusal(service, SEPARATION, **body) == ("over-limit", ["#/sweeps"])
    assert len(ask(service, SEPARATION, **{**body, "sweeps": body["sweeps"][:5]})["sweeps"]) == 5


def test_the_limits_of_the_graph_hold_for_both():
    service = service_with(OPERATIONS, max_nodes=3, max_edges=2)
    for path in (SEPARATION, COLLIDERS):
        assert refusal(service, path, graph=chain()) == ("over-limit", ["#/graph/nodes", "#/graph/edges"])


def test_all_faults_of_all_statements_and_sweeps_come_in_one_answer(service):
    found = refusal(
        service,
        SEPARATION,
        graph=chain(),
        statements=[
            {"x": "wether", "y": ["refund", "zz"]},
            {"x": ["late_van"], "y": "late_van"},
            {"x": [], "y": "nowhere"},
            {"x": "weather", "y": "refund", "given": ["refund", "elsewhere"]},
            {"x": "weather", "y": "refund"},
            {"x": "weather", "given": ["weather"]},
            {"x": 7, "y": "refund", "given": ["refund"]},
            "weather",
        ],
        sweeps=[{"x": "weather", "given": "weather"}, {"x": "nowhere", "given": ["late_van", "elsewhere"]}],
        explian=True,
    )
    assert found == (
        "invalid-request",
        [
            "#/explian",
            "#/statements/2/x",
            "#/statements/5",
            "#/statements/6/x",
            "#/statements/7",
            "#/statements/0/x",
            "#/statements/0/y/1",
            "#/statements/1",
            "#/statements/2/y",
            "#/statements/3/given/1",
            "#/statements/3",
            "#/statements/5",
            "#/statements/6",
            "#/sweeps/0",
            "#/sweeps/1/x",
            "#/sweeps/1/given/1",
        ],
    )


def test_unknown_names_alone_are_a_problem_of_their_own_with_the_nearest_known_ones(service):
    body = {"graph": chain(), "statements": [{"x": "wether", "y": "refunds"}], "sweeps": [{"x": "late van"}]}
    document = json.loads(service.post(SEPARATION, body).data)
    assert document["type"] == "/problems/unknown-node"
    told = {error["pointer"]: error["detail"] for error in document["errors"]}
    assert list(told) == ["#/statements/0/x", "#/statements/0/y", "#/sweeps/0/x"]
    near = ("weather", "refund", "late_van")
    assert all(f'"{name}"' in detail for name, detail in zip(near, told.values(), strict=True))


def test_faults_of_the_graph_come_with_those_of_the_names(service):
    graph = chain()
    graph["edges"].append({"source": "refund", "target": "weathr"})
    body = {"graph": graph, "statements": [{"x": "weathr", "y": "refund"}]}
    assert refusal(service, SEPARATION, **body)[1] == ["#/graph/edges/3/target", "#/statements/0/x"]


@pytest.mark.parametrize("member", ["statements", "sweeps"])
@pytest.mark.parametrize("said", [None, {}, "weather", 3])
def test_what_is_no_list_is_refused(service, member, said):
    assert refusal(service, SEPARATION, graph=chain(), **{member: said}) == (
        "invalid-request",
        [f"#/{member}"],
    )


# Colliders.


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


def turned_round(value: Any) -> Any:
    """The same with the members of every object in the opposite order; lists stay as they are."""
    if isinstance(value, dict):
        return {member: turned_round(held) for member, held in reversed(value.items())}
    return [turned_round(item) for item in value] if isinstance(value, list) else value


def test_the_same_request_is_answered_with_the_same_bytes_in_any_order_of_members(service):
    for seed in range(20):
        rng, value = asked_graph(seed)
        statements = [written(one) for one in questions(rng, value, 4)]
        body = {"graph": value, "statements": statements, "sweeps": [{"x": statements[0]["x"]}], "paths": 7}
        first = service.post(SEPARATION, body)
        assert first.status_code == 200
        assert service.post(SEPARATION, turned_round(body)).data == first.data


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
