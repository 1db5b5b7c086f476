"""Reading a graph: every fault is found, at its place, under its rule, and all of them at once."""

from __future__ import annotations

import random
from math import inf, nan
from typing import Any

import pytest

from pathgate.graphs import InvalidGraph, examine_graph, read_graph

Place = tuple[str | int, ...]

TWO: dict[str, Any] = {"nodes": ["a", "b"], "edges": []}


def faults_of(value: object) -> list[tuple[Place, str]]:
    """(place, rule) of every fault; the slug where there is no finer rule."""
    return [(fault.place, fault.rule or fault.slug) for fault in examine_graph(value).faults]


def with_nodes(*nodes: object, edges: list[object] | None = None) -> dict[str, Any]:
    return {"nodes": list(nodes), "edges": edges or []}


def edge(source: object, target: object, **members: object) -> dict[str, object]:
    return {"source": source, "target": target, **members}


NOT_A_GRAPH: list[tuple[object, list[tuple[Place, str]]]] = [
    (None, [((), "invalid-request")]),
    (3, [((), "invalid-request")]),
    ("a", [((), "invalid-request")]),
    ([], [((), "invalid-request")]),
    ({}, [((), "invalid-request"), ((), "invalid-request")]),
    ({"nodes": []}, [((), "invalid-request")]),
    ({"nodes": {}, "edges": None}, [(("nodes",), "invalid-request"), (("edges",), "invalid-request")]),
    ({"nodes": "ab", "edges": []}, [(("nodes",), "invalid-request")]),
    (TWO | {"node": []}, [(("node",), "invalid-request")]),
    (TWO | {"directed": False}, [(("directed",), "invalid-request")]),
    (TWO | {"directed": "yes"}, [(("directed",), "invalid-request")]),
    (TWO | {"multigraph": 1}, [(("multigraph",), "invalid-request")]),
    (TWO | {"graph": []}, [(("graph",), "invalid-request")]),
]


@pytest.mark.parametrize(("value", "expected"), NOT_A_GRAPH)
def test_what_is_no_graph_is_refused_member_by_member(value: object, expected: list[tuple[Place, str]]):
    assert faults_of(value) == expected


@pytest.mark.parametrize(
    ("node", "step"),
    [
        (3, ()),
        (None, ()),
        (True, ()),
        (["a"], ()),
        ("", ()),
        ("x" * 201, ()),
        ({}, ()),
        ({"name": "a"}, ()),
        ({"id": 3}, ("id",)),
        ({"id": ""}, ("id",)),
        ({"id": None}, ("id",)),
        ({"id": ["a"]}, ("id",)),
        ({"id": "x" * 201}, ("id",)),
    ],
)
def test_a_node_without_a_good_name_is_refused(node: object, step: Place):
    assert faults_of(with_nodes("a", node)) == [(("nodes", 1, *step), "invalid-request")]


def test_a_number_for_an_id_is_told_to_be_a_string():
    for value in (with_nodes({"id": 3}), with_nodes("a", edges=[edge("a", 3)])):
        (fault,) = examine_graph(value).faults
        assert fault.detail == "a name is a string, not a number"


@pytest.mark.parametrize(
    ("member", "said"),
    [
        *(("measured", said) for said in ("yes", 1, None, [])),
        *(("cost", said) for said in (0, -1, "1", True, None, inf, -inf, nan, 10**400)),
        *(("recorded", said) for said in (1.5, "2", True, None, inf, nan, [])),
        *(("constant_within", said) for said in ("b", None, {}, [3], ["b", None])),
        *(("columns", said) for said in ("b", None, {}, [3], [""], ["x" * 201])),
    ],
)
def test_what_is_said_of_a_node_has_a_kind(member: str, said: object):
    ((place, rule),) = faults_of(with_nodes({"id": "a", member: said}, "b"))
    assert place[:3] == ("nodes", 0, member)
    assert rule == "invalid-request"


@pytest.mark.parametrize(
    ("broken", "step", "rule"),
    [
        (3, (), "invalid-request"),
        ("a", (), "invalid-request"),
        (["a", "b"], (), "invalid-request"),
        (edge("a", 3), ("target",), "invalid-request"),
        (edge(None, "b"), ("source",), "invalid-request"),
        (edge("a", ""), ("target",), "invalid-request"),
        (edge("a", "c"), ("target",), "undeclared-node"),
        (edge("a", "b", kind="dashed"), ("kind",), "invalid-request"),
        (edge("a", "b", kind=None), ("kind",), "invalid-request"),
        (edge("a", "b", kind=[]), ("kind",), "invalid-request"),
        (edge("a", "b", doubtful="yes"), ("doubtful",), "invalid-request"),
        (edge("a", "b", doubtful=None), ("doubtful",), "invalid-request"),
        (edge("a", "b", note=3), ("note",), "invalid-request"),
        (edge("a", "b", note=None), ("note",), "invalid-request"),
        (edge("a", "a"), (), "self-loop"),
        (edge("a", "a", kind="bidirected"), (), "self-loop"),
        ({"source": "a"}, (), "invalid-request"),
        ({"target": "b"}, (), "invalid-request"),
    ],
)
def test_a_broken_edge_is_refused_where_it_is_broken(broken: object, step: Place, rule: str):
    assert faults_of(TWO | {"edges": [broken]}) == [(("edges", 0, *step), rule)]
    fine = with_nodes("a", "b", "d", edges=[edge("d", "a"), broken])
    assert faults_of(fine) == [(("edges", 1, *step), rule)]


