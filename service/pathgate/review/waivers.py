"""Which findings does a team accept, and which of its waivers accept nothing?

A waiver never changes a verdict. It holds where it gives a reason, has not run out and names a rule that may be
waived; where it does not hold, or meets no finding, that is a finding itself, so that none is ever silent.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from datetime import UTC, date, datetime
from typing import Any

from pathgate.graphs.errors import Fault, Place
from pathgate.graphs.names import did_you_mean, quoted
from pathgate.review.findings import Finding, Waiver
from pathgate.review.names import NameReader
from pathgate.review.rules import RULES
from pathgate.review.wording import listed


@dataclass(frozen=True, slots=True)
class Acceptance:
    """A waiver in a config and what it is about.

    Attributes:
        rule: the rule whose findings it accepts.
        columns: the names of the columns that such a finding blames; empty where any may be blamed.
        waiver: reason, owner, last day.
        place: where the config has it.
    """

    rule: str
    columns: frozenset[str]
    waiver: Waiver
    place: Place

    def is_about(self, finding: Finding) -> bool:
        """Would it accept this finding?"""
        return finding.rule == self.rule and self.columns in (frozenset(), frozenset(finding.columns))


def understand_waivers(said: Mapping[str, Any], names: NameReader) -> tuple[Acceptance, ...]:
    """The waivers of a config; an unknown rule, an unknown column and a date that is none are faults."""
    found = []
    for k, waiver in enumerate(said.get("accept", ())):
        place: Place = ("accept", k)
        rule = waiver["rule"]
        if rule not in RULES:
            detail = f"no rule is named {quoted(rule)}{did_you_mean(rule, list(RULES))}"
            names.faults.append(Fault("invalid-request", (*place, "rule"), detail))
        columns = waiver.get("columns", ())
        names.read(columns, (*place, "columns"))
        found.append(
            Acceptance(
                rule,
                frozenset(
                    _blamed(name, names) for name in ([columns] if isinstance(columns, str) else columns)
                ),
                Waiver(waiver.get("why", ""), waiver.get("owner", ""), _day(waiver, names.faults, place)),
                place,
            )
        )
    return tuple(found)


def _blamed(name: str, names: NameReader) -> str:
    """How findings call what a waiver names."""
    node = names.find(name)
    return name if node is None else names.graph.name(node)


def _day(waiver: Mapping[str, Any], faults: list[Fault], place: Place) -> date | None:
    if "until" not in waiver:
        return None
    try:
        return date.fromisoformat(waiver["until"])
    except ValueError:
        detail = f"{quoted(waiver['until'])} is no day of the calendar"
        faults.append(Fault("invalid-request", (*place, "until"), detail))
        return None


def accept(
    findings: Sequence[Finding], waivers: Sequence[Acceptance], today: date | None = None
) -> list[Finding]:
    """The findings, those that are accepted marked so, and after them one for each waiver that accepts nothing."""
    if not waivers:
        return list(findings)
    day = today or datetime.now(UTC).date()
    holding = [each for each in waivers if not _why_not(each, day)]
    marked = [_marked(finding, holding) for finding in findings]
    return [*marked, *(told for each in waivers for told in _told(each, findings, day))]


def _marked(finding: Finding, holding: Sequence[Acceptance]) -> Finding:
    waiver = next((each.waiver for each in holding if each.is_about(finding)), None)
    return finding if waiver is None else replace(finding, accepted=waiver)


def _told(waiver: Acceptance, findings: Sequence[Finding], day: date) -> Iterator[Finding]:
    about = next((finding for finding in findings if waiver.is_about(finding)), None)
    columns = about.columns if about else tuple(sorted(waiver.columns))
    reason = _why_not(waiver, day)
    if reason:
        rule, message = reason
        yield Finding(rule, columns, message, waiver.place)
    elif about is None:
        which = f" that blames {listed(columns)}" if columns else ""
        message = f"The waiver for {quoted(waiver.rule)} accepts nothing: there is no such finding{which}. Take it out."
        yield Finding("waiver-unused", columns, message, waiver.place)


def _why_not(waiver: Acceptance, day: date) -> tuple[str, str] | None:
    """The rule and the message for a waiver that does not hold."""
    if not RULES[waiver.rule].may_be_waived:
        message = f"Findings of {quoted(waiver.rule)} cannot be accepted: no number can mean anything where one stands."
        return "waiver-not-allowed", message
    if not waiver.waiver.why.strip():
        message = f"The waiver for {quoted(waiver.rule)} gives no reason (why), and so accepts nothing."
        return "waiver-without-reason", message
    until = waiver.waiver.until
    if until is not None and until < day:
        message = (
            f"The waiver for {quoted(waiver.rule)} ran out on {until.isoformat()}, and so accepts nothing."
        )
        return "waiver-expired", message
    return None
