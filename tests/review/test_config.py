"""Reading a config: which columns its names mean, and every fault with its place."""

from __future__ import annotations

import random
import time
from typing import Any

import pytest

from pathgate.graphs import read_graph
from pathgate.review import InvalidConfig, read_config

GRAPH = read_graph(
    {
        "nodes": [
            {"id": "late", "columns": ["deliveries.late", "is_late"]},
            "refund",
            "weather",
            {"id": "depot", "columns": ["site"]},
            {"id": "mood", "measured": False},
        ],
        "edges": [{"source": "late", "target": "refund"}],
    }
)
GOOD: dict[str, Any] = {"treatment": "late", "outcome": "refund", "covariates": []}


def faults_of(value: object) -> set[tuple[tuple, str]]:
    with pytest.raises(InvalidConfig) as caught:
        read_config(value, GRAPH)
    assert len(set(caught.value.faults)) == len(caught.value.faults)
    return {(fault.place, fault.slug) for fault in caught.value.faults}


@pytest.mark.parametrize(
    ("change", "faults"),
    [
        ({"treatment": ["late", "late"]}, [(("treatment", 1), "invalid-request")]),
        ({"treatment": ["late", "is_late"]}, [(("treatment", 1), "invalid-request")]),
        (
            {"covariates": ["depot", "weather", "site", "depot"]},
            [(("covariates", 2), "invalid-request"), (("covariates", 3), "invalid-request")],
        ),
        ({"outcome": "late"}, [(("outcome",), "invalid-request")]),
        ({"outcome": ["refund", "deliveries.late"]}, [(("outcome", 1), "invalid-request")]),
        ({"treatment": "delay"}, [(("treatment",), "unknown-node")]),
        (
            {"covariates": ["wether", "weather", "depo"]},
            [(("covariates", 0), "unknown-node"), (("covariates", 2), "unknown-node")],
        ),
        ({"row_filter": ["weather", "wether"]}, [(("row_filter", 1), "unknown-node")]),
        ({"row_filter": ["weather", "weather"]}, [(("row_filter", 1), "invalid-request")]),
        (
            {"row_filter": ["depot", {"columns": "weather"}, "site"]},
            [(("row_filter", 2), "invalid-request")],
        ),
        (
            {"row_filter": [{"columns": ["weather", "dpot"]}]},
            [(("row_filter", 0, "columns", 1), "unknown-node")],
        ),
        (
            {"row_filter": ["weather", {"columns": ["depot", "site"]}]},
            [(("row_filter", 1, "columns", 1), "invalid-request")],
        ),
        (
            {"row_filter": [{"columns": ["weather", "depot"], "fixed": True}]},
            [(("row_filter", 0, "fixed"), "invalid-request")],
        ),
        ({"row_filter": [{"columns": []}]}, [(("row_filter", 0, "columns"), "invalid-request")]),
        ({"row_filter": [{"fixed": True}]}, [(("row_filter", 0), "invalid-request")]),
        (
            {"row_filter": [{"columns": "depot", "fixd": True}]},
            [(("row_filter", 0, "fixd"), "invalid-request")],
        ),
        ({"treatment": []}, [(("treatment",), "invalid-request")]),
        ({"outcome": 3}, [(("outcome",), "invalid-request")]),
        (
            {"covariates": ["depot", 3, ""]},
            [(("covariates", 1), "invalid-request"), (("covariates", 2), "invalid-request")],
        ),
        ({"covariates": None}, [(("covariates",), "invalid-request")]),
        ({"asks": "sideways"}, [(("asks",), "invalid-request")]),
        ({"population": "some"}, [(("population",), "invalid-request")]),
        ({"row_filter_fixed": "no"}, [(("row_filter_fixed",), "invalid-request")]),
        ({"covariate": []}, [(("covariate",), "invalid-request")]),
        ({"name": 3}, [(("name",), "invalid-request")]),
    ],
)
def test_each_fault_is_found_at_its_place(change: dict[str, Any], faults: list[tuple[tuple, str]]):
    assert faults_of(GOOD | change) == set(faults)


@pytest.mark.parametrize(
    ("change", "faults"),
    [
        ({"fixed_effects": "depto"}, [(("fixed_effects",), "unknown-node")]),
        ({"weighted_by": ["weather", "wether"]}, [(("weighted_by", 1), "unknown-node")]),
        ({"matched_on": ["depot", "site"]}, [(("matched_on", 1), "invalid-request")]),
        ({"rows_exist_because": ["mood", "mod"]}, [(("rows_exist_because", 1), "unknown-node")]),
        (
            {"missing_because": {"wether": [], "weather": ["mood", "depo"]}},
            [
                (("missing_because", "wether"), "unknown-node"),
                (("missing_because", "weather", 1), "unknown-node"),
            ],
        ),
        ({"missing_because": ["weather"]}, [(("missing_because",), "invalid-request")]),
        ({"measured_everywhere": ["weather", "mood"]}, [(("measured_everywhere", 1), "invalid-request")]),
        ({"population": "whole", "asks": "direct"}, [(("population",), "invalid-request")]),
        ({"outside_graph": ["zone", "site"]}, [(("outside_graph", 1), "invalid-request")]),
        ({"outside_graph": "zone", "treatment": "zone"}, [(("treatment",), "unknown-node")]),
        ({"dialect": "parcel"}, [(("dialect",), "invalid-request")]),
    ],
)
def test_each_fault_of_what_pipelines_do_is_found_at_its_place(
    change: dict[str, Any], faults: list[tuple[tuple, str]]
):
    assert faults_of(GOOD | change) == set(faults)


