"""What to change so that a biased config carries its effect: fewest changes first.

A change adds or drops one covariate, or drops one part of the row filter. What can never stay goes first.
Then every choice of one further change is tried, of two and so on, as long as all of that many fit in
``MOST_TRIALS`` (fewer on large graphs, where a trial takes longer): what is found so is smallest. Past that,
remedies are built from minimal valid sets, less every change that turns out not to be needed. Every remedy
returned has been judged as the config itself is: applied, it reviews as sound.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import combinations, islice
from math import comb

from pathgate.criteria.adjustment import Effect, is_valid, valid_set
from pathgate.criteria.deadline import Deadline
from pathgate.criteria.selection import Part
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.kinship import ancestors, descendants
from pathgate.graphs.masks import mask_of, members
from pathgate.review.claims import Claim

MOST_TRIALS = 1000
# Nodes and edges that all trials of one search together may look at.
MOST_WORK = 4_000_000
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
    parts = _parts_that_may_stay(claim)
    start = _Choice(claim.usable_covariates & ~claim.effect_among(parts).forbidden, parts)
    found = list(_nearest(claim, start, deadline)) or list(_built(claim, start, deadline))
    remedies = {(choice.covariates, choice.kept_places(claim)): _remedy(claim, choice) for choice in found}
    ordered = sorted(remedies.values(), key=lambda remedy: (remedy.changes, _cost(claim, remedy)))
    return tuple(ordered[:MOST_REMEDIES])


@dataclass(frozen=True, slots=True)
class _Choice:
    covariates: int
    parts: tuple[Part, ...]

    def keeps(self, part: Part) -> bool:
        return any(part is kept for kept in self.parts)

    def kept_places(self, claim: Claim) -> tuple[int, ...]:
        kept = set(map(id, self.parts))
        return tuple(place for place, part in enumerate(claim.parts) if id(part) in kept)


def _parts_that_may_stay(claim: Claim) -> tuple[Part, ...]:
    """The filter less the parts that can never stay: unusable ones and those below a causal path."""
    if claim.row_filter_fixed:
        return claim.parts
    below = descendants(claim.graph, claim.effect_among(()).on_causal_paths)
    return tuple(part for part in claim.parts if claim.can_filter_by(part) and not part.columns & below)


def _trials(graph: CausalGraph) -> int:
    edges = len(graph.sources) + len(graph.lower_ends)
    return min(MOST_TRIALS, MOST_WORK // (graph.size + edges + 1))


def _nearest(claim: Claim, start: _Choice, deadline: Deadline) -> Iterator[_Choice]:
    """All sound choices with the fewest further changes, as far as these are few."""
    candidates = tuple(members(_worth_changing(claim.effect_among(start.parts), start)))
    droppable = () if claim.row_filter_fixed else start.parts
    left = _trials(claim.graph)
    for changes in range(len(candidates) + len(droppable) + 1):
        left -= comb(len(candidates) + len(droppable), changes)
        if left < 0:
            return
        sound = []
        for choice, effect in _changed(claim, start, candidates, changes):
            deadline.poll()
            if is_valid(effect, choice.covariates):
                sound.append(choice)
        if sound:
            yield from sound
            return


def _changed(
    claim: Claim, start: _Choice, candidates: tuple[int, ...], changes: int
) -> Iterator[tuple[_Choice, Effect]]:
    """Every choice that many changes away, each with the effect on the rows it keeps."""
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
    without_filter = [] if claim.row_filter_fixed or not start.parts else [()]
    for parts in (start.parts, *without_filter):
        effect = claim.effect_among(parts)
        for required in (start.covariates, 0):
            deadline.poll()
            covariates = valid_set(effect, required=required)
            if covariates is not None:
                yield _trimmed(claim, start, _Choice(covariates, parts), deadline)


def _trimmed(claim: Claim, start: _Choice, choice: _Choice, deadline: Deadline) -> _Choice:
    """The choice less its changes that can be taken back, one after the other."""
    for node in islice(members(start.covariates ^ choice.covariates), _trials(claim.graph)):
        deadline.poll()
        nearer = _Choice(choice.covariates ^ 1 << node, choice.parts)
        if is_valid(claim.effect_among(nearer.parts), nearer.covariates):
            choice = nearer
    for dropped in islice((part for part in start.parts if not choice.keeps(part)), _trials(claim.graph)):
        deadline.poll()
        parts = tuple(part for part in start.parts if part is dropped or choice.keeps(part))
        if is_valid(claim.effect_among(parts), choice.covariates):
            choice = _Choice(choice.covariates, parts)
    return choice


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
