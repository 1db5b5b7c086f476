"""Whose effect a covariate set carries: that of the rows kept, or that of everybody; one interface for both.

For the rows kept a set must be valid (``adjustment``); for everybody it must also undo the selection, alone or
with columns whose distribution over everybody is known (``whole``). Costs are those of the two modules; what no set
and what every set holds is asked of all columns at once for the rows kept, of one after the other for everybody.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Literal, Protocol

from pathgate.criteria.adjustment import Effect, covariates_in, is_valid, valid_set, valid_sets
from pathgate.criteria.deadline import Deadline
from pathgate.criteria.measuring import MeasureNext, measure_next
from pathgate.criteria.usability import needed_columns, unusable_columns
from pathgate.criteria.whole import (
    is_weightable,
    least_recovering_set,
    recovering_set,
    recovering_sets,
    recovers,
)
from pathgate.graphs.masks import mask_of, members

Least = Literal["smallest", "cheapest"]


class Population(Protocol):
    """What one can ask about covariate sets for an effect in a population. ``allowed`` and the like are masks.

    Raises:
        OutOfTime: whatever takes a deadline, when that came first.
    """

    @property
    def effect(self) -> Effect:
        """The effect, on the rows kept."""

    def carries(self, covariates: int) -> bool:
        """Does exactly this set carry the effect?"""

    def one(self, *, required: int = 0, allowed: int = -1) -> int | None:
        """A minimal set within the bounds, or None where none is."""

    def every_minimal(self, deadline: Deadline, *, required: int, allowed: int) -> Iterator[int]:
        """All minimal sets within the bounds, each once."""

    def least(self, prefer: Least, deadline: Deadline, *, required: int, allowed: int) -> int | None:
        """A set within the bounds of the fewest columns, or of the least cost."""

    def unusable(self, deadline: Deadline) -> int:
        """The measured columns, beside the forbidden, that no set can hold; none where there is no set."""

    def needed(self, deadline: Deadline) -> int:
        """The columns that every set holds; none where there is no set."""

    def measure_next(self, deadline: Deadline, *, required: int, allowed: int) -> MeasureNext | None:
        """What to measure so that there is a set, or None where nothing helps."""


@dataclass(frozen=True, slots=True)
class AmongKept:
    """The effect among the rows that were kept."""

    effect: Effect

    def carries(self, covariates: int) -> bool:
        return is_valid(self.effect, covariates)

    def one(self, *, required: int = 0, allowed: int = -1) -> int | None:
        return valid_set(self.effect, required=required, allowed=allowed)

    def every_minimal(self, deadline: Deadline, *, required: int, allowed: int) -> Iterator[int]:
        bounded = valid_sets(self.effect, required=required, allowed=allowed)
        if bounded is not None:
            for each in bounded.every_minimal(deadline):
                yield covariates_in(self.effect, each, required)

    def least(self, prefer: Least, deadline: Deadline, *, required: int, allowed: int) -> int | None:
        deadline.poll()
        bounded = valid_sets(self.effect, required=required, allowed=allowed)
        if bounded is None:
            return None
        found = bounded.smallest() if prefer == "smallest" else bounded.cheapest()
        return None if found is None else covariates_in(self.effect, found, required)

    def unusable(self, deadline: Deadline) -> int:
        return mask_of(each.node for each in unusable_columns(self.effect, deadline))

    def needed(self, deadline: Deadline) -> int:
        return needed_columns(self.effect, deadline)

    def measure_next(self, deadline: Deadline, *, required: int, allowed: int) -> MeasureNext | None:
        return measure_next(self.effect, deadline, required=required, allowed=allowed)


@dataclass(frozen=True, slots=True)
class InEverybody:
    """The effect in everybody, recovered from the kept rows and what is known of everybody (total effects only).

    Attributes:
        known: the columns whose joint distribution over everybody is known.
    """

    effect: Effect
    known: int = 0

    def carries(self, covariates: int) -> bool:
        return recovers(self.effect, covariates, self.known)

    def one(self, *, required: int = 0, allowed: int = -1) -> int | None:
        return recovering_set(self.effect, self.known, required=required, allowed=allowed)

    def every_minimal(self, deadline: Deadline, *, required: int, allowed: int) -> Iterator[int]:
        return recovering_sets(self.effect, self.known, deadline, required=required, allowed=allowed)

    def least(self, prefer: Least, deadline: Deadline, *, required: int, allowed: int) -> int | None:
        return least_recovering_set(
            self.effect, self.known, deadline, prefer=prefer, required=required, allowed=allowed
        )

    def unusable(self, deadline: Deadline) -> int:
        if self.one() is None:
            return 0
        found = 0
        for node in members(self.effect.usable):
            deadline.poll()
            if self.one(required=1 << node) is None:
                found |= 1 << node
        return found

    def needed(self, deadline: Deadline) -> int:
        found = 0
        for node in members(self.one() or 0):
            deadline.poll()
            if self.one(allowed=~(1 << node)) is None:
                found |= 1 << node
        return found

    def measure_next(self, deadline: Deadline, *, required: int, allowed: int) -> MeasureNext | None:
        if not is_weightable(self.effect, self.known, required=required, allowed=allowed):
            return None
        return measure_next(self.effect, deadline, required=required, allowed=allowed)
