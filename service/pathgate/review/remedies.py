"""What to change so that a biased config carries its effect: fewest changes first.

A change adds or drops one covariate, drops one column's fixed effects, or drops one part of the row filter. What can
never stay goes first. Then the nearest sound choices are looked for (``nearest``), as long as no more than
``MOST_TRIALS`` have to be judged (fewer on large graphs, where that takes longer): what is found so is smallest. Past
that, remedies are built from minimal valid sets, less every change that turns out not to be needed. Every remedy
returned has been judged as the config itself is: applied, it reviews as sound.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace
from itertools import islice

from pathgate.criteria.deadline import Deadline
from pathgate.criteria.selection import Part
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.kinship import descendants
from pathgate.graphs.masks import mask_of, members
from pathgate.review.claims import Choice, Claim
from pathgate.review.nearest import key_of, nearest_sound

MOST_TRIALS = 300
# Nodes and edges that all trials of one search together may look at.
MOST_WORK = 4_000_000
MOST_REMEDIES = 3


@dataclass(frozen=True, slots=True)
class Remedy:
    """A sound choice of what to adjust for and filter by near the config's own.

    Attributes:
        covariates: mask of all covariates to have, by weights and matching included.
        fixed_effects: mask of the columns whose fixed effects stay.
        add, drop: masks of the changes to what the config adjusts for, in whichever way.
        drop_parts: the parts of the row filter to drop.
        keeps_rows: does a filter remain?
    """

    covariates: int
    fixed_effects: int
    add: int
    drop: int
    drop_parts: tuple[Part, ...]
    keeps_rows: bool

    @property
    def adjusted_for(self) -> int:
        """All columns to adjust for, in whichever way."""
        return self.covariates | self.fixed_effects

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
    start = _start(claim)
    found = nearest_sound(claim, start, deadline, _trials(claim.graph)) or list(
        _built(claim, start, deadline)
    )
    remedies = {key_of(claim, choice): _remedy(claim, choice) for choice in found}
    ordered = sorted(
        (found for _key, found in sorted(remedies.items())),
        key=lambda remedy: (remedy.changes, _cost(claim, remedy)),
    )
    return tuple(ordered[:MOST_REMEDIES])


def _start(claim: Claim) -> Choice:
    """The config less what can never stay: unusable and forbidden columns, parts that have to go."""
    parts = _parts_that_may_stay(claim)
    barred = claim.effect_among(parts).forbidden | claim.ends
    fixed = mask_of(
        node
        for node in members(claim.usable.fixed_effects & ~barred)
        if not claim.absorbed(1 << node) & barred
    )
    return Choice(claim.usable.covariates & ~barred, fixed, parts)


def _keeps(choice: Choice, part: Part) -> bool:
    return any(part is kept for kept in choice.parts)


def _parts_that_may_stay(claim: Claim) -> tuple[Part, ...]:
    """The filter less the parts that can never stay: unusable ones and those below a causal path."""
    if claim.row_filter_fixed:
        return claim.parts
    below = descendants(claim.graph, claim.effect_among(()).on_causal_paths)
    return tuple(part for part in claim.parts if claim.can_filter_by(part) and not part.columns & below)


def _trials(graph: CausalGraph) -> int:
    edges = len(graph.sources) + len(graph.lower_ends)
    return min(MOST_TRIALS, MOST_WORK // (graph.size + edges + 1))


def _built(claim: Claim, start: Choice, deadline: Deadline) -> Iterator[Choice]:
    """Sound choices made from minimal valid sets: on the filter that may stay, and without a filter."""
    without_filter = [] if claim.row_filter_fixed or not start.parts else [()]
    for parts in (start.parts, *without_filter):
        for required in (start.covariates, 0):
            deadline.poll()
            choice = next(claim.choices(parts, required), None)
            if choice is not None:
                yield _trimmed(claim, start, choice, deadline)


def _trimmed(claim: Claim, start: Choice, choice: Choice, deadline: Deadline) -> Choice:
    """The choice less its changes that can be taken back, one after the other."""
    for node in islice(members(start.covariates ^ choice.covariates), _trials(claim.graph)):
        deadline.poll()
        nearer = replace(choice, covariates=choice.covariates ^ 1 << node)
        if claim.is_carried_by(nearer):
            choice = nearer
    for dropped in islice((part for part in start.parts if not _keeps(choice, part)), _trials(claim.graph)):
        deadline.poll()
        parts = tuple(part for part in start.parts if part is dropped or _keeps(choice, part))
        nearer = replace(choice, parts=parts)
        if claim.is_carried_by(nearer):
            choice = nearer
    return choice


def _remedy(claim: Claim, choice: Choice) -> Remedy:
    kept = key_of(claim, choice)[2]
    adjusted = choice.covariates | choice.fixed_effects
    return Remedy(
        covariates=choice.covariates,
        fixed_effects=choice.fixed_effects,
        # A column may cease to be a fixed effect and be adjusted for as it is: both dropped and added.
        add=adjusted & ~claim.adjusted_for | choice.covariates & ~claim.covariates,
        drop=claim.covariates & ~choice.covariates | claim.fixed_effects & ~choice.fixed_effects,
        drop_parts=tuple(part for place, part in enumerate(claim.parts) if place not in kept),
        keeps_rows=bool(kept),
    )


def _cost(claim: Claim, remedy: Remedy) -> float:
    return sum(claim.graph.cost(node) for node in members(remedy.adjusted_for))
