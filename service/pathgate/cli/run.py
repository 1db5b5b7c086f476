"""What came of one run of the gate: every config found, its findings as the gate weighs them, and the exit status.

All that is shown, in whatever format, is taken from here alone, so that no two formats can disagree.
Exit status: 0 nothing falls short, 1 some config does, 2 something could not be judged, which outranks 1.
"""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import Any, Literal

from pathgate.cli.baseline import Entry
from pathgate.cli.choices import FailOn
from pathgate.cli.files import shown
from pathgate.cli.spots import Region

Json = dict[str, Any]
Standing = Literal["new", "known", "accepted", "aside"]
"""``new`` makes its config fall short; ``known`` is in the baseline, ``accepted`` is waived in the config; ``aside``
is too mild to count."""

NOTHING_SHORT, FALLS_SHORT, NOT_JUDGED = 0, 1, 2
VERDICTS = ("sound", "biased", "unanswerable")


@dataclass(frozen=True, slots=True)
class Place:
    """A file, and where in it."""

    file: Path
    region: Region | None = None

    def __str__(self) -> str:
        """As ``file:line:column``, which editors and terminals follow."""
        region = self.region
        return shown(self.file) + (f":{region.line}:{region.column}" if region else "")


@dataclass(frozen=True, slots=True)
class Weighed:
    """A finding of a review.

    Attributes:
        document: as the review has it.
        place: where its cause stands.
        standing: what the gate makes of it.
    """

    document: Json
    place: Place
    standing: Standing

    @property
    def rule(self) -> str:
        """The rule that is broken."""
        return str(self.document["rule"])

    @property
    def severity(self) -> str:
        """``error``, ``warning`` or ``note``."""
        return str(self.document["severity"])

    @property
    def message(self) -> str:
        """One or two plain sentences."""
        return str(self.document["message"])

    @property
    def columns(self) -> tuple[str, ...]:
        """The columns to blame."""
        return tuple(self.document["columns"])

    @property
    def waiver(self) -> Json | None:
        """Why, by whom and until when it is accepted; None where it is not."""
        found: Json | None = self.document.get("accepted")
        return found


@dataclass(frozen=True, slots=True)
class Fault:
    """One reason why something could not be judged; without a place where the text names none."""

    message: str
    place: Place


@dataclass(frozen=True, slots=True)
class Item:
    """One config, and exactly one of its review and its problem.

    Attributes:
        name: what the config calls itself, else where it stands.
        place: where it stands.
        review: the document of /v1/review.
        problem: the document of the problem, without ``instance``: there was no request.
        findings: those of the review, in its order.
        faults: what the problem is, at least one.
        is_skipped: was it left alone because of something else (the graph, the baseline)?
        is_let_pass: does it pass although nobody judged it, because the caller wanted that?
    """

    name: str
    place: Place
    review: Json | None = None
    problem: Json | None = None
    findings: tuple[Weighed, ...] = ()
    faults: tuple[Fault, ...] = ()
    is_skipped: bool = False
    is_let_pass: bool = False

    @property
    def outcome(self) -> str:
        """The verdict, ``skipped`` or ``not judged``."""
        if self.review is None:
            return "skipped" if self.is_skipped else "not judged"
        return str(self.review["verdict"])

    @property
    def falls_short(self) -> bool:
        """Is anything found that counts and is neither accepted nor known?"""
        if self.review is None:
            return False
        # A verdict that rests on no error would be a fault of ours, and must not pass for that.
        is_unexplained = self.outcome != "sound" and all(each.severity != "error" for each in self.findings)
        return is_unexplained or any(each.standing == "new" for each in self.findings)


@dataclass(frozen=True, slots=True)
class Counts:
    """How many configs were found and how they ended; and how many findings that count are what.

    Those skipped and those let pass are among those not judged.
    """

    found: int
    reviewed: int
    verdicts: Counter[str]
    not_judged: int
    skipped: int
    let_pass: int
    new: int
    known: int
    accepted: int


@dataclass(frozen=True)
class Run:
    """All configs in order.

    Attributes:
        items: one for each config found, and for each name that stands for none.
        problem: why nothing could be judged at all.
        faults: what that problem is, with places.
        fail_on: from which severity on a finding counts.
        baseline: the file of what was known before; None where there is none.
        gone: entries of it that no longer occur.
        notes: what else to say of it, in sentences.
        shows_hinges: were machines to be told what sound verdicts hinge on?
    """

    items: tuple[Item, ...] = ()
    problem: Json | None = None
    faults: tuple[Fault, ...] = ()
    fail_on: FailOn = "error"
    baseline: Path | None = None
    gone: tuple[Entry, ...] = ()
    notes: tuple[str, ...] = ()
    shows_hinges: bool = False

    @cached_property
    def counts(self) -> Counts:
        """How they ended."""
        outcomes = Counter(item.outcome for item in self.items)
        standings = Counter(each.standing for item in self.items for each in item.findings)
        judged = {verdict: outcomes[verdict] for verdict in VERDICTS}
        return Counts(
            found=len(self.items),
            reviewed=sum(judged.values()),
            verdicts=Counter(judged),
            not_judged=outcomes["not judged"] + outcomes["skipped"],
            skipped=outcomes["skipped"],
            let_pass=sum(item.is_let_pass for item in self.items),
            new=standings["new"],
            known=standings["known"],
            accepted=standings["accepted"],
        )

    @property
    def exit_status(self) -> int:
        """What the command ends with."""
        if self.problem or not self.items or self.counts.reviewed + self.counts.let_pass < len(self.items):
            return NOT_JUDGED
        return FALLS_SHORT if any(item.falls_short for item in self.items) else NOTHING_SHORT
