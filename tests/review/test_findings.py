"""Findings: an error exactly where the config falls short, witnesses by definition, warnings as they are meant."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Callable
from dataclasses import replace
from typing import Any

import pytest

from pathgate.review import review_document
from pathgate.review.rules import RULES
from tests.brute import Path, descendants, forbidden, is_open
from tests.criteria.asking import edges_exist, is_directed_path
from tests.review.brute_findings import held_fixed, usable
from tests.review.brute_review import Question, meant_by, reviews_as_sound, selected_graph
from tests.review.random_configs import random_config, review_of, reviewed
from tests.review.random_pipelines import random_pipeline
from tests.values import Graph, arrows_of, graph_of, measured_names, node_names

CONFIGS = [
    pytest.param(range(200), id="200"),
    pytest.param(range(200, 1500), id="1300", marks=pytest.mark.slow),
    pytest.param(range(1500, 3000), id="1500", marks=pytest.mark.full),
]


@pytest.mark.parametrize("seeds", CONFIGS)
def test_errors_stand_exactly_where_the_config_is_not_sound_and_name_columns(seeds: range):
    rules: Counter[str] = Counter()
    for seed, question in ((seed, configs(seed)) for configs in BOTH for seed in seeds):
        _, answer = reviewed(question)
        graph = answer.claim.graph
        errors = [finding for finding in answer.findings if finding.severity == "error"]
        assert bool(errors) is not reviews_as_sound(question), seed
        for finding in answer.findings:
            assert finding.columns, seed
            assert list(finding.columns) == sorted(set(finding.columns), key=graph.index.__getitem__), seed
            assert finding.message.endswith(".")
        rules.update({finding.rule for finding in answer.findings})
        kinds = [finding.severity for finding in answer.findings]
        assert kinds == sorted(kinds, key=["error", "warning", "note"].index)
        shown = [repr(told) for told in review_document(answer)["findings"]]
        assert len(set(shown)) == len(shown), seed
    # Notes on SQL, products in formulas and waivers have tests of their own.
    elsewhere = {"missing-at-random-assumed", "join-selects-rows", "rows-are-groups", "outside-graph"}
    elsewhere |= {"treatment-in-product", *(name for name in RULES if name.startswith("waiver-"))}
    assert set(rules) == set(RULES) - elsewhere


BOTH = (random_config, random_pipeline)


@pytest.mark.parametrize("seeds", CONFIGS)
@pytest.mark.parametrize("configs", BOTH)
def test_paths_in_findings_are_open_given_what_the_config_conditions_on(
    seeds: range, configs: Callable[[int], Question]
):
    seen: Counter[str] = Counter()
    for seed in seeds:
        question = configs(seed)
        _, answer = reviewed(question)
        parts = judged(question)
        selected, conditioned = selected_graph(question, usable(question)[2])
        given = held_fixed(question) | set(conditioned)
        # What lies on or below a causal path has to go in any case; paths are shown as they are without it.
        barred = barred_by(question, selected) | question.ends
        for finding, told in zip(answer.findings, review_document(answer)["findings"], strict=True):
            if told["rule"] == "not-recovered":
                continue
            if "open_path" in told:
                shown = told["open_path"]
                labels = tuple(node_of(label, parts, selected) for label in shown["nodes"])
                path = Path(labels, tuple(shown["arrows"]))
                assert edges_exist(path, selected), seed
                assert is_open(selected, path, given - barred), seed
                let_go = {node for node, is_collider in path.inner() if not is_collider} & given
                let_go &= question.measured
                assert ("lets go of" in finding.message) is bool(let_go), seed
                assert not is_claimed(question, path), seed
                assert [step["role"] == "collider" for step in shown["steps"]] == [c for _, c in path.inner()]
                seen["open"] += 1
                seen["let go"] += bool(let_go)
            if "causal_path" in told:
                causal, descent = (
                    tuple(node_of(label, parts, selected) for label in told[member])
                    for member in ("causal_path", "descent")
                )
                assert is_directed_path(causal, selected), seed
                assert is_directed_path(descent, selected), seed
                assert (causal[0] in question.treated, causal[-1] in question.results) == (True, True)
                assert not set(causal[1:]) & question.treated, seed
                assert descent[0] in causal[1:]
                assert descent[-1] in given
                columns = [node for node in descent if node in set(node_names(question.columns.graph))]
                assert told["rule"].endswith("-on-causal-path") is (len(columns) == 1), seed
                seen["causal"] += 1
    assert min(seen["open"], seen["causal"]) > len(seeds) / 10
    assert seen["let go"] or len(seeds) < 1000


def test_a_path_that_only_a_forbidden_covariate_blocks_is_told_with_what_has_to_go():
    # late → call → refund, late ↔ call; call is adjusted for
    value = graph_of(("late", "call"), ("call", "refund"), bidirected=[("late", "call")])
    _, answer = review_of(value, {"treatment": "late", "outcome": "refund", "covariates": ["call"]})
    first, second = answer.findings
    assert (first.rule, first.columns) == ("covariate-on-causal-path", ("call",))
    assert second.rule == "unmeasured-cause"
    assert 'is open once the config lets go of "call"' in second.message
    assert "[call]" not in second.message


def test_everybody_is_lost_along_a_path_from_who_is_kept_to_the_outcome():
    # late → refund ← age → kept
    value = graph_of(("late", "refund"), ("age", "refund"))
    config = {
        "treatment": "late",
        "outcome": "refund",
        "covariates": [],
        "rows_exist_because": "age",
        "population": "whole",
    }
    _, answer = review_of(value, config)
    (finding,) = review_document(answer)["findings"]
    assert (finding["rule"], finding["pointer"]) == ("not-recovered", "#/config/rows_exist_because")
    assert finding["open_path"]["nodes"] == [{"part": {"rows_exist_because": "age"}}, "age", "refund"]
    assert answer.verdict == "unanswerable"
    known = review_of(value, config | {"measured_everywhere": "age"})[1]
    assert (known.verdict, known.remedies[0].covariates) == ("biased", known.claim.graph.mask("age"))


@pytest.mark.parametrize("seeds", CONFIGS)
def test_paths_from_who_is_kept_to_the_outcome_are_open_given_all_that_can_be_weighted_by(seeds: range):
    seen = 0
    for seed in seeds:
        question = replace(random_pipeline(seed), asks="total", population="whole")
        _, answer = reviewed(question)
        parts = judged(question)
        selected, conditioned = selected_graph(question, usable(question)[2])
        weights = held_fixed(question) & question.columns.nodes(question.measured_everywhere)
        for told in review_document(answer)["findings"]:
            if told["rule"] == "not-recovered":
                shown = told["open_path"]
                path = Path(
                    tuple(node_of(label, parts, selected) for label in shown["nodes"]), tuple(shown["arrows"])
                )
                assert edges_exist(path, selected), seed
                assert is_open(selected, path, weights - set(conditioned)), seed
                assert {path.nodes[0] in conditioned, path.nodes[-1] in question.results} == {True}, seed
                seen += 1
    assert seen > len(seeds) / 50


def barred_by(question: Question, selected: Graph) -> frozenset[str]:
    if question.asks == "total":
        return forbidden(selected, question.treated, question.results)
    has_arrow = (*question.treated, *question.results) in arrows_of(selected)
    return descendants(selected, question.results) if has_arrow else frozenset()


def is_claimed(question: Question, path: Path) -> bool:
    """Is the path a part of the effect that the config claims?"""
    return path.is_causal if question.asks == "total" else path.is_causal and len(path.arrows) == 1


def judged(question: Question) -> list[dict[str, Any]]:
    """What keeps rows, as far as it can be judged, silently last, each with what the config says of it."""
    parts = [
        {**meant, "written": part["written"]}
        for part in usable(question)[2]
        for meant in meant_by(question, [part])
    ]
    if question.rows_exist_because:
        parts.append({"fixed": False, "written": {"rows_exist_because": list(question.rows_exist_because)}})
    for name, causes in question.missing_because.items():
        if causes:
            parts.append({"fixed": False, "written": {"missing_because": {name: list(causes)}}})
    return parts


def node_of(label: Any, parts: list[dict[str, Any]], selected: Graph) -> str:
    """The oracle's name of a node: selection nodes stand at the end of its graph, one for each loose part."""
    if isinstance(label, str):
        return label
    loose = [part for part in parts if not part["fixed"]]
    # A part is shown as it was written, and judged without its unmeasured columns.
    (place, *_) = [k for k, part in enumerate(loose) if part["written"] == label["part"]]
    names = node_names(selected)
    return names[len(names) - len(loose) + place]


