"""Which of very many valid sets need to be looked at to find the most precise one?

Two steps never raise the large-sample variance of a linear effect estimate and never cost validity: taking
away a column that tells nothing more about the outcomes, adding one that tells nothing about the treatments
(Henckel, Perković & Maathuis 2022; their comparison of any two sets is a chain of such steps). A region is
the valid sets between two bounds; narrowing leaves only those that every other one leads to by such steps.
A few searches of the graph for each column narrowed away.
"""

from __future__ import annotations

from dataclasses import dataclass

from pathgate.criteria.adjustment import Effect
from pathgate.criteria.batch import separated_each
from pathgate.criteria.deadline import Deadline
from pathgate.criteria.reachability import Conditions, connected
from pathgate.criteria.verdict import are_separated
from pathgate.graphs.kinship import ancestors
from pathgate.graphs.masks import mask_of, members


@dataclass(frozen=True, slots=True)
class Region:
    """The valid sets that hold ``held`` and besides only some of ``optional``.

    Attributes:
        held, optional: disjoint masks; what keeping rows conditions on counts as held.
        left_out: columns that no set here holds because those that do are another region's.
    """

    held: int
    optional: int
    left_out: int = 0


def parted(effect: Effect, region: Region) -> tuple[Region, Region]:
    """The sets of a narrowed region without some optional column next to the outcomes, and those with it."""
    near = _next_to_outcomes(effect, region)
    column = near & -near
    rest = region.optional & ~column
    without = Region(region.held, rest, region.left_out | column)
    return without, Region(region.held | column, rest, region.left_out)


def narrowed(effect: Effect, region: Region, deadline: Deadline) -> Region | None:
    """The part of a region that all its sets lead to by steps that never raise the variance.

    None where it holds no valid set, or where all of them lead to sets that hold a column left out here. With
    no column optional, what is held is valid and the whole region leads to it.

    Raises:
        OutOfTime: the deadline came first.
    """
    while _holds_any(effect, region):
        deadline.poll()
        optional = region.optional & _may_tell_of_outcomes(effect, region)
        inner = Region(region.held, optional, region.left_out)
        free = ~_may_tell_of_treatments(effect, inner) | _bound_to_outcomes(effect, inner)
        # Another region holds these columns, and never the other way round: no two point at each other.
        if free & region.left_out:
            return None
        inner = Region(region.held | optional & free, optional & ~free, region.left_out)
        if inner == region:
            inner = _narrowed_near_outcomes(effect, region, deadline)
        if inner == region:
            return region
        region = inner
    return None


def _narrowed_near_outcomes(effect: Effect, region: Region, deadline: Deadline) -> Region:
    near = _next_to_outcomes(effect, region)
    if not near:
        return Region(region.held, 0, region.left_out)
    unusable = near & ~_usable_at_all(effect, region, near, deadline)
    return Region(region.held, region.optional & ~unusable, region.left_out)


def _widest(effect: Effect, region: Region, column: int = 0) -> int:
    """A set that holds a column and separates where any set of the region with it does."""
    ends = effect.treatments | effect.outcomes
    held = region.held | column
    return held | (region.optional & ancestors(effect.back_door_graph, ends | held))


def _holds_any(effect: Effect, region: Region) -> bool:
    widest = _widest(effect, region)
    return are_separated(effect.back_door_graph, effect.treatments, effect.outcomes, widest)


def _usable_at_all(effect: Effect, region: Region, asked: int, deadline: Deadline) -> int:
    """Those of some optional columns that a set of the region holds."""
    columns = list(members(asked))
    ends = effect.treatments, effect.outcomes
    statements = [(*ends, _widest(effect, region, 1 << column)) for column in columns]
    verdicts = separated_each(effect.back_door_graph, statements, deadline)
    return mask_of(column for column, is_usable in zip(columns, verdicts, strict=True) if is_usable)


def _next_to_outcomes(effect: Effect, region: Region) -> int:
    """The optional columns that tell something about the outcomes while no other optional one is adjusted for.

    Where there are none, no optional columns tell anything together either, and each set of the region
    leads to what is held by taking them away.
    """
    graph, always = effect.kept.graph, region.held | effect.treatments
    conditions = Conditions(always | region.optional, ancestors(graph, always))
    return region.optional & connected(graph, effect.outcomes, conditions)


def _may_tell_of_outcomes(effect: Effect, region: Region) -> int:
    """Nodes joined to the outcomes, beside the treatments, in some set of the region.

    Beyond what is always conditioned on nothing blocks, and whatever may be conditioned on opens.
    """
    graph, always = effect.kept.graph, region.held | effect.treatments
    return connected(graph, effect.outcomes, Conditions(always, ancestors(graph, always | region.optional)))


def _may_tell_of_treatments(effect: Effect, region: Region) -> int:
    """Nodes joined to the treatments in some set of the region."""
    graph = effect.kept.graph
    opening = ancestors(graph, region.held | region.optional)
    return connected(graph, effect.treatments, Conditions(region.held, opening))


def _bound_to_outcomes(effect: Effect, region: Region) -> int:
    """Nodes that, while not in a set of the region, are joined to the outcomes by a path no set can block.

    Only paths that leave the node by its tail, or nodes at which colliders are open anyway: whatever joined
    the node to a treatment then joined it to the outcomes, and the set was not valid. So to valid sets these
    nodes are free to add. The parents of the nodes on causal paths are among them.
    """
    graph = effect.back_door_graph
    sometimes, opened = region.held | region.optional, ancestors(graph, region.held)
    reached = {True: 0, False: 0}
    waiting = [(node, True) for node in members(effect.outcomes)]
    while waiting:
        node, is_by_tail = waiting.pop()
        bit = 1 << node
        if bit & reached[is_by_tail]:
            continue
        reached[is_by_tail] |= bit
        is_passed = not bit & sometimes
        if is_passed:
            waiting += [(child, False) for child in graph.children(node)]
        if is_passed if is_by_tail else bit & opened:
            waiting += [(parent, True) for parent in graph.parents(node)]
            waiting += [(spouse, False) for spouse in graph.spouses(node)]
    return reached[True] | (reached[False] & opened)
