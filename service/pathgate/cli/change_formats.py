"""A comparison of two graphs as text for people, as JSON, and as Markdown for the comment under a change."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import click

from pathgate.cli.changes import OUTCOMES, ChangeRun, Item, told
from pathgate.cli.files import shown
from pathgate.cli.finding import Json
from pathgate.cli.markdown_format import escaped
from pathgate.cli.run import Place
from pathgate.cli.wording import fault_lines
from pathgate.cli.writing import json_bytes
from pathgate.review.change_words import edge_text
from pathgate.review.hinges import plain_name
from pathgate.review.visible import visible

# Promises of one kind that are listed for people; more are counted.
_MOST_PROMISES = 20

_COLOURS = {"broken": "red", "mended": "green", "other-reason": "yellow", "same": "yellow"}
_HEADINGS = {
    0: "Pathgate: this change of graph breaks no config",
    1: "Pathgate: this change of graph breaks some config",
    2: "Pathgate: something could not be judged against the new graph",
}


def change_counts(run: ChangeRun) -> str:
    """How many configs were found and what became of them, and how many promises come and go, in one line.

    >>> change_counts(ChangeRun())
    '0 configs found: 0 broken, 0 mended, 0 other-reason, 0 same; 0 not judged.'
    """
    found = "1 config" if len(run.items) == 1 else f"{len(run.items):,} configs"
    outcomes = ", ".join(f"{run.counts[outcome]:,} {outcome}" for outcome in OUTCOMES)
    line = f"{found} found: {outcomes}; {run.not_judged:,} not judged."
    if run.differences is None:
        return line
    promises = run.differences["independencies"]
    least = "" if run.differences["complete"] else "at least "
    lost, gained = (f"{len(promises[side]):,} {side}" for side in ("lost", "gained"))
    return f"{line} Independencies: {least}{lost}, {gained}."


def change_text(run: ChangeRun, *, colour: bool = False) -> str:
    """A line for each config that changes or cannot be judged, what differs, and the counts."""
    lines = [line for item in told(run) for line in _item_lines(item, colour=colour)]
    for title, items in _sections(run):
        lines += [f"{title}:", *(f"  {visible(each)}" for each in items)]
    return "".join(f"{line}\n" for line in [*lines, change_counts(run)])


def change_json(run: ChangeRun) -> bytes:
    """The document of /v1/changes with all promises on one page, and beside it what only the command knows."""
    if run.problem is not None:
        return json_bytes(run.problem)
    gate = {
        "exit_status": run.exit_status,
        "counts": {
            "found": len(run.items),
            **{outcome.replace("-", "_"): run.counts[outcome] for outcome in OUTCOMES},
            "not_judged": run.not_judged,
        },
        "configs": [_place(item.place) for item in run.items],
    }
    return json_bytes(
        {"configs": [item.entry for item in run.items], **(run.differences or {}), "gate": gate}
    )


def change_markdown(run: ChangeRun) -> bytes:
    """A table of the configs, a sentence for each that changes, and what differs."""
    return ("\n\n".join(_blocks(run)) + "\n").encode()


def _item_lines(item: Item, *, colour: bool) -> Iterator[str]:
    outcome = item.entry["change"]
    word = (outcome if item.is_judged or outcome == "broken" else "not judged").upper()
    if colour:
        word = click.style(word, fg=_COLOURS[outcome], bold=True)
    yield f"{word}  {visible(item.entry['summary'])}"
    yield from (f"  {line}" for line in fault_lines(item.faults))


def _blocks(run: ChangeRun) -> Iterator[str]:
    yield f"## {_HEADINGS[run.exit_status]}"
    yield escaped(change_counts(run))
    if run.faults:
        yield "\n".join(f"- {escaped(line)}" for line in fault_lines(run.faults))
    if run.items:
        rows = [
            "| Config | Before | After | Change | Where |",
            "|---|---|---|---|---|",
            *map(_row, run.items),
        ]
        yield "\n".join(rows)
    sentences = [f"- {escaped(item.entry['summary'])}" for item in told(run)]
    if sentences:
        yield "\n".join(sentences)
    for title, items in _sections(run):
        yield f"### {title}"
        yield "\n".join(f"- {escaped(each)}" for each in items)


def _row(item: Item) -> str:
    sides = [item.entry[side] or "not judged" for side in ("before", "after")]
    cells = [escaped(item.entry["name"]), *sides, item.entry["change"], escaped(str(item.place))]
    return f"| {' | '.join(cells)} |"


def _sections(run: ChangeRun) -> Iterator[tuple[str, Sequence[str]]]:
    """What differs between the graphs, and which promises come and go, each under its title."""
    if run.differences is None:
        return
    edges, nodes = run.differences["edges"], run.differences["nodes"]
    changed = [f"{plain_name(each['node'])} ({', '.join(each['members'])})" for each in nodes["changed"]]
    listed = {
        "New nodes": [plain_name(name) for name in nodes["added"]],
        "Removed nodes": [plain_name(name) for name in nodes["removed"]],
        "Changed nodes": changed,
        "New edges": [_edge(edge) for edge in edges["added"]],
        "Removed edges": [_edge(edge) for edge in edges["removed"]],
    }
    for side, title in (
        ("lost", "Independencies no longer promised"),
        ("gained", "Independencies now promised"),
    ):
        promises = run.differences["independencies"][side]
        shown_promises = [_promise(each) for each in promises[:_MOST_PROMISES]]
        more = len(promises) - len(shown_promises)
        listed[title] = [*shown_promises, *([f"and {more:,} more"] if more else [])]
    yield from ((title, items) for title, items in listed.items() if items)


def _edge(edge: Json) -> str:
    return edge_text((edge["kind"], edge["source"], edge["target"]))


def _promise(promise: Json) -> str:
    given = ", ".join(map(plain_name, promise["given"]))
    return f"{plain_name(promise['x'])} and {plain_name(promise['y'])}" + (f" given {given}" if given else "")


def _place(place: Place) -> Json:
    region = place.region
    at = {"line": region.line, "column": region.column} if region else {}
    return {"file": shown(place.file), **at}