@pytest.mark.parametrize(
    ("derived", "change", "faults"),
    [
        ({"late": {"from": "depot"}}, {}, [(("derived", "late"), "invalid-request")]),
        ({"site": {"recodes": "depot"}}, {}, [(("derived", "site"), "invalid-request")]),
        ({"": {"from": "depot"}}, {}, [(("derived", ""), "invalid-request")]),
        ({"a": {"from": "depo"}}, {"covariates": "a"}, [(("derived", "a", "from"), "unknown-node")]),
        ({"a": {"recodes": "depo"}}, {}, [(("derived", "a", "recodes"), "unknown-node")]),
        ({"a": {"from": ["depot", "site"]}}, {}, [(("derived", "a", "from", 1), "invalid-request")]),
        ({"a": {"from": "b"}, "b": {"from": "a"}}, {}, [(("derived", "a"), "invalid-request")]),
        ({"a": {"from": []}}, {}, [(("derived", "a", "from"), "invalid-request")]),
        ({"a": {"from": "depot", "coarse": True}}, {}, [(("derived", "a", "coarse"), "invalid-request")]),
        ({"a": {"from": "depot"}}, {"outside_graph": "a"}, [(("derived", "a"), "invalid-request")]),
        (
            {"a": {"from": ["late", "refund"]}},
            {"treatment": "a"},
            [(("outcome",), "invalid-request")],
        ),
        ({"a": {"recodes": "late"}}, {"outcome": "a"}, [(("outcome",), "invalid-request")]),
        (
            {"a": {"from": ["late", "depot"]}},
            {"treatment": "a", "asks": "direct"},
            [(("treatment",), "invalid-request")],
        ),
        (
            {"a": {"recodes": "depot"}},
            {"covariates": ["a", "depot", "a"]},
            [(("covariates", 2), "invalid-request")],
        ),
    ],
)
def test_each_fault_of_a_derived_column_is_found_at_its_place(
    derived: dict[str, Any], change: dict[str, Any], faults: list[tuple[tuple, str]]
):
    assert faults_of(GOOD | {"derived": derived} | change) == set(faults)


def test_derived_columns_are_nodes_and_recodes_are_names_whatever_their_order():
    derived = {
        "score": {"from": ["log_weather", "site"]},
        "log_weather": {"recodes": "wet"},
        "wet": {"recodes": "weather", "coarse": True},
        "grade": {"from": "score"},
    }
    config = read_config(GOOD | {"derived": derived, "covariates": ["grade", "log_weather"]}, GRAPH)
    graph = config.columns.graph
    assert graph.names[: GRAPH.size] == GRAPH.names
    assert sorted(graph.names[GRAPH.size :]) == ["grade", "score"]
    assert graph.names_of(graph.parent_masks[graph.index["score"]]) == ("weather", "depot")
    assert graph.names_of(graph.parent_masks[graph.index["grade"]]) == ("score",)
    assert [graph.name(named.node) for named in config.covariates] == ["grade", "weather"]
    assert config.columns.recodes == {"wet": True, "log_weather": True}


def test_a_treatment_computed_from_others_stands_for_them():
    derived = {"score": {"from": ["late", "weather"]}}
    config = read_config(GOOD | {"derived": derived, "treatment": ["score", "depot"]}, GRAPH)
    named = [(GRAPH.name(each.node), each.place, each.written) for each in config.treatments]
    assert named == [
        ("late", ("treatment", 0), "score"),
        ("weather", ("treatment", 0), "score"),
        ("depot", ("treatment", 1), "depot"),
    ]


@pytest.mark.parametrize("missing", ["treatment", "outcome", "covariates"])
def test_a_config_needs_its_three_members(missing: str):
    rest = {member: said for member, said in GOOD.items() if member != missing}
    assert faults_of(rest) == {((), "invalid-request")}
    with pytest.raises(InvalidConfig, match=missing):
        read_config(rest, GRAPH)


@pytest.mark.parametrize("value", [None, 3, "late", [], [GOOD]])
def test_what_is_no_object_is_no_config(value: object):
    assert faults_of(value) == {((), "invalid-request")}


