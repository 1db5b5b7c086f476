"""Digests: equal for what is read alike, different for whatever can change an answer, and RFC 8785 underneath."""

from __future__ import annotations

import copy
import hashlib
import json
import random
from typing import Any

import pytest
import rfc8785
from hypothesis import given
from hypothesis import strategies as st

from pathgate.graphs.reading import read_graph
from pathgate.review import provenance
from pathgate.review.config import read_config
from pathgate.review.provenance import config_digest, graph_digest, provenance_document
from pathgate.review.schema import CONFIG_SCHEMA
from pathgate.version import VERSION
from tests.strategies import small_graphs

Json = dict[str, Any]

GRAPH: Json = {
    "nodes": [
        {"id": "locker", "recorded": 0},
        {"id": "weather", "cost": 2.5, "columns": ["forecast.rain"]},
        {"id": "locker_size", "constant_within": ["locker"], "measured": False},
        "late_pickup",
        {"id": "refund", "columns": ["billing.refund"]},
        {"id": "ticket", "recorded": 3},
    ],
    "edges": [
        {"source": "weather", "target": "late_pickup", "note": "people put off the walk"},
        {"source": "locker_size", "target": "late_pickup", "doubtful": True},
        {"source": "late_pickup", "target": "refund"},
        {"source": "weather", "target": "refund", "kind": "bidirected"},
        {"source": "locker", "target": "ticket"},
    ],
}
CONFIG: Json = {"treatment": "late_pickup", "outcome": "refund", "covariates": ["weather", "locker"]}


def digest_of(value: Json) -> str:
    return graph_digest(read_graph(value))


def said_otherwise(graph: Json, rng: random.Random) -> Json:
    """The same graph: other orders, every default said or none, attributes that are not read."""
    nodes = [_node_otherwise(node, rng) for node in graph["nodes"]]
    edges = [_edge_otherwise(edge, rng) for edge in graph["edges"]]
    rng.shuffle(nodes)
    rng.shuffle(edges)
    return _shuffled_members({"edges": edges, "nodes": nodes, "graph": {"about": "a city"}}, rng)


def _node_otherwise(node: Any, rng: random.Random) -> Any:
    said = {"id": node} if isinstance(node, str) else dict(node)
    defaults = {"measured": True, "cost": rng.choice([1, 1.0]), "columns": [], "constant_within": []}
    return _shuffled_members({**(defaults if rng.random() < 0.5 else {}), **said, "about": "a column"}, rng)


def _edge_otherwise(edge: Json, rng: random.Random) -> Json:
    said = {
        **({"kind": "directed", "doubtful": False} if rng.random() < 0.5 else {}),
        **edge,
        "drawn": "thick",
    }
    if said.get("kind") == "bidirected" and rng.random() < 0.5:
        said |= {"source": said["target"], "target": said["source"]}
    return _shuffled_members(said, rng)


def _shuffled_members(value: Json, rng: random.Random) -> Json:
    items = list(value.items())
    rng.shuffle(items)
    return dict(items)


@given(small_graphs(), st.randoms(use_true_random=False))
def test_a_graph_said_otherwise_has_the_same_digest(graph, rng):
    assert digest_of(said_otherwise(graph, rng)) == digest_of(graph)


@pytest.mark.parametrize("seed", range(20))
def test_every_remark_survives_being_said_otherwise(seed):
    assert digest_of(said_otherwise(GRAPH, random.Random(seed))) == digest_of(GRAPH)


def _rename(graph: Json, old: str, new: str) -> None:
    for edge in graph["edges"]:
        edge.update({end: new for end in ("source", "target") if edge[end] == old})


def _timeless(graph: Json) -> None:
    for node in graph["nodes"]:
        if isinstance(node, dict):
            node.pop("recorded", None)


