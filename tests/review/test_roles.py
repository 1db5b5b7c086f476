"""Roles: each column has exactly one, in the order of their definitions, and it is the textbook's."""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable
from typing import get_args

import pytest

from pathgate.criteria import Deadline
from pathgate.graphs import read_graph
from pathgate.review import read_config
from pathgate.review.claims import Claim
from pathgate.review.roles import Role, column_roles
from tests.brute import all_paths, ancestors, descendants, is_valid_adjustment, open_paths, proper_paths
from tests.review.brute_review import Question, is_sound_choice
from tests.review.random_configs import random_config, review_of, reviewed
from tests.review.random_pipelines import random_pipeline
from tests.values import Graph, graph_of, node_names

CONFIGS = [
    pytest.param(range(300), id="300"),
    pytest.param(range(300, 2000), id="1700", marks=pytest.mark.slow),
]


def roles_in(question: Question) -> dict[str, str]:
    """The role of every node of the graph."""
    graph = read_graph(question.graph)
    claim = Claim.of(read_config(question.config(), graph))
    found = column_roles(claim, graph.everything, None, Deadline.never(), is_sound=False)
    assert [each.column for each in found] == list(graph.names)
    return {each.column: each.role for each in found}


@pytest.mark.parametrize("seeds", CONFIGS)
def test_every_node_has_the_first_role_whose_definition_fits(seeds: range):
    seen: Counter[str] = Counter()
    for seed in seeds:
        question = random_config(seed)
        for name, role in roles_in(question).items():
            expected = role_of(name, question)
            if expected is not None:
                assert role == expected, (seed, name)
            else:
                assert role in ("collider", "descendant-of-collider", *weaker_roles(name, question)[:1]), seed
            seen[role] += 1
    assert set(seen) <= set(get_args(Role))
    assert len(seeds) < 1000 or set(seen) == set(get_args(Role))


def role_of(name: str, question: Question) -> str | None:
    """The role by the definitions that come before colliders; None where none of those fits."""
    graph, treatments, outcomes = question.graph, question.treatments, question.outcomes
    causal = [path for path in proper_paths(graph, treatments, outcomes) if path.is_causal]
    on_paths = {node for path in causal for node in path.nodes[1:]}
    fits = {
        "treatment": name in treatments,
        "outcome": name in outcomes,
        "mediator": name in on_paths,
        "descendant-of-outcome": name in descendants(graph, on_paths & set(outcomes)),
        "descendant-of-mediator": name in descendants(graph, on_paths),
        "confounder": name in ancestors(graph, treatments)
        and reaches_outcome_past_treatments(name, question),
    }
    return next((role for role, does in fits.items() if does), None)


def reaches_outcome_past_treatments(name: str, question: Question) -> bool:
    paths = (
        path
        for outcome in question.outcomes
        for path in all_paths(question.graph, name, outcome, avoiding=question.treatments)
    )
    return any(path.is_causal for path in paths)


def weaker_roles(name: str, question: Question) -> list[str]:
    """The roles that are left for a node that is no collider, in order; the first one fits best."""
    graph = question.graph
    fitting = []
    if name in ancestors(graph, question.treatments):
        fitting.append("cause-of-treatment")
    if reaches_outcome_past_treatments(name, question):
        fitting.append("cause-of-outcome")
    if name in descendants(graph, question.treatments):
        fitting.append("descendant-of-treatment")
    if next(open_paths(graph, name, question.ends), None) is not None:
        fitting.append("proxy")
    return [*fitting, "unrelated"]


@pytest.mark.parametrize("seeds", CONFIGS)
def test_adjusting_for_a_collider_spoils_a_valid_set(seeds: range):
    told = 0
    for seed in seeds:
        question = random_config(seed)
        graph = question.graph
        for name, role in roles_in(question).items():
            if role in ("collider", "descendant-of-collider"):
                ends = (graph, question.treatments, question.outcomes)
                free = [other for other in node_names(graph) if other not in question.ends | {name}]
                pairs = [(valid, valid | {name}) for valid in valid_among(ends, free)]
                if pairs:
                    assert any(not is_valid_adjustment(*ends, spoilt) for _, spoilt in pairs), (seed, name)
                    told += 1
    assert told > len(seeds) / 20


