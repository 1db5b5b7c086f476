"""The same input gives the same bytes: whatever the hash seed, the order of members, at the shell or over HTTP."""

from __future__ import annotations

import json
import subprocess
from pathlib import Path
from typing import Any

import msgspec
import pytest

from pathgate.demo import demo_configs, demo_graph
from pathgate.web.app import create_app
from pathgate.web.settings import Settings
from tests.cli.shelf import COMMAND, ENVIRONMENT, write

RICH = {
    "name": "everything",
    "treatment": "late_delivery",
    "formula": "refund ~ late_delivery * order_value + I(order_value + app_user)",
    "row_filter": "ticket_opened = TRUE AND order_value > 3",
    "missing_because": {"order_value": ["app_user"]},
    "rows_exist_because": ["app_user"],
}
GRAPH = {
    "nodes": ["weather", "late_delivery", "ticket_opened", "order_value", "app_user", "refund"],
    "edges": [
        {"source": source, "target": target}
        for source, target in (
            ("weather", "late_delivery"),
            ("weather", "refund"),
            ("late_delivery", "refund"),
            ("late_delivery", "ticket_opened"),
            ("order_value", "ticket_opened"),
            ("order_value", "refund"),
            ("app_user", "order_value"),
        )
    ],
}


def turned(value: Any) -> Any:
    """The same value with the members of every object the other way round."""
    if isinstance(value, dict):
        return {key: turned(value[key]) for key in reversed(value)}
    return [turned(each) for each in value] if isinstance(value, list) else value


def at_the_shell(folder: Path, seed: int, *, is_turned: bool) -> bytes:
    """The reviews, as the shell prints them."""
    order = turned if is_turned else lambda value: value
    write(folder, "graph.json", order(GRAPH))
    write(folder, "configs.json", order([RICH]))
    words = [*COMMAND, "review", "graph.json", "configs.json", "--format", "json"]
    environment = {**ENVIRONMENT, "PYTHONHASHSEED": str(seed)}
    done = subprocess.run(words, cwd=folder, env=environment, capture_output=True, check=False, timeout=120)
    assert done.returncode == 1, done.stderr
    return msgspec.json.encode(json.loads(done.stdout)["reviews"])


@pytest.mark.slow
def test_a_review_is_the_same_bytes_everywhere(tmp_path):
    client = create_app(Settings()).test_client()
    over_http = client.post("/v1/reviews", json={"graph": GRAPH, "configs": [RICH]}).json["reviews"]
    assert over_http[0]["review"]["verdict"] == "biased"
    wanted = msgspec.json.encode(over_http)
    for seed in (0, 1, 2):
        assert at_the_shell(tmp_path, seed, is_turned=seed == 1) == wanted


def test_the_order_of_members_never_matters():
    client = create_app(Settings()).test_client()
    for config in demo_configs():
        body = {"graph": demo_graph(), "config": config}
        assert client.post("/v1/review", json=turned(body)).data == client.post("/v1/review", json=body).data
