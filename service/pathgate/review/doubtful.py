"""Does a config's soundness depend on the edges that the team marked as doubtful, and on which?

An edge less never makes a sound config unsound (``criteria.hinges``). So it is sound with and without each exactly
when it is sound with all, never sound when it is not with none; and a set of doubtful edges need only be tried where
every larger set is unsound. Up to ``MOST_TRIED`` edges every set is settled; past that, edges are taken away one by
one from the unsound whole until nothing more can go, once for each edge that might be kept.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

from pathgate.criteria.deadline import Deadline
from pathgate.graphs.graph import CausalGraph, Edge
from pathgate.graphs.masks import members
from pathgate.review.claims import Claim

# Of so many doubtful edges all 1,024 sets are settled.
MOST_TRIED = 10

Holds = Literal["always", "never", "depends"]


@dataclass(frozen=True, slots=True)
class Doubtful:
    """Is a config sound with and without the doubtful edges?

    Attributes:
        verdict: ``always`` or ``never`` sound, or it ``depends``.
        depends_on: the edges whose presence changes that in some company of the others, in the graph's order.
        is_complete: is none missing from ``depends_on``?
    """

    verdict: Holds
    depends_on: tuple[Edge, ...] = ()
    is_complete: bool = True


def judge_doubtful(claim: Claim, deadline: Deadline, *, is_sound: bool) -> Doubtful:
    """How far a verdict rests on the doubtful edges of the claim's graph.

    Raises:
        OutOfTime: the deadline came before even the verdict was known.

    >>> from pathgate.graphs.reading import read_graph
    >>> rain = [{"source": "rain", "target": end, "doubtful": True} for end in ("delay", "refund")]
    >>> edges = [*rain, {"source": "delay", "target": "refund"}]
    >>> graph = read_graph({"nodes": ["rain", "delay", "refund"], "edges": edges})
    >>> claim = Claim(graph, treatments=graph.mask("delay"), outcomes=graph.mask("refund"), covariates=0, parts=())
    >>> judge_doubtful(claim, Deadline.never(), is_sound=False).verdict
    'depends'
    """
    if is_sound:
        return Doubtful("always")
    edges = sorted(claim.graph.doubtful)
    deadline.poll()
    if not _is_sound_with(claim, edges, 0):
        return Doubtful("never")
    if len(edges) <= MOST_TRIED:
        found, is_complete = _settle_all(claim, edges, deadline)
    else:
        found, is_complete = _take_away(claim, edges, deadline), False
    return Doubtful("depends", tuple(edges[place] for place in members(found)), is_complete)


def _settle_all(claim: Claim, edges: Sequence[Edge], deadline: Deadline) -> tuple[int, bool]:
    """The places of the edges that matter in some company; complete unless the deadline came."""
    everything = (1 << len(edges)) - 1
    sound = [False] * (everything + 1)
    found = 0
    for chosen in range(everything - 1, -1, -1):
        if deadline.expired:
            return found, False
        absent = [1 << place for place in members(everything & ~chosen)]
        held = [bit for bit in absent if sound[chosen | bit]]
        sound[chosen] = bool(held) or _is_sound_with(claim, edges, chosen)
        if sound[chosen]:
            for bit in absent:
                found |= 0 if sound[chosen | bit] else bit
    return found, True


def _take_away(claim: Claim, edges: Sequence[Edge], deadline: Deadline) -> int:
    """The places of some edges that matter: those of least unsound sets, each edge kept as long as can be once."""
    everything = (1 << len(edges)) - 1
    found = 0
    for kept_longest in range(len(edges)):
        if found >> kept_longest & 1:
            continue
        least = everything
        for place in [*(other for other in range(len(edges)) if other != kept_longest), kept_longest]:
            if deadline.expired:
                return found
            if not _is_sound_with(claim, edges, least & ~(1 << place)):
                least &= ~(1 << place)
        # Without any one of these the config is sound, with all of them it is not.
        found |= least
    return found


def _is_sound_with(claim: Claim, edges: Sequence[Edge], chosen: int) -> bool:
    """Is the claim sound on the graph that has only these of the doubtful edges?"""
    graph = claim.graph
    for place, edge in enumerate(edges):
        if not chosen >> place & 1:
            graph = graph.without_edge(edge)
    return is_sound_on(claim, graph)


def is_sound_on(claim: Claim, graph: CausalGraph) -> bool:
    """Would the claim be sound on another graph of the same nodes?"""
    return claim.on(graph).is_carried_by(claim.own_choice)