def test_an_edge_without_either_end_says_so_of_both():
    assert faults_of(TWO | {"edges": [{}]}) == [(("edges", 0), "invalid-request")] * 2


@pytest.mark.parametrize(
    ("edges", "expected"),
    [
        ([edge("a", "b"), edge("a", "b")], [(("edges", 1), "repeated-edge")]),
        (
            [edge("a", "b", kind="bidirected"), edge("b", "a", kind="bidirected")],
            [(("edges", 1), "repeated-edge")],
        ),
        ([edge("a", "b"), edge("a", "b", kind="directed")], [(("edges", 1), "repeated-edge")]),
        (
            [edge("b", "a"), edge("b", "a"), edge("b", "a")],
            [(("edges", 1), "repeated-edge"), (("edges", 2), "repeated-edge")],
        ),
        ([edge("a", "b"), edge("b", "a", kind="bidirected")], []),
        ([edge("a", "b"), edge("b", "a")], [(("edges",), "cycle")]),
    ],
)
def test_an_edge_may_not_be_repeated_but_two_kinds_may_join_one_pair(
    edges: list[object], expected: list[tuple[Place, str]]
):
    assert faults_of(TWO | {"edges": edges}) == expected


def test_a_repeated_id_is_refused_and_edges_mean_the_first():
    value = with_nodes("a", {"id": "b"}, "a", "b", edges=[edge("a", "b")])
    assert faults_of(value) == [(("nodes", 2), "repeated-id"), (("nodes", 3), "repeated-id")]


def test_an_unknown_end_comes_with_the_nearest_declared_node():
    value = with_nodes("weather", "refund", edges=[edge("wether", "refund")])
    (fault,) = examine_graph(value).faults
    assert (fault.slug, fault.columns) == ("unknown-node", ("wether",))
    assert 'did you mean "weather"' in fault.detail


def test_other_names_must_be_nobody_elses():
    nodes = [{"id": "a", "columns": ["x", "b"]}, {"id": "b", "columns": ["y", "x", "b"]}, "c"]
    assert faults_of(with_nodes(*nodes)) == [
        (("nodes", 0, "columns", 1), "ambiguous-name"),
        (("nodes", 1, "columns", 1), "ambiguous-name"),
    ]
    assert read_graph(with_nodes({"id": "a", "columns": ["a", "x", "x"]})).aliases == {"a": 0, "x": 0}


def test_every_unknown_name_in_a_list_of_a_node_is_found():
    value = with_nodes({"id": "a", "constant_within": ["b", "x", "a", "y"]}, "b")
    assert faults_of(value) == [
        (("nodes", 0, "constant_within", 1), "undeclared-node"),
        (("nodes", 0, "constant_within", 3), "undeclared-node"),
    ]


def test_arrows_may_not_run_back_in_time():
    nodes = [{"id": "a", "recorded": 2}, {"id": "b", "recorded": 1}, {"id": "c", "recorded": 2.0}, "d"]
    edges = [edge("a", "b"), edge("a", "c"), edge("b", "a", kind="bidirected"), edge("a", "d")]
    assert faults_of(with_nodes(*nodes, edges=edges)) == [(("edges", 0), "arrow-back-in-time")]
    bare = [{"id": "d", "recorded": -3}, {"id": "e", "recorded": 0}, "f"]
    assert faults_of(with_nodes(*bare, edges=[edge("d", "e"), edge("e", "f"), edge("f", "d")])) == [
        (("edges",), "cycle")
    ]


def letters_apart(one: str, other: str) -> int:
    """Insertions, deletions and replacements that lead from one word to the other (Levenshtein 1966)."""
    row = list(range(len(other) + 1))
    for place, letter in enumerate(one, start=1):
        above, row[0] = row[0], place
        for k, met in enumerate(other, start=1):
            above, row[k] = row[k], min(row[k] + 1, row[k - 1] + 1, above + (letter != met))
    return row[-1]


def misspelt(word: str, rng: random.Random) -> str:
    for _ in range(rng.randint(0, 4)):
        place = rng.randrange(len(word) + 1)
        letter = rng.choice(["", "x", "e", "M"])
        word = word[:place] + letter + word[place + rng.choice([0, 1]) :]
    return word