def test_all_faults_of_shape_and_of_names_come_in_one_answer():
    value = {
        "treatment": ["late", "lat"],
        "outcome": ["refund", "late"],
        "covariates": ["depot", "depot", "wether"],
        "row_filter": [{"columns": "dpot"}, {"columns": ["late", "refund"], "fixed": True}, 3],
        "asks": "sideways",
        "colour": "red",
    }
    faults = faults_of(value)
    assert faults >= {
        (("treatment", 1), "unknown-node"),
        (("outcome", 1), "invalid-request"),
        (("covariates", 1), "invalid-request"),
        (("covariates", 2), "unknown-node"),
        (("row_filter", 2), "invalid-request"),
        (("asks",), "invalid-request"),
        (("colour",), "invalid-request"),
    }


@pytest.mark.parametrize(
    ("unknown", "nearest"),
    [
        ("wether", '"weather"'),
        ("Late", '"late"'),
        ("refnud", '"refund"'),
        ("deliveries.lat", '"deliveries.late"'),
    ],
)
def test_an_unknown_name_comes_with_the_nearest_known_ones(unknown: str, nearest: str):
    with pytest.raises(InvalidConfig) as caught:
        read_config(GOOD | {"covariates": [unknown]}, GRAPH)
    (fault,) = caught.value.faults
    assert fault.columns == (unknown,)
    assert f"did you mean {nearest}" in fault.detail


def test_other_names_of_a_column_mean_that_column():
    config = read_config(
        {
            "treatment": "is_late",
            "outcome": "refund",
            "covariates": ["site"],
            "row_filter": ["deliveries.late", {"columns": "site"}],
        },
        GRAPH,
    )
    assert [named.node for named in (*config.treatments, *config.covariates)] == [0, 3]
    assert [part.part.columns for part in config.rows.filter_parts] == [1 << 0, 1 << 3]
    assert [part.part.written for part in config.rows.filter_parts] == [
        ["deliveries.late"],
        {"columns": "site"},
    ]


def test_bare_names_are_one_part_and_objects_are_parts_of_their_own():
    row_filter = ["weather", {"columns": "depot", "fixed": True}, "late"]
    config = read_config(GOOD | {"row_filter": row_filter}, GRAPH)
    parts = [
        (GRAPH.names_of(one.part.columns), one.part.fixed, one.place) for one in config.rows.filter_parts
    ]
    assert parts == [
        (("late", "weather"), False, ("row_filter",)),
        (("depot",), True, ("row_filter", 1)),
    ]


def test_unmeasured_columns_and_ends_among_covariates_are_read_and_left_to_the_review():
    value = GOOD | {"covariates": ["mood", "late"], "row_filter": ["mood"], "outcome": "mood"}
    config = read_config(value, GRAPH)
    assert [named.place for named in config.covariates] == [("covariates", 0), ("covariates", 1)]


def test_random_nonsense_never_gets_past_as_anything_but_a_fault():
    atoms = [None, True, 0, -1.5, "", "late", "zzz", "refund", [], {}, ["late", "late"], {"columns": "depot"}]
    refused = 0
    for seed in range(3000):
        rng = random.Random(seed)

        def value(depth: int, rng: random.Random = rng) -> Any:
            kind = rng.random()
            if depth == 0 or kind < 0.5:
                return rng.choice(atoms)
            if kind < 0.75:
                return [value(depth - 1) for _ in range(rng.randint(0, 3))]
            keys = ["columns", "fixed", "late", "treatment", ""]
            return {rng.choice(keys): value(depth - 1) for _ in range(rng.randint(0, 3))}

        members = rng.sample(["treatment", "outcome", "covariates", "row_filter", "asks", "name", "x"], 3)
        mixed = {member: said for member, said in GOOD.items() if rng.random() < 0.8}
        mixed |= {member: value(3) for member in members}
        refused += outcome_of(mixed)
    assert 1500 < refused < 3000


def outcome_of(value: dict[str, Any]) -> bool:
    """Is it refused, with faults that say something? Else it has been understood."""
    try:
        config = read_config(value, GRAPH)
    except InvalidConfig as problem:
        return all(fault.detail and fault.place[:1] <= ("x",) for fault in problem.faults)
    return not (config.treatments and config.outcomes)


def test_reading_computed_columns_takes_time_in_proportion_to_what_is_declared():
    # Copying the arrows with each new column made it quadratic: a ratio of 16.
    names = [f"bay{k}" for k in range(300)]
    graph = read_graph({"nodes": [*names, "late", "refund"], "edges": []})
    config = {"treatment": "late", "outcome": "refund", "covariates": []}

    def seconds(derived: dict) -> float:
        start = time.process_time()
        read = read_config({**config, "derived": derived}, graph)
        taken = time.process_time() - start
        assert read.columns.graph.size == graph.size + len(derived)
        return taken

    few, many = (
        min(seconds({f"score{k}": {"from": names} for k in range(count)}) for _ in range(3))
        for count in (100, 400)
    )
    assert many < 10 * few, (few, many)
