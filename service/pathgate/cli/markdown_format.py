"""A run in Markdown, for the comment under a change or the summary of a build: a table, then what is wrong.

No name can break the table, begin a link or an element of HTML: whatever Markdown might read is escaped.
"""

from __future__ import annotations

import re
from collections.abc import Iterator

from pathgate.cli.run import Item, Run
from pathgate.cli.wording import counts_text, fault_lines, finding_line, gone_text, outcome_text
from pathgate.review.visible import visible

_SPECIAL = re.compile(r"[\\`*_{}\[\]<>#|~@&$^!]")
# What begins a list, a line or a heading where it opens a line, and what begins a link of itself anywhere.
_OPENING = re.compile(r"^(\s*[0-9]*)([-+=.)])")
_ADDRESS = re.compile(r"(:|www)([/.])", re.IGNORECASE)


def run_markdown(run: Run) -> bytes:
    """The page."""
    return ("\n\n".join(_blocks(run)) + "\n").encode()


def _blocks(run: Run) -> Iterator[str]:
    yield f"## Pathgate: {outcome_text(run)}"
    yield escaped(counts_text(run))
    if run.faults:
        yield "\n".join(f"- {escaped(line)}" for line in fault_lines(run.faults))
    if run.items:
        rows = [
            "| Config | Outcome | Falls short | New | Known | Accepted | Where |",
            "|---|---|---|---|---|---|---|",
        ]
        yield "\n".join([*rows, *map(_row, run.items)])
    for item in run.items:
        yield from _details(item)
    notes = [*run.notes, *map(gone_text, run.gone)]
    if notes:
        yield "\n".join(f"- {escaped(note)}" for note in notes)


def _row(item: Item) -> str:
    standings = [each.standing for each in item.findings]
    numbers = [str(standings.count(standing)) for standing in ("new", "known", "accepted")]
    unjudged = "let pass" if item.is_let_pass else "not judged"
    short = unjudged if item.review is None else "yes" if item.falls_short else "no"
    cells = [escaped(item.name), item.outcome, short, *numbers, escaped(str(item.place))]
    return f"| {' | '.join(cells)} |"


def _details(item: Item) -> Iterator[str]:
    lines = list(_lines(item))
    if lines:
        yield f"### {escaped(item.name)}: {item.outcome}"
        yield "\n".join(lines)


def _lines(item: Item) -> Iterator[str]:
    if item.review is None:
        yield from (f"- {escaped(line.removeprefix('- '))}" for line in fault_lines(item.faults))
        return
    yield from (f"- {escaped(finding_line(finding))}" for finding in item.findings)
    for remedy in item.review["remedies"]:
        yield f"- {escaped(remedy['message'])}"


def escaped(text: str) -> str:
    """A text on one line that Markdown shows as it is.

    >>> print(escaped("a | b <script> `c` [d](e) *f*"))
    a \\| b \\<script\\> \\`c\\` \\[d\\](e) \\*f\\*
    """
    shown = _SPECIAL.sub(r"\\\g<0>", visible(text))
    return _OPENING.sub(r"\1\\\2", _ADDRESS.sub(r"\1\\\2", shown))
