"""Which of many changes did it? A set that still does, and none of whose proper subsets does.

Delta debugging (Zeller & Hildebrandt 2002): changes are taken away, first in halves, then in ever smaller parts, then
one by one, as long as the outcome stays what it is. Where taking one away can undo what another did (an arrow turned
round, a column no longer measured), that alone would not show that no smaller set does it; so what is left is held
against all its proper subsets. A set of changes is a mask. At most ``MOST_TRIALS`` outcomes are looked at.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from itertools import combinations

from pathgate.criteria.errors import OutOfTime
from pathgate.graphs.masks import mask_of, members

MOST_TRIALS = 256


@dataclass(frozen=True, slots=True)
class Culprits:
    """A set of changes that has the outcome; ``is_least`` where it is known that no proper subset has it."""

    changes: int
    is_least: bool


def least_changes(
    everything: int, has_outcome: Callable[[int], bool], *, first: int = 0, most: int = MOST_TRIALS
) -> Culprits:
    """A least set of changes that has the outcome.

    Args:
        everything: all changes; they are known to have the outcome, and none of them not to have it.
        has_outcome: has a set of changes the outcome? May raise ``OutOfTime``, which ends the search.
        first: changes that are likely to have no part in it, and are taken away first, together.
        most: how many sets to look at.

    >>> least_changes(0b11111, lambda chosen: chosen & 0b01010 == 0b01010)
    Culprits(changes=10, is_least=True)
    """
    search = _Search(everything, has_outcome, most)
    try:
        search.drop(first)
        search.drop_parts()
        search.look_below()
    except (_Enough, OutOfTime):
        return Culprits(search.left, is_least=False)
    return Culprits(search.left, is_least=True)


class _Enough(Exception):
    """As many sets as may be looked at have been."""


@dataclass(slots=True)
class _Search:
    """What is left of the changes, always with the outcome."""

    left: int
    has_outcome: Callable[[int], bool]
    trials_left: int
    lacking: set[int] = field(default_factory=set)

    def drop(self, part: int) -> bool:
        """Take some of the changes away, if the outcome stays."""
        rest = self.left & ~part
        if rest == self.left or not self._has(rest):
            return False
        self.left = rest
        return True

    def drop_parts(self) -> None:
        """Take halves away, then quarters, and so on; then one by one until none can go."""
        size = self.left.bit_count() // 2
        while size > 1:
            self._drop_each(size)
            size = min(size, self.left.bit_count()) // 2
        while self._drop_each(1):
            pass

    def _drop_each(self, size: int) -> bool:
        """Go once through all parts of a size; did any go?"""
        return sum(self.drop(part) for part in _parts(self.left, size)) > 0

    def look_below(self) -> None:
        """Go on to a smaller set, if any proper subset has the outcome."""
        count = self.left.bit_count()
        for size in range(1, count - 1):
            for chosen in combinations(members(self.left), size):
                subset = mask_of(chosen)
                if self._has(subset):
                    # All smaller sets, those below this one among them, have been looked at.
                    self.left = subset
                    return

    def _has(self, chosen: int) -> bool:
        if chosen == 0 or chosen in self.lacking:
            return False
        if self.trials_left == 0:
            raise _Enough
        self.trials_left -= 1
        found = self.has_outcome(chosen)
        if not found:
            self.lacking.add(chosen)
        return found


def _parts(mask: int, size: int) -> Iterator[int]:
    """The changes in groups of ``size``, in their order."""
    places = list(members(mask))
    for start in range(0, len(places), size):
        yield mask_of(places[start : start + size])
