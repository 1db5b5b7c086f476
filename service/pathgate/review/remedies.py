"""What to change so that a biased config carries its effect: fewest changes first.

A change adds or drops one covariate, or drops one part of the row filter. What can never stay goes first.
Then every choice of up to ``EXHAUSTIVE`` further changes is tried, so that a small remedy is a smallest one;
past that, and past ``MOST_TRIALS`` trials, remedies are built from minimal valid sets instead. Every remedy
returned has been judged as the config itself is: applied, it reviews as sound.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import combinations

from pathgate.criteria.adjustment import Effect, is_valid, valid_set
from pathgate.criteria.deadline import Deadline
from pathgate.criteria.selection import Part
from pathgate.graphs.kinship import ancestors
from pathgate.graphs.masks import mask_of, members
from pathgate.review.claims import Claim

EXHAUSTIVE = 2
MOST_TRIALS = 2000
MOST_REMEDIES = 3


@dataclass(frozen=True, slots=True)
class Remedy:
    """A sound choice of covariates and filter parts near the config's own.

    Attributes:
        covariates: mask of all covariates to have.
        add, drop: masks of the changes to the config's covariates.
        drop_parts: the parts of the row filter to drop.
        keeps_rows: does a filter remain?
    """

    covariates: int
    add: int
    drop: int
    drop_parts: tuple[Part, ...]
    keeps_rows: bool

    @property
    def changes(self) -> int:
        """How many changes it asks for."""
        return self.add.bit_count() + self.drop.bit_count() + len(self.drop_parts)


def find_remedies(claim: Claim, deadline: Deadline) -> tuple[Remedy, ...]:
    """Up to ``MOST_REMEDIES`` remedies: at least one wherever the claim can be carried at all.

    Raises:
        OutOfTime: the deadline came first.
    """
    if not claim.can_be_carried:
        return ()
    start = _Choice(claim.usable_covariates, _parts_that_may_stay(claim))
    found = list(_nearest(claim, start, deadline)) or list(_built(claim, start, deadline))
    remedies = {(choice.covariates, choice.kept_places(claim)): _remedy(claim, choice) for choice in found}
    ordered = sorted(remedies.values(), key=lambda remedy: (remedy.changes, _cost(claim, remedy)))
    return tuple(ordered[:MOST_REMEDIES])


@dataclass(frozen=True, slots=True)
class _Choice:
    covariates: int
    parts: tuple[Part, ...]

    def kept_places(self, claim: Claim) -> tuple[int, ...]:
        kept = set(map(id, self.parts))
        return tuple(place for place, part in enumerate(claim.parts) if id(part) in kept)


def _parts_that_may_stay(claim: Claim) -> tuple[Part, ...]:
    """The filter less the parts that can never stay: unusable ones and those below a causal path."""
    if claim.row_filter_fixed:
        return claim.parts
    usable = filter(claim.can_filter_by, claim.parts)
    # A part's selection node is no ancestor of anything, so each can be judged by itself.
    effects = ((part, claim.effect_among([part])) for part in usable)
    return tuple(part for part, effect in effects if not effect.kept.conditioned & effect.forbidden)


def _nearest(claim: Claim, start: _Choice, deadline: Deadline) -> Iterator[_Choice]:
    """All sound choices with the fewest further changes, as far as these are few."""
    forbidden = claim.effect_among(start.parts).forbidden
    start = _Choice(start.covariates & ~forbidden, start.parts)
    left = MOST_TRIALS
    for changes in range(EXHAUSTIVE + 1):
        sound = []
        for choice, effect in _changed(claim, start, changes):
            left -= 1
            if left < 0:
                return
            deadline.poll()
            if is_valid(effect, choice.covariates):
                sound.append(choice)
        if sound:
            yield from sound
            return


def _changed(claim: Claim, start: _Choice, changes: int) -> Iterator[tuple[_Choice, Effect]]:
    """Every choice that many changes away, each with the effect on the rows it keeps."""
    candidates = list(members(_worth_changing(claim.effect_among(start.parts), start)))
    droppable = () if claim.row_filter_fixed else start.parts
    for parts_dropped in range(min(changes, len(droppable)) + 1):
        for dropped in combinations(droppable, parts_dropped):
            parts = tuple(part for part in start.parts if all(part is not gone for gone in dropped))
            effect = claim.effect_among(parts)
            for toggled in combinations(candidates, changes - parts_dropped):
                yield _Choice(start.covariates ^ mask_of(toggled), parts), effect


def _worth_changing(effect: Effect, start: _Choice) -> int:
    """Covariates to drop, and columns to add: only an ancestor of what is in question can block a path."""
    ends = effect.treatments | effect.outcomes
    relevant = ancestors(effect.back_door_graph, ends | start.covariates | effect.kept.conditioned)
    return (relevant & effect.usable & ~effect.kept.conditioned) | start.covariates


def _built(claim: Claim, start: _Choice, deadline: Deadline) -> Iterator[_Choice]:
    """Sound choices made from minimal valid sets: on the filter that may stay, and without a filter."""
    for parts in dict.fromkeys([start.parts, () if not claim.row_filter_fixed else start.parts]):
        deadline.poll()
        effect = claim.effect_among(parts)
        kept = start.covariates & ~effect.forbidden
        for required in (kept, 0):
            covariates = valid_set(effect, required=required)
            if covariates is not None:
                yield _Choice(covariates, parts)


def _remedy(claim: Claim, choice: _Choice) -> Remedy:
    kept = choice.kept_places(claim)
    return Remedy(
        covariates=choice.covariates,
        add=choice.covariates & ~claim.covariates,
        drop=claim.covariates & ~choice.covariates,
        drop_parts=tuple(part for place, part in enumerate(claim.parts) if place not in kept),
        keeps_rows=bool(kept),
    )


def _cost(claim: Claim, remedy: Remedy) -> float:
    return sum(claim.graph.cost(node) for node in members(remedy.covariates))
