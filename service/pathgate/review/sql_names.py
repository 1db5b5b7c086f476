"""Which columns of a graph does a SQL text in a config read, and what does it assume that it does not say?

A row filter gives its parts and what is taken for granted about them; an expression gives its inputs and how
much of them it keeps. What is declared as outside the graph reads nothing of it and is told apart. Linear.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from functools import cached_property

from pathgate.criteria.selection import Part
from pathgate.graphs.errors import Fault, Place
from pathgate.graphs.masks import mask_of
from pathgate.graphs.names import quoted
from pathgate.review.assumed import Assumed, SqlFilter
from pathgate.review.keeps import Keeps
from pathgate.review.names import NameReader
from pathgate.review.sql_bounds import SqlRefused
from pathgate.review.sql_columns import ColumnFinder, Reads
from pathgate.review.sql_expression import read_expression
from pathgate.review.sql_filter import Condition, Conditions, sql_conditions


def read_sql_filter(
    text: str, dialect: str, names: NameReader, place: Place, missing: Mapping[int, int] | None = None
) -> SqlFilter:
    """The parts of a row filter in SQL; what is wrong with it is added to the faults of ``names``.

    Args:
        text: the condition, or the SELECT that it stands in.
        dialect: in whose SQL it is written.
        names: what its names can mean; a condition on one that stands for less than its node fixes nothing.
        place: where it stands.
        missing: the nodes whose causes of being null are known; nothing is assumed about those.
    """
    try:
        found = sql_conditions(text, dialect)
    except SqlRefused as refused:
        names.faults.append(Fault(refused.slug, place, refused.detail))
        return SqlFilter()
    finder = ColumnFinder(
        names.graph, found.dialect, names.faults, place, found.joined, names.outside, names.coarse
    )
    reading = _Reading(found, finder, mask_of(missing or ()))
    for condition in found.parts:
        reading.take(condition)
    return reading.filter()


def read_sql_expression(text: str, dialect: str, names: NameReader, place: Place) -> tuple[int, Keeps]:
    """The columns that an expression in SQL is computed from, and how much of them it keeps.

    What is wrong with it is added to the faults of ``names``. The mask is empty without a fault where the
    expression reads nothing but names that are declared as outside the graph. It keeps no more of a column than
    the name does that it reads.
    """
    try:
        found = read_expression(text, dialect)
    except SqlRefused as refused:
        names.faults.append(Fault(refused.slug, place, refused.detail))
        return 0, "computed"
    finder = ColumnFinder(
        names.graph, found.dialect, names.faults, place, outside=names.outside, coarse=names.coarse
    )
    reads = finder.read(found.columns, found.words)
    if reads.columns.bit_count() + len(reads.outside) > 1:
        return reads.columns, "computed"
    # Two spellings of one column are one column that occurs twice.
    return reads.columns, "coarse" if found.keeps == "computed" or reads.is_coarse else found.keeps


def names_in_expression(text: str, dialect: str) -> tuple[str, ...]:
    """The last steps of the names that an expression reads; none where it cannot be read."""
    try:
        return tuple(dict.fromkeys(column.name for column in read_expression(text, dialect).columns))
    except SqlRefused:
        return ()


@dataclass
class _Reading:
    """A row filter, read condition by condition."""

    found: Conditions
    finder: ColumnFinder
    missing: int
    parts: list[Part] = field(default_factory=list)
    assumed: list[Assumed] = field(default_factory=list)
    emptied: int = 0
    compared: int = 0

    def take(self, condition: Condition) -> None:
        """Adds what one condition selects on and what it leaves unsaid."""
        reads = self._read(condition)
        unmeasured = reads.columns & ~self.finder.graph.measured
        if reads.outside:
            self._assume("outside", 0, condition.written, reads.outside)
        if condition.null_test == "missing" and reads.columns & self.missing:
            self._refuse_dropped(reads.columns)
        elif condition.null_test and not unmeasured:
            if reads.columns & ~self.missing:
                self._assume("null-test", reads.columns, condition.written)
            self.emptied |= reads.columns if condition.null_test == "missing" else 0
        elif reads.columns:
            fixed = condition.fixed and not reads.outside and not reads.is_coarse
            self.parts.append(Part(reads.columns, fixed, condition.written))
            self.compared |= reads.columns & ~unmeasured & ~self.missing

    def filter(self) -> SqlFilter:
        """What has been read, with what is assumed about all of it."""
        if self.compared:
            self._assume("comparison", self.compared)
        return SqlFilter(tuple(self.parts), (*self.assumed, *self._of_select()), self.emptied)

    def _of_select(self) -> Iterator[Assumed]:
        joined, place = self.found.joined, self.finder.place
        if joined is not None and joined.selecting:
            yield Assumed("join", 0, place, joined.selecting)
        if joined is not None and joined.groups:
            yield Assumed("group", self._groups.columns, place, names=self._groups.outside)

    def _read(self, condition: Condition) -> Reads:
        if condition.is_key:
            found = [self.finder.find(column) for column in condition.columns]
            nodes = {one.node if one is not None else None for one in found}
            # The same column on both sides, or keys that the graph does not know: rows that belong together.
            if None in nodes or len(nodes) == 1:
                return Reads()
        reads = self.finder.read(condition.columns, condition.words)
        if not condition.is_grouped:
            return reads
        both = dict.fromkeys((*reads.outside, *self._groups.outside))
        return Reads(reads.columns | self._groups.columns, tuple(both), reads.is_coarse)

    @cached_property
    def _groups(self) -> Reads:
        return self.finder.read(self.found.joined.groups if self.found.joined is not None else ())

    def _assume(
        self, kind: str, columns: int, written: str | None = None, names: tuple[str, ...] = ()
    ) -> None:
        self.assumed.append(Assumed(kind, columns, self.finder.place, written=written, names=names))

    def _refuse_dropped(self, columns: int) -> None:
        """Of a column whose nulls are said to be dropped, only nulls are to be kept."""
        (name,) = self.finder.graph.names_of(columns)
        detail = f"only rows where {quoted(name)} is null are kept, and missing_because says that these are dropped"
        self.finder.faults.append(Fault("invalid-request", self.finder.place, detail, (name,)))