GRAPH_CHANGES = {
    "id": lambda g: g["nodes"].__setitem__(3, "late_pick_up") or _rename(g, "late_pickup", "late_pick_up"),
    "one more node": lambda g: g["nodes"].append("promotion"),
    "measured": lambda g: g["nodes"][0].update(measured=False),
    "cost": lambda g: g["nodes"][1].update(cost=2.25),
    "cost left out": lambda g: g["nodes"][1].pop("cost"),
    "recorded": lambda g: g["nodes"][5].update(recorded=4),
    "recorded left out": lambda g: g["nodes"][5].pop("recorded"),
    "recorded beyond doubles": lambda g: g["nodes"][5].update(recorded=2**53 + 1),
    "recorded beyond doubles, by one": lambda g: g["nodes"][5].update(recorded=2**53),
    "constant_within": lambda g: g["nodes"][2].update(constant_within=["weather"]),
    "constant within both": lambda g: g["nodes"][2].update(constant_within=["weather", "locker"]),
    "columns": lambda g: g["nodes"][4].update(columns=["billing.refunds"]),
    "columns of another": lambda g: g["nodes"][0].update(columns=[g["nodes"][4].pop("columns")[0]]),
    "source": lambda g: g["edges"][2].update(source="weather"),
    "turned round": lambda g: g["edges"][4].update(source="ticket", target="locker") or _timeless(g),
    "timeless": _timeless,
    "kind": lambda g: g["edges"][2].update(kind="bidirected"),
    "doubtful": lambda g: g["edges"][0].update(doubtful=True),
    "no longer doubtful": lambda g: g["edges"][1].update(doubtful=False),
    "doubtful and bidirected": lambda g: g["edges"][3].update(doubtful=True),
    "note": lambda g: g["edges"][0].update(note="people put the walk off"),
    "empty note": lambda g: g["edges"][2].update(note=""),
    "note on bidirected": lambda g: g["edges"][3].update(note="storms"),
    "edge left out": lambda g: g["edges"].pop(2),
}


def test_whatever_is_read_of_a_graph_changes_its_digest():
    digests = {"as it is": digest_of(GRAPH)}
    for what, change in GRAPH_CHANGES.items():
        changed = copy.deepcopy(GRAPH)
        change(changed)
        digests[what] = digest_of(changed)
    assert len(set(digests.values())) == len(GRAPH_CHANGES) + 1, digests


@given(small_graphs(), small_graphs())
def test_different_graphs_have_different_digests(first, second):
    # Plain reading is the yardstick: the two hold the same nodes and edges, or they do not.
    assert (digest_of(first) == digest_of(second)) == (_plainly(first) == _plainly(second))


def _plainly(graph: Json) -> tuple[set[Any], set[Any]]:
    nodes = {
        (node, True) if isinstance(node, str) else (node["id"], node.get("measured", True))
        for node in graph["nodes"]
    }
    edges = set()
    for edge in graph["edges"]:
        ends = (edge["source"], edge["target"])
        is_arrow = edge.get("kind", "directed") == "directed"
        edges.add((ends if is_arrow else frozenset(ends), is_arrow))
    return nodes, edges


def test_the_digest_is_that_of_the_form_that_the_docs_describe():
    graph = {
        "nodes": [
            {"id": "weather", "cost": 0.5, "recorded": 1},
            "delay",
            {"id": "refund", "measured": False},
        ],
        "edges": [
            {"source": "weather", "target": "refund", "kind": "bidirected"},
            {"source": "weather", "target": "delay", "note": "wet roads"},
        ],
    }
    form = (
        '{"edges":[{"doubtful":false,"kind":"bidirected","source":"refund","target":"weather"},'
        '{"doubtful":false,"kind":"directed","note":"wet roads","source":"weather","target":"delay"}],'
        '"nodes":[{"columns":[],"constant_within":[],"cost":1,"id":"delay","measured":true},'
        '{"columns":[],"constant_within":[],"cost":1,"id":"refund","measured":false},'
        '{"columns":[],"constant_within":[],"cost":0.5,"id":"weather","measured":true,"recorded":1}]}'
    )
    assert digest_of(graph) == f"sha256:{hashlib.sha256(form.encode()).hexdigest()}"


SAME_CONFIGS = {
    "a name for a list": {"treatment": ["late_pickup"], "outcome": ["refund"]},
    "another order of a set": {"covariates": ["locker", "weather"]},
    "a name, a note and an editor's schema": {"name": "n", "meta": {"x": 0.5}, "$schema": "s"},
    "defaults": {
        "asks": "total",
        "population": "kept",
        "dialect": "standard",
        "row_filter_fixed": False,
        "row_filter": [],
        "derived": {},
        "missing_because": {},
        "accept": [],
        "fixed_effects": [],
        "weighted_by": [],
        "matched_on": [],
        "rows_exist_because": [],
        "measured_everywhere": [],
        "outside_graph": [],
    },
}

