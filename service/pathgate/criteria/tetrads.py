"""Which tetrads of covariances vanish in every linear model of the graph, and which choke point makes them?

By trek separation (Sullivant, Talaska & Draisma 2010): the covariances of rows {a, b} with columns {c, d} have
determinant zero in every linear model exactly where one node lies on every trek from a row to a column, always
on the rows' side or always on the columns' side. A trek goes up arrows from a row to its top and down arrows to
a column; the top is a node or a bidirected edge. In the graph of two sides (each node once on the way up and once
on the way down) that node dominates both columns, seen from the two rows. So one pass over that graph for each
pair of rows finds their tetrads with all columns: O(columns² · (nodes + edges)) in all, many pairs at a time.
"""

from __future__ import annotations

from collections import defaultdict, deque
from collections.abc import Iterator
from dataclasses import dataclass
from itertools import islice

import numpy as np
import numpy.typing as npt

from pathgate.criteria.deadline import Deadline
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import IntArray, members

_Labels = npt.NDArray[np.int32]

_UNREACHED = -1
# So many pairs of rows go through the graph at once, unless the table of their labels grew past so many cells.
_MOST_PAIRS = 1024
_MOST_CELLS = 4_000_000


@dataclass(frozen=True, slots=True)
class Tetrad:
    """Two rows and two columns, four different measured nodes, whose covariances have determinant zero.

    Attributes:
        rows, columns: each pair in the graph's order; the first of the four in that order is a row.
        rows_side: the choke point, where every trek passes it between a row and the trek's top, both included.
        columns_side: the same for the way from the top to a column. One of the two sides holds one node, the
            other none. Where the unmeasured cause behind a bidirected edge is a choke point, so are its ends.
    """

    rows: tuple[str, str]
    columns: tuple[str, str]
    rows_side: tuple[str, ...]
    columns_side: tuple[str, ...]


def tetrads(graph: CausalGraph, deadline: Deadline) -> Iterator[Tetrad]:
    """Every vanishing tetrad without a vanishing covariance in it, each once, in the graph's order.

    A tetrad with a vanishing covariance in it vanishes only where a whole row or column of it does; that says
    nothing new, and those are left out. Of several choke points the one nearest to the rows is named.

    Raises:
        OutOfTime: the deadline came first.

    >>> graph = CausalGraph.of(*(("haste", sign) for sign in "abcd"), unmeasured=["haste"])
    >>> for each in tetrads(graph, Deadline.never()):
    ...     print(each.rows, each.columns, each.rows_side)
    ('a', 'b') ('c', 'd') ('haste',)
    ('a', 'c') ('b', 'd') ('haste',)
    ('a', 'd') ('b', 'c') ('haste',)
    """
    return (found for _place, found in tetrads_from(graph, 0, deadline))