def test_fixed_effects_are_blamed_for_what_they_hold_fixed():
    # late → call → refund; a call's kind is that of its depot
    value = graph_of(("late", "call"), ("call", "refund"), isolated=["depot"], unmeasured=["call"])
    nodes = [
        {**node, "constant_within": ["depot"]} if node["id"] == "call" else node for node in value["nodes"]
    ]
    config = {"treatment": "late", "outcome": "refund", "covariates": [], "fixed_effects": ["depot"]}
    _, answer = review_of({**value, "nodes": nodes}, config)
    (finding,) = answer.findings
    assert (finding.rule, finding.columns, finding.place) == (
        "covariate-on-causal-path",
        ("depot",),
        ("fixed_effects", 0),
    )
    assert finding.message.startswith(
        '"call" lies on the causal path late → [call] → refund: absorbing the fixed effects of "depot",'
    )
    assert answer.claim.graph.names_of(answer.remedies[0].drop) == ("depot",)


def test_blame_names_the_rule_the_column_and_the_place():
    value = graph_of(
        ("value", "late"),
        ("value", "refund"),
        ("late", "call"),
        ("call", "refund"),
        ("late", "ticket"),
        ("refund", "ticket"),
        ("ticket", "survey"),
        ("weather", "late"),
        ("weather", "flag"),
        ("mood", "flag"),
        ("mood", "refund"),
        ("flag", "report"),
        ("call", "rating"),
        unmeasured=["mood"],
    )
    cases = [
        ([], [], [("missing-covariate", ("value",), ("covariates",))]),
        (["value", "call"], [], [("covariate-on-causal-path", ("call",), ("covariates", 1))]),
        (["value", "rating"], [], [("covariate-below-causal-path", ("rating",), ("covariates", 1))]),
        (["value", "survey"], [], [("covariate-below-causal-path", ("survey",), ("covariates", 1))]),
        (["flag", "value"], [], [("covariate-on-collider", ("flag",), ("covariates", 0))]),
        (["report", "value"], [], [("covariate-below-collider", ("report",), ("covariates", 0))]),
        (["value"], ["flag"], [("filter-on-collider", ("flag",), ("row_filter",))]),
        (["value"], [{"columns": "report"}], [("filter-below-collider", ("report",), ("row_filter", 0))]),
        (["value"], ["refund"], [("filter-on-causal-path", ("refund",), ("row_filter",))]),
        (["value"], ["ticket", "value"], [("filter-below-causal-path", ("ticket",), ("row_filter",))]),
        (["value", "flag", "weather"], [], []),
    ]
    for covariates, row_filter, expected in cases:
        config = {
            "treatment": "late",
            "outcome": "refund",
            "covariates": covariates,
            "row_filter": row_filter,
        }
        _, answer = review_of(value, config)
        found = [(f.rule, f.columns, f.place) for f in answer.findings if f.severity == "error"]
        assert found == expected, (covariates, row_filter)


