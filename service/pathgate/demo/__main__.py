"""``python -m pathgate.demo --url URL``: a running service reviews the demo configs, and a table shows what it
said.

For whoever has just started the service: does it answer, and what do its answers look like? Nothing is read
from this installation but the demo itself; the verdicts are those of the service.
"""

from __future__ import annotations

import argparse
import json
import shlex
import sys
from collections.abc import Sequence
from typing import Any

from pathgate.demo import demo_configs, demo_graph
from pathgate.demo.asking import NoAnswer, ask_review
from pathgate.demo.table import Row, print_table, row_of

# Small enough to be read in the line that shows it: rain delays parcels and brings refunds by itself.
_FIRST_QUESTION = {
    "graph": {
        "nodes": ["weather", "late_delivery", "refund"],
        "edges": [
            {"source": "weather", "target": "late_delivery"},
            {"source": "weather", "target": "refund"},
            {"source": "late_delivery", "target": "refund"},
        ],
    },
    "config": {"treatment": "late_delivery", "outcome": "refund", "covariates": []},
}


def main(words: Sequence[str] | None = None) -> int:
    """Review the demo and print the table; the exit status, 0 where every config was reviewed."""
    url = _arguments(words).url.rstrip("/")
    try:
        rows = [_row(url, config) for config in demo_configs()]
    except NoAnswer as error:
        print(f"pathgate.demo: {error}", file=sys.stderr)  # noqa: T201 - this is a command
        return 1
    print_table(rows)
    print(f"The reference, as a page: {url}/docs\nTo ask by hand:\n{curl_line(url)}")  # noqa: T201
    return 0


def _row(url: str, config: dict[str, Any]) -> Row:
    answer = ask_review(url, demo_graph(), config)
    try:
        return row_of(answer)
    except (LookupError, TypeError, AttributeError):
        raise NoAnswer(f"what answers at {url} is not this service: it sent no whole review") from None


def curl_line(url: str) -> str:
    """One line for a shell that asks the service a small question.

    >>> print(curl_line("http://127.0.0.1:8080").split(" -d")[0])
    curl -s http://127.0.0.1:8080/v1/review -H 'Content-Type: application/json'
    """
    body = json.dumps(_FIRST_QUESTION, separators=(",", ":"))
    return shlex.join(["curl", "-s", f"{url}/v1/review", "-H", "Content-Type: application/json", "-d", body])


def _arguments(words: Sequence[str] | None) -> argparse.Namespace:
    parser = argparse.ArgumentParser(
        prog="python -m pathgate.demo", description="Have a running service review the demo configs."
    )
    parser.add_argument(
        "--url", default="http://127.0.0.1:8080", help="where the service is (default: %(default)s)"
    )
    return parser.parse_args(words)


if __name__ == "__main__":
    sys.exit(main())