def tetrads_from(graph: CausalGraph, start: int, deadline: Deadline) -> Iterator[tuple[int, Tetrad]]:
    """The same from a place on, each with its place; what comes before is not looked for.

    Places rise from one tetrad to the next, not always by one; 0 is the first.

    Raises:
        OutOfTime: the deadline came first.
    """
    sides = _Sides.of(graph)
    measured = np.fromiter(members(graph.measured), dtype=np.int64)
    # The place tells the number of the pair of rows, and which of its tetrads it is: fewer than these.
    most = max(1, len(measured)) ** 2
    rank, skipped = divmod(start, most)
    pairs = _pairs_from(measured.tolist(), rank)
    at_once = max(1, min(_MOST_PAIRS, _MOST_CELLS // (2 * graph.size + 1)))
    while block := list(islice(pairs, at_once)):
        found = _Found.of(sides, measured, np.array(block, dtype=np.int64), deadline)
        for place in np.flatnonzero(found.counts).tolist():
            deadline.poll()
            named = enumerate(_named(graph, block[place], found.chokes(place)), start=(rank + place) * most)
            yield from islice(named, 0 if place else skipped, None)
        rank, skipped = rank + len(block), 0


def _pairs_from(columns: list[int], rank: int) -> Iterator[tuple[int, int]]:
    """All pairs of columns in order, without the first ``rank`` of them."""
    for place, first in enumerate(columns):
        later = columns[place + 1 :]
        yield from ((first, other) for other in later[rank:])
        rank = max(0, rank - len(later))


@dataclass(frozen=True, slots=True)
class _Sides:
    """The graph of two sides: state v is node v on the way up, state size + v is node v on the way down.

    Attributes:
        size: how many nodes the graph has.
        steps: each state with those that lead into it, the latter earlier in the list. State 2 · size, which
            is never reached, stands where nothing leads into a state.
    """

    size: int
    steps: tuple[tuple[int, IntArray], ...]

    @classmethod
    def of(cls, graph: CausalGraph) -> _Sides:
        size = graph.size
        order = graph.topological_order
        upward = [(node, graph.children(node)) for node in reversed(order)]
        downward = [
            (
                size + node,
                (node, *graph.spouses(node), *(size + parent for parent in graph.parents(node))),
            )
            for node in order
        ]
        steps = [(state, np.array(before or (2 * size,))) for state, before in upward + downward]
        return cls(size, tuple(steps))

    def heads(self, pairs: IntArray, deadline: Deadline) -> _Labels:
        """For each state and pair of rows, the first state past the rows' beginning that every way there passes.

        A row that the other row does not reach is marked by ``2 * size`` more: its treks are not the other's.
        """
        labels = np.full((2 * self.size + 1, len(pairs)), _UNREACHED, dtype=np.int32)
        one, other = np.ascontiguousarray(pairs.T)
        for state, before in self.steps:
            deadline.poll()
            heads = _merged(labels[before], state)
            if state < self.size:
                begins = (one == state) | (other == state)
                alone = np.where(heads == _UNREACHED, np.int32(2 * self.size + state), np.int32(state))
                heads = np.where(begins, alone, heads)
            labels[state] = heads
        return labels


def _merged(before: _Labels, state: int) -> _Labels:
    """The heads of a state, from those of the states that lead into it.

    Where ways with different heads meet, the meeting is the first state that all of them pass.
    """
    if len(before) == 1:
        only: _Labels = before[0]
        return only
    highest = before.max(axis=0)
    # Read without sign, what is unreached is larger than every label.
    lowest = before.view(np.uint32).min(axis=0).view(np.int32)
    return np.where(highest == lowest, highest, np.int32(state))


@dataclass(frozen=True, slots=True)
class _Found:
    """The tetrads of a block of pairs of rows.

    Attributes:
        measured: the measured nodes.
        heads: for each pair of rows and measured node its head; below zero, and no two alike, where the node
            is no column for these rows.
        counts: for each pair of rows, how many tetrads it has.
    """

    measured: IntArray
    heads: _Labels
    counts: IntArray

    @classmethod
    def of(cls, sides: _Sides, measured: IntArray, pairs: IntArray, deadline: Deadline) -> _Found:
        labels = sides.heads(pairs, deadline)
        heads = np.ascontiguousarray(labels[sides.size + measured].T)
        is_shared = (heads != _UNREACHED) & (heads < 2 * sides.size)
        is_column = (measured > pairs[:, :1]) & (measured != pairs[:, 1:])
        unlike = -1 - np.arange(len(measured), dtype=np.int32)
        heads = np.where(is_shared & is_column, heads, unlike)
        return cls(measured, heads, _equal_pairs(heads))

    def chokes(self, place: int) -> Iterator[tuple[int, int, int]]:
        """Two columns and the choke state, in order, for one pair of rows."""
        heads = self.heads[place]
        columns = list(zip(self.measured[heads >= 0].tolist(), heads[heads >= 0].tolist(), strict=True))
        later: dict[int, deque[int]] = defaultdict(deque)
        for column, head in columns:
            later[head].append(column)
        for column, head in columns:
            later[head].popleft()
            for other in later[head]:
                yield column, other, head


def _equal_pairs(heads: _Labels) -> IntArray:
    """For each row of the table, how many pairs of its entries are equal."""
    ordered = np.sort(heads, axis=1)
    places = np.arange(heads.shape[1])
    is_repeated = np.zeros(heads.shape, dtype=np.bool_)
    is_repeated[:, 1:] = ordered[:, 1:] == ordered[:, :-1]
    firsts = np.maximum.accumulate(np.where(is_repeated, 0, places), axis=1)
    counts: IntArray = (places - firsts).sum(axis=1)
    return counts


def _named(
    graph: CausalGraph, rows: tuple[int, int], chokes: Iterator[tuple[int, int, int]]
) -> Iterator[Tetrad]:
    row_names = (graph.name(rows[0]), graph.name(rows[1]))
    for first, second, state in chokes:
        choke = (graph.name(state % graph.size),)
        sides = (choke, ()) if state < graph.size else ((), choke)
        yield Tetrad(row_names, (graph.name(first), graph.name(second)), *sides)
