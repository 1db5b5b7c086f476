"""Row filters in SQL in a review: what is taken for granted about nulls, joins and groups; lists of parts say alike."""

from __future__ import annotations

from typing import Any

import pytest

from pathgate.graphs.names import quoted
from tests.review.random_configs import random_config, review_of
from tests.review.sql_asking import GRAPH, config_of, parts_of


def notes_of(row_filter: str) -> list[tuple[str, list[str], Any]]:
    _, answer = review_of(
        GRAPH, {"treatment": "late", "outcome": "refund", "covariates": [], "row_filter": row_filter}
    )
    assert answer.verdict == "sound"
    return [(f.rule, list(f.columns), f.part) for f in answer.findings if f.severity == "note"]


def test_null_tests_select_on_being_recorded_and_are_noted():
    row_filter = "depot IS NOT NULL AND NOT weight IS NULL AND ticket IS NULL"
    assert parts_of(row_filter) == []
    assumed = "missing-at-random-assumed"
    assert notes_of(row_filter) == [
        (assumed, ["depot"], "depot IS NOT NULL"),
        (assumed, ["weight"], "NOT weight IS NULL"),
        (assumed, ["ticket"], "ticket IS NULL"),
    ]


def test_comparisons_get_one_note_for_all_of_them():
    assert notes_of("depot = 1 AND weight > 2") == [("missing-at-random-assumed", ["depot", "weight"], None)]
    assert notes_of("1 = 1") == []


def test_a_null_test_of_what_is_not_measured_is_an_error():
    _, answer = review_of(
        GRAPH, {"treatment": "late", "outcome": "refund", "covariates": [], "row_filter": "mood IS NOT NULL"}
    )
    assert [f.rule for f in answer.findings if f.severity == "error"] == ["unmeasured-filter-column"]


SELECT = """
SELECT d.*, LEFT(t.kind, 3) AS kind
FROM warehouse.deliveries AS d
JOIN tickets AS t ON d.id = t.delivery AND t.opened = TRUE AND d.depot = t.depot
LEFT JOIN scales AS s ON s.id = d.id AND s.unknown > 3
WHERE d.late > 2 AND (s.weight > 1 OR t.ticket)
GROUP BY d.depot HAVING COUNT(*) > 5 AND MAX(rain) > 1
ORDER BY d.depot
"""


def test_a_select_gives_the_conditions_of_where_having_and_inner_joins():
    assert parts_of(SELECT) == [
        ("t.opened = TRUE", {"tickets.opened"}, True),
        ("d.late > 2", {"late"}, False),
        ("(s.weight > 1 OR t.ticket)", {"weight", "ticket"}, False),
        ("COUNT(*) > 5", {"depot"}, False),
        ("MAX(rain) > 1", {"rain", "depot"}, False),
    ]


def test_joins_and_groups_are_noted():
    notes = {rule: columns for rule, columns, _ in notes_of(SELECT)}
    assert set(notes) == {"missing-at-random-assumed", "join-selects-rows", "rows-are-groups"}
    assert notes["rows-are-groups"] == ["depot"]
    assert notes["join-selects-rows"] == []
    assert [a.tables for a in config_of(SELECT).rows.assumed if a.kind == "join"] == [("tickets",)]


@pytest.mark.parametrize(
    ("joins", "tables"),
    [
        ("a, b WHERE a.id = b.id", ("b",)),
        ("a CROSS JOIN b", ("b",)),
        ("a NATURAL JOIN b", ("b",)),
        ("a RIGHT JOIN b ON LEFT(a.k, 1) = b.k", ("a",)),
        ("a LEFT JOIN b USING (k) JOIN c USING (k)", ("c",)),
        ("a FULL JOIN b ON a.k = b.k", None),
        ("a LEFT JOIN b ON a.k = b.k", None),
        ("a", None),
    ],
)
def test_only_joins_that_drop_rows_are_noted(joins: str, tables: tuple[str, ...] | None):
    config = config_of(" ".join(["SELECT late FROM", joins]))
    assert config.rows.filter_parts == ()
    assert next((assumed.tables for assumed in config.rows.assumed if assumed.kind == "join"), None) == tables


def test_keys_that_are_different_columns_of_the_graph_select():
    assert parts_of("SELECT late FROM a JOIN b ON a.depot = b.weight") == [
        ("a.depot = b.weight", {"depot", "weight"}, False)
    ]


def sql_of(parts: Any) -> str:
    """A filter in SQL that says what parts say; no two of its conditions are written alike."""
    shown = []
    for k, part in enumerate(parts):
        names = [quoted(name) for name in dict.fromkeys(part["columns"])]
        shown.append(f"{names[0]} = {k}" if part["fixed"] else " OR ".join(f"{name} > {k}" for name in names))
    return " AND ".join(f"({one})" if " OR " in one else one for one in shown)


@pytest.mark.parametrize("seeds", [range(300), pytest.param(range(300, 2500), marks=pytest.mark.slow)])
def test_sql_and_the_list_of_its_parts_review_alike(seeds: range):
    compared = remedied = 0
    for seed in seeds:
        question = random_config(seed)
        if not question.parts:
            continue
        config = question.config()
        sql = sql_of(question.parts)
        _, listed = review_of(question.graph, config)
        graph, said = review_of(question.graph, config | {"row_filter": sql})
        compared += 1
        assert said.verdict == listed.verdict, seed
        assert [(f.rule, f.columns) for f in said.findings if f.rule != "missing-at-random-assumed"] == [
            (f.rule, f.columns) for f in listed.findings
        ], seed
        assert [(r.covariates, len(r.drop_parts)) for r in said.remedies] == [
            (r.covariates, len(r.drop_parts)) for r in listed.remedies
        ], seed
        for remedy in said.remedies:
            dropped = {part.written for part in remedy.drop_parts}
            rest = " AND ".join(part for part in sql.split(" AND ") if part not in dropped)
            mended = config | {
                "covariates": list(graph.names_of(remedy.covariates)),
                "row_filter": rest or [],
            }
            assert review_of(question.graph, mended)[1].verdict == "sound", seed
            remedied += 1
    assert compared > len(seeds) // 3
    assert remedied > len(seeds) // 10
