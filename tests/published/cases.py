"""Where are the published cases, and which of them hold a given kind of answer?

``published.json`` beside this module is data: graphs, questions, answers, and the source of each.
"""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any


def load_published() -> dict[str, Any]:
    """The whole file: ``about``, ``counts`` and ``cases``."""
    text = Path(__file__).with_name("published.json").read_text(encoding="utf-8")
    loaded: dict[str, Any] = json.loads(text)
    return loaded


def rows_of(kind: str) -> list[tuple[str, dict[str, Any], Any]]:
    """(case name, graph, row) for each row of ``kind`` ("separation", "adjustment" …) in any case."""
    cases = [case for case in load_published()["cases"] if kind in case]
    return [(case["name"], case["graph"], row) for case in cases for row in _as_list(case[kind])]


def selected_on(row: dict[str, Any]) -> list[dict[str, Any]]:
    """What the rows of an adjustment question are kept by: a part of its own for each name."""
    return [{"columns": [name], "fixed": False} for name in row.get("selected_on", [])]


def _as_list(value: Any) -> list[Any]:
    return value if isinstance(value, list) else [value]
