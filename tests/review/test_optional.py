"""What advice says of precision, held against the variances of linear worlds of the same graph."""

from __future__ import annotations

import random
from collections import Counter
from typing import Any

import numpy as np
import pytest

from pathgate.review import review_document
from tests.linear_worlds import draw_world, estimate_variance
from tests.review.random_configs import review_of
from tests.strategies import random_graph, random_question
from tests.values import Graph, graph_of

SEEDS = [
    pytest.param(range(250), id="250"),
    pytest.param(range(250, 1500), id="1250", marks=pytest.mark.slow),
]
WORLDS = 3


def columns_of(graph: Graph, config: dict[str, Any]) -> tuple[str, list[dict[str, Any]]]:
    _, answer = review_of(graph, config)
    document = review_document(answer)
    return document["verdict"], document["columns"]


@pytest.mark.parametrize("seeds", SEEDS)
def test_what_a_column_does_to_precision_is_what_it_does_in_every_linear_world(seeds: range):
    seen: Counter[str] = Counter()
    for seed in seeds:
        rng = random.Random(seed)
        graph = random_graph(rng, rng.randint(3, 6), arrow=0.4, bidirected=0.1, unmeasured=0.1)
        asked = random_question(rng, graph, single=True)
        config = {"treatment": asked.x[0], "outcome": asked.y[0], "covariates": list(asked.given)}
        verdict, columns = columns_of(graph, config)
        for told in columns:
            if "precision" not in told:
                continue
            assert verdict == "sound", seed
            without = set(asked.given) - {told["column"]}
            for draw in range(WORLDS):
                world = draw_world(graph, np.random.default_rng([seed, draw]))
                ends = (world, asked.x[0], asked.y[0])
                ratio = estimate_variance(*ends, without | {told["column"]}) / estimate_variance(
                    *ends, without
                )
                if told["precision"] in ("raises", "none"):
                    assert ratio <= 1 + 1e-9, seed
                if told["precision"] in ("lowers", "none"):
                    assert ratio >= 1 - 1e-9, seed
            seen[told["precision"]] += 1
    assert set(seen) == {"raises", "lowers", "none"}


def test_a_cause_of_the_outcome_helps_and_a_cause_of_the_treatment_costs():
    # lot → late → refund ← mood
    graph = graph_of(("lot", "late"), ("late", "refund"), ("mood", "refund"))
    _, columns = columns_of(graph, {"treatment": "late", "outcome": "refund", "covariates": ["lot", "mood"]})
    told = {each["column"]: (each["advice"], each.get("precision")) for each in columns}
    assert told["lot"] == ("optional", "lowers")
    assert told["mood"] == ("optional", "raises")
