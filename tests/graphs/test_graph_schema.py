"""The published schema of a graph and the reader of graphs call the same values well formed."""

from __future__ import annotations

import copy
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as some
from jsonschema_rs import Draft202012Validator

from pathgate.graphs.edge_list import EDGE_MEMBERS
from pathgate.graphs.node_list import NODE_MEMBERS
from pathgate.graphs.reading import GRAPH_MEMBERS, examine_graph
from pathgate.graphs.schema import EDGE_SCHEMA, GRAPH_SCHEMA, NODE_SCHEMA

JUDGE = Draft202012Validator(GRAPH_SCHEMA)
GRAPH: dict[str, Any] = {
    "$schema": "schemas/graph.json",
    "directed": True,
    "multigraph": False,
    "graph": {},
    "nodes": [
        "weather",
        {
            "id": "delay",
            "measured": False,
            "cost": 2.5,
            "recorded": 1,
            "constant_within": ["weather"],
            "columns": ["d"],
        },
    ],
    "edges": [
        {"source": "weather", "target": "delay", "kind": "directed", "doubtful": True, "note": "n", "key": 0}
    ],
}
PLACES: list[tuple[str | int, ...]] = [
    *[(member,) for member in GRAPH],
    *[("nodes", 0), ("nodes", 1), ("edges", 0)],
    *[("nodes", 1, member) for member in NODE_MEMBERS],
    *[("nodes", 1, member, 0) for member in ("constant_within", "columns")],
    *[("edges", 0, member) for member in EDGE_MEMBERS],
]
WRONG = [
    *[None, True, False, 0, 1, 1.0, -1, 0.5, 10**300, -(10**300), 1e308, "", "weather", "x" * 200, "x" * 201],
    *[
        "directed",
        "bidirected",
        [],
        [""],
        [1],
        ["weather"],
        ["x" * 201],
        [[]],
        {},
        {"id": 1},
        {"id": "weather"},
    ],
]


def is_well_formed(value: Any) -> bool:
    """No fault of shape; names that nobody bears and circles of arrows are another matter."""
    return not any(fault.slug == "invalid-request" for fault in examine_graph(value).faults)


@pytest.mark.parametrize("place", PLACES, ids=lambda place: ".".join(map(str, place)))
@pytest.mark.parametrize("wrong", WRONG, ids=lambda wrong: f"{wrong!r:.20}")
def test_schema_and_reader_agree_on_any_value_at_any_place(place, wrong):
    value = copy.deepcopy(GRAPH)
    holder: Any = value
    for step in place[:-1]:
        holder = holder[step]
    holder[place[-1]] = wrong
    assert JUDGE.is_valid(value) == is_well_formed(value)


@given(
    value=some.recursive(
        some.sampled_from([None, 1, "", "a"]), lambda inner: some.lists(inner, max_size=2), max_leaves=3
    )
)
def test_schema_and_reader_agree_on_what_is_no_graph_at_all(value):
    assert JUDGE.is_valid(value) == is_well_formed(value)


@pytest.mark.parametrize("member", GRAPH_SCHEMA["required"])
def test_neither_does_without_nodes_or_edges(member):
    value = {name: said for name, said in GRAPH.items() if name != member}
    assert not JUDGE.is_valid(value)
    assert not is_well_formed(value)


def test_both_know_the_same_members():
    assert set(GRAPH_SCHEMA["properties"]) == set(GRAPH_MEMBERS)
    assert set(NODE_SCHEMA["properties"]) == set(NODE_MEMBERS)
    assert set(EDGE_SCHEMA["properties"]) == set(EDGE_MEMBERS)


def test_attributes_of_ones_own_are_free_on_nodes_and_edges_alone():
    value = copy.deepcopy(GRAPH)
    value["nodes"][1]["team"] = {"any": [1]}
    value["edges"][0]["weight"] = None
    assert JUDGE.is_valid(value)
    assert is_well_formed(value)
    value["team"] = 1
    assert not JUDGE.is_valid(value)
    assert not is_well_formed(value)


def test_every_member_says_what_it_means():
    for schema in (GRAPH_SCHEMA, NODE_SCHEMA, EDGE_SCHEMA):
        assert all(part["description"].endswith((".", "`.")) for part in schema["properties"].values())


def test_the_example_is_a_graph():
    for example in GRAPH_SCHEMA["examples"]:
        assert JUDGE.is_valid(example)
        assert not examine_graph(example).faults
