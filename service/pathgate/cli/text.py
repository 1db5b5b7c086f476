"""An outcome as text for people: what is wrong with each config, why, and what to change.

Written for whoever keeps the pipeline and has never heard of a collider. Nothing that a file says can steer the
terminal: unprintable characters are shown by their numbers.
"""

from __future__ import annotations

import textwrap
from collections.abc import Callable, Iterator
from typing import Any

import click

from pathgate.cli.run import Item, Run, Weighed
from pathgate.cli.wording import counts_text, fault_lines, gone_text, waiver_text
from pathgate.review.visible import visible

Json = dict[str, Any]
Wrap = Callable[[str, str], str]

# Sentences that a sound verdict hinges on that are listed; more are counted.
_MOST_HINGES = 8

_MEANINGS = {
    "sound": "If the graph is right, the number that this model reports is the effect it is read as.",
    "biased": "The number that this model reports is not the effect it is read as. This can be mended.",
    "unanswerable": "The number that this model reports is not the effect it is read as, and no choice of the"
    " columns that the platform holds makes it so.",
}
_COLOURS = {
    "sound": "green",
    "biased": "red",
    "unanswerable": "magenta",
    "not judged": "yellow",
    "skipped": "yellow",
}
_HOW_TO_READ_PATHS = (
    "In paths: → leads from cause to effect, ↔ joins two columns that share a cause nobody measures, [x] is held"
    " fixed by the model or the filter, (x) is not measured, {x} is a condition on the rows."
)


def run_text(run: Run, *, width: int | None = None, colour: bool = False) -> str:
    """Every item, what they have in common once, and how they ended.

    Args:
        width: where to break lines; None breaks none, so that each finding stays on a line of its own.
        colour: mark verdicts by colour beside the words.
    """
    wrap = _wrapper(width)
    blocks = [] if run.problem else ["\n".join(_item_lines(item, wrap, colour=colour)) for item in run.items]
    blocks += [wrap("", note) for note in _common_notes(run)]
    return "\n\n".join([*blocks, counts_text(run)]) + "\n"


def _item_lines(item: Item, wrap: Wrap, *, colour: bool) -> Iterator[str]:
    verdict = item.outcome.upper()
    if colour:
        verdict = click.style(verdict, fg=_COLOURS[item.outcome], bold=True)
    yield f"{verdict}  {visible(item.name)}"
    if item.review is None:
        yield from (wrap("  ", line) for line in fault_lines(item.faults))
        return
    yield wrap("  ", _MEANINGS[item.outcome])
    for finding in item.findings:
        yield from (wrap("  ", line) for line in _finding_lines(finding))
    if item.outcome != "sound" and not item.falls_short:
        yield wrap("  ", "It does not fail: every error is accepted or known.")
    yield from (wrap("  ", line) for line in _remedy_lines(item.review["remedies"]))
    yield from (wrap("  ", line) for line in _measuring_lines(item.review.get("measure_next")))
    yield from (wrap("  ", line) for line in _doubtful_lines(item.review.get("doubtful")))
    yield from (wrap("  ", line) for line in _hinge_lines(item.review.get("hinges_on")))


def _finding_lines(finding: Weighed) -> Iterator[str]:
    word = "known " if finding.standing == "known" else "accepted " if finding.waiver else ""
    at = visible(str(finding.place))
    yield f"{word}{finding.severity} {finding.rule} at {at}: {visible(finding.message)}"
    if finding.waiver:
        yield f"- {visible(waiver_text(finding.waiver))}"


def _measuring_lines(found: Json | None) -> Iterator[str]:
    """What would have to be measured, where nothing that is measured will do."""
    if found is not None:
        causes = [f"what {first} and {second} have in common" for first, second in found["causes_of"]]
        yield f"It could be answered if this were measured: {visible(', '.join([*found['measure'], *causes]))}."


def _doubtful_lines(found: Json | None) -> Iterator[str]:
    """On which of the edges in doubt it depends whether the config is sound."""
    if found is not None and found["verdict"] == "depends":
        arrows = {"directed": "→", "bidirected": "↔"}
        edges = [f"{edge['source']} {arrows[edge['kind']]} {edge['target']}" for edge in found["depends_on"]]
        yield f"Whether it is sound depends on edges marked as doubtful: {visible(', '.join(edges))}."


def _hinge_lines(found: Json | None) -> Iterator[str]:
    """What one must believe is absent for a sound verdict to stand."""
    absent = found["absent_edges"] if found else []
    if absent:
        yield "The verdict hinges on every one of these being true:"
        yield from (f"- {visible(edge['question'])}" for edge in absent[:_MOST_HINGES])
    if len(absent) > _MOST_HINGES:
        yield f"… {len(absent) - _MOST_HINGES:,} more"


def _remedy_lines(remedies: list[Json]) -> Iterator[str]:
    steps = [visible(remedy["message"]).removeprefix("to mend it, ") for remedy in remedies]
    if len(steps) == 1:
        yield f"To mend it: {steps[0]}."
    elif steps:
        yield "To mend it, do one of these:"
        yield from (f"- {step}" for step in steps)


def _common_notes(run: Run) -> Iterator[str]:
    reviews = [item.review for item in run.items if item.review is not None]
    findings = [finding for review in reviews for finding in review["findings"]]
    if any("open_path" in finding or "causal_path" in finding for finding in findings):
        yield _HOW_TO_READ_PATHS
    cautions = dict.fromkeys(caution for review in reviews for caution in review["cautions"])
    if cautions:
        yield " ".join(cautions)
    yield from (visible(gone_text(entry)) for entry in run.gone)
    yield from run.notes


def _wrapper(width: int | None) -> Wrap:
    if width is None:
        return lambda indent, text: indent + text
    return lambda indent, text: textwrap.fill(
        text,
        width,
        initial_indent=indent,
        subsequent_indent=indent + "  " if indent else "",
        break_long_words=False,
        break_on_hyphens=False,
    )
