"""What a notebook gets from the package is what the service answers over HTTP."""

import pytest

from pathgate.criteria import (
    AmongKept,
    Deadline,
    InEverybody,
    Pairs,
    Part,
    equivalence,
    independencies,
    keep_rows,
    most_precise,
    tetrads,
    total_effect,
)
from pathgate.demo import demo_graph
from pathgate.graphs import read_graph
from pathgate.web.app import create_app
from pathgate.web.settings import Settings

NEVER = Deadline.never()
ENDS = {"treatment": "late_delivery", "outcome": "refund"}


@pytest.fixture(scope="module")
def graph():
    return read_graph(demo_graph())


def asked(operation, **question):
    client = create_app(Settings()).test_client()
    reply = client.post(f"/v1/{operation}", json={"graph": demo_graph()} | question)
    assert reply.status_code == 200, reply.get_json()
    return reply.get_json()


def effect_on(graph, *parts):
    return total_effect(keep_rows(graph, parts), graph.mask(ENDS["treatment"]), graph.mask(ENDS["outcome"]))


def test_the_most_precise_sets_are_the_same(graph):
    answer = asked("adjustment", **ENDS, prefer="most-precise")
    found = most_precise(effect_on(graph), NEVER)
    assert answer["sets"]
    assert [each["columns"] for each in answer["sets"]] == [list(graph.names_of(each)) for each in found.sets]
    assert (answer["uniform"], answer["every_candidate"]) == (found.uniform, found.complete)


@pytest.mark.parametrize("population", ["kept", "whole"])
def test_the_sets_for_a_population_are_the_same(graph, population):
    part = Part(graph.mask("weather"), fixed=False, written="weather")
    asked_of = AmongKept(effect_on(graph, part))
    question = {"population": population, "selected_on": ["weather"]}
    if population == "whole":
        question["measured_everywhere"] = ["weather"]
        asked_of = InEverybody(asked_of.effect, graph.mask("weather"))
    answer = asked("adjustment", **ENDS, **question)
    found = asked_of.every_minimal(NEVER, required=0, allowed=graph.everything)
    assert answer["sets"]
    assert {frozenset(each["columns"]) for each in answer["sets"]} == {
        frozenset(graph.names_of(each)) for each in found
    }
    assert answer["exists"] == (asked_of.one() is not None)
    assert answer["needed"] == list(graph.names_of(asked_of.needed(NEVER)))


def test_the_smallest_statements_are_the_same(graph):
    answer = asked("independencies", limit=1000)
    pairs = Pairs(keep_rows(graph))
    found = [independencies.smallest(pairs, *pair) for pair in independencies.separable_pairs(pairs, NEVER)]
    assert answer["complete"]
    assert [(each["x"], [each["y"]], each["given"]) for each in answer["independencies"]] == [
        (graph.name(each.x), list(graph.names_of(each.y)), list(graph.names_of(each.given))) for each in found
    ]


def test_the_tetrads_are_the_same(graph):
    answer = asked("constraints", limit=1000)
    assert answer["complete"]
    assert [(each["rows"], each["columns"]) for each in answer["tetrads"]] == [
        (list(each.rows), list(each.columns)) for each in tetrads(graph, NEVER)
    ]


def test_the_class_is_the_same():
    chain = {
        "nodes": ["promotion", "parcels", "locker_full"],
        "edges": [
            {"source": "promotion", "target": "parcels"},
            {"source": "parcels", "target": "locker_full"},
        ],
    }
    answer = asked("equivalence", graph=chain)
    found = equivalence(read_graph(chain), NEVER)
    assert answer["class_size"] == found.class_size == 3
    assert [(each["source"], each["target"]) for each in answer["reversible"]] == list(found.reversible)
