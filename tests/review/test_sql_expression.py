"""Computed columns in SQL: what they read and keep, held against their values in a database, and what is refused."""

from __future__ import annotations

import math
import random
import sqlite3
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from pathgate.graphs import read_graph
from pathgate.graphs.errors import Fault
from pathgate.review.names import NameReader
from pathgate.review.schema import DIALECTS, STANDARD_DIALECT
from pathgate.review.sql_bounds import MOST_NESTING, SqlRefused
from pathgate.review.sql_expression import read_expression
from pathgate.review.sql_names import read_sql_expression

READ = read_graph(
    {
        "nodes": [
            {"id": "weight", "columns": ["parcels.weight", "kilograms"]},
            *("depot", "late", "Rain", "rain", "current_date", "price band"),
        ],
        "edges": [],
    }
)


def keeps(text: str, dialect: str = STANDARD_DIALECT) -> str:
    return read_expression(text, dialect).keeps


@pytest.mark.parametrize("text", ["weight", "(weight)", "p.weight", "+weight"])
def test_a_bare_column_is_itself(text: str):
    assert {keeps(text, dialect) for dialect in DIALECTS} == {"column"}


@pytest.mark.parametrize(
    "text",
    [
        *("weight + 1", "1 - weight", "weight - 2.5", "weight * 2", "-3 * weight", "weight * (60 * 60)", "-weight"),
        *("ln(weight)", "log(weight)", "log10(weight)", "exp(-weight)", "sqrt(weight)", "CAST(weight AS TEXT)"),
        *("exp(weight) / 60", "10 / sqrt(weight)", "((ln(2 * weight) + 1) * 0.5)", "weight + 0"),
    ],
)  # fmt: skip
def test_steps_that_lose_nothing_are_one_to_one_everywhere(text: str):
    assert {dialect for dialect in DIALECTS if keeps(text, dialect) != "one-to-one"} == set()


@pytest.mark.parametrize(
    "text",
    [
        *("weight > 5", "weight = 5", "weight IN (1, 2)", "weight IS NULL", "weight BETWEEN 1 AND 2"),
        *("CASE WHEN weight > 5 THEN 1 ELSE 0 END", "CASE weight WHEN 1 THEN 2 END", "weight LIKE 'a%'"),
        *("round(weight)", "floor(weight)", "ceil(weight)", "abs(weight)", "upper(weight)", "substring(weight, 1, 3)"),
        *("coalesce(weight, 0)", "width_bucket(weight, 0, 9, 3)", "some_function(weight)", "power(weight, 2)"),
        *("CAST(weight AS INT)", "CAST(weight AS DATE)", "CAST(weight AS VARCHAR(3)) || 'a'", "weight || 'a'"),
        *("weight - weight", "weight * weight", "weight + weight", "weight / weight", "p.weight - p.weight"),
        *("weight * 0", "weight * 0.0", "weight * (60 * 0)", "0 / weight", "weight / 0", "weight * 1e-400"),
        *("weight + 1e300", "weight * 'a'", "weight + '1'", "weight * (1 / 2)", "weight * NULL", "NOT weight > 5"),
        *("log(weight, weight)", "ln(abs(weight))", "abs(ln(weight))", "nullif(weight, 1)", "log(1, weight)"),
    ],
)  # fmt: skip
def test_what_loses_or_may_lose_values_is_coarse_everywhere(text: str):
    assert {dialect for dialect in DIALECTS if keeps(text, dialect) != "coarse"} == set()


@pytest.mark.parametrize(
    "text", ["weight % 5", "mod(weight, 5)", "date_trunc('day', weight)", "greatest(weight, 3)"]
)
def test_buckets_of_other_spellings_are_coarse(text: str):
    assert keeps(text) == "coarse"


@pytest.mark.parametrize(
    "text",
    ["weight * late", "CASE WHEN late THEN weight ELSE 0 END", "concat(depot, rain)", "weight > late",
     "CASE WHEN depot = 'a' THEN 1 WHEN late THEN 2 END", "coalesce(weight, late)"],
)  # fmt: skip
def test_several_columns_are_computed_from(text: str):
    assert keeps(text) == "computed"


