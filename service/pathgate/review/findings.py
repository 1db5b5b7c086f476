"""What a review found: one finding for each thing wrong or worth knowing, each with its witness.

Its rule says how grave it is and what it means; its place, where in the config it comes from. Of the witnesses (an
open path, a causal path, a way down from one) it has those that its rule is about.
"""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date
from typing import Literal

from pathgate.criteria.paths import OpenPath
from pathgate.criteria.selection import Label
from pathgate.graphs.errors import Place
from pathgate.review.rules import RULES, Severity

Verdict = Literal["sound", "biased", "unanswerable"]


@dataclass(frozen=True, slots=True)
class Waiver:
    """Why a team accepts a finding, who answers for it, and until which day."""

    why: str
    owner: str = ""
    until: date | None = None


@dataclass(frozen=True, slots=True)
class Finding:
    """One thing found.

    Attributes:
        rule: the name of a rule in ``RULES``.
        columns: the columns to blame, in the graph's order.
        message: one or two plain sentences.
        place: where in the config the cause stands.
        part: the condition on the rows it is about, as written; None where it is about none.
        path: the open path that shows it.
        causal_path: the causal path, by labels, that a conditioned column lies on or descends from.
        descent: from a node of the causal path down to what is conditioned on.
        accepted: the waiver that accepts it; it never changes a verdict.
    """

    rule: str
    columns: tuple[str, ...]
    message: str
    place: Place
    part: object = None
    path: OpenPath | None = None
    causal_path: tuple[Label, ...] = ()
    descent: tuple[Label, ...] = ()
    accepted: Waiver | None = None

    @property
    def severity(self) -> Severity:
        """How grave it is: with an ``error`` the config is not sound."""
        return RULES[self.rule].severity
