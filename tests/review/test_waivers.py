"""Waivers: what they accept, when they hold, and that none is ever silent."""

from __future__ import annotations

from datetime import date
from typing import Any

import pytest

from pathgate.graphs import CausalGraph
from pathgate.review import InvalidConfig, Review, read_config, review, review_document
from pathgate.review.rules import RULES

# weather → late → refund, weather → refund
GRAPH = CausalGraph.of(("weather", "late"), ("weather", "refund"), ("late", "refund"))
CONFIG = {"treatment": "late", "outcome": "refund", "covariates": []}
WAIVER = {"rule": "missing-covariate", "columns": ["weather"], "why": "a pilot run", "owner": "locker team"}
TODAY = date(2026, 5, 17)


def reviewed(*waivers: dict[str, Any]) -> Review:
    config = read_config({**CONFIG, "accept": list(waivers)}, GRAPH)
    return review(GRAPH, config, today=TODAY)


def rules_of(answer: Review) -> list[str]:
    return [finding.rule for finding in answer.findings]


def test_a_waiver_marks_its_finding_and_leaves_the_verdict_alone():
    answer = reviewed(WAIVER | {"until": "2026-05-17"})
    assert answer.verdict == "biased"
    assert not answer.falls_short
    (told,) = review_document(answer)["findings"]
    assert told["severity"] == "error"
    assert told["accepted"] == {"why": "a pilot run", "owner": "locker team", "until": "2026-05-17"}
    assert reviewed().falls_short


@pytest.mark.parametrize(
    ("changed", "rule"),
    [
        ({"until": "2026-05-16"}, "waiver-expired"),
        ({"why": "  "}, "waiver-without-reason"),
        ({"columns": ["late"]}, "waiver-unused"),
        ({"rule": "covariate-on-collider"}, "waiver-unused"),
        ({"rule": "outcome-fixed"}, "waiver-not-allowed"),
        ({"rule": "waiver-unused"}, "waiver-not-allowed"),
    ],
)
def test_a_waiver_that_accepts_nothing_is_a_finding_itself(changed: dict[str, Any], rule: str):
    answer = reviewed(WAIVER | changed)
    assert answer.falls_short
    assert rules_of(answer) == ["missing-covariate", rule]
    assert answer.findings[1].place == ("accept", 0)
    assert RULES[rule].severity == "warning"


def test_without_columns_every_finding_of_the_rule_is_accepted():
    waiver = {"rule": "missing-covariate", "why": "known"}
    assert not reviewed(waiver).falls_short
    assert rules_of(reviewed(waiver)) == ["missing-covariate"]


@pytest.mark.parametrize(
    ("changed", "place"),
    [
        ({"rule": "missing-covariat"}, ("accept", 0, "rule")),
        ({"columns": ["wether"]}, ("accept", 0, "columns", 0)),
        ({"until": "2026-02-30"}, ("accept", 0, "until")),
        ({"until": "soon"}, ("accept", 0, "until")),
        ({"because": "x"}, ("accept", 0, "because")),
    ],
)
def test_what_a_waiver_cannot_mean_is_refused(changed: dict[str, Any], place: tuple):
    with pytest.raises(InvalidConfig) as caught:
        reviewed(WAIVER | changed)
    assert [fault.place for fault in caught.value.faults] == [place]


def test_a_waiver_never_turns_a_verdict():
    for rule in RULES:
        assert reviewed({"rule": rule, "why": "known"}).verdict == reviewed().verdict
