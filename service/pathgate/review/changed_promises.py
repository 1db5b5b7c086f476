"""Which independencies does one graph promise and another not?

The statements of a graph's basis (one for each separable pair of columns) are held against the other graph; one that
names a node which that graph lacks or does not measure cannot be kept there. A statement breaks only by an edge more
or a column less, and only above what it is about, so the others are not looked at; many go through the other graph
together (``criteria.batch``).
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property
from itertools import islice
from typing import Literal

from pathgate.criteria.batch import Statement, separated_each
from pathgate.criteria.deadline import Deadline
from pathgate.criteria.independencies import Independency, basis
from pathgate.criteria.selection import keep_rows
from pathgate.criteria.separable import Pairs
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.kinship import descendants
from pathgate.graphs.masks import mask_of, members
from pathgate.review.graph_difference import Difference, NamedEdge

# Statements that go through the other graph together: many cost little more than one, and the first should come soon.
_TOGETHER = 512


Side = Literal["lost", "gained"]


@dataclass(frozen=True, slots=True)
class Promise:
    """``x`` is independent of ``y`` given ``given``, all by name."""

    x: str
    y: str
    given: tuple[str, ...]


@dataclass(frozen=True)
class BrokenPromises:
    """The statements of one graph's basis that another graph does not keep.

    Attributes:
        promising: whose basis it is.
        other: the graph that it is held against.
        difference: between the two, in either direction.
    """

    promising: CausalGraph
    other: CausalGraph
    difference: Difference

    @property
    def places(self) -> int:
        """One more than the place of any statement."""
        return self.promising.size**2

    def statements(self, deadline: Deadline, start: int = 0) -> Iterator[tuple[int, Promise]]:
        """The statements not kept, in the order of the pairs and from a place on, each with its place.

        Raises:
            OutOfTime: the deadline came first.

        >>> old = CausalGraph.of(("rain", "delay"), ("delay", "refund"))
        >>> new = CausalGraph.of(("rain", "delay"), ("delay", "refund"), ("rain", "refund"))
        >>> list(BrokenPromises(old, new, Difference(old, new)).statements(Deadline.never()))
        [(2, Promise(x='rain', y='refund', given=('delay',)))]
        """
        size = max(1, self.promising.size)
        waiting = self._about_changes(divmod(start, size), deadline)
        while chunk := list(islice(waiting, _TOGETHER)):
            for each in self._not_kept(chunk, deadline):
                yield each.x * size + each.y.bit_length() - 1, self._named(each)

    def _about_changes(self, start: tuple[int, int], deadline: Deadline) -> Iterator[Independency]:
        """The statements of the basis about something at or below a change, from a pair on."""
        affected = self._affected
        if not affected:
            return
        pairs = Pairs(keep_rows(self.promising))
        first, second = start
        for node in members(pairs.columns >> first << first):
            deadline.poll()
            others = pairs.separable(node, deadline) & (-1 if affected >> node & 1 else affected)
            if node == first:
                others = others >> second << second
            yield from (basis(pairs, node, other) for other in members(others))

    def _not_kept(self, listed: list[Independency], deadline: Deadline) -> list[Independency]:
        asked = [(each, self._in_other(each)) for each in listed]
        statements = [statement for _each, statement in asked if statement is not None]
        verdicts = iter(separated_each(self.other, statements, deadline))
        return [each for each, statement in asked if statement is None or not next(verdicts)]

    def _in_other(self, each: Independency) -> Statement | None:
        """The statement about the other graph, where that has all its columns."""
        given = 0
        for node in members(each.given):
            place = self._columns_of_other[node]
            if place is None:
                return None
            given |= 1 << place
        x, y = self._columns_of_other[each.x], self._columns_of_other[each.y.bit_length() - 1]
        return None if x is None or y is None else (1 << x, 1 << y, given)

    def _named(self, each: Independency) -> Promise:
        graph = self.promising
        return Promise(graph.name(each.x), graph.name(each.y.bit_length() - 1), graph.names_of(each.given))

    @cached_property
    def _columns_of_other(self) -> tuple[int | None, ...]:
        """For each node its index in the other graph; None where that has no such column."""
        found = (self.other.index.get(name) for name in self.promising.names)
        return tuple(None if at is None or not self.other.measured >> at & 1 else at for at in found)

    @cached_property
    def _affected(self) -> int:
        """The columns one of which a statement must be about for it not to be kept.

        On a path that is open in the other graph alone, or on the way down from one of its colliders, lies an edge
        that only that graph has. What this leads to lies above x, y or something given there, and what is given lies
        above x or y here; so does a given column that is none there.
        """
        mine, other = self.promising, self.other
        joined = set[str]()
        for kind, first, second in self._new_there:
            joined.update((first, second) if kind == "bidirected" else (second,))
        below = other.names_of(descendants(other, mask_of(other.index[name] for name in joined)))
        lost = (node for node, place in enumerate(self._columns_of_other) if place is None)
        known = (mine.index[name] for name in below if name in mine.index)
        return descendants(mine, mask_of(known) | mask_of(lost) & mine.measured)

    @property
    def _new_there(self) -> tuple[NamedEdge, ...]:
        """The edges that only the other graph has."""
        found = self.difference
        return found.added_edges if self.other is found.new else found.removed_edges


def lost_and_gained(
    difference: Difference, deadline: Deadline, start: int = 0
) -> Iterator[tuple[int, tuple[Side, Promise]]]:
    """The promises lost, then those gained, from a place on, each with its place.

    Raises:
        OutOfTime: the deadline came first.
    """
    lost = BrokenPromises(difference.old, difference.new, difference)
    for place, each in lost.statements(deadline, start):
        yield place, ("lost", each)
    gained = BrokenPromises(difference.new, difference.old, difference)
    for place, each in gained.statements(deadline, max(0, start - lost.places)):
        yield lost.places + place, ("gained", each)