# Pairs within one member: each its own meaning, all different from each other and from leaving the member out.
CONFIG_VALUES: dict[str, list[Any]] = {
    "treatment": ["ticket", ["ticket", "late_pickup"]],
    "outcome": ["ticket", ["refund", "ticket"]],
    "asks": ["direct"],
    "covariates": [[], "weather", ["weather", "ticket"]],
    "formula": ["refund ~ late_pickup", "refund ~ late_pickup + weather"],
    "fixed_effects": ["ticket", ["ticket", "locker"]],
    "weighted_by": ["ticket", ["ticket", "locker"]],
    "matched_on": ["ticket", ["ticket", "locker"]],
    "derived": [
        {"risk": {"from": "weather"}},
        {"risk": {"from": ["weather", "ticket"]}},
        {"risk": {"recodes": "weather"}},
        {"risk": {"recodes": "weather", "coarse": True}},
        {"risk": {"sql": "weather"}},
        {"wet": {"sql": "weather"}},
    ],
    "row_filter": [
        "ticket = 1",
        "ticket = 2",
        ["ticket"],
        ["ticket", "weather"],
        [{"columns": "ticket", "fixed": True}],
        [{"columns": "ticket"}, {"columns": "weather"}],
        [{"columns": "weather"}, {"columns": "ticket"}],
    ],
    "dialect": ["duckdb", "postgres"],
    "row_filter_fixed": [True],
    "rows_exist_because": ["ticket", ["ticket", "locker"]],
    "missing_because": [{"weather": []}, {"weather": "ticket"}, {"ticket": "weather"}],
    "population": ["whole"],
    "measured_everywhere": ["ticket", ["ticket", "locker"]],
    "outside_graph": ["ds", ["ds", "batch"]],
    "accept": [
        [{"rule": "missing-covariate"}],
        [{"rule": "no-arrow"}],
        [{"rule": "no-arrow", "columns": "weather"}],
        [{"rule": "no-arrow", "why": "known"}],
        [{"rule": "no-arrow", "owner": "routing"}],
        [{"rule": "no-arrow", "until": "2027-01-31"}],
    ],
}


@pytest.mark.parametrize("what", SAME_CONFIGS)
def test_a_config_said_otherwise_has_the_same_digest(what):
    otherwise = {**CONFIG, **SAME_CONFIGS[what]}
    read_config(otherwise, read_graph(GRAPH))
    assert config_digest(otherwise) == config_digest(CONFIG)


@given(st.randoms(use_true_random=False))
def test_the_order_of_members_and_sets_does_not_count(rng):
    config = {**CONFIG, **{member: rng.choice(values) for member, values in CONFIG_VALUES.items()}}
    assert config_digest(_disordered(config, rng)) == config_digest(config)


def _disordered(value: Any, rng: random.Random) -> Any:
    if isinstance(value, dict):
        return _shuffled_members({member: _disordered(held, rng) for member, held in value.items()}, rng)
    if isinstance(value, list) and all(isinstance(each, str) for each in value):
        return rng.sample(value, len(value))
    return [_disordered(each, rng) for each in value] if isinstance(value, list) else value


def test_every_member_of_a_config_is_tried_or_left_out():
    assert CONFIG_VALUES.keys() | {"$schema", "name", "meta"} == CONFIG_SCHEMA["properties"].keys()


@pytest.mark.parametrize("member", CONFIG_VALUES)
def test_whatever_a_member_says_changes_the_digest(member):
    configs = [CONFIG, *({**CONFIG, member: value} for value in CONFIG_VALUES[member])]
    assert len({config_digest(config) for config in configs}) == len(configs)


@given(st.data())
def test_two_configs_that_differ_in_one_member_differ_in_their_digests(data):
    base = {
        **CONFIG,
        **{m: data.draw(st.sampled_from(v)) for m, v in CONFIG_VALUES.items() if data.draw(st.booleans())},
    }
    member = data.draw(st.sampled_from(sorted(CONFIG_VALUES)))
    other = data.draw(st.sampled_from(CONFIG_VALUES[member]))
    is_same = base.get(member) == other
    assert (config_digest({**base, member: other}) == config_digest(base)) == is_same


