"""Which sound choices lie nearest to a config's own? By closing what is open, one change after the other.

A change adds or drops a covariate, drops a column's fixed effects or drops a part of the row filter. Whatever mends a
choice must close its open path: condition on a node of it that is no collider, or let go of everything that opens one
of its colliders. So a few changes of each choice need to be followed, breadth first, and all choices that are sound
after the fewest changes are found. One search for a path a choice.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from pathgate.criteria.adjustment import Effect
from pathgate.criteria.deadline import Deadline
from pathgate.criteria.determined import made_of
from pathgate.criteria.paths import Trail, find_open_path
from pathgate.criteria.selection import Part
from pathgate.graphs.kinship import ancestors, descendants
from pathgate.graphs.masks import members
from pathgate.review.claims import Choice, Claim


@dataclass(frozen=True, slots=True)
class _Step:
    """A choice on the way, with the covariates that were added and dropped to get there."""

    choice: Choice
    added: int = 0
    dropped: int = 0

    def with_covariate(self, node: int) -> _Step:
        covariates, fixed_effects, parts = _taken_apart(self.choice)
        choice = Choice(covariates | 1 << node, fixed_effects, parts)
        return _Step(choice, self.added | 1 << node, self.dropped)

    def without_covariate(self, node: int) -> _Step:
        covariates, fixed_effects, parts = _taken_apart(self.choice)
        choice = Choice(covariates & ~(1 << node), fixed_effects, parts)
        return _Step(choice, self.added, self.dropped | 1 << node)

    def without_fixed_effect(self, node: int) -> _Step:
        covariates, fixed_effects, parts = _taken_apart(self.choice)
        return _Step(Choice(covariates, fixed_effects & ~(1 << node), parts), self.added, self.dropped)

    def without_part(self, part: Part) -> _Step:
        covariates, fixed_effects, parts = _taken_apart(self.choice)
        kept = tuple(each for each in parts if each is not part)
        return _Step(Choice(covariates, fixed_effects, kept), self.added, self.dropped)


def _taken_apart(choice: Choice) -> tuple[int, int, tuple[Part, ...]]:
    """A choice's members: thousands are made anew in a search, and ``replace`` takes several times as long."""
    return choice.covariates, choice.fixed_effects, choice.parts


Key = tuple[int, int, tuple[int, ...]]


def key_of(claim: Claim, choice: Choice) -> Key:
    """A choice as something to tell it from others by: covariates, fixed effects, places of the parts that stay."""
    if choice.parts is claim.parts:
        return choice.covariates, choice.fixed_effects, tuple(range(len(claim.parts)))
    kept = set(map(id, choice.parts))
    places = tuple(place for place, part in enumerate(claim.parts) if id(part) in kept)
    return choice.covariates, choice.fixed_effects, places


def nearest_sound(claim: Claim, start: Choice, deadline: Deadline, most: int) -> list[Choice]:
    """All sound choices that lie the fewest changes from ``start``; none where more than ``most`` had to be judged.

    ``start`` holds nothing that can never stay.

    Raises:
        OutOfTime: the deadline came first.
    """
    level = {key_of(claim, start): _Step(start)}
    judged = 0
    while level:
        judged += len(level)
        if judged > most:
            return []
        sound: list[Choice] = []
        following: dict[Key, _Step] = {}
        for step in level.values():
            deadline.poll()
            # Once one is sound no further change is looked for, and to judge is cheaper than to find a path.
            closing = None if sound else _closing(claim, step)
            if closing is not None:
                following.update((key_of(claim, nearer.choice), nearer) for nearer in closing)
            elif claim.is_carried_by(step.choice):
                sound.append(step.choice)
            elif not sound:
                # Only who is kept stands in the way: no path tells which columns could undo that.
                following.update((key_of(claim, nearer.choice), nearer) for nearer in _any(claim, step))
        if sound:
            return sound
        level = following
    return []


def _closing(claim: Claim, step: _Step) -> list[_Step] | None:
    """Changes one of which is part of whatever mends this choice; None where no path is open in it."""
    choice = step.choice
    stuck = claim.leaves_no_variation(choice)
    if stuck:
        return list(_freeing(claim, step, stuck))
    effect = claim.effect_among(choice.parts)
    held = claim.held_fixed(choice)
    graph = effect.back_door_graph
    conditions = effect.conditioning(held | effect.kept.conditioned)
    trail = find_open_path(graph, effect.treatments, effect.outcomes, conditions)
    if trail is None:
        return None
    nearer = list(_blocking(effect, step, trail, held))
    for node, role in trail.inner:
        if role == "collider":
            nearer += _letting_go(claim, step, effect, node, held)
    return nearer


def _blocking(effect: Effect, step: _Step, trail: Trail, held: int) -> Iterator[_Step]:
    for node, role in trail.inner:
        may_add = effect.usable >> node & 1 and not (step.dropped | held) >> node & 1
        if role != "collider" and may_add:
            yield step.with_covariate(node)


def _letting_go(claim: Claim, step: _Step, effect: Effect, collider: int, held: int) -> Iterator[_Step]:
    """Changes one of which is part of every way of closing a collider, where it can be closed at all."""
    kept = effect.kept
    openers = (held | kept.conditioned) & descendants(kept.graph, 1 << collider)
    changes = [_without(claim, step, effect, node) for node in members(openers)]
    if changes and all(changes):
        yield from changes[0]


def _without(claim: Claim, step: _Step, effect: Effect, node: int) -> tuple[_Step, ...]:
    """Changes one of which is needed for a node not to be held fixed; none where it has to stay so."""
    choice = step.choice
    part = effect.kept.part_of.get(node)
    if part is not None:
        is_droppable = not claim.row_filter_fixed and any(part is each for each in choice.parts)
        return (step.without_part(part),) if is_droppable else ()
    if choice.covariates >> node & 1:
        return () if step.added >> node & 1 else (step.without_covariate(node),)
    fixed = tuple(members(choice.fixed_effects))
    alone = [column for column in fixed if column == node or claim.absorbed(1 << column) >> node & 1]
    # What is computed from things that several fixed effects hold fixed is freed by letting go of one of them.
    return tuple(step.without_fixed_effect(column) for column in alone[:1] or fixed)


def _freeing(claim: Claim, step: _Step, stuck: int) -> Iterator[_Step]:
    """Let go of a computed column that only the treatment could make vary, or of something it is computed from."""
    choice = step.choice
    involved = made_of(1 << stuck.bit_length() - 1, claim.inputs)
    for column in members(choice.covariates & involved & ~step.added):
        yield step.without_covariate(column)
    for column in members(choice.fixed_effects):
        yield step.without_fixed_effect(column)
    if not claim.row_filter_fixed:
        for part in choice.parts:
            if part.fixed and part.columns & involved:
                yield step.without_part(part)


def _any(claim: Claim, step: _Step) -> Iterator[_Step]:
    """Every change: only an ancestor of what is in question can block anything."""
    choice = step.choice
    effect = claim.effect_among(choice.parts)
    kept = effect.kept
    ends = effect.treatments | effect.outcomes
    relevant = ancestors(effect.back_door_graph, ends | claim.held_fixed(choice) | kept.conditioned)
    held = claim.held_fixed(choice) | kept.conditioned | step.dropped
    for node in members(relevant & effect.usable & ~held):
        yield step.with_covariate(node)
    for node in members(choice.covariates & ~step.added):
        yield step.without_covariate(node)
    for node in members(choice.fixed_effects):
        yield step.without_fixed_effect(node)
    for part in () if claim.row_filter_fixed else choice.parts:
        yield step.without_part(part)
