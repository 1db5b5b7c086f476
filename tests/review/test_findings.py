"""Findings: an error exactly where the config falls short, witnesses by definition, warnings as they are meant."""

from __future__ import annotations

from collections import Counter
from typing import Any

import pytest

from pathgate.review import review_document
from pathgate.review.rules import RULES
from tests.brute import Path, descendants, forbidden, is_open, with_selection
from tests.criteria.asking import edges_exist, is_directed_path
from tests.review.brute_review import Question, is_sound
from tests.review.random_configs import random_config, review_of, reviewed
from tests.values import Graph, arrows_of, graph_of, measured_names, node_names

CONFIGS = [
    pytest.param(range(400), id="400"),
    pytest.param(range(400, 3000), id="2600", marks=pytest.mark.slow),
]


@pytest.mark.parametrize("seeds", CONFIGS)
def test_errors_stand_exactly_where_the_config_is_not_sound_and_name_columns(seeds: range):
    rules: Counter[str] = Counter()
    for seed in seeds:
        question = random_config(seed)
        graph, answer = reviewed(question)
        errors = [finding for finding in answer.findings if finding.severity == "error"]
        assert bool(errors) is not is_sound(question, question.covariates, question.parts), seed
        for finding in answer.findings:
            assert finding.columns, seed
            assert list(finding.columns) == sorted(set(finding.columns), key=graph.index.__getitem__), seed
            assert finding.message.endswith(".")
        rules.update({finding.rule for finding in answer.findings})
        kinds = [finding.severity for finding in answer.findings]
        assert kinds == sorted(kinds, key=["error", "warning", "note"].index)
        shown = [repr(told) for told in review_document(answer)["findings"]]
        assert len(set(shown)) == len(shown), seed
    # Notes are about filters in SQL: test_sql_filter gives an example of each.
    assert set(rules) == {name for name, rule in RULES.items() if rule.severity != "note"}


@pytest.mark.parametrize("seeds", CONFIGS)
def test_paths_in_findings_are_open_given_what_the_config_conditions_on(seeds: range):
    seen: Counter[str] = Counter()
    for seed in seeds:
        question = random_config(seed)
        _, answer = reviewed(question)
        parts = judged(question)
        selected, conditioned = with_selection(question.graph, parts)
        given = usable_covariates(question) | set(conditioned)
        # What lies on or below a causal path has to go in any case; paths are shown as they are without it.
        barred = barred_by(question, selected) | question.ends
        for finding, told in zip(answer.findings, review_document(answer)["findings"], strict=True):
            if "open_path" in told:
                shown = told["open_path"]
                labels = tuple(node_of(label, parts, selected) for label in shown["nodes"])
                path = Path(labels, tuple(shown["arrows"]))
                assert edges_exist(path, selected), seed
                assert is_open(selected, path, given - barred), seed
                let_go = {node for node, is_collider in path.inner() if not is_collider} & given
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
                assert (causal[0] in question.treatments, causal[-1] in question.outcomes) == (True, True)
                assert not set(causal[1:]) & set(question.treatments), seed
                assert descent[0] in causal[1:]
                assert descent[-1] in given
                columns = [node for node in descent if node in set(node_names(question.graph))]
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


def barred_by(question: Question, selected: dict) -> frozenset[str]:
    if question.asks == "total":
        return forbidden(selected, question.treatments, question.outcomes)
    has_arrow = (*question.treatments, *question.outcomes) in arrows_of(selected)
    return descendants(selected, question.outcomes) if has_arrow else frozenset()


def is_claimed(question: Question, path: Path) -> bool:
    """Is the path a part of the effect that the config claims?"""
    return path.is_causal if question.asks == "total" else path.is_causal and len(path.arrows) == 1


def usable_covariates(question: Question) -> set[str]:
    return set(question.covariates) & set(measured_names(question.graph)) - question.ends


def judged(question: Question) -> list[dict]:
    """The filter as far as it can be judged: measured columns only, nothing that holds an end at one value."""
    measured = set(measured_names(question.graph))
    parts = []
    for part in question.parts:
        columns = [name for name in part["columns"] if name in measured]
        if columns and not (part["fixed"] and question.ends & set(columns)):
            parts.append({**part, "columns": columns, "written": part})
    return parts


def node_of(label: Any, parts: list[dict], selected: Graph) -> str:
    """The oracle's name of a node: selection nodes stand at the end of its graph, one for each loose part."""
    if isinstance(label, str):
        return label
    loose = [part for part in parts if not part["fixed"]]
    # A part is shown as it was written, and judged without its unmeasured columns.
    (place, *_) = [k for k, part in enumerate(loose) if part["written"] == label["part"]]
    names = node_names(selected)
    return names[len(names) - len(loose) + place]


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
