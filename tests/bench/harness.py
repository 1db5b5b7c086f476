"""Times two things in turn and tells how their times compare.

Machines are noisy and drift, so a time by itself says little: each round runs the peer and then us, and the
median of the rounds' ratios is the figure. ``wanted`` is what the project promises, told beside what was seen.
"""

from __future__ import annotations

import gc
import math
import statistics
import time
from collections.abc import Callable, Sequence
from dataclasses import dataclass

Work = Callable[[], object]


@dataclass(frozen=True, slots=True)
class Figure:
    """One line of the table.

    Attributes:
        what: what was measured.
        peer: what it is compared with.
        seen: the ratio, so that ``wanted`` can be read beside it.
        wanted: ``"<= 4"`` or ``">= 10"``.
        ours, theirs: median seconds (or whatever ``unit`` says) of the two.
    """

    what: str
    peer: str
    seen: float
    wanted: str
    ours: float
    theirs: float
    unit: str = "s"

    @property
    def is_kept(self) -> bool:
        """Is the promise kept in this run?"""
        sign, bound = self.wanted.split()
        return self.seen <= float(bound) if sign == "<=" else self.seen >= float(bound)


def times_faster(what: str, ours: Work, peer: str, theirs: Work, *, wanted: str, rounds: int = 7) -> Figure:
    """How many times faster than the peer we are."""
    return _paired(what, ours, peer, theirs, wanted, rounds, is_slowdown=False)


def times_slower(what: str, ours: Work, peer: str, theirs: Work, *, wanted: str, rounds: int = 7) -> Figure:
    """How many times as long as a floor we take."""
    return _paired(what, ours, peer, theirs, wanted, rounds, is_slowdown=True)


def median_seconds(work: Work, rounds: int = 7) -> float:
    """The median of several runs, after one that is not counted."""
    work()
    return statistics.median(seconds(work) for _ in range(rounds))


def growth_exponent(sizes: Sequence[int], seconds: Sequence[float]) -> float:
    """The slope of log time over log size (least squares): 1 is linear."""
    return statistics.linear_regression([math.log(n) for n in sizes], [math.log(s) for s in seconds]).slope


def table(figures: Sequence[Figure]) -> str:
    """The figures, one a line."""
    rows = [("", "what", "against", "ratio", "wanted", "ours", "theirs")]
    rows += [
        (
            "ok" if figure.is_kept else "SHORT",
            figure.what,
            figure.peer,
            f"{figure.seen:.3g}",
            figure.wanted,
            f"{figure.ours:.4g} {figure.unit}",
            f"{figure.theirs:.4g} {figure.unit}",
        )
        for figure in figures
    ]
    widths = [max(len(row[column]) for row in rows) for column in range(len(rows[0]))]
    return "\n".join(
        "  ".join(cell.ljust(width) for cell, width in zip(row, widths, strict=True)) for row in rows
    )


def _paired(
    what: str, ours: Work, peer: str, theirs: Work, wanted: str, rounds: int, *, is_slowdown: bool
) -> Figure:
    ours(), theirs()
    pairs = [(seconds(theirs), seconds(ours)) for _ in range(rounds)]
    ratios = [our / their if is_slowdown else their / our for their, our in pairs]
    return Figure(
        what=what,
        peer=peer,
        seen=statistics.median(ratios),
        wanted=wanted,
        ours=statistics.median(our for _their, our in pairs),
        theirs=statistics.median(their for their, _our in pairs),
    )


def seconds(work: Work) -> float:
    """How long one run takes; what was left over before it is cleared away first."""
    gc.collect()
    began = time.perf_counter()
    work()
    return time.perf_counter() - began
