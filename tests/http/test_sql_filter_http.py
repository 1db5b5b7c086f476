"""A row filter in SQL over HTTP: findings and remedies show its parts, and faults have their place."""

from __future__ import annotations

from typing import Any

import pytest

from pathgate.web.endpoints.review import OPERATION
from tests.http.conftest import Service

BODY = next(example.request for example in OPERATION.examples if example.name == "a-filter-in-sql")


def body_with(**changes: Any) -> dict[str, Any]:
    return {**BODY, "config": {**BODY["config"], **changes}}


def test_findings_and_remedies_show_the_part_as_written(service: Service):
    answer = service.post("/v1/review", BODY).json
    assert answer["verdict"] == "biased"
    errors = [finding for finding in answer["findings"] if finding["severity"] == "error"]
    assert [(finding["rule"], finding["part"]) for finding in errors] == [
        ("filter-on-collider", "ticket_opened = TRUE")
    ]
    assert errors[0]["pointer"] == "#/config/row_filter"
    assert answer["remedies"][0]["drop_filter_parts"] == ["ticket_opened = TRUE"]
    assert "stop filtering by `ticket_opened = TRUE`" in answer["summary"]
    mended = service.post("/v1/review", body_with(row_filter="region = 'north'")).json
    assert mended["verdict"] == "sound"
    assert {finding["severity"] for finding in mended["findings"]} == {"note"}


@pytest.mark.parametrize(
    ("changes", "pointer"),
    [
        ({"row_filter": "regoin = 'north'"}, "#/config/row_filter"),
        ({"row_filter": "region = "}, "#/config/row_filter"),
        ({"row_filter": "(" * 10_000}, "#/config/row_filter"),
        ({"row_filter": "x" * 50_000}, "#/config/row_filter"),
        ({"dialect": "duckbd"}, "#/config/dialect"),
    ],
)
def test_what_cannot_be_read_is_a_fault_at_its_place(service: Service, changes: dict[str, Any], pointer: str):
    reply = service.post("/v1/review", body_with(**changes))
    assert reply.status_code == 422
    assert [error["pointer"] for error in reply.json["errors"]] == [pointer]