def test_a_filter_that_joins_two_causes_is_blamed_for_reading_them_together():
    # late ← weather, mood → refund, late → refund; rows are kept by weather and mood together
    value = graph_of(("weather", "late"), ("mood", "refund"), ("late", "refund"))
    config = {
        "treatment": "late",
        "outcome": "refund",
        "covariates": [],
        "row_filter": ["weather", "mood"],
    }
    _, answer = review_of(value, config)
    (finding,) = answer.findings
    assert (finding.rule, finding.columns) == ("filter-on-collider", ("weather", "mood"))
    assert finding.part == ["weather", "mood"]


@pytest.mark.parametrize(
    ("value", "treatment", "rule", "says"),
    [
        # late → call → refund, late ↔ call: the one measured node in between must not be adjusted for
        (
            graph_of(("late", "call"), ("call", "refund"), bidirected=[("late", "call")]),
            ["late"],
            "unmeasured-cause",
            '"call" may not be adjusted for',
        ),
        # late → call → refund, call → visit → refund: everything is measured, call is a mediator of late
        (
            graph_of(("late", "call"), ("call", "refund"), ("call", "visit"), ("visit", "refund")),
            ["late", "visit"],
            "unblockable-path",
            '"call" may not be adjusted for',
        ),
        (graph_of(("refund", "late")), ["late"], "unblockable-path", "is a direct cause of the treatment"),
        (
            graph_of(("late", "refund"), bidirected=[("late", "refund")]),
            ["late"],
            "unmeasured-cause",
            "nothing on it is measured",
        ),
    ],
)
def test_what_cannot_be_blocked_is_told_truly(value: Graph, treatment: list[str], rule: str, says: str):
    _, answer = review_of(value, {"treatment": treatment, "outcome": "refund", "covariates": []})
    assert answer.verdict == "unanswerable"
    (error,) = [finding for finding in answer.findings if finding.severity == "error"]
    assert error.rule == rule
    assert says in error.message
    assert set(error.columns) == {treatment[-1], "refund"}


@pytest.mark.parametrize("seeds", CONFIGS[:1])
def test_nothing_is_called_unmeasured_that_is_measured(seeds: range):
    told = 0
    for seed in seeds:
        question = random_config(seed)
        _, answer = reviewed(question)
        measured = set(measured_names(question.graph))
        barred = forbidden(question.graph, question.treatments, question.outcomes)
        for finding in answer.findings:
            if finding.rule in ("unmeasured-cause", "unblockable-path"):
                assert finding.path is not None
                inner = set(map(str, finding.path.nodes[1:-1]))
                assert ("nothing on it is measured" in finding.message) is not (inner & measured) or (
                    not inner and finding.rule == "unblockable-path"
                ), seed
                assert inner & measured <= barred, seed
                hidden = bool(inner - measured) or "both" in finding.path.arrows
                assert (finding.rule == "unmeasured-cause") is hidden, seed
                told += 1
    assert told > 30


REQUESTS = ("Stop ", "Drop ", "Take ", "Adjust ", "Start ", "Record ", "Check ", "Claim ", "If you do hold ")


def test_every_error_ends_by_saying_what_to_do():
    seen = set()
    for seed in range(250):
        question = random_pipeline(seed)
        _, answer = review_of(question.graph, question.config())
        for finding in answer.findings:
            if finding.severity == "error":
                last = re.split(r"(?<=[.:]) (?=[A-Z])", finding.message)[-1]
                assert last.startswith(REQUESTS), (seed, finding.rule, finding.message)
                seen.add(finding.rule)
    assert len(seen) > 12, sorted(seen)
