"""Where a claim is unanswerable: what would have to be measured, at least, for some choice to carry it?

What the claim itself needs and the platform does not hold comes first: treatments, outcomes, columns of conditions
that have to stay. The rest is ``criteria.measuring`` on the graph in which these are measured; so the whole costs
least. None where no measuring helps, as where only choices that leave the treatments no variation are left.
"""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction

from pathgate.criteria.deadline import Deadline
from pathgate.criteria.measuring import MeasureNext
from pathgate.graphs.masks import members
from pathgate.review.claims import Claim


def measure_next_for(claim: Claim, deadline: Deadline) -> MeasureNext | None:
    """The cheapest that would have to be measured for some choice to carry the claim.

    Raises:
        OutOfTime: the deadline came first.

    >>> from pathgate.graphs.reading import read_graph
    >>> nodes = [{"id": "delay", "measured": False}, {"id": "rain", "measured": False}, "refund"]
    >>> ends = [("rain", "delay"), ("rain", "refund"), ("delay", "refund")]
    >>> edges = [{"source": source, "target": target} for source, target in ends]
    >>> graph = read_graph({"nodes": nodes, "edges": edges})
    >>> claim = Claim(graph, treatments=graph.mask("delay"), outcomes=graph.mask("refund"), covariates=0, parts=())
    >>> graph.names_of(measure_next_for(claim, Deadline.never()).nodes)
    ('delay', 'rain')
    """
    needed = claim.ends
    for part in claim.undroppable:
        needed |= part.columns & ~claim.readable
    needed &= ~claim.graph.measured
    measured = _with_measured(claim, needed)
    if not all(map(measured.can_filter_by, measured.undroppable)):
        return None
    population = measured.population_of(measured.effect_among(measured.undroppable))
    found = population.measure_next(deadline, required=0, allowed=-1)
    if found is None or not (found.causes_of or _with_measured(measured, found.nodes).can_be_carried):
        return None
    cost = found.cost + sum((Fraction(claim.graph.cost(node)) for node in members(needed)), Fraction(0))
    return MeasureNext(found.nodes | needed, found.causes_of, cost)


def _with_measured(claim: Claim, nodes: int) -> Claim:
    """The claim as it would be on a graph in which these nodes are measured."""
    return claim.on(replace(claim.graph, measured=claim.graph.measured | nodes))