@pytest.mark.parametrize(
    ("text", "lossless", "lossy"),
    [
        # Whole numbers may be divided without a fraction, and fractions may be cut to few digits.
        ("weight / 2", "bigquery duckdb mysql oracle snowflake spark", "standard postgres sqlite trino tsql drill"),
        ("weight / 2.0", "standard postgres sqlite tsql clickhouse redshift mysql", "trino presto athena teradata"),
        ("1 / weight", "bigquery duckdb oracle", "standard postgres sqlite trino tsql mysql snowflake"),
        ("1.0 / weight", "standard postgres sqlite", "tsql redshift mysql snowflake trino"),
        ("weight / 100000", "duckdb", "mysql snowflake"),
        ("weight * 0.001", "standard trino tsql mysql", ""),
        ("CAST(weight AS DOUBLE PRECISION) / 60 / 60", "standard postgres trino sqlite mysql", ""),
        ("-(1 + CAST(weight AS DOUBLE PRECISION) * 2) / 60", "standard postgres trino mysql", ""),
        ("weight * 1.0 / 60", "standard postgres sqlite tsql", "trino"),
        ("weight * 1 / 60", "duckdb", "standard postgres sqlite tsql trino"),
        ("weight::NUMERIC / 60", "postgres", "duckdb"),
        ("CAST(weight AS FLOAT)", "postgres sqlite", "standard duckdb spark mysql"),
        ("CAST(weight AS VARCHAR)", "standard postgres trino", "tsql oracle"),
        ("CAST(weight AS VARCHAR(3))", "", "standard postgres tsql"),
        ("CAST(weight AS CHAR)", "mysql", "standard postgres"),
        ("NOT late", "standard postgres bigquery", "mysql sqlite duckdb snowflake"),
        ("NOT NOT late", "standard", "sqlite"),
        # The base comes first, or last.
        ("log(2, weight)", "standard postgres snowflake", "bigquery tsql"),
        ("log(weight, 2)", "bigquery tsql", "standard postgres snowflake"),
        ("TRY_CAST(weight AS DOUBLE)", "", "duckdb trino"),
    ],
)  # fmt: skip
def test_dialects_differ_in_what_they_lose(text: str, lossless: str, lossy: str):
    assert {dialect: keeps(text, dialect) for dialect in lossless.split()} == dict.fromkeys(
        lossless.split(), "one-to-one"
    )
    assert {dialect: keeps(text, dialect) for dialect in lossy.split()} == dict.fromkeys(
        lossy.split(), "coarse"
    )


@pytest.mark.parametrize(
    ("text", "slug", "words"),
    [
        ("sum(weight)", "invalid-request", 'an aggregate mixes rows; name its inputs with "from" instead'),
        ("weight / avg(weight)", "invalid-request", "an aggregate mixes rows"),
        ("COUNT(*)", "invalid-request", "an aggregate mixes rows"),
        ("max(weight)", "invalid-request", "an aggregate mixes rows"),
        ("sum(weight) OVER (PARTITION BY depot)", "invalid-request", "a window function mixes rows"),
        ("lag(weight) OVER (ORDER BY late)", "invalid-request", "a window function mixes rows"),
        ("1 + 2", "invalid-request", "reads no column"),
        ("'weight'", "invalid-request", "reads no column"),
        ("CURRENT_DATE", "invalid-request", "reads no column"),
        ("weight * random()", "invalid-request", "a random value"),
        ("parcels.*", "invalid-request", "* stands for all columns"),
        ("SELECT weight FROM parcels", "invalid-request", "no SELECT"),
        ("(SELECT weight FROM parcels)", "invalid-request", "no SELECT"),
        ("WITH a AS (SELECT 1) SELECT weight FROM a", "invalid-request", "no SELECT"),
        ("weight + (SELECT 1)", "not-supported", "a query inside the expression"),
        ("weight IN (SELECT weight FROM parcels)", "not-supported", "a query inside the expression"),
        ("EXISTS (SELECT 1)", "not-supported", "a query inside the expression"),
        ("transform(weight, w -> w + 1)", "not-supported", "a function written in place"),
        ("weight AS kilos", "invalid-request", "not an expression in this dialect"),
        ("weight, late", "invalid-request", "not an expression in this dialect"),
        ("weight +", "invalid-request", "not an expression in this dialect"),
        ("weight; late", "invalid-request", "(line 1, column 7)"),
        ("", "invalid-request", "no expression"),
        ("weight || 'a", "invalid-request", "not closed"),
        ("(" * 30 + "weight" + ")" * 30, "invalid-request", "nested too deeply"),
        ("weight" + "[1]" * 5_000, "invalid-request", "nested too deeply"),
    ],
)
def test_what_is_no_computed_column_is_refused_by_name(text: str, slug: str, words: str):
    with pytest.raises(SqlRefused) as caught:
        read_expression(text, STANDARD_DIALECT)
    assert caught.value.slug == slug
    assert words in caught.value.detail


