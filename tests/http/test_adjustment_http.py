"""/v1/adjustment against brute force over all subsets, over HTTP as callers ask."""

from __future__ import annotations

import random
from collections import Counter
from typing import Any

import pytest

from pathgate.web.app import create_app
from pathgate.web.settings import Settings
from tests.brute import descendants, forbidden, inclusion_minimal, valid_sets, with_selection
from tests.published.cases import rows_of, selected_on
from tests.strategies import random_graph, random_parts, random_question
from tests.values import Graph, arrows_of, measured_names, node_names

CASES = [
    pytest.param(range(250), id="250"),
    pytest.param(range(250, 2500), id="2250", marks=pytest.mark.slow),
]


@pytest.fixture(scope="module")
def client():
    return create_app(Settings()).test_client()


def ask(client, graph: Graph, **asked: Any) -> Any:
    answer = client.post("/v1/adjustment", json={"graph": graph, **asked})
    assert answer.status_code == 200, answer.get_json()
    return answer.get_json()


class World:
    """A random question with all its valid sets by definition."""

    def __init__(self, seed: int) -> None:
        rng = random.Random(seed)
        self.graph = random_graph(
            rng, rng.randint(2, 7), arrow=rng.choice([0.25, 0.4]), bidirected=rng.choice([0, 0.1, 0.2])
        )
        for node in self.graph["nodes"]:
            if isinstance(node, dict):
                node["measured"] = node.get("measured", True)
                node["cost"] = rng.choice([0.1, 0.3, 1, 2, 2.5])
        self.asks = rng.choice(["total", "direct"])
        asked = random_question(rng, self.graph, single=self.asks == "direct")
        for node in self.graph["nodes"]:
            if isinstance(node, dict) and node["id"] in asked.x + asked.y:
                node["measured"] = True
        self.ends = {"treatment": list(asked.x), "outcome": list(asked.y)}
        self.parts = random_parts(rng, self.graph) if rng.random() < 0.5 else []
        selected, conditioned = with_selection(self.graph, self.parts)
        self.valid = valid_sets(selected, asked.x, asked.y, conditioned, asks=self.asks)
        self.columns = [name for name in measured_names(self.graph) if name not in asked.x + asked.y]
        self.fixed = {name for part in self.parts if part["fixed"] for name in part["columns"]}
        self.required = set(rng.sample(self.columns, rng.randint(0, min(1, len(self.columns)))))
        left = [name for name in self.columns if name not in self.required]
        self.excluded = set(rng.sample(left, rng.randint(0, min(2, len(left)))))

    @property
    def question(self) -> dict[str, Any]:
        return {**self.ends, "asks": self.asks, "selected_on": self.parts, "limit": 1000}

    def cost(self, columns: Any) -> float:
        costs = {node["id"]: node["cost"] for node in self.graph["nodes"] if isinstance(node, dict)}
        return sum(costs.get(name, 1) for name in columns)


@pytest.mark.parametrize("seeds", CASES)
def test_lists_bounds_and_best_sets_are_those_of_brute_force(client, seeds: range):
    seen: Counter[str] = Counter()
    for seed in seeds:
        world = World(seed)
        bounds = {"require": sorted(world.required), "exclude": sorted(world.excluded)}
        # A column that the filter holds at one value is in no minimal set unless it is required.
        useful = [one for one in world.valid if not one & (world.fixed - world.required)]
        within = [one for one in useful if world.required <= one and not one & world.excluded]
        answer = ask(client, world.graph, **world.question, **bounds)
        listed = [frozenset(one["columns"]) for one in answer["sets"]]
        assert answer["complete"]
        assert answer["exists"] is bool(within), seed
        assert len(listed) == len(set(listed))
        assert set(listed) == set(inclusion_minimal(within)), seed
        assert list(map(len, listed)) == sorted(map(len, listed))
        for prefer, measure in (("smallest", len), ("cheapest", world.cost)):
            best = ask(client, world.graph, **world.question, **bounds, prefer=prefer)["sets"]
            assert [round(measure(one["columns"]), 9) for one in best] == (
                [round(min(map(measure, within)), 9)] if within else []
            ), seed
            assert all(frozenset(one["columns"]) in within for one in best)
            assert all(round(one["cost"], 9) == round(world.cost(one["columns"]), 9) for one in best)
        seen["exists" if within else "none"] += 1
    assert min(seen["exists"], seen["none"]) > len(seeds) / 10


@pytest.mark.parametrize("seeds", CASES)
def test_checks_and_the_three_lists_are_those_of_brute_force(client, seeds: range):
    seen: Counter[str] = Counter()
    for seed in seeds:
        world = World(seed)
        rng = random.Random(seed)
        checked = rng.sample(world.columns, rng.randint(0, len(world.columns)))
        answer = ask(client, world.graph, **world.question, check=checked, exclude=sorted(world.excluded))
        is_valid = frozenset(checked) in world.valid
        assert answer["check"]["valid"] is is_valid, seed
        assert bool(answer["check"]["reasons"]) is not is_valid, seed
        barred = barred_by(world)
        assert {told["column"] for told in answer["forbidden"]} == barred, seed
        unusable = {n for n in world.columns if n not in barred and not any(n in one for one in world.valid)}
        needed = {n for n in world.columns if all(n in one for one in world.valid)}
        assert {told["column"] for told in answer["unusable"]} == (unusable if world.valid else set()), seed
        assert set(answer["needed"]) == (needed if world.valid else set()), seed
        assert ("measure_next" in answer) is not answer["exists"]
        seen.update(unusable=len(unusable), needed=len(answer["needed"]), valid=is_valid)
    assert min(seen.values()) > len(seeds) / 20


