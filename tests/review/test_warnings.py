"""Degenerate configs and warnings: given exactly where semantics mean them, and nowhere else."""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable

import pytest

from pathgate.review import Finding
from pathgate.review.rules import RULES
from tests.review.brute_findings import (
    carries_among_kept,
    degenerate,
    is_selected,
    recovered,
    warnings,
)
from tests.review.brute_review import Question
from tests.review.random_configs import random_config, review_of, reviewed
from tests.review.random_pipelines import random_pipeline
from tests.values import graph_of

CONFIGS = [
    pytest.param(range(200), id="200"),
    pytest.param(range(200, 1500), id="1300", marks=pytest.mark.slow),
    pytest.param(range(1500, 3000), id="1500", marks=pytest.mark.full),
]


CONFIGURED = [(random_config, set()), (random_pipeline, {"no-variation-left"})]


@pytest.mark.parametrize("seeds", CONFIGS)
@pytest.mark.parametrize(("configs", "more"), CONFIGURED)
def test_degenerate_members_are_errors_at_their_places(
    seeds: range, configs: Callable[[int], Question], more: set[str]
):
    seen: Counter[str] = Counter()
    for seed in seeds:
        question = configs(seed)
        _, answer = reviewed(question)
        found = [(f.rule, f.place, frozenset(f.columns)) for f in answer.findings if f.rule in DEGENERATE]
        assert Counter(found) == Counter(degenerate(question)), seed
        seen.update(rule for rule, *_ in found)
    assert set(seen) == DEGENERATE - {"no-variation-left"} | more


DEGENERATE = {
    *(f"{role}-among-covariates" for role in ("treatment", "outcome")),
    *(f"{role}-fixed" for role in ("treatment", "outcome")),
    *(f"unmeasured-{role}" for role in ("treatment", "outcome", "covariate", "filter-column")),
    "no-variation-left",
}


@pytest.mark.parametrize("seeds", CONFIGS)
def test_warnings_are_given_exactly_where_they_are_meant(seeds: range):
    seen: Counter[str] = Counter()
    for configs in (random_config, random_pipeline):
        for seed in seeds:
            question = configs(seed)
            _, answer = reviewed(question)
            found = [
                (f.rule, f.place, frozenset(f.columns)) for f in answer.findings if f.severity == "warning"
            ]
            assert Counter(found) == Counter(warnings(question)), (configs, seed)
            seen.update(rule for rule, *_ in found)
    assert set(seen) == {name for name, rule in RULES.items() if rule.severity == "warning"} - OF_OTHERS


# Products stand in formulas, and waivers are judged after all else.
OF_OTHERS = {name for name in RULES if name.startswith("waiver-")} | {"treatment-in-product"}


@pytest.mark.parametrize("seeds", CONFIGS)
def test_a_note_says_where_the_number_speaks_of_the_rows_kept_alone(seeds: range):
    noted = 0
    for seed in seeds:
        question = random_pipeline(seed)
        _, answer = reviewed(question)
        found = [f.rule for f in answer.findings if f.severity == "note" or f.rule == "not-recovered"]
        rule = "kept-rows-only" if question.population == "kept" else "not-recovered"
        expected = is_selected(question) and carries_among_kept(question) and not recovered(question)
        assert found == ([rule] if expected else []), seed
        noted += expected
    assert noted > len(seeds) / 50


def test_what_is_outside_the_graph_is_noted_once_and_passed_over():
    value = graph_of(("late", "refund"))
    config = {
        "treatment": "late",
        "outcome": "refund",
        "covariates": ["tariff"],
        "outside_graph": ["tariff", "zone", "unused"],
        "weighted_by": "zone",
        "row_filter": ["zone", "tariff"],
        "missing_because": {"zone": "tariff"},
    }
    _, answer = review_of(value, config)
    assert answer.verdict == "sound"
    assert [(f.rule, f.columns, f.place) for f in answer.findings] == [
        ("outside-graph", ("tariff",), ("covariates", 0)),
        ("outside-graph", ("zone",), ("weighted_by",)),
    ]


def test_of_the_names_of_a_column_the_fullest_counts_and_the_others_repeat_it():
    value = graph_of(("weight", "late"), ("weight", "refund"), ("late", "refund"))
    derived = {
        "log_weight": {"recodes": "weight"},
        "size": {"recodes": "weight", "coarse": True},
        "heavy": {"recodes": "weight", "coarse": True},
    }
    cases = [
        (["size", "weight"], [("redundant-covariate", 0)]),
        (["size", "log_weight"], [("redundant-covariate", 0)]),
        (["weight", "log_weight"], [("redundant-covariate", 1)]),
        (["size", "heavy"], [("coarse-covariate", 0), ("coarse-covariate", 1)]),
        (["log_weight"], []),
    ]
    for covariates, expected in cases:
        config = {"treatment": "late", "outcome": "refund", "covariates": covariates, "derived": derived}
        _, answer = review_of(value, config)
        assert answer.verdict == "sound"
        assert [(f.rule, f.place[1]) for f in answer.findings] == expected, covariates


def test_a_sound_config_may_carry_warnings_and_never_errors(ticket_graph):
    value = {"nodes": [*ticket_graph.names, "reply"], "edges": []}
    value["edges"] = [{"source": "late_delivery", "target": "reply"}]
    config = {
        "treatment": "late_delivery",
        "outcome": "refund",
        "covariates": [],
        "row_filter": ["reply"],
    }
    _, answer = review_of(value, config)
    assert answer.verdict == "sound"
    assert [finding.rule for finding in answer.findings] == ["no-causal-path", "filter-depends-on-treatment"]


def test_every_rule_of_a_finding_is_declared_once():
    assert all(name == rule.name for name, rule in RULES.items())
    assert Finding("outcome-fixed", ("refund",), "It is held.", ("row_filter",)).severity == "error"