def test_the_largest_of_several_columns_of_a_row_is_no_aggregate():
    assert keeps("max(weight, late)") == "computed"


@pytest.mark.parametrize("dialect", ["standard", "postgres", "snowflake"])
def test_long_flat_expressions_are_read(dialect: str):
    assert keeps("weight" + " + 1" * 4_000, dialect) == "one-to-one"
    assert keeps("+".join(["weight"] * 2_500), dialect) == "coarse"
    deep = MOST_NESTING - 1
    assert keeps("ln(" * deep + "weight" + ")" * deep, dialect) == "one-to-one"


STEPS = (
    *("(# + 3)", "(2 - #)", "(# * -1.5)", "(0.5 * #)", "-(#)", "ln(#)", "log(#)", "log(2, #)", "exp(#)", "sqrt(#)"),
    *("(# / 2.0)", "(10.0 / #)", "CAST(# AS TEXT)", "CAST(# AS REAL)", "(#)", "(# * (3 * 2))", "log10(#)"),
)  # fmt: skip
LOSSY_STEPS = (
    *("(# / 2)", "(7 / #)", "(# * 0)", "(# % 3)", "round(#)", "abs(#)", "CAST(# AS INTEGER)", "(# - #)", "(# * #)"),
    *("power(#, 2)", "coalesce(#, 0)", "(# > 2)", "CASE WHEN # > 1 THEN 1 ELSE # END", "upper(#)", "substr(#, 1, 2)"),
    *("(NOT #)", "max(#, 2)", "log(#, 2)", "(# + 1e300)", "(# * 1e-300 * 1e-300)", "(# / (1 / 2.0))", "(# * (1 / 2))"),
    *("nullif(#, 2)", "(# / (2 * 3))", "CAST(# AS VARCHAR(1))", "(# || 'a')", "(~ #)", "(# IS NULL)"),
)  # fmt: skip
VALUES = (-7, -2.5, -2, -1, 0, 0.25, 1, 1.5, 2, 2.75, 3, 4, 5, 8, 11, 30)


def results_of(text: str) -> list[Any]:
    """What a database makes of each value; nulls, which stand for no result, left out."""
    rows = " UNION ALL ".join(f"SELECT {value} AS x" for value in VALUES)
    with sqlite3.connect(":memory:") as database:
        found = [row[0] for row in database.execute(f"SELECT {text} FROM ({rows})")]  # noqa: S608 - of our own making
    database.close()
    return [value for value in found if value is not None]


def is_exact_enough(values: list[Any]) -> bool:
    """Numbers far from one lose their digits, which says nothing about the operation."""
    numbers = [abs(value) for value in values if not isinstance(value, str)]
    return all(math.isfinite(number) and (number == 0 or 1e-4 < number < 1e4) for number in numbers)


