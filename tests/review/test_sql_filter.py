"""Row filters in SQL: their parts, what those read and fix; what cannot be read is refused by name."""

from __future__ import annotations

import pytest
from sqlglot.dialects.dialect import Dialect

from pathgate.graphs import read_graph
from pathgate.review import InvalidConfig, read_config
from pathgate.review.schema import DIALECTS, MOST_SQL_CHARACTERS
from pathgate.review.sql_bounds import MOST_NESTING
from tests.review.sql_asking import Said, config_of, fault_of, parts_of


@pytest.mark.parametrize(
    "condition",
    [
        *("depot = 'north'", "'north' = depot", "(depot) = ('north')", "depot = -1", "depot IS FALSE"),
        *("depot", "NOT depot", "depot IS TRUE", "depot = TRUE", "NOT (depot <> 1)", "NOT NOT depot"),
        *(
            "depot IN ('a')",
            "depot IN ('a', 'a', NULL)",
            "depot BETWEEN 3 AND 3",
            "depot = DATE '2026-01-01'",
        ),
        *("depot IS NOT DISTINCT FROM 'a'", "depot = :ds", "depot = CAST('3' AS INT)"),
    ],
)
def test_what_leaves_one_constant_fixes_its_column(condition: str):
    assert parts_of(condition) == [(condition, {"depot"}, True)]


@pytest.mark.parametrize(
    "condition",
    [
        *("depot <> 'a'", "depot > 3", "depot IN ('a', 'b')", "depot NOT IN ('a')", "depot BETWEEN 1 AND 2"),
        *("depot IS NOT TRUE", "depot IS NOT FALSE", "lower(depot) = 'a'", "CAST(depot AS INT) = 1"),
        *("depot LIKE 'a'", "depot = 'a' OR depot = 'b'", "depot = 1 OR FALSE", "NOT (depot = 1)"),
        *(
            "depot = random()",
            "depot IN (:depots)",
            "CASE WHEN depot = 1 THEN TRUE END",
            "COALESCE(depot, 1) = 1",
        ),
        *(
            "depot = depot",
            "depot IS DISTINCT FROM 'a'",
            "(depot IS NULL) = FALSE",
            "depot = 'a' OR depot IS NULL",
        ),
    ],
)
def test_what_may_leave_more_fixes_nothing(condition: str):
    assert parts_of(condition) == [(condition, {"depot"}, False)]


@pytest.mark.parametrize("dialect", ["duckdb", "mysql", "snowflake", "sqlite"])
def test_where_numbers_count_as_truth_values_only_false_is_one_value(dialect: str):
    written = "depot AND weight IS TRUE AND NOT ticket AND rain = TRUE"
    assert [fixed for _, _, fixed in parts_of(written, dialect)] == [False, False, True, True]


@pytest.mark.parametrize(
    ("row_filter", "said"),
    [
        (
            "depot = 'a AND b' AND weight BETWEEN 1 AND 2 AND ticket",
            [
                ("depot = 'a AND b'", "depot", True),
                ("weight BETWEEN 1 AND 2", "weight", False),
                ("ticket", "ticket", True),
            ],
        ),
        (
            "((depot = 1 AND (weight = 2))) AND (ticket)",
            [("depot = 1", "depot", True), ("(weight = 2)", "weight", True), ("(ticket)", "ticket", True)],
        ),
        ("depot = 1 AND weight = 2 OR ticket", [("depot = 1 AND weight = 2 OR ticket", "depot weight ticket", False)]),
        (
            "depot = 1 AND (weight = 2 OR ticket)",
            [("depot = 1", "depot", True), ("(weight = 2 OR ticket)", "weight ticket", False)],
        ),
        ("NOT (depot = 1 AND weight = 2)", [("NOT (depot = 1 AND weight = 2)", "depot weight", False)]),
        (
            "CASE WHEN depot = 1 AND weight = 2 THEN ticket END",
            [("CASE WHEN depot = 1 AND weight = 2 THEN ticket END", "depot weight ticket", False)],
        ),
        (
            "depot = 1 /* ) AND ( */\n AND -- AND\n weight > 2 -- end",
            [("depot = 1", "depot", True), ("weight > 2", "weight", False)],
        ),
        ("depot = 1 AND 1 = 1 AND TRUE AND depot = 1;", [("depot = 1", "depot", True)]),
        ("1 = 1", []),
        ("weight < depot", [("weight < depot", "weight depot", False)]),
    ],
)  # fmt: skip
def test_a_filter_is_split_at_its_top_level_ands(row_filter: str, said: list[tuple[str, str, bool]]):
    assert parts_of(row_filter) == [(text, set(names.split()), fixed) for text, names, fixed in said]


