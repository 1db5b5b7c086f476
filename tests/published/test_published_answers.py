"""The production code gives every published answer on separation and total effects, asked in both ways."""

from __future__ import annotations

from itertools import combinations
from typing import Any

import pytest

from pathgate.criteria import Deadline, is_separated, is_valid, separation, tetrads, valid_set
from pathgate.graphs import read_graph
from tests.criteria.asking import effect_of
from tests.published.cases import load_published, rows_of, selected_on
from tests.review.random_configs import review_of
from tests.strategies import all_dags
from tests.values import Graph, is_adjacent, measured_names

Row = dict[str, Any]
TOTAL = [
    (name, graph, row) for name, graph, row in rows_of("adjustment") if row.get("asks", "total") == "total"
]


def named(rows: list[tuple[str, Graph, Any]]) -> list[Any]:
    return [pytest.param(graph, row, id=f"{name}-{place}") for place, (name, graph, row) in enumerate(rows)]


def config_of(row: Row, covariates: list[str]) -> Row:
    return {
        "treatment": row["treatment"],
        "outcome": row["outcome"],
        "covariates": covariates,
        "row_filter": selected_on(row),
        "row_filter_fixed": True,
    }


def test_the_published_questions_are_all_here():
    assert len(rows_of("separation")) > 20
    assert len(TOTAL) > 10
    assert sum(len(row.get("valid", [])) + len(row.get("invalid", [])) for _, _, row in TOTAL) > 30
    assert any(row.get("selected_on") for _, _, row in TOTAL)


@pytest.mark.parametrize(("graph", "row"), named(rows_of("separation")))
def test_separations_are_as_published(graph: Graph, row: list[Any]):
    x, y, given, expected = row
    read = read_graph(graph)
    assert is_separated(read, x, y, given) is expected
    answer = separation(read, x, y, given)
    assert (answer.separated, answer.open_path is None) == (expected, expected)


@pytest.mark.parametrize(("graph", "row"), named(TOTAL))
def test_sets_are_valid_as_published(graph: Graph, row: Row):
    effect = effect_of(graph, row["treatment"], row["outcome"], selected_on(row))
    for verdict in ("valid", "invalid"):
        for columns in row.get(verdict, []):
            assert is_valid(effect, effect.kept.graph.mask(columns)) is (verdict == "valid"), columns
    found = valid_set(effect)
    if "exists" in row:
        assert (found is not None) is row["exists"]
    assert found is not None or not row.get("valid")
    assert found is None or is_valid(effect, found)


@pytest.mark.parametrize(("graph", "row"), named(TOTAL))
def test_reviews_are_sound_where_a_published_set_is_valid_and_only_there(graph: Graph, row: Row):
    unsound = "unanswerable" if row.get("exists", True) is False else "biased"
    for columns in row.get("valid", []):
        assert review_of(graph, config_of(row, columns))[1].verdict == "sound", columns
    for columns in row.get("invalid", []):
        answer = review_of(graph, config_of(row, columns))[1]
        assert answer.verdict in (
            (unsound,) if "exists" in row or row.get("valid") else ("biased", "unanswerable")
        )
        assert any(finding.severity == "error" for finding in answer.findings), columns


@pytest.mark.parametrize(("graph", "pair"), named(rows_of("inseparable")))
def test_pairs_published_as_inseparable_have_no_separator_and_all_others_have(graph: Graph, pair: list[str]):
    read = read_graph(graph)
    for x, y in combinations(measured_names(graph), 2):
        found = separation(read, x, y).separator
        assert (found is None) is (is_adjacent(graph, x, y) or {x, y} == set(pair)), (x, y)


def test_minimal_separations_are_as_published():
    rows = rows_of("minimal_separations")
    for _, graph, row in rows:
        read = read_graph(graph)
        assert is_separated(read, row["x"], row["y"], row["given"])
        for left_out in row["given"]:
            rest = [name for name in row["given"] if name != left_out]
            assert not is_separated(read, row["x"], row["y"], rest)
    assert rows


def test_exactly_the_published_tetrads_are_listed():
    by_case: dict[str, tuple[Graph, list[Any]]] = {}
    for name, graph, row in rows_of("tetrads"):
        by_case.setdefault(name, (graph, []))[1].append(row)
    for graph, published in by_case.values():
        found = tetrads(read_graph(graph), Deadline.never())
        assert [[list(each.rows), list(each.columns)] for each in found] == published
    assert by_case


def test_as_many_dags_are_read_as_are_known_to_exist():
    counts = load_published()["counts"]["labelled DAGs on 1..5 nodes (OEIS A003024)"]
    for size in (1, 2, 3, 4):
        assert len([read_graph(value) for value in all_dags(size)]) == counts[size - 1]
