"""Which columns no valid set can hold, and which every valid set holds.

A column can be held exactly when it and all allowed ancestors of treatments, outcomes and itself separate; it
can be left out exactly when all allowed ancestors but itself do (van der Zander, Liśkiewicz & Textor 2019). All
columns are asked about at once, each as a lane of one search (``batch``), and one search more finds the path for
each column that no set holds.
"""

from __future__ import annotations

from dataclasses import dataclass

from pathgate.criteria.adjustment import Effect, valid_set
from pathgate.criteria.batch import Lanes
from pathgate.criteria.deadline import Deadline
from pathgate.criteria.paths import Trail, find_open_path
from pathgate.criteria.reachability import Conditions
from pathgate.graphs.kinship import ancestors
from pathgate.graphs.masks import mask_of, members


@dataclass(frozen=True, slots=True)
class Unusable:
    """A column that no valid set holds, and a path that adjusting for it opens, whatever else is adjusted for."""

    node: int
    opens: Trail


def unusable_columns(effect: Effect, deadline: Deadline) -> tuple[Unusable, ...]:
    """The measured columns, beside the forbidden ones, that no valid set holds; none where no set is valid.

    Raises:
        OutOfTime: the deadline came first.
    """
    if valid_set(effect) is None:
        return ()
    graph, choosable = effect.back_door_graph, _choosable(effect)
    always = _always_relevant(effect)
    candidates = list(members(choosable & ~always))
    lanes_below = [0] * graph.size
    for lane, node in enumerate(candidates):
        lanes_below[node] |= 1 << lane
    for node in reversed(graph.topological_order):
        for child in graph.children(node):
            lanes_below[node] |= lanes_below[child]
    all_lanes = (1 << len(candidates)) - 1
    blocked = [0] * graph.size
    for node in members(choosable):
        blocked[node] = all_lanes if always >> node & 1 else lanes_below[node]
    joined = _joined_lanes(effect, blocked, all_lanes, deadline)
    found = []
    for lane in members(joined):
        deadline.poll()
        found.append(_unusable(effect, candidates[lane]))
    return tuple(found)


def needed_columns(effect: Effect, deadline: Deadline) -> int:
    """Mask of the columns that every valid set holds; empty where no set is valid.

    Raises:
        OutOfTime: the deadline came first.
    """
    # What every valid set holds, each one does.
    candidates = list(members(valid_set(effect) or 0))
    all_lanes = (1 << len(candidates)) - 1
    blocked = [0] * effect.back_door_graph.size
    for node in members(_choosable(effect) & _always_relevant(effect)):
        blocked[node] = all_lanes
    for lane, node in enumerate(candidates):
        blocked[node] &= ~(1 << lane)
    joined = _joined_lanes(effect, blocked, all_lanes, deadline)
    return mask_of(candidates[lane] for lane in members(joined))


def _choosable(effect: Effect) -> int:
    return effect.usable & ~effect.kept.conditioned


def _always_relevant(effect: Effect) -> int:
    ends = effect.treatments | effect.outcomes
    return ancestors(effect.back_door_graph, ends | effect.kept.conditioned)


def _joined_lanes(effect: Effect, blocked: list[int], all_lanes: int, deadline: Deadline) -> int:
    """The lanes in which treatments and outcomes are joined."""
    for node in members(effect.kept.conditioned):
        blocked[node] = all_lanes
    starts = [0] * effect.back_door_graph.size
    for node in members(effect.treatments):
        starts[node] = all_lanes
    lanes = Lanes.of(effect.back_door_graph, starts, blocked)
    lanes.run(deadline)
    joined = 0
    for node in members(effect.outcomes):
        joined |= lanes.at(node)
    return joined


def _unusable(effect: Effect, node: int) -> Unusable:
    graph = effect.back_door_graph
    ends = effect.treatments | effect.outcomes
    relevant = ancestors(graph, ends | effect.kept.conditioned | 1 << node)
    conditioned = (relevant & _choosable(effect)) | effect.kept.conditioned
    trail = find_open_path(graph, effect.treatments, effect.outcomes, Conditions.on(graph, conditioned))
    if trail is None:
        message = "a column is unusable because a path stays open whatever else is adjusted for"
        raise AssertionError(message)
    return Unusable(node, trail)
