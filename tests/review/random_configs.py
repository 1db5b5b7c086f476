"""Random configs on random graphs, with the degenerate ones among them: same seed, same config."""

from __future__ import annotations

import random
from typing import Any

from pathgate.graphs import CausalGraph, read_graph
from pathgate.review import Review, read_config, review
from tests.review.brute_review import Question
from tests.strategies import random_graph, random_parts, random_question
from tests.values import node_names


def random_config(seed: int, most_nodes: int = 6, *, unmeasured: float = 0.12) -> Question:
    """One config. Some adjust for a treatment, filter by something unmeasured, or hold an end at one value."""
    rng = random.Random(seed)
    arrow, bidirected = rng.choice([0.25, 0.4, 0.6]), rng.choice([0, 0.1, 0.2])
    size = rng.randint(2, most_nodes)
    graph = random_graph(rng, size, arrow=arrow, bidirected=bidirected, unmeasured=unmeasured)
    asks = "direct" if rng.random() < 0.25 else "total"
    asked = random_question(rng, graph, single=asks == "direct")
    covariates = list(asked.given)
    parts = random_parts(rng, graph, 3, fixed=0.4)
    if rng.random() < 0.1:
        parts.append({"columns": [rng.choice(node_names(graph))], "fixed": rng.random() < 0.5})
    if rng.random() < 0.05:
        covariates.append(rng.choice(asked.x + asked.y))
    fixed = rng.random() < 0.25
    return Question(graph, asked.x, asked.y, tuple(covariates), tuple(parts), fixed, asks)


def reviewed(question: Question) -> tuple[CausalGraph, Review]:
    """The production code's review of it."""
    return review_of(question.graph, question.config())


def review_of(value: Any, config: Any) -> tuple[CausalGraph, Review]:
    """The review of a config on a graph, both as callers send them."""
    graph = read_graph(value)
    return graph, review(graph, read_config(config, graph))
