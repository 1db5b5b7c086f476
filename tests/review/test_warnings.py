"""Degenerate configs and warnings: given exactly where semantics mean them, and nowhere else."""

from __future__ import annotations

from collections import Counter

import pytest

from pathgate.review import Finding
from pathgate.review.rules import RULES
from tests.brute import ancestors, descendants
from tests.review.brute_review import Question
from tests.review.random_configs import random_config, review_of, reviewed
from tests.values import arrows_of, measured_names

CONFIGS = [
    pytest.param(range(400), id="400"),
    pytest.param(range(400, 3000), id="2600", marks=pytest.mark.slow),
]


@pytest.mark.parametrize("seeds", CONFIGS)
def test_degenerate_members_are_errors_at_their_places(seeds: range):
    seen: Counter[str] = Counter()
    for seed in seeds:
        question = random_config(seed)
        _, answer = reviewed(question)
        found = {(f.rule, f.place) for f in answer.findings if f.rule in DEGENERATE}
        assert found == degenerate(question), seed
        seen.update(rule for rule, _ in found)
    assert set(seen) == DEGENERATE


DEGENERATE = {
    *(f"{role}-among-covariates" for role in ("treatment", "outcome")),
    *(f"{role}-fixed" for role in ("treatment", "outcome")),
    *(f"unmeasured-{role}" for role in ("treatment", "outcome", "covariate", "filter-column")),
}


def degenerate(question: Question) -> set[tuple[str, tuple]]:
    measured = set(measured_names(question.graph))
    expected: set[tuple[str, tuple]] = set()
    sides = {"treatment": question.treatments, "outcome": question.outcomes}
    for role, names in sides.items():
        expected |= {
            (f"unmeasured-{role}", (role, k)) for k, name in enumerate(names) if name not in measured
        }
    for k, name in enumerate(question.covariates):
        expected |= {(f"{role}-among-covariates", ("covariates", k)) for role in sides if name in sides[role]}
        if name not in measured and name not in question.ends:
            expected.add(("unmeasured-covariate", ("covariates", k)))
    for k, part in enumerate(question.parts):
        if set(part["columns"]) - measured:
            expected.add(("unmeasured-filter-column", ("row_filter", k)))
        for role, names in sides.items():
            if part["fixed"] and set(part["columns"]) & set(names):
                expected.add((f"{role}-fixed", ("row_filter", k)))
    return expected


@pytest.mark.parametrize("seeds", CONFIGS)
def test_warnings_are_given_exactly_where_they_are_meant(seeds: range):
    seen: Counter[str] = Counter()
    for seed in seeds:
        question = random_config(seed)
        _, answer = reviewed(question)
        found = sorted(
            (f.rule, f.place, frozenset(f.columns)) for f in answer.findings if f.severity == "warning"
        )
        assert found == sorted(warnings(question)), seed
        seen.update(rule for rule, _, _ in found)
    assert set(seen) == {name for name, rule in RULES.items() if rule.severity == "warning"}


def warnings(question: Question) -> list[tuple[str, tuple, frozenset[str]]]:
    graph, treatments = question.graph, set(question.treatments)
    expected = []
    for k, treatment in enumerate(question.treatments):
        below = descendants(graph, treatment)
        if not below & set(question.outcomes):
            expected.append(("no-causal-path", ("treatment", k), frozenset({treatment})))
        elif question.asks == "direct" and (treatment, question.outcomes[0]) not in arrows_of(graph):
            expected.append(("no-arrow", ("treatment", k), frozenset({treatment})))
        later = below & treatments - {treatment}
        if later:
            expected.append(("treatment-precedes-treatment", ("treatment", k), later | {treatment}))
        expected += [
            ("outcome-precedes-treatment", ("outcome", place), frozenset({outcome, treatment}))
            for place, outcome in enumerate(question.outcomes)
            if outcome in ancestors(graph, treatment)
        ]
    for k, part in enumerate(question.parts):
        descending = frozenset(part["columns"]) & descendants(graph, treatments)
        if descending and set(part["columns"]) - treatments:
            expected.append(("filter-depends-on-treatment", ("row_filter", k), descending))
    return expected


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
