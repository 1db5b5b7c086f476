"""What a sound verdict hinges on: the absent edges that must stay absent, the arrows that must not be turned.

Each as a sentence that somebody who knows the parcels, and no graph theory, can answer yes or no, with the
independency that would show an absent edge in data. ``criteria.hinges`` decides; this module leaves out what
would make the graph faulty (a cycle, an arrow back in time) and keeps to stated sizes. Only a sound verdict
hinges on anything. No verdict hinges on an edge that is there: with an edge less a sound config stays sound.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property

from pathgate.criteria.deadline import Deadline
from pathgate.criteria.errors import OutOfTime
from pathgate.criteria.exposing import Exposing
from pathgate.criteria.hinges import Hinges
from pathgate.criteria.independencies import Independency
from pathgate.criteria.whole_hinges import WholeHinges
from pathgate.graphs.graph import Edge
from pathgate.graphs.masks import mask_of, members
from pathgate.review.claims import Claim
from pathgate.review.visible import visible

# Graphs of more nodes are not looked into, and of more names than these no further edges are listed.
MOST_NODES = 1024
MOST_NAMES = 2_000_000

_PLAIN = frozenset("abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789_.-")


@dataclass(frozen=True, slots=True)
class AbsentEdge:
    """An edge that must not exist, and the promised independency of its ends that its existence would break.

    Attributes:
        edge: kind and ends.
        exposed_by: None where an end is unmeasured or no set of columns separates the two.
    """

    edge: Edge
    exposed_by: Independency | None = None


@dataclass(frozen=True, slots=True)
class HingesOn:
    """What one verdict hinges on.

    Attributes:
        absent_edges: bidirected ones first, in the graph's order.
        reversed: arrows as they are in the graph, in its order.
        is_complete: is nothing left out for lack of time or room?
    """

    absent_edges: tuple[AbsentEdge, ...] = ()
    reversed: tuple[Edge, ...] = ()
    is_complete: bool = True


def hinges_of(claim: Claim, deadline: Deadline, *, is_sound: bool) -> HingesOn:
    """What the verdict on a claim hinges on; nothing where it is not sound.

    >>> from pathgate.graphs.graph import CausalGraph
    >>> graph = CausalGraph.of(("rain", "delay"), ("delay", "refund"))
    >>> claim = Claim(graph, treatments=graph.mask("delay"), outcomes=graph.mask("refund"), covariates=0, parts=())
    >>> found = hinges_of(claim, Deadline.never(), is_sound=True)
    >>> [(each.edge[0], graph.name(each.edge[1]), graph.name(each.edge[2])) for each in found.absent_edges]
    [('bidirected', 'rain', 'refund'), ('bidirected', 'delay', 'refund'), ('directed', 'rain', 'refund')]
    """
    if not is_sound:
        return HingesOn()
    if claim.graph.size > MOST_NODES:
        return HingesOn(is_complete=False)
    search = _Search(claim, deadline)
    return HingesOn(tuple(search.absent_edges()), tuple(search.turned_arrows()), search.is_complete)


def question(kind: str, first: str, second: str, *, is_turned: bool = False) -> str:
    """The sentence that must be true of an edge for the verdict to stand; the names are ready to be shown.

    >>> question("directed", "rain", "refund"), question("directed", "rain", "delay", is_turned=True)
    ('rain does not influence refund', 'rain drives delay and not the other way round')
    """
    if is_turned:
        return f"{first} drives {second} and not the other way round"
    if kind == "bidirected":
        return f"Nothing unmeasured drives both {first} and {second}"
    return f"{first} does not influence {second}"


def plain_name(name: str) -> str:
    """A name as it stands, in quotes where it could be misread as part of the sentence."""
    return name if _PLAIN.issuperset(name) else f'"{visible(name)}"'


def _hinges(claim: Claim) -> Hinges | WholeHinges:
    if claim.population == "whole":
        return WholeHinges(claim.effect, claim.usable_covariates, claim.known)
    return Hinges(claim.effect, claim.usable_covariates, claim.asks == "direct")


class _Search:
    """Goes through a graph node by node until the time or the room is used up."""

    def __init__(self, claim: Claim, deadline: Deadline) -> None:
        self.is_complete = True
        self._graph = claim.graph
        self._computed = mask_of(claim.inputs)
        self._deadline = deadline
        self._hinges = _hinges(claim)
        self._exposing = Exposing(
            claim.graph, deadline, hubs=claim.ends, kept=claim.effect.kept, inputs=claim.inputs
        )
        self._room = MOST_NAMES

    def absent_edges(self) -> Iterator[AbsentEdge]:
        """The edges whose existence would end the verdict, as far as time and room go."""
        try:
            for kind, node, others in self._rows():
                self._deadline.poll()
                for other, exposed_by in self._exposing.statements(node, others).items():
                    self._room -= 2 + (exposed_by.given.bit_count() if exposed_by else 0)
                    if self._room < 0:
                        self.is_complete = False
                        return
                    yield AbsentEdge((kind, node, other), exposed_by)
        except OutOfTime:
            self.is_complete = False

    def turned_arrows(self) -> Iterator[Edge]:
        """The arrows that must not lead the other way round."""
        for source, targets in enumerate(self._graph.child_masks):
            for target in members(targets & ~self._computed):
                if self._deadline.expired:
                    self.is_complete = False
                    return
                if self._is_later(target, source) or not self._hinges.may_turning_harm(source, target):
                    continue
                # Another directed path from source to target would close a cycle.
                if self._exposing.above(target) & targets & ~(1 << target):
                    continue
                if self._hinges.does_turning_harm(source, target):
                    yield "directed", source, target

    def _rows(self) -> Iterator[tuple[str, int, int]]:
        """Kind, node and the other ends of the edges that must not exist; bidirected edges at the lower end."""
        graph, hinges = self._graph, self._hinges
        # What is computed from others has no other cause.
        free = graph.everything & ~self._computed
        for node in members(free):
            absent = free >> (node + 1) << (node + 1) & ~graph.spouse_masks[node]
            others = hinges.bidirected_with(node) & absent
            if others:
                yield "bidirected", node, others
        for node in range(graph.size):
            absent = free & ~graph.child_masks[node] & ~(1 << node) & self._not_earlier(node)
            others = hinges.arrows_from(node, absent)
            if others:
                yield "directed", node, others & ~self._exposing.above(node)

    def _not_earlier(self, node: int) -> int:
        """The nodes that an arrow from this one may lead to without going back in time."""
        return ~self._before.get(self._graph.recorded[node], 0) if node in self._graph.recorded else -1

    @cached_property
    def _before(self) -> dict[int, int]:
        """For each moment at which something is recorded, what is recorded before it."""
        before, earlier, last = dict[int, int](), 0, 0
        moments = sorted((moment, node) for node, moment in self._graph.recorded.items())
        for moment, node in moments:
            if moment not in before:
                earlier |= last
                before[moment], last = earlier, 0
            last |= 1 << node
        return before

    def _is_later(self, node: int, other: int) -> bool:
        """Is one known to be recorded after the other?"""
        recorded = self._graph.recorded
        return node in recorded and other in recorded and recorded[node] > recorded[other]