def barred_by(world: World) -> set[str]:
    treatments, outcomes = world.ends["treatment"], world.ends["outcome"]
    if world.asks == "total":
        return set(forbidden(world.graph, treatments, outcomes))
    has_arrow = (treatments[0], outcomes[0]) in arrows_of(world.graph)
    return set(descendants(world.graph, outcomes)) - {*treatments, *outcomes} if has_arrow else set()


def test_pages_join_up_to_the_whole_list(client):
    graph = ladder(6)
    whole = ask(client, graph, treatment="late", outcome="refund", limit=1000)
    paged, cursor = [], {}
    while True:
        page = ask(client, graph, treatment="late", outcome="refund", limit=7, **cursor)
        assert {k: v for k, v in page.items() if k not in ("sets", "cursor", "complete")} == {
            k: v for k, v in whole.items() if k not in ("sets", "complete")
        }
        paged += page["sets"]
        if page["complete"]:
            break
        cursor = {"cursor": page["cursor"]}
    assert len(whole["sets"]) == 2**6
    assert sorted(map(str, paged)) == sorted(map(str, whole["sets"]))


def test_an_astronomically_long_list_answers_its_first_page(client):
    answer = ask(client, ladder(150), treatment="late", outcome="refund", limit=10)
    assert len(answer["sets"]) == 10
    assert answer["complete"] is False


def ladder(rungs: int) -> Graph:
    # On each rung one of two columns will do: late ← a → b → refund
    edges = [("late", "refund")]
    for rung in range(rungs):
        edges += [(f"a{rung}", f"b{rung}"), (f"a{rung}", "late"), (f"b{rung}", "refund")]
    names = dict.fromkeys(name for edge in edges for name in edge)
    return {"nodes": list(names), "edges": [{"source": s, "target": t} for s, t in edges]}


def test_every_published_adjustment_is_answered_as_published(client):
    rows = rows_of("adjustment")
    for name, graph, row in rows:
        question = {
            "treatment": row["treatment"],
            "outcome": row["outcome"],
            "asks": row.get("asks", "total"),
        }
        if "selected_on" in row:
            question["selected_on"] = selected_on(row)
        if row.get("exists") is False:
            assert ask(client, graph, **question)["exists"] is False, name
        for columns, valid in [(s, True) for s in row.get("valid", ())] + [
            (s, False) for s in row.get("invalid", ())
        ]:
            assert ask(client, graph, **question, check=columns)["check"]["valid"] is valid, (name, columns)
        if "most_precise" in row:
            best = ask(client, graph, **question, prefer="most-precise")
            assert best["uniform"] is True
            assert [set(one["columns"]) for one in best["sets"]] == [set(row["most_precise"])]
    assert len(rows) > 20


def test_which_set_is_most_precise_can_depend_on_strengths(client):
    # w → x → y, w ↔ m ↔ y
    graph = {
        "nodes": ["w", "x", "m", "y"],
        "edges": [
            {"source": "w", "target": "x"},
            {"source": "x", "target": "y"},
            {"source": "w", "target": "m", "kind": "bidirected"},
            {"source": "m", "target": "y", "kind": "bidirected"},
        ],
    }
    answer = ask(client, graph, treatment="x", outcome="y", prefer="most-precise")
    assert (answer["uniform"], answer["every_candidate"]) == (False, True)
    assert [one["columns"] for one in answer["sets"]] == [[], ["w", "m"]]


def test_what_makes_no_sense_together_is_refused(client):
    graph = ladder(1)
    graph["nodes"].append({"id": "habit", "measured": False})
    asked = {"graph": graph, "treatment": "late", "outcome": "refund"}
    for change, pointer in (
        ({"require": ["a0"], "exclude": ["a0"]}, "#/exclude"),
        ({"require": ["habit"]}, "#/require"),
        ({"treatment": "habit"}, "#/treatment"),
        ({"treatment": ["late", "a0"], "asks": "direct"}, "#/treatment/1"),
        ({"asks": "direct", "population": "whole"}, "#/population"),
        ({"asks": "direct", "prefer": "most-precise"}, "#/prefer"),
        ({"measured_everywhere": ["a0"]}, "#/measured_everywhere"),
        ({"cursor": "AAAA"}, None),
    ):
        answer = client.post("/v1/adjustment", json=asked | change)
        assert answer.status_code == 422, change
        if pointer:
            assert [error["pointer"] for error in answer.get_json()["errors"]] == [pointer]
        else:
            assert answer.get_json()["type"] == "/problems/bad-cursor"


def test_the_effect_in_everybody_needs_what_undoes_the_selection(client):
    # late → refund ← age; rows kept by age
    graph = {
        "nodes": ["late", "refund", "age"],
        "edges": [{"source": "late", "target": "refund"}, {"source": "age", "target": "refund"}],
    }
    question = {"treatment": "late", "outcome": "refund", "selected_on": ["age"], "population": "whole"}
    alone = ask(client, graph, **question, check=[])
    assert (alone["exists"], alone["check"]["valid"]) == (False, False)
    assert alone["check"]["reasons"][0]["rule"] == "not-recovered"
    assert alone["check"]["reasons"][0]["open_path"]["nodes"] == ["refund", "age", {"part": ["age"]}]
    known = ask(client, graph, **question, measured_everywhere=["age"])
    assert [one["columns"] for one in known["sets"]] == [["age"]]
    assert known["needed"] == ["age"]
    assert node_names(graph) == ["late", "refund", "age"]
