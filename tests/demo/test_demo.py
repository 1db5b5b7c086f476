"""The demo shows what it says it shows: each config falls short in its own way, and its remedy mends it."""

from __future__ import annotations

from typing import Any

import pytest

from pathgate.demo import demo_configs, demo_graph
from pathgate.graphs import read_graph
from pathgate.review import read_config, review, review_document
from pathgate.review.rules import RULES

# Written by hand: name, verdict, rule of the first finding, the columns it blames.
INTENDED = [
    ("late-delivery-refunds", "sound", None, []),
    ("refunds-at-equal-rating", "biased", "covariate-on-collider", ["rated_drop_off"]),
    ("redirection-refunds", "biased", "covariate-below-collider", ["follow_up_call"]),
    ("late-delivery-repeat-orders", "biased", "filter-on-collider", ["rated_drop_off"]),
    ("promotion-late-pickups", "biased", "covariate-on-causal-path", ["locker_full"]),
    ("reminder-late-pickups", "biased", "missing-covariate", ["locker_full"]),
    ("courier-experience-delays", "biased", "unmeasured-covariate", ["route_pressure"]),
    ("ticket-refunds", "unanswerable", "unmeasured-cause", ["ticket_opened", "refund"]),
]
BIASED = [name for name, verdict, _rule, _columns in INTENDED if verdict == "biased"]


def config_named(name: str) -> dict[str, Any]:
    return next(config for config in demo_configs() if config["name"] == name)


def reviewed(config: dict[str, Any]) -> dict[str, Any]:
    graph = read_graph(demo_graph())
    return review_document(review(graph, read_config(config, graph)))


def test_the_graph_is_of_a_size_to_be_read_and_has_every_kind_of_edge_and_node():
    nodes, edges = demo_graph()["nodes"], demo_graph()["edges"]
    assert 14 <= len(nodes) <= 20
    assert sum(not node.get("measured", True) for node in nodes) == 2
    assert any(edge.get("kind") == "bidirected" for edge in edges)
    assert any("note" in edge for edge in edges)
    assert any("cost" in node for node in nodes)
    assert all("recorded" in node for node in nodes if node.get("measured", True))


def test_the_configs_are_the_intended_ones_and_each_says_why_it_is_there():
    configs = demo_configs()
    assert [config["name"] for config in configs] == [name for name, *_ in INTENDED]
    assert all(config["meta"]["why"].endswith(".") for config in configs)


@pytest.mark.parametrize(("name", "verdict", "rule", "columns"), INTENDED)
def test_each_config_is_judged_as_intended(name, verdict, rule, columns):
    answer = reviewed(config_named(name))
    first = answer["findings"][0] if answer["findings"] else {"rule": None, "columns": []}
    assert (answer["verdict"], first["rule"], first["columns"]) == (verdict, rule, columns)


@pytest.mark.parametrize(("name", "verdict", "rule", "columns"), INTENDED)
def test_no_config_falls_short_for_a_second_reason(name, verdict, rule, columns):
    errors = {
        each["rule"] for each in reviewed(config_named(name))["findings"] if each["severity"] == "error"
    }
    assert errors == ({rule} if rule else set())
    assert errors <= set(RULES)


@pytest.mark.parametrize("name", BIASED)
def test_every_remedy_of_a_biased_config_mends_it(name):
    config = config_named(name)
    remedies = reviewed(config)["remedies"]
    assert remedies
    for remedy in remedies:
        kept = [part for part in config.get("row_filter", []) if part not in remedy["drop_filter_parts"]]
        mended = {**config, "covariates": remedy["covariates"], "row_filter": kept}
        assert mended != {"row_filter": [], **config}
        assert reviewed(mended)["verdict"] == "sound"


def test_a_caller_who_changes_the_demo_changes_it_for_nobody_else():
    demo_graph()["nodes"].clear()
    demo_configs().clear()
    assert demo_graph()["nodes"]
    assert demo_configs()
