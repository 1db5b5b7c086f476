"""The sentences that several formats share, so that all of them say the same."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from pathgate.cli.baseline import Entry
from pathgate.cli.run import FALLS_SHORT, NOT_JUDGED, NOTHING_SHORT, VERDICTS, Fault, Run, Weighed
from pathgate.review.visible import visible

# Faults of one config that are listed; more are counted.
_MOST_FAULTS = 10

_OUTCOMES = {
    NOTHING_SHORT: "no config falls short",
    FALLS_SHORT: "some config falls short",
    NOT_JUDGED: "something could not be judged",
}


def counts_text(run: Run) -> str:
    """How many configs were found and how they ended, and how many findings that count are new, in one line.

    >>> counts_text(Run())
    '0 configs found, 0 reviewed: 0 sound, 0 biased, 0 unanswerable; 0 not judged. Errors: 0 new, 0 known, 0 accepted.'
    """
    counts = run.counts
    verdicts = ", ".join(f"{counts.verdicts[verdict]} {verdict}" for verdict in VERDICTS)
    configs = "1 config" if counts.found == 1 else f"{counts.found} configs"
    aside = ((counts.skipped, "skipped"), (counts.let_pass, "let pass"))
    how = ", ".join(f"{number} {word}" for number, word in aside if number)
    of_these = f" ({how})" if how else ""
    counted = "Errors" if run.fail_on == "error" else "Errors and warnings"
    return (
        f"{configs} found, {counts.reviewed} reviewed: {verdicts}; {counts.not_judged} not judged{of_these}."
        f" {counted}: {counts.new} new, {counts.known} known, {counts.accepted} accepted."
    )


def outcome_text(run: Run) -> str:
    """What the exit status says, in a few words.

    >>> outcome_text(Run())
    'something could not be judged'
    """
    if run.exit_status == NOTHING_SHORT and run.counts.let_pass:
        return f"no config that was judged falls short, and {run.counts.let_pass:,} let pass were not judged"
    return _OUTCOMES[run.exit_status]


def let_pass_text(run: Run) -> str:
    """That configs pass which nobody judged; empty where none do."""
    if not run.counts.let_pass:
        return ""
    return f"Not judged and let pass, since the service is out of reach and the call says so: {run.counts.let_pass:,}."


def fault_lines(faults: Sequence[Fault]) -> list[str]:
    """What keeps something from being judged: a line, and below it each fault where it is not the only one."""
    lines = [_fault_line(fault) for fault in faults]
    if len(lines) < 2:
        return lines
    listed = lines[:_MOST_FAULTS]
    more = [f"and {len(lines) - len(listed):,} more"] if len(lines) > len(listed) else []
    return [f"{len(lines):,} faults:", *(f"- {line}" for line in [*listed, *more])]


def finding_line(finding: Weighed) -> str:
    """A finding with its place, and why it is accepted where it is."""
    waiver = f" [{waiver_text(finding.waiver)}]" if finding.waiver else ""
    word = "known " if finding.standing == "known" else "accepted " if finding.waiver else ""
    return f"{word}{finding.severity} {finding.rule} at {finding.place}: {finding.message}{waiver}"


def waiver_text(waiver: Mapping[str, Any]) -> str:
    """Why a finding is accepted, by whom and until when."""
    owner = f" by {waiver['owner']}" if waiver.get("owner") else ""
    until = f" until {waiver['until']}" if waiver.get("until") else ""
    return f"Accepted{owner}{until}: {waiver.get('why') or 'no reason given'}"


def gone_text(entry: Entry) -> str:
    """That an entry of the baseline can be taken out."""
    config = f" of {entry.config}" if entry.config else ""
    columns = f" ({', '.join(entry.columns)})" if entry.columns else ""
    return f"No longer found, and still in the baseline: {entry.rule}{columns} in {entry.file}{config}."


def _fault_line(fault: Fault) -> str:
    # A sentence without a pointer says its place itself.
    at = f" (at {fault.place})" if fault.place.region and fault.message.startswith("#") else ""
    return visible(fault.message + at)