def test_conditions_given_as_names_are_the_one_condition_that_they_make_up():
    bare = {**CONFIG, "row_filter": ["ticket", {"columns": "locker", "fixed": True}, "weather"]}
    said = {
        **CONFIG,
        "row_filter": [
            {"columns": ["weather", "ticket"], "fixed": False},
            {"columns": ["locker"], "fixed": True},
        ],
    }
    assert config_digest(bare) == config_digest(said)


def test_a_list_of_one_name_is_no_sql_of_that_text():
    assert config_digest({**CONFIG, "row_filter": "ticket"}) != config_digest(
        {**CONFIG, "row_filter": ["ticket"]}
    )


_TEXTS = st.text(st.characters(exclude_categories=["Cs"]), max_size=4)
_VALUES = st.recursive(
    st.none() | st.booleans() | st.integers(1 - 2**53, 2**53 - 1) | _TEXTS,
    lambda inner: st.lists(inner, max_size=4) | st.dictionaries(_TEXTS, inner, max_size=4),
)


@given(st.dictionaries(_TEXTS, _VALUES, max_size=5))
def test_the_native_encoder_writes_the_canonical_form_wherever_it_is_used(value):
    written = provenance._canonical_bytes(value, is_plain=True)
    assert written == rfc8785.dumps(value)
    assert json.loads(written) == value


@given(st.text(st.characters(exclude_categories=["Cs"])))
def test_a_text_is_written_as_in_the_canonical_form(text):
    assert provenance._text(text).encode() == rfc8785.dumps(text)


@given(
    small_graphs(),
    st.lists(st.floats(min_value=0, exclude_min=True, allow_infinity=False) | st.integers(1, 2**70)),
    st.integers(-(2**60), 2**60),
    st.randoms(use_true_random=False),
)
def test_the_form_of_a_graph_is_canonical_whatever_is_said_of_it(graph, costs, moment, rng):
    nodes = [{"id": node} if isinstance(node, str) else dict(node) for node in graph["nodes"]]
    for node, cost in zip(nodes, costs, strict=False):
        node.update(cost=cost, recorded=moment, constant_within=[rng.choice(nodes)["id"], node["id"]])
        node["columns"] = [f"{node['id'][:150]}.{k}é🚚\uffee" for k in range(rng.randrange(3))]
    edges = [
        {**edge, "doubtful": rng.random() < 0.5, "note": f'"{rng.random()}" 🚚\n'} for edge in graph["edges"]
    ]
    form = provenance._graph_form(read_graph({"nodes": nodes, "edges": edges}))
    # As floats, for so RFC 8785 means all numbers, and the encoder refuses whole ones that no double is sure of.
    value = json.loads(form, parse_int=float)
    assert rfc8785.dumps(value) == form.encode()
    ids = [node["id"].encode("utf-16-be") for node in value["nodes"]]
    assert ids == sorted(ids)
    keys = [
        (edge["kind"], edge["source"].encode("utf-16-be"), edge["target"].encode("utf-16-be"))
        for edge in value["edges"]
    ]
    assert keys == sorted(keys)
    assert {node["id"]: float(node["cost"]) for node in value["nodes"]} == {
        node["id"]: float(node.get("cost", 1)) for node in nodes
    }


def test_names_are_sorted_by_their_utf16_units():
    # The code point of the van is the higher one, its first UTF-16 unit the lower.
    assert provenance._set(["\uffee", "🚚"]) == ["🚚", "\uffee"]
    config = {"treatment": "🚚", "derived": {"\uffee": {"from": "🚚"}, "🚛": {"from": "🚚"}}}
    swapped = {**config, "derived": dict(reversed(config["derived"].items()))}
    assert config_digest(config) == config_digest(swapped)


def test_what_no_json_can_carry_has_no_digest():
    with pytest.raises(ValueError, match="surrogate"):
        config_digest({**CONFIG, "formula": "\ud800"})


def test_the_provenance_of_a_review_names_version_graph_and_config():
    graph = read_graph(GRAPH)
    document = provenance_document(graph, CONFIG)
    assert document == {
        "version": VERSION,
        "graph_digest": graph_digest(graph),
        "config_digest": config_digest(CONFIG),
    }
    assert provenance_document(graph, CONFIG, known_digest=document["graph_digest"]) == document
