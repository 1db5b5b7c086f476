"""Published answers that a config can express, through the review: filters, losses, direct effects, coefficients."""

from __future__ import annotations

from typing import Any

import pytest

from pathgate.review import review_document
from tests.published.cases import load_published, rows_of
from tests.review.random_configs import review_of
from tests.values import Graph, arrows_of, measured_names

Row = dict[str, Any]


def named(rows: list[tuple[str, Graph, Any]]) -> list[Any]:
    return [pytest.param(graph, row, id=f"{name}-{place}") for place, (name, graph, row) in enumerate(rows)]


def ways_of_keeping(columns: list[str]) -> list[Row]:
    """Every way in which a config can say that rows are kept by these columns, one for each."""
    if not columns:
        return [{}]
    as_parts = [{"columns": [name], "fixed": False} for name in columns]
    ways: list[Row] = [
        {"row_filter": as_parts, "row_filter_fixed": True},
        {"row_filter": " AND ".join(f"{name} > 0" for name in columns), "row_filter_fixed": True},
        {"missing_because": {name: [name] for name in columns}},
    ]
    return ways + ([{"rows_exist_because": columns}] if len(columns) == 1 else [])


@pytest.mark.parametrize(("graph", "row"), named(rows_of("adjustment")))
def test_total_and_direct_effects_are_sound_where_published_however_rows_are_kept(graph: Graph, row: Row):
    asked = {member: row[member] for member in ("treatment", "outcome", "asks") if member in row}
    for way in ways_of_keeping(row.get("selected_on", [])):
        for covariates in row.get("valid", []):
            assert review_of(graph, {**asked, "covariates": covariates, **way})[1].verdict == "sound"
        for covariates in row.get("invalid", []):
            answer = review_of(graph, {**asked, "covariates": covariates, **way})[1]
            assert answer.verdict in ("biased", "unanswerable")
            assert answer.verdict == "biased" or not row.get("valid"), (way, covariates)
        if row.get("exists", True) is False:
            answer = review_of(graph, {**asked, "covariates": [], **way})[1]
            assert (answer.verdict, answer.remedies) == ("unanswerable", ())


def separations_of_pairs() -> list[tuple[str, Graph, Any]]:
    """The separation rows about two nodes, with no arrow from the first to the second, given measured columns."""
    return [
        (name, graph, (*x, *y, given, expected))
        for name, graph, (x, y, given, expected) in rows_of("separation")
        if len(x) == len(y) == 1
        and (*x, *y) not in arrows_of(graph)
        and {*x, *y, *given} <= set(measured_names(graph))
    ]


def test_most_published_separations_are_about_pairs():
    assert len(separations_of_pairs()) > len(rows_of("separation")) * 0.6


@pytest.mark.parametrize(("graph", "row"), named(separations_of_pairs()))
def test_a_direct_effect_without_an_arrow_is_sound_where_the_two_are_separated(graph: Graph, row: Any):
    x, y, given, expected = row
    config = {"treatment": x, "outcome": y, "covariates": given, "asks": "direct"}
    answer = review_of(graph, config)[1]
    assert (answer.verdict == "sound") is expected
    assert {"no-arrow", "no-causal-path"} & {finding.rule for finding in answer.findings}


def test_nothing_makes_a_direct_effect_of_a_pair_that_no_set_separates():
    rows = rows_of("inseparable")
    for _, graph, (x, y) in rows:
        config = {"treatment": x, "outcome": y, "covariates": [], "asks": "direct"}
        assert review_of(graph, config)[1].verdict == "unanswerable"
    assert rows


def test_minimal_separations_make_direct_effects_and_no_smaller_sets_do():
    rows = rows_of("minimal_separations")
    for _, graph, row in rows:
        config = {"treatment": row["x"], "outcome": row["y"], "covariates": row["given"], "asks": "direct"}
        assert review_of(graph, config)[1].verdict == "sound"
        for left_out in row["given"]:
            less = [name for name in row["given"] if name != left_out]
            assert review_of(graph, {**config, "covariates": less})[1].verdict == "biased"
    assert rows


def test_coefficients_of_the_table_fallacy_are_read_as_published():
    # Westreich & Greenland 2013: that of the exposure is its total effect, that of smoking beside it is direct
    (graph,) = [case["graph"] for case in load_published()["cases"] if case["name"] == "table fallacy"]
    config = {"treatment": "hiv", "outcome": "stroke", "covariates": ["age", "smoke"]}
    told = {
        each["term"]: each["reads_as"]
        for each in review_document(review_of(graph, config)[1])["coefficients"]
    }
    assert (told["hiv"], told["smoke"], told["age"]) == ("total", "direct", "direct")


def test_of_covariates_that_are_all_valid_none_is_called_harmful():
    # Henckel, Perković & Maathuis 2022: c alone suffices, p adds precision, i takes it away
    (graph,) = [case["graph"] for case in load_published()["cases"] if case["name"] == "least-variance"]
    config = {"treatment": "x", "outcome": "y", "covariates": ["c", "p", "i"]}
    told = {
        each["column"]: each["advice"] for each in review_document(review_of(graph, config)[1])["columns"]
    }
    assert (told["c"], told["p"], told["i"]) == ("keep", "optional", "optional")