def text_of(steps: list[str]) -> tuple[str, bool]:
    """The expression that steps make of x, and whether a database keeps enough digits all along."""
    text, is_exact = "x", True
    for step in steps:
        text = step.replace("#", text)
        is_exact = is_exact and is_exact_enough(results_of(text))
    return text, is_exact


@given(st.lists(st.sampled_from(STEPS + LOSSY_STEPS), min_size=1, max_size=4))
@settings(max_examples=300, deadline=None)
def test_what_is_called_one_to_one_gives_different_results_for_different_values(steps: list[str]):
    text, is_exact = text_of(steps)
    if is_exact and keeps(text, "sqlite") == "one-to-one":
        results = results_of(text)
        assert len(set(results)) == len(results), text


def test_most_of_what_loses_nothing_is_recognised_and_what_loses_is_seen_to_lose():
    rng = random.Random(3)
    recognised = lossy = 0
    for _ in range(150):
        text, _ = text_of(rng.choices(STEPS, k=rng.randint(1, 4)))
        recognised += keeps(text, "sqlite") in ("one-to-one", "column")
    for step in LOSSY_STEPS:
        results = results_of(step.replace("#", "x"))
        lossy += len(set(results)) < len(results)
    assert recognised == 150
    assert lossy > len(LOSSY_STEPS) / 2


def read(
    text: str, dialect: str = STANDARD_DIALECT, coarse: frozenset[str] = frozenset(), **more: Any
) -> tuple[set[str], str, list[Fault]]:
    faults: list[Fault] = []
    names = NameReader(READ, faults, recodes=dict.fromkeys(coarse, True), **more)
    mask, kept = read_sql_expression(text, dialect, names, ("derived", "band", "sql"))
    return set(READ.names_of(mask)), kept, faults


@pytest.mark.parametrize(
    ("text", "columns", "kept"),
    [
        ("WEIGHT", "weight", "column"),
        ("p.Weight * 2", "weight", "one-to-one"),
        ('ln("weight")', "weight", "one-to-one"),
        ("parcels.weight > 5", "weight", "coarse"),
        ("weight * late", "weight late", "computed"),
        ("weight - kilograms", "weight", "coarse"),
        ("weight - WEIGHT", "weight", "coarse"),
        ('"current_date" - weight', "weight current_date", "computed"),
    ],
)
def test_names_fit_as_they_do_in_row_filters(text: str, columns: str, kept: str):
    assert read(text) == (set(columns.split()), kept, [])


@pytest.mark.parametrize(
    ("text", "slug", "words"),
    [
        ("wieght * 2", "unknown-node", 'no node is named "wieght" (did you mean "weight"?)'),
        ("RAIN", "unknown-node", 'fits "Rain" and "rain"'),
        ("CURRENT_DATE - weight", "invalid-request", "put the column's name in quotes"),
        ("sum(weight)", "invalid-request", "an aggregate mixes rows"),
        ('depot = "north"', "unknown-node", "'single ones' a text"),
    ],
)  # fmt: skip
def test_what_is_wrong_with_an_expression_is_a_fault_at_its_place(text: str, slug: str, words: str):
    _, _, (fault,) = read(text)
    assert (fault.slug, fault.place) == (slug, ("derived", "band", "sql"))
    assert words in fault.detail


def test_names_outside_the_graph_are_read_by_an_expression_without_a_fault():
    outside = frozenset({"ds"})
    assert read("weight * ds", outside=outside) == ({"weight"}, "computed", [])
    assert read("DS - ds", outside=outside) == (set(), "coarse", [])
    assert read("weight * dt", outside=outside)[2][0].detail.endswith('(did you mean "ds"?)')


def test_what_is_computed_from_a_bucket_keeps_no_more_than_the_bucket():
    coarse = frozenset({"kilograms"})
    for text in ("kilograms", "Kilograms + 1", "ln(p.kilograms)"):
        assert read(text, coarse=coarse) == ({"weight"}, "coarse", [])
    assert read("weight + 1", coarse=coarse) == ({"weight"}, "one-to-one", [])