def valid_among(ends: tuple, free: list[str]) -> list[frozenset[str]]:
    return [
        frozenset(name for place, name in enumerate(free) if bits >> place & 1)
        for bits in range(1 << len(free))
        if is_valid_adjustment(*ends, [name for place, name in enumerate(free) if bits >> place & 1])
    ]


TEXTBOOK: list[tuple[str, Graph, dict[str, str]]] = [
    (
        "confounder, mediator and their company",
        # value → late, value → refund, late → call → refund, call → note, refund → ticket
        graph_of(
            ("value", "late"),
            ("value", "refund"),
            ("late", "call"),
            ("call", "refund"),
            ("call", "note"),
            ("refund", "ticket"),
        ),
        {
            "value": "confounder",
            "call": "mediator",
            "note": "descendant-of-mediator",
            "ticket": "descendant-of-outcome",
        },
    ),
    (
        "an instrument, a cause of the outcome, a reply to the treatment, a bystander",
        graph_of(
            ("lot", "late"), ("late", "refund"), ("mood", "refund"), ("late", "reply"), isolated=["moon"]
        ),
        {
            "lot": "cause-of-treatment",
            "mood": "cause-of-outcome",
            "reply": "descendant-of-treatment",
            "moon": "unrelated",
        },
    ),
    (
        "M shape: adjusting for flag joins weather and mood",
        graph_of(
            ("weather", "late"),
            ("weather", "flag"),
            ("mood", "flag"),
            ("mood", "refund"),
            ("late", "refund"),
            ("flag", "report"),
        ),
        {
            "weather": "cause-of-treatment",
            "mood": "cause-of-outcome",
            "flag": "collider",
            "report": "descendant-of-collider",
        },
    ),
    (
        "selection on a common consequence where there is no effect",
        graph_of(("late", "ticket"), ("refund", "ticket"), ("ticket", "survey")),
        {"ticket": "collider", "survey": "descendant-of-collider"},
    ),
    (
        "a proxy of a confounder",
        graph_of(("value", "late"), ("value", "refund"), ("late", "refund"), ("value", "band")),
        {"value": "confounder", "band": "proxy"},
    ),
]


@pytest.mark.parametrize(("value", "roles"), [pytest.param(v, r, id=n) for n, v, r in TEXTBOOK])
def test_roles_are_those_of_the_textbook(value: Graph, roles: dict[str, str]):
    found = roles_in(Question(value, ("late",), ("refund",), ()))
    assert {name: role for name, role in found.items() if name not in ("late", "refund")} == roles


@pytest.mark.parametrize("seeds", CONFIGS)
@pytest.mark.parametrize("configs", [random_config, random_pipeline])
def test_advice_followed_leads_to_a_sound_config(seeds: range, configs: Callable[[int], Question]):
    followed: Counter[str] = Counter()
    for seed in seeds:
        question = configs(seed)
        _, answer = reviewed(question)
        advice = {each.column: each.advice for each in answer.columns}
        used = question.adjusted_for | question.absorbing
        assert used | question.ends <= set(advice)
        # A column may have to be a covariate where it was a fixed effect: that the remedy alone says.
        if answer.verdict == "unanswerable" or any(
            one.adjusted_for & one.drop for one in answer.remedies[:1]
        ):
            continue
        kept = {name for name in used - question.ends if advice[name] in ("keep", "optional")}
        added = {name for name, said in advice.items() if said == "add"}
        assert not added & used, seed
        dropped = [part.written for remedy in answer.remedies[:1] for part in remedy.drop_parts]
        parts = [part for part in question.parts if part not in dropped]
        covariates, absorbing = question.adjusted_for & kept | added, question.absorbing & kept
        assert is_sound_choice(question, covariates, absorbing, parts), seed
        for name in used if answer.verdict == "sound" else ():
            without = (question.adjusted_for - {name}, question.absorbing - {name})
            assert (advice[name] == "optional") is is_sound_choice(question, *without, question.parts), seed
            followed[advice[name]] += 1
        followed[answer.verdict] += 1
    assert min(followed[each] for each in ("sound", "biased", "keep", "optional")) > len(seeds) / 100


def test_columns_told_of_are_those_of_the_config_its_remedies_and_its_open_paths():
    value = graph_of(
        ("weather", "late"), ("weather", "route"), ("route", "refund"), ("late", "refund"), isolated=["moon"]
    )
    _, answer = review_of(value, {"treatment": "late", "outcome": "refund", "covariates": []})
    assert {each.column for each in answer.columns} == {"late", "refund", "weather", "route"}
