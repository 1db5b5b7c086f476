"""Which independencies does one graph promise and another not?

The statements of a graph's basis (one for each separable pair of columns) are held against the other graph; one that
names a node which that graph lacks or does not measure cannot be kept there. Whether two nodes are separated depends
on what lies above them and on what is given, so only statements about something at or below a change are looked at
at all; those of one column go through the other graph together (``criteria.batch``).
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property

from pathgate.criteria.batch import Statement, separated_each
from pathgate.criteria.deadline import Deadline
from pathgate.criteria.independencies import Independency, basis
from pathgate.criteria.selection import keep_rows
from pathgate.criteria.separable import Pairs
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.kinship import descendants
from pathgate.graphs.masks import mask_of, members
from pathgate.review.graph_difference import Difference


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
        pairs = Pairs(keep_rows(self.promising))
        size = max(1, self.promising.size)
        first, second = divmod(start, size)
        for node in members(pairs.columns >> first << first):
            deadline.poll()
            wanted = -1 if self._affected >> node & 1 else self._affected
            if node == first:
                wanted = wanted >> second << second
            others = pairs.separable(node, deadline) & wanted if self._affected else 0
            listed = [basis(pairs, node, other) for other in members(others)]
            for each in self._not_kept(listed, deadline):
                yield node * size + each.y.bit_length() - 1, self._named(each)

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
        """The nodes at or below a change in either graph: a statement about none of them is kept."""
        touched = _touched(self.difference)
        below = set[str]()
        for graph in (self.promising, self.other):
            ends = mask_of(graph.index[name] for name in touched if name in graph.index)
            below.update(graph.names_of(descendants(graph, ends)))
        return mask_of(self.promising.index[name] for name in below if name in self.promising.index)


def _touched(difference: Difference) -> set[str]:
    """The nodes whose own edges or presence among the columns changed; of an arrow only the end it leads to."""
    touched = {*difference.added_nodes, *difference.removed_nodes}
    touched.update(each.node for each in difference.changed_nodes if "measured" in each.members)
    for kind, source, target in (*difference.added_edges, *difference.removed_edges):
        touched.update((source, target) if kind == "bidirected" else (target,))
    return touched
