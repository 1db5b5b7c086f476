"""Coefficients: each term judged as if it were the treatment, by trying the definitions on it."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator
from dataclasses import replace

import pytest

from pathgate.graphs import CausalGraph
from pathgate.review import read_config, review, review_document
from tests.review.brute_review import Question, reviews_as_sound
from tests.review.random_configs import random_config, review_of
from tests.review.random_pipelines import random_pipeline

SEEDS = [
    pytest.param(range(200), id="200"),
    pytest.param(range(200, 1200), id="1000", marks=pytest.mark.slow),
    pytest.param(range(1200, 2500), id="1300", marks=pytest.mark.full),
]


def read_by_definition(question: Question, term: str) -> str:
    """The total effect, the direct one, or neither; a term is judged with all others held fixed."""
    columns = question.columns
    node = columns.node(term)
    if question.ends - question.measured or node not in question.measured:
        return "neither"
    if question.results & (columns.bases(node) | {node}):
        return "neither"
    # Rows of one value of the outcome, or of the column itself, leave nothing to compare.
    if pinned(question) & (question.results | columns.bases(node) | {node}):
        return "neither"
    adjusted = [*question.covariates, *question.weighted_by, *question.matched_on, *question.fixed_effects]
    if question.results & columns.nodes(adjusted):
        return "neither"
    usable = question.measured - question.ends
    held = columns.nodes([*question.covariates, *question.weighted_by, *question.matched_on]) & usable
    held |= columns.nodes(question.treatments)
    alone = replace(
        question,
        treatments=(term,),
        covariates=tuple(sorted(held - {node})),
        weighted_by=(),
        matched_on=(),
        fixed_effects=tuple(name for name in question.fixed_effects if columns.node(name) in usable),
        parts=tuple(judged_parts(question)),
        population="kept",
    )
    if reviews_as_sound(replace(alone, asks="total")):
        return "total"
    is_single = len(alone.treated) == 1 and len(alone.results) == 1
    return "direct" if is_single and reviews_as_sound(replace(alone, asks="direct")) else "neither"


def pinned(question: Question) -> set:
    """The columns that the filter holds at one value."""
    fixed = [
        part
        for part in question.parts
        if part.get("fixed") and not set(question.columns.coarse) & set(part["columns"])
    ]
    return {node for part in fixed for node in question.columns.nodes(part["columns"])}


def judged_parts(question: Question) -> Iterator[dict]:
    """The parts of the filter as far as they can be judged."""
    for part in question.parts:
        read = question.columns.nodes(part["columns"]) & question.measured
        coarse = set(question.columns.coarse) & set(part["columns"])
        fixed = part.get("fixed", False) and not coarse
        if read and not (fixed and read & question.ends):
            yield {"columns": sorted(read), "fixed": fixed}


@pytest.mark.parametrize("draw", [random_config, random_pipeline])
@pytest.mark.parametrize("seeds", SEEDS)
def test_every_term_reads_as_its_definition_says(seeds: range, draw):
    seen: Counter[str] = Counter()
    for seed in seeds:
        question = draw(seed)
        _, answer = review_of(question.graph, question.config())
        told = review_document(answer)["coefficients"]
        terms = [*question.treatments, *dict.fromkeys(question.covariates)]
        for each in told:
            assert each["reads_as"] == read_by_definition(question, each["term"]), (seed, each)
            assert each["why"]
            seen[each["reads_as"]] += 1
        assert {each["term"] for each in told} <= set(terms)
        assert {question.columns.node(each["term"]) for each in told} == question.columns.nodes(terms), seed
    assert set(seen) == {"total", "direct", "neither"}


def test_the_verdict_of_the_treatment_does_not_carry_over_to_a_confounder():
    # weather → late → refund, weather → refund, region → weather, region → refund (Westreich & Greenland 2013)
    graph = CausalGraph.of(
        ("weather", "late"),
        ("weather", "refund"),
        ("late", "refund"),
        ("region", "weather"),
        ("region", "refund"),
    )
    config = {"treatment": "late", "outcome": "refund", "covariates": ["weather"]}
    told = review_document(review(graph, read_config(config, graph)))["coefficients"]
    assert [(each["term"], each["reads_as"]) for each in told] == [("late", "total"), ("weather", "neither")]
    assert "region" in told[1]["why"]


@pytest.mark.parametrize(
    ("config", "why"),
    [
        (
            {"row_filter": "refund = TRUE"},
            'the rows kept have one value of "refund", so nothing is left to explain',
        ),
        (
            {"row_filter": "late = TRUE"},
            "the rows kept have one value of it, so nothing of it is left to vary",
        ),
        (
            {"covariates": ["refund"]},
            'the model adjusts for the outcome "refund" itself, so nothing is left to explain',
        ),
        (
            {"covariates": ["claims"], "derived": {"claims": {"from": ["refund", "weather"]}}},
            'it is computed from the outcome "refund"',
        ),
    ],
)
def test_where_nothing_is_left_to_compare_no_coefficient_is_an_effect(config: dict, why: str):
    graph = CausalGraph.of(("late", "refund"), ("weather", "refund"))
    asked = {"treatment": "late", "outcome": "refund", "covariates": ["weather"], **config}
    told = review_document(review(graph, read_config(asked, graph)))["coefficients"]
    assert ("neither", why) in {(each["reads_as"], each["why"]) for each in told}
    assert told[0]["reads_as"] == "neither"
