"""Files for the tests of the command: a small graph, configs of each verdict, and a way to write them."""

from __future__ import annotations

import json
import os
import sys
from pathlib import Path
from typing import Any

from tests.values import graph_of

# weather → late → refund, weather → refund, late → ticket ← habit → refund; habit is unmeasured.
GRAPH = graph_of(
    ("weather", "late"),
    ("weather", "refund"),
    ("late", "refund"),
    ("late", "ticket"),
    ("habit", "ticket"),
    ("habit", "refund"),
    unmeasured=["habit"],
)
SOUND = {"name": "sound one", "treatment": "late", "outcome": "refund", "covariates": ["weather"]}
BIASED = {**SOUND, "name": "biased one", "covariates": ["weather", "ticket"]}
UNANSWERABLE = {
    "name": "lost one",
    "treatment": "ticket",
    "outcome": "refund",
    "covariates": ["late", "weather"],
}
MISNAMED = {**SOUND, "name": "misnamed one", "covariates": ["wether"]}

# A filter with one part that opens a collider, written over several lines.
FILTERED_YAML = """\
- name: filtered one
  treatment: late
  outcome: refund
  covariates: [weather]
  row_filter: >-
    weather > 3
    AND ticket = 1
"""
# What a config says of a finding that its team accepts.
WAIVER = {"why": "the ticket desk was closed", "owner": "refunds team", "until": "2999-01-31"}

COMMAND = [sys.executable, "-c", "from pathgate.cli.main import main; main(prog_name='pathgate')"]
# Without what would change what is printed.
ENVIRONMENT = {key: said for key, said in os.environ.items() if not key.startswith("PATHGATE_MAX")}


def write(folder: Path, name: str, value: Any) -> str:
    """A file with a value as JSON, or with a text or bytes as they are; its path as a word of a command."""
    path = folder / name
    if isinstance(value, bytes):
        path.write_bytes(value)
    else:
        path.write_text(value if isinstance(value, str) else json.dumps(value), "utf-8")
    return str(path)
