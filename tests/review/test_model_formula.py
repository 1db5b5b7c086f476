"""Formulas in a config: which terms are the treatment's, what a sum and a product of columns do."""

from __future__ import annotations

import pytest

from pathgate.graphs import CausalGraph
from pathgate.review import InvalidConfig, read_config, review


@pytest.mark.parametrize(
    "formula",
    [
        "refund ~ I(late + rain)",
        "refund ~ rain + I(late + rain)",
        "refund ~ late:rain",
        "refund ~ I(late * rain)",
        "refund ~ score",
    ],
)
def test_a_treatment_that_only_a_mixture_holds_has_no_term_of_its_own(formula: str):
    graph = CausalGraph.of(("late", "refund"), ("rain", "late"))
    derived = {"score": {"from": ["late", "rain"]}}
    with pytest.raises(InvalidConfig) as refused:
        read_config({"treatment": "late", "formula": formula, "derived": derived}, graph)
    assert "by itself" in str([fault.detail for fault in refused.value.faults])


def test_a_sum_of_columns_that_stand_alone_is_collinear_and_no_product():
    graph = CausalGraph.of(("late", "refund"), ("rain", "late"), ("rain", "refund"), ("locker", "refund"))
    told = {}
    for formula in (
        "refund ~ late + rain + I(late - 2 * rain)",
        "refund ~ late + rain + locker + I(rain - locker / 3)",
        "refund ~ late + rain + I(late * rain)",
    ):
        answer = review(graph, read_config({"treatment": "late", "formula": formula}, graph))
        told[formula] = [finding.rule for finding in answer.findings]
    assert list(told.values()) == [["no-variation-left"], ["redundant-covariate"], ["treatment-in-product"]]


def test_a_product_without_the_treatment_alone_says_what_it_takes_for_granted():
    graph = CausalGraph.of(("late", "refund"), ("rain", "refund"))
    config = read_config({"treatment": "late", "formula": "refund ~ rain + late:rain"}, graph)
    (finding,) = review(graph, config).findings
    assert finding.rule == "treatment-in-product"
    assert 'without a term of "late" alone' in finding.message
