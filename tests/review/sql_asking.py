"""A graph, and what configs with a row filter in SQL come to on it."""

from __future__ import annotations

from typing import Any

import pytest

from pathgate.graphs import read_graph
from pathgate.review import InvalidConfig, read_config
from pathgate.review.schema import STANDARD_DIALECT

GRAPH: dict[str, Any] = {
    "nodes": [
        {"id": "late", "columns": ["deliveries.late", "is_late"]},
        *(
            "refund",
            "depot",
            "weight",
            "ticket",
            "Rain",
            "rain",
            "order",
            "two words",
            "été",
            "tickets.opened",
        ),
        {"id": "mood", "measured": False},
    ],
    "edges": [{"source": "late", "target": "refund"}],
}
READ = read_graph(GRAPH)

Said = list[tuple[str, set[str], bool]]


def config_of(row_filter: str, dialect: str = STANDARD_DIALECT) -> Any:
    value = {"treatment": "late", "outcome": "refund", "covariates": []}
    return read_config(value | {"row_filter": row_filter, "dialect": dialect}, READ)


def parts_of(row_filter: str, dialect: str = STANDARD_DIALECT) -> Said:
    """Each part as written, the columns it reads, whether it fixes."""
    parts = [one.part for one in config_of(row_filter, dialect).rows.filter_parts]
    return [(str(part.written), set(READ.names_of(part.columns)), part.fixed) for part in parts]


def fault_of(row_filter: str, dialect: str = STANDARD_DIALECT) -> tuple[str, str]:
    with pytest.raises(InvalidConfig) as caught:
        config_of(row_filter, dialect)
    (fault,) = caught.value.faults
    assert fault.place == ("row_filter",)
    return fault.slug, fault.detail
