"""What can be tried without data of one's own: one causal graph and eight model configs, all invented.

A city's parcel-locker network. One config is sound, each of the others falls short in another way, and all of
them look reasonable. Package data, so that any installation has them.
"""

from __future__ import annotations

import json
from importlib.resources import files
from typing import Any

Json = dict[str, Any]


def demo_graph() -> Json:
    """The graph, as callers send it; a fresh value each time."""
    graph: Json = _package_data("graph.json")
    return graph


def demo_configs() -> list[Json]:
    """The configs, each with a ``name`` and, as ``meta.why``, a sentence on what the example shows.

    >>> [config["name"] for config in demo_configs()][:2]
    ['late-delivery-refunds', 'refunds-at-equal-rating']
    """
    configs: list[Json] = _package_data("configs.json")
    return configs


def _package_data(name: str) -> Any:
    return json.loads(files(__package__).joinpath(name).read_text("utf-8"))