def test_the_operators_of_a_dialect_are_its_own():
    assert len(parts_of('depot = "north" && weight = 1', "mysql")) == 2
    for loose in ("depot = 1 || weight = 2", "depot = 1 XOR weight = 2 AND depot = 3"):
        assert parts_of(loose, "mysql") == [(loose, {"depot", "weight"}, False)]


@pytest.mark.parametrize(
    ("name", "dialect", "column"),
    [
        ("late", "standard", "late"),
        ("IS_LATE", "standard", "late"),
        ("Rain", "standard", "Rain"),
        ('"rain"', "standard", "rain"),
        ("d.weight", "standard", "weight"),
        ("warehouse.d.WEIGHT", "standard", "weight"),
        ("tickets.opened", "standard", "tickets.opened"),
        ("warehouse.Tickets.Opened", "standard", "tickets.opened"),
        ('"two words"', "standard", "two words"),
        ('"order"', "standard", "order"),
        ("`order`", "bigquery", "order"),
        ("[two words]", "tsql", "two words"),
        ("été", "standard", "été"),
        ("ÉTÉ", "standard", "été"),
        ('"LATE"', "snowflake", "late"),
        ('"LATE"', "duckdb", "late"),
        ("WEIGHT", "mysql", "weight"),
    ],
)
def test_names_fit_exactly_or_by_folding(name: str, dialect: str, column: str):
    assert parts_of(f"{name} = 1", dialect) == [(f"{name} = 1", {column}, True)]


@pytest.mark.parametrize(
    ("row_filter", "dialect", "words"),
    [
        ("dpot = 1", "standard", 'no node is named "dpot" (did you mean "depot"?)'),
        ("RAIN = 1", "standard", 'fits "Rain" and "rain"'),
        ('"LATE" = 1', "postgres", 'no node is named "LATE"'),
        ("LATE = 1", "clickhouse", 'no node is named "LATE"'),
        ('depot = "north"', "standard", "'single ones' a text"),
    ],
)
def test_unknown_names_are_faults_with_the_nearest_ones(row_filter: str, dialect: str, words: str):
    slug, detail = fault_of(row_filter, dialect)
    assert slug == "unknown-node"
    assert words in detail


@pytest.mark.parametrize(
    ("row_filter", "slug", "words"),
    [
        ("depot IN (SELECT depot FROM t)", "not-supported", "a query inside"),
        ("EXISTS (SELECT 1)", "not-supported", "a query inside"),
        ("SELECT late FROM (SELECT 1) AS t", "not-supported", "a query inside"),
        ("SELECT late FROM a UNION SELECT late FROM b", "not-supported", "UNION"),
        ("WITH a AS (SELECT 1) SELECT late FROM a", "not-supported", "WITH"),
        ("SELECT late FROM a LIMIT 3", "not-supported", "LIMIT"),
        ("SELECT DISTINCT late FROM a", "not-supported", "DISTINCT"),
        ("SELECT late FROM a ANTI JOIN b ON a.x = b.x", "not-supported", "ANTI JOIN"),
        ("SELECT late FROM a GROUP BY 1", "not-supported", "GROUP BY"),
        (
            "SELECT weight + 1 AS depot FROM a WHERE depot = 1",
            "unknown-node",
            "something the SELECT computes",
        ),
        ("count(*) > 1", "invalid-request", "aggregate"),
        ("row_number() OVER (ORDER BY late) = 1", "invalid-request", "window"),
        ("1 = 0", "invalid-request", "reads no column"),
        ("depot = 1 AND FALSE", "invalid-request", "reads no column"),
        ("random() < 0.1", "invalid-request", "reads no column"),
        ("'depot'", "invalid-request", "reads no column"),
        ("depot = NULL", "invalid-request", "IS NULL"),
        ("late IS NULL", "invalid-request", "needs its values"),
        ("depot = 1; DROP TABLE parcels", "invalid-request", "(line 1, column 10)"),
        ("depot = 1\n  AND weight >", "invalid-request", '">" (line 2, column 14)'),
        ("WHERE depot = 1", "invalid-request", "leave out the word WHERE"),
        ("depot = 'a", "invalid-request", "not closed"),
        ('"depot = 1', "invalid-request", "not closed"),
        ("depot = 1 /* a", "invalid-request", "not closed"),
        ("  ", "invalid-request", "no condition"),
        ("-- nothing", "invalid-request", "no condition"),
        ("DROP TABLE parcels", "invalid-request", "not a condition"),
        ("depot, weight", "invalid-request", "not a condition"),
    ],
)
def test_what_cannot_be_read_is_refused_by_name(row_filter: str, slug: str, words: str):
    found, detail = fault_of(row_filter)
    assert found == slug
    assert words in detail