NODE_MEMBERS = ("id", "measured", "cost", "recorded", "constant_within", "columns")
EDGE_MEMBERS = ("source", "target", "kind", "doubtful", "note", "key")


@pytest.mark.parametrize(("owner", "members"), [("nodes", NODE_MEMBERS), ("edges", EDGE_MEMBERS)])
def test_an_attribute_within_two_letters_of_a_member_of_six_or_more_is_refused(
    owner: str, members: tuple[str, ...]
):
    refused = 0
    for seed in range(800):
        rng = random.Random(seed)
        word = misspelt(rng.choice(members), rng)
        if word in members:
            continue
        value = with_nodes({"id": "a"}, {"id": "b"}, {"id": "c"}, edges=[edge("a", "b"), edge("b", "c")])
        value[owner][1][word] = 1
        near = any(len(member) >= 6 and letters_apart(word, member) <= 2 for member in members)
        expected = [((owner, 1, word), "invalid-request")] if near else []
        assert faults_of(value) == expected, word
        refused += near
    assert refused > 200


def test_other_attributes_are_free():
    value = with_nodes({"id": "a", "team": "lockers", "x": 3.5}, "b", edges=[edge("a", "b", weight=2, key=0)])
    assert faults_of(value) == []


def test_a_member_that_is_no_string_is_a_fault_and_no_accident():
    # YAML can hold such a thing, JSON cannot.
    for value in (with_nodes({"id": "a", 3: "x"}), with_nodes("a") | {3: "x"}):
        assert [rule for _, rule in faults_of(value)] == ["invalid-request"]
    value = with_nodes("a", "b", edges=[{**edge("a", "b"), None: "x", "y": 1}])
    assert [rule for _, rule in faults_of(value)] == ["invalid-request"]


FAULTY: dict[str, Any] = {
    "nodes": [
        "a",
        {"id": "b", "mesured": False, "cost": -1},
        3,
        "a",
        {"id": "d", "recorded": 2, "columns": ["b"]},
        {"id": "e", "recorded": 1, "constant_within": ["z"]},
        "f",
    ],
    "edges": [
        edge("a", "zz"),
        edge("d", "e"),
        edge("b", "b"),
        edge("a", "f"),
        edge("a", "f", kindd="x"),
        edge("f", "a", note=3),
        edge("e", "f", kind="dotted"),
        "a",
    ],
    "directed": False,
    "edge": [],
}
ITS_FAULTS = [
    (("nodes", 1, "mesured"), "invalid-request"),
    (("nodes", 1, "cost"), "invalid-request"),
    (("nodes", 2), "invalid-request"),
    (("nodes", 3), "repeated-id"),
    (("nodes", 4, "columns", 0), "ambiguous-name"),
    (("nodes", 5, "constant_within", 0), "undeclared-node"),
    (("edges", 0, "target"), "undeclared-node"),
    (("edges", 1), "arrow-back-in-time"),
    (("edges", 2), "self-loop"),
    (("edges", 4), "repeated-edge"),
    (("edges", 5, "note"), "invalid-request"),
    (("edges", 6, "kind"), "invalid-request"),
    (("edges", 7), "invalid-request"),
    (("directed",), "invalid-request"),
    (("edge",), "invalid-request"),
    (("edges",), "cycle"),
]


def test_all_faults_come_in_one_answer_nodes_first_then_edges_then_cycles():
    found = faults_of(FAULTY)
    assert sorted(found, key=str) == sorted(ITS_FAULTS, key=str)
    assert [place[0] for place, _ in found if place[0] in ("nodes", "edges")] == ["nodes"] * 6 + ["edges"] * 8
    with pytest.raises(InvalidGraph) as caught:
        read_graph(FAULTY)
    assert caught.value.slug == "invalid-graph"
    assert len(caught.value.faults) == len(found)
    assert str(len(found) - 1) in str(caught.value)


def test_random_nonsense_is_refused_or_read_and_never_an_accident():
    atoms = [None, True, 0, 1.5, -(10**30), "", "a", "b", [], {}, nan, "id", "bidirected"]
    words = ["id", "nodes", "edges", "source", "target", "kind", "measured", "cost", "recorded", "columns"]

    def made(rng: random.Random, depth: int) -> Any:
        kind = rng.random()
        if depth == 0 or kind < 0.3:
            return rng.choice(atoms)
        if kind < 0.55:
            return [made(rng, depth - 1) for _ in range(rng.randint(0, 4))]
        return {rng.choice(words): made(rng, depth - 1) for _ in range(rng.randint(0, 4))}

    for seed in range(4000):
        rng = random.Random(seed)
        value = {"nodes": ["a", "b", made(rng, 3)], "edges": [edge("a", "b"), made(rng, 2)]}
        if rng.random() < 0.3:
            value = made(rng, 4)
        examined = examine_graph(value)
        assert all(fault.detail and fault.place is not None for fault in examined.faults)
