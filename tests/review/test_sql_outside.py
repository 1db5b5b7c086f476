"""Row filters in SQL: columns declared as outside the graph, columns that stand for less, known causes of nulls."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import pytest

from pathgate.graphs import read_graph
from pathgate.graphs.errors import Fault
from pathgate.graphs.masks import mask_of
from pathgate.review.names import NameReader
from pathgate.review.schema import STANDARD_DIALECT
from pathgate.review.sql_names import Assumed, SqlFilter, read_sql_filter

READ = read_graph(
    {
        "nodes": [
            "late",
            {"id": "depot", "columns": ["depot_group"]},
            *("weight", "Rain", "rain", "audit.batch"),
            {"id": "mood", "measured": False},
        ],
        "edges": [],
    }
)
OUTSIDE = frozenset({"ds", "shard id", "audit.depot", "RAIN", "BaTch"})
PLACE = ("row_filter",)


def mask(*names: str) -> int:
    return mask_of(READ.index[name] for name in names)


def read(
    text: str,
    dialect: str = STANDARD_DIALECT,
    missing: Mapping[int, int] | None = None,
    coarse: frozenset[str] = frozenset(),
    **more: Any,
) -> tuple[SqlFilter, list[Fault]]:
    faults: list[Fault] = []
    names = NameReader(READ, faults, recodes=dict.fromkeys(coarse, True), **more)
    return read_sql_filter(text, dialect, names, PLACE, missing), faults


def said(text: str, dialect: str = STANDARD_DIALECT) -> list[tuple[str, set[str], bool]]:
    found, faults = read(text, dialect, outside=OUTSIDE)
    assert not faults
    return [(str(part.written), set(READ.names_of(part.columns)), part.fixed) for part in found.parts]


def outside_of(text: str, dialect: str = STANDARD_DIALECT) -> list[tuple[Any, tuple[str, ...]]]:
    found, faults = read(text, dialect, outside=OUTSIDE)
    assert not faults
    return [(one.written, one.names) for one in found.assumed if one.kind == "outside"]


@pytest.mark.parametrize(
    ("condition", "dialect", "names"),
    [
        ("ds = '2026-01-01'", "standard", ("ds",)),
        ("d.DS BETWEEN 1 AND 2", "standard", ("ds",)),
        ("ds IS NOT NULL", "standard", ("ds",)),
        ("ds IS NULL", "standard", ("ds",)),
        ('"shard id" = 3 OR ds > 1', "standard", ("shard id", "ds")),
        ('"DS" = 1', "snowflake", ("ds",)),
        ("audit.depot = 1", "standard", ("audit.depot",)),
        ("RAIN > 1", "standard", ("RAIN",)),
        ("batch = 3", "standard", ("BaTch",)),
    ],
)
def test_a_condition_on_names_outside_alone_selects_on_nothing_of_the_graph(
    condition: str, dialect: str, names: tuple[str, ...]
):
    found, faults = read(condition, dialect, outside=OUTSIDE)
    assert (found.parts, found.emptied, faults) == ((), 0, [])
    assert found.assumed == (Assumed("outside", 0, PLACE, written=condition, names=names),)


@pytest.mark.parametrize(
    ("condition", "columns"),
    [
        ("depot = ds", "depot"),
        ("depot = CASE WHEN ds > 1 THEN 'a' END", "depot"),
        ("weight > 3 OR ds = 1 OR late", "weight late"),
    ],
)
def test_a_condition_on_both_selects_on_the_columns_of_the_graph_and_fixes_none(condition: str, columns: str):
    assert said(condition) == [(condition, set(columns.split()), False)]
    assert outside_of(condition) == [(condition, ("ds",))]


def test_parts_are_told_apart():
    text = "depot = 'north' AND ds = 1 AND weight > ds"
    assert said(text) == [("depot = 'north'", {"depot"}, True), ("weight > ds", {"weight"}, False)]
    assert outside_of(text) == [("ds = 1", ("ds",)), ("weight > ds", ("ds",))]
    kinds = [one.kind for one in read(text, outside=OUTSIDE)[0].assumed]
    assert kinds == ["outside", "outside", "comparison"]


@pytest.mark.parametrize(
    ("name", "column"),
    [("depot", "depot"), ("p.DEPOT", "depot"), ('"rain"', "rain"), ("audit.batch", "audit.batch")],
)
def test_what_fits_a_node_is_that_node(name: str, column: str):
    assert said(f"{name} = 1") == [(f"{name} = 1", {column}, True)]
    assert outside_of(f"{name} = 1") == []


@pytest.mark.parametrize(
    ("text", "dialect", "words"),
    [
        ("dz = 1", "standard", 'no node is named "dz" (did you mean "ds"?)'),
        ('"Ds" = 1', "postgres", 'no node is named "Ds"'),
        ("DS = 1", "clickhouse", 'no node is named "DS"'),
        ("raiN = 1", "standard", 'fits "Rain" and "rain"'),
        ("SELECT weight + 1 AS ds FROM a WHERE ds = 1", "standard", "something the SELECT computes"),
    ],
)
def test_what_fits_neither_is_a_fault(text: str, dialect: str, words: str):
    _, (fault,) = read(text, dialect, outside=OUTSIDE)
    assert fault.slug == "unknown-node"
    assert words in fault.detail


def test_nothing_is_outside_unless_declared():
    assert [fault.slug for fault in read("ds = 1")[1]] == ["unknown-node"]


def test_names_outside_are_told_in_one_way_whatever_their_order():
    names = ["dS", "Ds", "DS"]
    for order in (names, names[::-1]):
        found, _ = read("ds = 1", outside=frozenset(order))
        assert [one.names for one in found.assumed] == [("DS",)]


def test_keys_and_groups_may_be_outside():
    text = (
        "SELECT late FROM a JOIN b ON a.ds = b.ds AND a.ds = b.depot"
        " GROUP BY ds, depot HAVING COUNT(*) > 3 AND ds > 1"
    )
    assert said(text) == [("COUNT(*) > 3", {"depot"}, False)]
    found, _ = read(text, outside=OUTSIDE)
    assert [(one.kind, one.written, one.names) for one in found.assumed] == [
        ("outside", "COUNT(*) > 3", ("ds",)),
        ("outside", "ds > 1", ("ds",)),
        ("comparison", None, ()),
        ("join", None, ()),
        ("group", None, ("ds",)),
    ]


def test_many_conditions_on_many_groups_read_them_all():
    columns = ", ".join(["depot", "weight", "rain", '"Rain"'] * 300)
    having = " AND ".join(f"SUM(late) > {k}" for k in range(500))
    text = f"SELECT late FROM a GROUP BY {columns} HAVING {having}"  # noqa: S608 - read, never run
    parts = read(text)[0].parts
    assert len(parts) == 500
    assert {part.columns for part in parts} == {mask("late", "depot", "weight", "rain", "Rain")}


def test_a_condition_on_a_bucket_of_a_column_does_not_fix_the_column():
    coarse = frozenset({"depot_group"})
    for condition in ("depot_group = 'a'", "DEPOT_GROUP IN ('a')"):
        (part,) = read(condition, coarse=coarse)[0].parts
        assert (READ.names_of(part.columns), part.fixed) == (("depot",), False)
    assert [part.fixed for part in read("depot = 'a'", coarse=coarse)[0].parts] == [True]
    assert [part.fixed for part in read("depot_group = 'a'")[0].parts] == [True]


def kinds_of(text: str, *names: str) -> list[tuple[str, tuple[str, ...]]]:
    missing = {READ.index[name]: mask("weight") for name in names}
    found, faults = read(text, missing=missing)
    assert not faults
    return [(one.kind, READ.names_of(one.columns)) for one in found.assumed]


def test_nothing_is_assumed_about_nulls_whose_causes_are_known():
    text = "depot IS NOT NULL AND late > 3 AND weight = 1"
    assert kinds_of(text) == [("null-test", ("depot",)), ("comparison", ("late", "weight"))]
    assert kinds_of(text, "depot", "late") == [("comparison", ("weight",))]
    assert kinds_of(text, "late", "weight") == [("null-test", ("depot",))]
    assert kinds_of(text, "depot", "late", "weight") == []
    assert kinds_of("weight > depot", "depot") == [("comparison", ("weight",))]


def test_known_causes_of_nulls_leave_the_parts_as_they_are():
    missing = {READ.index["late"]: mask("weight")}
    text = "late > 3 AND late IS NOT NULL AND depot = 1"
    known, unknown = read(text, missing=missing)[0].parts, read(text)[0].parts
    assert [(part.columns, part.fixed, part.written) for part in known] == [
        (mask("late"), False, "late > 3"),
        (mask("depot"), True, "depot = 1"),
    ]
    assert [part.written for part in unknown] == [part.written for part in known]


@pytest.mark.parametrize("name", ["depot", "mood"])
def test_only_nulls_that_are_said_to_be_dropped_cannot_be_kept(name: str):
    missing = {READ.index[name]: 0}
    found, (fault,) = read(f"{name} IS NULL", missing=missing)
    assert (found.parts, found.emptied) == ((), 0)
    assert (fault.slug, fault.place, fault.columns) == ("invalid-request", PLACE, (name,))
    assert fault.detail == (
        f'only rows where "{name}" is null are kept, and missing_because says that these are dropped'
    )


def test_a_condition_that_nulls_may_pass_is_no_fault():
    missing = {READ.index["depot"]: 0}
    assert not read("depot IS NULL OR weight > 3", missing=missing)[1]


@pytest.mark.parametrize("dialect", ["postgres", "duckdb", "clickhouse", "standard"])
def test_long_chains_of_indices_are_refused_and_many_single_ones_read(dialect: str):
    for link in ("[1]", ".a[1]"):
        _, faults = read("weight" + link * 1_500 + " > 1", dialect)
        assert [fault.detail.startswith("the SQL text is nested too deeply") for fault in faults] == [True]
    text = " OR ".join(["weight[1][2] = 3"] * 800)
    found, faults = read(text, dialect)
    assert not faults
    assert [READ.names_of(part.columns) for part in found.parts] == [("weight",)]
