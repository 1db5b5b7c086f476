"""The document of a review: the same bytes for the same question, whatever the order and the names."""

from __future__ import annotations

import json
import random
import re
from typing import Any

import pytest

from pathgate.criteria import Deadline, OutOfTime
from pathgate.graphs import read_graph
from pathgate.graphs.graph import SMALL
from pathgate.review import read_config, review, review_document
from pathgate.review.document import pointer
from tests.review.brute_review import Question
from tests.review.random_configs import random_config, review_of
from tests.strategies import HOSTILE_NAMES, renamed
from tests.values import graph_of, node_names

SEEDS = [
    pytest.param(range(150), id="150"),
    pytest.param(range(150, 1150), id="1000", marks=pytest.mark.slow),
]


def document_of(value: Any, config: Any) -> str:
    return json.dumps(review_document(review_of(value, config)[1]))


@pytest.mark.parametrize("seeds", SEEDS)
def test_the_same_question_gives_the_same_bytes_in_whatever_order_edges_and_members_come(seeds: range):
    for seed in seeds:
        question = random_config(seed)
        rng = random.Random(seed)
        edges = [turned(edge, rng) for edge in question.graph["edges"]]
        rng.shuffle(edges)
        other = dict(reversed(question.graph.items())) | {"edges": edges}
        config = question.config()
        members = dict(rng.sample(list(config.items()), len(config)))
        assert document_of(other, members) == document_of(question.graph, config), seed


def turned(edge: dict[str, Any], rng: random.Random) -> dict[str, Any]:
    """The same edge: its members in another order, and the ends of a bidirected one swapped or not."""
    ends = (edge["source"], edge["target"])
    if edge.get("kind") == "bidirected" and rng.random() < 0.5:
        ends = (ends[1], ends[0])
    return dict(rng.sample(list((edge | {"source": ends[0], "target": ends[1]}).items()), len(edge)))


@pytest.mark.parametrize("seeds", SEEDS)
def test_other_names_change_the_names_and_nothing_else(seeds: range):
    for seed in seeds:
        question = random_config(seed)
        order = node_names(question.graph)
        first = {name: f"<{place}>" for place, name in enumerate(order)}
        second = {name: f"({place * 7 + 3})" for place, name in enumerate(order)}
        back = {second[name]: first[name] for name in order}
        texts = [
            document_of(renamed(question.graph, names), rename_config(question, names).config())
            for names in (first, second)
        ]
        translated = re.sub(r"\((\d+)\)", lambda found, back=back: back.get(found[0], found[0]), texts[1])
        assert without_quotes(translated) == without_quotes(texts[0]), seed


def without_quotes(text: str) -> str:
    """Drawn paths quote names that could be misread, and put unmeasured ones in parentheses."""
    return text.replace('\\"', "")


def rename_config(question: Question, names: dict[str, str]) -> Question:
    sides = (question.treatments, question.outcomes, question.covariates)
    treatments, outcomes, covariates = (tuple(names[name] for name in side) for side in sides)
    parts = tuple({**part, "columns": [names[name] for name in part["columns"]]} for part in question.parts)
    value = renamed(question.graph, names)
    fixed, asks = question.row_filter_fixed, question.asks
    return Question(value, treatments, outcomes, covariates, parts, fixed, asks)


@pytest.mark.parametrize("seeds", SEEDS[:1])
def test_the_order_of_the_nodes_changes_neither_verdict_nor_rules_nor_changes(seeds: range):
    for seed in seeds:
        question = random_config(seed)
        rng = random.Random(seed)
        nodes = rng.sample(question.graph["nodes"], len(question.graph["nodes"]))
        one, other = (
            review_of(value, question.config())[1]
            for value in (question.graph, question.graph | {"nodes": nodes})
        )
        assert one.verdict == other.verdict, seed
        assert [remedy.changes for remedy in one.remedies[:1]] == [r.changes for r in other.remedies[:1]]
        roles, others = ({each.column: each.role for each in answer.columns} for answer in (one, other))
        assert all(others.get(column, role) == role for column, role in roles.items()), seed


def test_a_graph_too_large_for_masks_is_reviewed_with_the_same_bytes():
    for seed in range(40):
        question = random_config(seed)
        unlinked = [f"unlinked {k}" for k in range(SMALL)]
        large = question.graph | {"nodes": [*question.graph["nodes"], *unlinked]}
        assert document_of(large, question.config()) == document_of(question.graph, question.config()), seed


