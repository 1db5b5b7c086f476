"""The verdicts of several reviews as a table for people: what was judged, what breaks it, what to change."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from rich import box
from rich.console import Console
from rich.table import Table
from rich.text import Text

from pathgate.review.visible import visible

# Where no terminal says how wide it is.
WIDTH_ELSEWHERE = 100
_NARROWEST, _WIDEST = 60, 120

_STYLES = {"sound": "green", "biased": "red", "unanswerable": "magenta"}


@dataclass(frozen=True, slots=True)
class Row:
    """One row of the table, ready to be shown; ``broken_by`` has a line for the rule and one for the columns."""

    name: str
    verdict: str
    broken_by: str
    change: str


def row_of(review: dict[str, Any]) -> Row:
    """The row for an answer of ``/v1/review``: its first error and its first remedy."""
    errors = [each for each in review.get("findings", ()) if each.get("severity") == "error"]
    remedies = [each["message"] for each in review.get("remedies", ())]
    broken_by = (errors[0]["rule"], ", ".join(errors[0]["columns"])) if errors else ("nothing",)
    change = remedies[0].removeprefix("to mend it, ") if remedies else _without_remedy(review["verdict"])
    return Row(
        name=visible(review.get("name", "")),
        verdict=visible(review["verdict"]),
        broken_by="\n".join(map(visible, broken_by)),
        change=visible(change),
    )


def print_table(rows: Sequence[Row], console: Console | None = None) -> None:
    """Write the table to standard output; in colour on a terminal only."""
    console = console or _console()
    table = Table(box=box.SIMPLE_HEAD, pad_edge=False)
    table.add_column("config", no_wrap=True, max_width=_WIDEST // 4)
    table.add_column("verdict", no_wrap=True)
    table.add_column("what breaks it", overflow="fold")
    table.add_column("what to change", overflow="fold")
    for row in rows:
        style = _STYLES.get(row.verdict, "")
        table.add_row(Text(row.name), Text(row.verdict, style), Text(row.broken_by), Text(row.change))
    console.print(table)


def _console() -> Console:
    console = Console(highlight=False, emoji=False, markup=False)
    width = console.width if console.is_terminal else WIDTH_ELSEWHERE
    console.width = max(_NARROWEST, min(_WIDEST, width))
    return console


def _without_remedy(verdict: str) -> str:
    return "nothing" if verdict == "sound" else "no choice of measured columns mends it"