@pytest.mark.parametrize(
    "row_filter",
    [
        "(" * 10_000 + "depot" + ")" * 10_000,
        "(" * 9_000 + "depot" + ")" * 9_000,
        "CASE WHEN " * 900 + "depot" + " THEN 1 END" * 900,
        "NOT " * 4_000 + "depot",
        "depot = " + "- " * 4_000 + "1",
        "f(" * 5_000 + "depot" + ")" * 5_000,
        "end(" * 4_000 + "depot" + ")" * 4_000,
        "DATE(" * 24 + "depot" + ")" * 24,
        "ARRAY<" * 3_000,
        "INTERVAL " * 2_000 + "1 DAY",
        "depot" + "[1]" * 5_000,
    ],
)
def test_deep_nesting_is_refused_before_it_can_hurt(row_filter: str):
    _, detail = fault_of(row_filter)
    assert "nested too deeply" in detail or f"at most {MOST_SQL_CHARACTERS:,} characters" in detail


@pytest.mark.parametrize("word", ["(", "NOT (", "CASE WHEN ", "coalesce("])
def test_as_deep_as_is_allowed_is_read_even_far_down_the_stack(word: str):
    levels = MOST_NESTING // (2 if word == "NOT (" else 1)
    text = word * levels + "depot > 1" + (" THEN TRUE END" if "CASE" in word else ")") * levels

    def from_depth(frames: int) -> Said:
        return from_depth(frames - 1) if frames else parts_of(text)

    assert from_depth(100) == [(text, {"depot"}, False)]


@pytest.mark.parametrize(
    "text",
    [
        " OR ".join(["depot = 1"] * 1_500),
        "+".join(["depot"] * 3_000) + " > 1",
        "depot IN (" + ", ".join(["1", "2"] * 3_000) + ")",
    ],
)
def test_long_flat_conditions_are_read(text: str):
    assert parts_of(text) == [(text, {"depot"}, False)]


def test_many_parts_are_read():
    text = " AND ".join(f"depot <> {number}" for number in range(1_000))
    assert [part for part, _, _ in parts_of(text)] == text.split(" AND ")


@pytest.mark.parametrize("dialect", DIALECTS[1:])
def test_every_dialect_that_is_offered_is_known(dialect: str):
    assert Dialect.get_or_raise(dialect)
    assert parts_of("depot = 'a' AND weight > 1", dialect) == [
        ("depot = 'a'", {"depot"}, True),
        ("weight > 1", {"weight"}, False),
    ]


def test_an_unknown_dialect_comes_with_the_nearest():
    with pytest.raises(InvalidConfig, match='did you mean "duckdb"') as caught:
        config_of('depot = "north', "duckbd")
    # In what words the filter is written is not known then, so nothing is said of it.
    assert [fault.place for fault in caught.value.faults] == [("dialect",)]


def test_a_function_without_brackets_is_not_taken_for_the_column_of_its_name():
    graph = read_graph({"nodes": ["late", "refund", "depot", "current_user"], "edges": []})
    value = {"treatment": "late", "outcome": "refund", "covariates": []}
    with pytest.raises(InvalidConfig, match="put the column's name in quotes"):
        read_config(value | {"row_filter": "CURRENT_USER = depot"}, graph)
    (part,) = read_config(value | {"row_filter": '"current_user" = depot'}, graph).rows.filter_parts
    assert graph.names_of(part.part.columns) == ("depot", "current_user")