def test_hostile_names_come_through_whole():
    names = list(HOSTILE_NAMES)
    rng = random.Random(7)
    for _ in range(100):
        late, refund, weather, ticket = rng.sample(names, 4)
        value = graph_of(
            *((weather, late), (weather, refund), (late, refund), (late, ticket), (refund, ticket))
        )
        config = {"treatment": late, "outcome": refund, "covariates": [ticket], "row_filter": [weather]}
        document = json.loads(document_of(value, config))
        assert document["verdict"] == "biased"
        assert {name for finding in document["findings"] for name in finding["columns"]} == {weather, ticket}
        assert document["remedies"][0]["covariates"] == [weather]
        assert {each["column"] for each in document["columns"]} == {late, refund, weather, ticket}


def test_members_are_those_of_the_contract():
    value = graph_of(("weather", "late"), ("weather", "refund"), ("late", "refund"))
    config = {
        "name": "late-refunds",
        "treatment": "late",
        "outcome": "refund",
        "covariates": [],
        "row_filter": [{"columns": ["weather"]}],
        "meta": {"team": ["lockers"]},
    }
    document = json.loads(document_of(value, config))
    assert document["name"] == "late-refunds"
    assert document["meta"] == {"team": ["lockers"]}
    (finding,) = document["findings"]
    assert finding["rule"] == "missing-covariate"
    assert finding["pointer"] == "#/config/covariates"
    assert finding["open_path"] == {
        "nodes": ["late", "weather", "refund"],
        "arrows": ["backward", "forward"],
        "steps": [{"node": "weather", "role": "fork", "open": True, "because": "not-conditioned"}],
    }
    (remedy,) = document["remedies"]
    assert {
        name: remedy[name] for name in ("covariates", "add", "drop", "drop_filter_parts", "population")
    } == {
        "covariates": ["weather"],
        "add": ["weather"],
        "drop": [],
        "drop_filter_parts": [],
        "population": "kept",
    }
    assert "late" in document["summary"]
    assert document["columns"] == [
        {"column": "weather", "role": "confounder", "advice": "add"},
        {"column": "late", "role": "treatment", "advice": "keep"},
        {"column": "refund", "role": "outcome", "advice": "keep"},
    ]


def test_a_part_stands_in_a_path_as_it_was_written():
    value = graph_of(("weather", "late"), ("mood", "refund"), ("late", "refund"))
    for row_filter, written in (
        (["weather", "mood"], ["weather", "mood"]),
        ([{"columns": ["mood", "weather"]}], {"columns": ["mood", "weather"]}),
    ):
        config = {"treatment": "late", "outcome": "refund", "covariates": [], "row_filter": row_filter}
        document = json.loads(document_of(value, config))
        (finding,) = document["findings"]
        assert finding["part"] == written
        assert finding["open_path"]["nodes"][2] == {"part": written}
        assert finding["open_path"]["steps"][1]["because"] == "conditioned"
        assert document["remedies"][0]["drop_filter_parts"] in ([], [written])


@pytest.mark.parametrize(
    ("place", "expected"),
    [
        ((), "#"),
        (("config", "covariates", 3), "#/config/covariates/3"),
        (("a/b~c", "é %"), "#/a~1b~0c/%C3%A9%20%25"),
    ],
)
def test_pointers_are_those_of_rfc_6901_in_fragments(place: tuple, expected: str):
    assert pointer(place) == expected


def test_a_review_is_cut_off_by_its_deadline_at_any_of_its_stages():
    names = [f"c{k}" for k in range(6)]
    value = graph_of(*((name, end) for name in names for end in ("late", "refund")), ("late", "refund"))
    graph = read_graph(value)
    config = read_config({"treatment": "late", "outcome": "refund", "covariates": []}, graph)
    readings = 0

    def counting() -> float:
        nonlocal readings
        readings += 1
        return 0.0

    assert review(graph, config, Deadline(1, clock=counting)).verdict == "biased"
    assert readings > 20
    for last in range(1, readings):
        left = iter([0.0] * last)
        with pytest.raises(OutOfTime):
            review(graph, config, Deadline(1, clock=lambda left=left: next(left, 2.0)))
