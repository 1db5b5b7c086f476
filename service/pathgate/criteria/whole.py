"""Which covariates recover the effect in everybody from the rows kept, by adjusting?

Generalised adjustment (Correa, Tian & Bareinboim 2018): the effect in everybody is the sum over covariates z
of P(outcome | treatment, z, kept) · P(z less w | w, kept) · P(w), where w, the *weighting*, is a part of the
covariates whose distribution over everybody is known. It is right in every model of the graph exactly when
the covariates carry the effect among the rows kept (``adjustment.is_valid``), and the weighting alone
separates the outcomes from what keeping rows conditions on in the back-door graph. With no weighting the kept
rows suffice alone. O(nodes + edges) a question about one set.

Like every use of the formula it takes for granted that rows with any value of the weighting had some chance
of being kept. A column held at one value never weights; a filter that leaves whole values of a column out
keeps the formula from being evaluated there, so whoever knows of one takes that column out of ``known``.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from fractions import Fraction
from typing import Literal

from pathgate.criteria.adjustment import Effect, covariates_in, is_valid, valid_sets
from pathgate.criteria.deadline import Deadline
from pathgate.criteria.joint_cuts import Cut, JointCuts
from pathgate.criteria.separators import Separators
from pathgate.graphs.kinship import ancestors
from pathgate.graphs.masks import members


def weighting(effect: Effect, covariates: int, known: int = 0) -> int | None:
    """The part of these covariates to weight by everybody; None where they do not recover the effect.

    Args:
        effect: a total effect, on the rows kept.
        covariates: a mask without treatments and outcomes; it may hold unmeasured nodes.
        known: the columns whose joint distribution over everybody is known.

    Returns:
        A minimal part of the covariates that are known which makes the formula right: 0 where the kept rows
        suffice alone. Not every larger part does.

    >>> from pathgate.criteria import Part, keep_rows, total_effect
    >>> from pathgate.graphs import CausalGraph
    >>> graph = CausalGraph.of(("late", "refund"), ("age", "refund"), nodes=["region"])
    >>> kept = keep_rows(graph, [Part(graph.mask(["age"]), fixed=False, written="age")])
    >>> effect, age = total_effect(kept, graph.mask("late"), graph.mask("refund")), graph.mask(["age"])
    >>> weighting(effect, age), weighting(effect, age, age) == age
    (None, True)
    """
    if not is_valid(effect, covariates):
        return None
    return _weightings(effect, known, allowed=covariates).minimal()


def recovers(effect: Effect, covariates: int, known: int = 0) -> bool:
    """Is the effect in everybody recovered by adjusting for these covariates? See ``weighting``."""
    return weighting(effect, covariates, known) is not None


def is_weightable(effect: Effect, known: int = 0, *, required: int = 0, allowed: int = -1) -> bool:
    """Could some allowed weighting undo the selection, whatever else had to be measured?

    Where it could, measuring what makes a valid set among the rows kept (``measuring.measure_next``) makes
    one that recovers the effect in everybody; where it could not, no measuring among the kept rows does.
    """
    return _weightings(effect, known, required=required, allowed=effect.usable & allowed).exists


def recovering_set(effect: Effect, known: int = 0, *, required: int = 0, allowed: int = -1) -> int | None:
    """A set that recovers the effect, holds ``required``, keeps to ``allowed`` and is minimal so.

    None exactly where no such set of measured columns recovers it. As many questions about one set as
    there are columns in the weighting.
    """
    weight = _weightings(effect, known, required=required, allowed=effect.usable & allowed).minimal()
    if weight is None:
        return None
    always = required | weight
    bounded = valid_sets(effect, required=always, allowed=allowed)
    minimal = None if bounded is None else bounded.minimal()
    if minimal is None:
        return None
    found = covariates_in(effect, minimal, always)
    # Among the ancestors that matter a set that recovers may grow, so one pass over the weighting is enough.
    for node in members(weight & ~required):
        if recovers(effect, found & ~(1 << node), known):
            found &= ~(1 << node)
    return found


def recovering_sets(
    effect: Effect, known: int, deadline: Deadline, *, required: int = 0, allowed: int = -1
) -> Iterator[int]:
    """All minimal sets that recover the effect and hold ``required``, each once.

    Where ``required`` undoes the selection already, or nothing has to, they are the minimal valid sets and
    come with polynomial delay. Otherwise they come weighting by weighting, and a set that is not minimal, or
    has its own weighting among the others, is passed over: no bound is known to us on how many in a row.

    Raises:
        OutOfTime: the deadline came first.
    """
    bounded = valid_sets(effect, required=required, allowed=allowed)
    if bounded is None:
        return
    weightings = _weightings(effect, known, required=required, allowed=bounded.allowed)
    weight_cut, joint = Cut.of(weightings), _joint(effect, known, bounded, required)
    for weight in weightings.every_minimal(deadline):
        spare = weight & ~required
        for each in replace(bounded, required=bounded.required | weight).every_minimal(deadline):
            found = covariates_in(effect, each, required)
            if weight_cut.core(found) == spare and not spare & ~joint.needed(found):
                yield found


def least_recovering_set(
    effect: Effect,
    known: int,
    deadline: Deadline,
    *,
    prefer: Literal["smallest", "cheapest"],
    required: int = 0,
    allowed: int = -1,
) -> int | None:
    """A recovering set of the fewest columns, or of the least cost; None where none recovers.

    One minimum cut where ``required`` undoes the selection or nothing has to, otherwise a bounded search.

    Raises:
        OutOfTime: the deadline came first.
    """
    bounded = valid_sets(effect, required=required, allowed=allowed)
    if bounded is None:
        return None
    joint = _joint(effect, known, bounded, required)
    graph = effect.kept.graph
    costs = {
        node: Fraction(1 if prefer == "smallest" else graph.cost(node)) for node in members(joint.choosable)
    }
    least = joint.least(costs, deadline)
    return None if least is None else least | required


def _weightings(effect: Effect, known: int, *, required: int = 0, allowed: int) -> Separators:
    """The allowed weightings that undo the selection, as separating sets; a required column costs nothing."""
    graph, selected = effect.back_door_graph, effect.kept.conditioned
    relevant = ancestors(graph, selected | effect.outcomes)
    usable = known & ~selected
    given = required & usable & relevant
    # Weightings near the outcomes come first: what else carries the effect seldom makes them superfluous.
    return Separators(graph, effect.outcomes, selected, required=given, allowed=allowed & usable)


def _joint(effect: Effect, known: int, bounded: Separators, required: int) -> JointCuts:
    """Recovering sets as the sets that cut treatments, and by known columns the selection, from outcomes."""
    weightings = _weightings(effect, known, required=required, allowed=bounded.allowed)
    return JointCuts((Cut.of(weightings), Cut.of(bounded)))
