"""Configs that mean harm or mere excess: five hundred columns, names of every kind, nesting, a filter too long."""

from __future__ import annotations

import json
from typing import Any

import pytest

NAMES = [
    "o'clock",
    'the "late" one',
    "web.visits",
    "a`b",
    "line\nbreak",
    "\x1b[31mred",
    "\u202eright to left",
    "מסירה",
    "#/config/row_filter",
    "'; DROP TABLE parcels; --",
    "~",
    " ",
]


def asked(service: Any, graph: dict[str, Any], **config: Any) -> Any:
    return service.post("/v1/review", {"graph": graph, "config": config})


def around(name: str) -> dict[str, Any]:
    """``name`` is a common cause of treatment and outcome."""
    ends = [(name, "late"), (name, "refund"), ("late", "refund")]
    return {
        "nodes": [name, "late", "refund"],
        "edges": [{"source": source, "target": target} for source, target in ends],
    }


@pytest.mark.parametrize("name", NAMES)
def test_a_column_of_any_name_is_judged_like_any_other(service, name: str):
    ends = {"treatment": "late", "outcome": "refund"}
    biased = asked(service, around(name), covariates=[], **ends).json
    assert biased["verdict"] == "biased"
    assert [finding["columns"] for finding in biased["findings"]] == [[name]]
    assert biased["remedies"][0]["add"] == [name]
    quoted = '"' + name.replace('"', '""') + '"'
    for more in (
        {"covariates": [name]},
        {"covariates": [], "row_filter": [{"columns": name, "fixed": True}]},
        {"covariates": [], "row_filter": f"{quoted} = 3"},
        {"covariates": ["again"], "derived": {"again": {"recodes": name}}},
        {"covariates": ["again"], "derived": {"again": {"sql": quoted}}},
    ):
        assert asked(service, around(name), **ends, **more).json["verdict"] == "sound", more


def test_five_hundred_columns_are_judged(service):
    causes = [f"cause {k}" for k in range(500)]
    graph = {
        "nodes": [*causes, "late", "refund"],
        "edges": [{"source": each, "target": end} for each in causes for end in ("late", "refund")]
        + [{"source": "late", "target": "refund"}],
    }
    ends = {"treatment": "late", "outcome": "refund"}
    reply = asked(service, graph, covariates=causes, **ends)
    assert reply.json["verdict"] == "sound"
    assert len(reply.json["coefficients"]) == 501
    lacking = asked(service, graph, covariates=causes[1:], **ends)
    assert lacking.json["remedies"][0]["add"] == [causes[0]]


@pytest.mark.parametrize(
    "row_filter",
    ["(" * 300 + "late > 1" + ")" * 300, "NOT " * 4_000 + "late", "late > 1 AND " * 4_000 + "late > 1"],
)
def test_a_filter_nested_too_deeply_or_too_long_is_refused_in_a_sentence(service, row_filter: str):
    reply = asked(
        service, around("x"), treatment="late", outcome="refund", covariates=[], row_filter=row_filter
    )
    assert reply.status_code == 422
    (fault,) = json.loads(reply.data)["errors"]
    assert fault["pointer"] == "#/config/row_filter"
    assert fault["detail"]
