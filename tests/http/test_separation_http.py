"""Separation over HTTP: many statements at once, sweeps, proofs, faults and limits."""

from __future__ import annotations

import json
import random
from collections import Counter

import pytest

from pathgate.web.endpoints import OPERATIONS
from tests.brute import (
    Path,
    descendants,
    inclusion_minimal,
    is_open,
    separated,
    separating_sets,
    shortest_open_length,
)
from tests.criteria.asking import edges_exist
from tests.http.asking import Json, ask, asked_graph, chain, refusal, turned_round
from tests.http.conftest import service_with
from tests.strategies import Question, random_question
from tests.values import Graph, measured_names, node_names

SEPARATION, COLLIDERS = "/v1/separation", "/v1/colliders"


def written(asked: Question) -> Json:
    return {"x": list(asked.x), "y": list(asked.y), "given": list(asked.given)}


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


def test_the_same_request_is_answered_with_the_same_bytes_in_any_order_of_members(service):
    for seed in range(20):
        rng, value = asked_graph(seed)
        statements = [written(one) for one in questions(rng, value, 4)]
        body = {"graph": value, "statements": statements, "sweeps": [{"x": statements[0]["x"]}], "paths": 7}
        first = service.post(SEPARATION, body)
        assert first.status_code == 200
        assert service.post(SEPARATION, turned_round(body)).data == first.data
