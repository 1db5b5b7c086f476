"""Where no measured set is valid: what would have to be measured, at least, to make one?

Unmeasured nodes could be measured, at their cost, and so could the common cause behind a bidirected edge, at
a cost of 1: a node with arrows to both ends. Every allowed column is free, so all of them are taken away from
the augmented graph of the ancestors that matter (``hubs``); what is left to choose is a vertex cut of the
least cost between treatments and outcomes (Menger 1927; van der Zander, Liśkiewicz & Textor 2019), found
exactly by one minimum cut.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from fractions import Fraction

import numpy as np

from pathgate.criteria.adjustment import Effect
from pathgate.criteria.cuts import cheapest_cut
from pathgate.criteria.deadline import Deadline
from pathgate.criteria.hubs import Hubs
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import members

CAUSE_COST = Fraction(1)
"""What measuring the common cause behind a bidirected edge costs."""


@dataclass(frozen=True, slots=True)
class MeasureNext:
    """What to measure so that some valid set exists.

    Attributes:
        nodes: mask of unmeasured nodes.
        causes_of: the bidirected edges whose common cause to measure, by their ends, lower index first.
        cost: what all of it costs together.
    """

    nodes: int
    causes_of: tuple[tuple[int, int], ...]
    cost: Fraction


def measure_next(
    effect: Effect, deadline: Deadline, *, required: int = 0, allowed: int = -1
) -> MeasureNext | None:
    """The cheapest unmeasured nodes and common causes whose measuring would make a valid set.

    Args:
        effect: a total or a direct effect, on the rows kept.
        deadline: when to give up.
        required: what every valid set is to hold.
        allowed: what it may hold, unmeasured nodes included: those left out are not to be measured.

    Returns:
        None where no measuring helps; nothing to measure where a valid set exists as things are. Among
        equally cheap answers the one nearest to the outcomes, whatever the order of the graph.

    Raises:
        OutOfTime: the deadline came first.

    >>> from pathgate.criteria import keep_rows, total_effect
    >>> graph = CausalGraph.of(
    ...     ("storm", "late"), ("storm", "mood"), ("mood", "refund"), unmeasured=["storm", "mood"],
    ...     bidirected=[("late", "refund")],
    ... )
    >>> effect = total_effect(keep_rows(graph), graph.mask(["late"]), graph.mask(["refund"]))
    >>> found = measure_next(effect, Deadline.never())
    >>> graph.names_of(found.nodes), found.causes_of, int(found.cost)
    (('mood',), ((1, 3),), 2)
    """
    deadline.poll()
    graph = effect.back_door_graph
    explicit, edges = _with_causes(graph)
    ends = effect.treatments | effect.outcomes
    always = required | effect.kept.conditioned
    if always & (effect.forbidden | ends):
        return None
    hubs = Hubs.over(explicit, ends | always)
    taken = always | (effect.usable & allowed)
    candidates = graph.everything & ~graph.measured & allowed & ~(effect.forbidden | ends | always)
    choosable = hubs.relevant & (candidates | explicit.everything & ~graph.everything)
    if not _is_open(hubs, effect, taken):
        return MeasureNext(0, (), Fraction(0))
    if _is_open(hubs, effect, taken | choosable):
        return None
    deadline.poll()
    costs = _costs(graph, choosable)
    cut = cheapest_cut(hubs, effect.treatments, effect.outcomes, costs, taken)
    return MeasureNext(
        nodes=cut & graph.everything,
        causes_of=tuple(edges[node - graph.size] for node in members(cut & ~graph.everything)),
        cost=sum((costs[node] for node in members(cut)), Fraction(0)),
    )


def _with_causes(graph: CausalGraph) -> tuple[CausalGraph, list[tuple[int, int]]]:
    """The graph with a nameless node at the end for each bidirected edge, and those edges in that order."""
    edges = list(zip(graph.lower_ends.tolist(), graph.upper_ends.tolist(), strict=True))
    causes = np.arange(graph.size, graph.size + len(edges))
    # The causes come after all other nodes, so the arrows stay sorted by source.
    sources = np.concatenate([graph.sources, np.repeat(causes, 2)])
    targets = np.concatenate([graph.targets, np.array(edges, dtype=np.int64).reshape(-1)])
    none = np.empty(0, dtype=np.int64)
    names = graph.names + ("",) * len(edges)
    explicit = replace(graph, names=names, sources=sources, targets=targets, lower_ends=none, upper_ends=none)
    return explicit, edges


def _costs(graph: CausalGraph, choosable: int) -> dict[int, Fraction]:
    return {
        node: Fraction(graph.cost(node)) if node < graph.size else CAUSE_COST for node in members(choosable)
    }


def _is_open(hubs: Hubs, effect: Effect, taken: int) -> bool:
    """Does anything still lead from treatments to outcomes when these nodes are taken away?"""
    reached, _stopped = hubs.spread(effect.treatments, taken)
    return bool(reached & effect.outcomes)
