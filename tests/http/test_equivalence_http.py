"""POST /v1/equivalence: sizes of any length, and every way in which a pair of graphs cannot be compared."""

from __future__ import annotations

import json
from itertools import combinations
from math import factorial

import pytest

from pathgate.web.endpoints import OPERATIONS
from pathgate.web.endpoints.equivalence import OPERATION
from pathgate.web.operations import envelope_shape
from tests.http.asking import ask, faults
from tests.http.conftest import TINY_GRAPH, service_with
from tests.values import Graph, graph_of

PATH = "/v1/equivalence"
CHAIN = graph_of(("weather", "late_pickup"), ("late_pickup", "refund"))


def complete(size: int, of: int = 1) -> Graph:
    """``of`` complete graphs without links between them."""
    groups = ([f"locker_{group}_{number}" for number in range(size)] for group in range(of))
    return graph_of(*(pair for names in groups for pair in combinations(names, 2)))


def test_arrows_are_told_apart(service):
    graph = graph_of(("weather", "locker_full"), ("promotion", "locker_full"), ("promotion", "parcels"))
    graph["nodes"][1:1] = [{"id": "season", "recorded": 1}, {"id": "storms", "recorded": 2}]
    graph["edges"].append({"source": "season", "target": "storms"})
    assert ask(service, PATH, graph=graph) == {
        "compelled": [
            {"source": "weather", "target": "locker_full"},
            {"source": "promotion", "target": "locker_full"},
        ],
        "reversible": [{"source": "promotion", "target": "parcels"}],
        "fixed_by_time": [{"source": "season", "target": "storms"}],
        "class_size": 4,
    }


def test_sizes_that_json_readers_would_round_are_strings(service):
    assert ask(service, PATH, graph=complete(18))["class_size"] == factorial(18) < 2**53
    assert ask(service, PATH, graph=complete(19))["class_size"] == str(factorial(19))
    assert ask(service, PATH, graph=complete(100))["class_size"] == str(factorial(100))


def test_sizes_of_more_digits_than_python_writes_by_itself_come_whole(service):
    size = ask(service, PATH, graph=complete(4, of=3_200))["class_size"]
    assert len(size) > 4_300
    assert int(size[:4_000]) == 24**3_200 // 10 ** (len(size) - 4_000)


def test_the_class_of_a_large_tree_is_counted_within_the_time_budget(service):
    tree = graph_of(*((f"n{(node - 1) // 3}", f"n{node}") for node in range(1, 10_000)))
    answer = ask(service, PATH, graph=tree)
    assert answer["class_size"] == len(answer["reversible"]) + 1 == 10_000


def test_two_graphs_are_told_apart_by_a_statement_or_not_at_all(service):
    turned = {**CHAIN, "edges": [{"source": e["target"], "target": e["source"]} for e in CHAIN["edges"]]}
    assert ask(service, PATH, graph=CHAIN, other=turned) == {"equivalent": True, "statement": None}
    collider = graph_of(("refund", "late_pickup"), ("weather", "late_pickup"))
    statement = {"x": "weather", "y": "refund", "given": [], "holds_in": "other"}
    assert ask(service, PATH, graph=CHAIN, other=collider) == {"equivalent": False, "statement": statement}


@pytest.mark.parametrize("member", ["graph", "other"])
def test_hidden_causes_are_refused_each_at_its_place(service, member):
    spoilt = {
        "nodes": ["weather", {"id": "late_pickup", "measured": False}, "refund"],
        "edges": [
            {"source": "weather", "target": "late_pickup"},
            {"source": "refund", "target": "weather", "kind": "bidirected"},
        ],
    }
    found = faults(service, PATH, **{"graph": CHAIN, "other": CHAIN, member: spoilt})
    assert list(found) == [f"#/{member}/nodes/1/measured", f"#/{member}/edges/1/kind"]
    assert '"late_pickup" is marked as unmeasured' in found[f"#/{member}/nodes/1/measured"]
    assert '"refund" and "weather" is bidirected' in found[f"#/{member}/edges/1/kind"]


def test_all_that_is_wrong_with_either_graph_comes_in_one_answer(service):
    found = faults(
        service,
        PATH,
        graph={"nodes": ["weather"], "edges": [{"source": "weather", "target": "wether"}], "links": []},
        other={"nodes": ["weather", 3], "edges": {}},
    )
    assert list(found) == ["#/graph/edges/0/target", "#/graph/links", "#/other/nodes/1", "#/other/edges"]


def test_a_cycle_in_the_other_graph_is_shown(service):
    other = graph_of(("weather", "late_pickup"), ("late_pickup", "refund"), ("refund", "weather"))
    reply = service.post(PATH, {"graph": CHAIN, "other": other})
    problem = json.loads(reply.data)
    assert (reply.status_code, problem["type"]) == (422, "/problems/cycle")
    assert [fault["pointer"] for fault in problem["errors"]] == ["#/other/edges"]
    assert len(problem["cycle"]) == 4


def test_other_nodes_are_refused_by_name(service):
    found = faults(
        service, PATH, graph=CHAIN, other=graph_of(("wether", "late_pickup"), ("late_pickup", "refund"))
    )
    assert 'did you mean "weather"' in found["#/other/nodes/0"]
    assert '"weather", a node of "graph", is missing here' in found["#/other/nodes"]


@pytest.mark.parametrize("other", [None, True, 5, "graph", [], [CHAIN], {"nodes": [], "edges": 1}])
def test_another_graph_that_is_none_is_refused(service, other):
    assert all(pointer.startswith("#/other") for pointer in faults(service, PATH, graph=CHAIN, other=other))


def test_the_limits_hold_for_both_graphs():
    service = service_with(OPERATIONS, max_nodes=2, max_edges=1)
    assert list(faults(service, PATH, graph=TINY_GRAPH, other=CHAIN)) == ["#/other/nodes", "#/other/edges"]
    assert list(faults(service, PATH, graph=CHAIN, other=TINY_GRAPH)) == ["#/graph/nodes", "#/graph/edges"]


def test_neither_graph_is_looked_at_by_the_schema_library():
    assert OPERATION.graph_members == ("graph", "other")
    assert envelope_shape(OPERATION).schema["properties"] == {"graph": True, "other": True}
    assert all("graph" in operation.graph_members for operation in OPERATIONS)


def test_a_question_that_takes_too_long_is_cut_off():
    hasty = service_with(OPERATIONS, time_budget_seconds=0.05)
    for more in ({}, {"other": complete(60, of=20)}):
        reply = hasty.post(PATH, {"graph": complete(60, of=20), **more})
        assert (reply.status_code, json.loads(reply.data)["type"]) == (422, "/problems/too-costly")
