"""What decides which rows a model sees: its row filter, and what makes rows go missing without it.

Both become parts, since a graph makes no difference between them; but what the filter does can be undone in the config,
and what loses rows beside it cannot, so that no remedy drops it. A filter in SQL is read by ``sql_names``.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from pathgate.criteria.selection import Part
from pathgate.graphs.errors import Fault
from pathgate.graphs.masks import mask_of
from pathgate.graphs.names import quoted
from pathgate.review.assumed import Assumed
from pathgate.review.names import Named, NameReader
from pathgate.review.parts import FilterPart, read_parts
from pathgate.review.schema import STANDARD_DIALECT


@dataclass(frozen=True, slots=True)
class RowsKept:
    """Which rows a model sees.

    Attributes:
        filter_parts: the conditions of the row filter.
        silent_parts: what keeps rows beside it: ``rows_exist_because`` and ``missing_because``.
        assumed: what the filter leaves unsaid.
    """

    filter_parts: tuple[FilterPart, ...] = ()
    silent_parts: tuple[FilterPart, ...] = ()
    assumed: tuple[Assumed, ...] = ()


ALL_ROWS = RowsKept()


def understand_rows(said: Mapping[str, Any], names: NameReader, modelled: Sequence[Named]) -> RowsKept:
    """The rows that a config's model sees; the columns of the model must be left something to compare."""
    silent, missing = _silent(said, names)
    row_filter, place = said.get("row_filter", []), ("row_filter",)
    if not isinstance(row_filter, str):
        return RowsKept(read_parts(row_filter, names, place), silent)
    if any(fault.place == ("dialect",) for fault in names.faults):
        return RowsKept((), silent)
    # The SQL parser takes long to load, and many configs have none for it.
    from pathgate.review.sql_names import read_sql_filter  # noqa: PLC0415 - slow to import

    dialect = said.get("dialect", STANDARD_DIALECT)
    found = read_sql_filter(row_filter, dialect, names, place, missing)
    names.passed_over.extend((name, place) for each in found.assumed for name in each.names)
    for named in modelled:
        if found.emptied >> named.node & 1:
            name = names.graph.name(named.node)
            detail = f"only rows where {quoted(name)} is null are kept, and the model needs its values"
            names.faults.append(Fault("invalid-request", place, detail, (name,)))
    return RowsKept(tuple(FilterPart(part, place) for part in found.parts), silent, found.assumed)


def _silent(said: Mapping[str, Any], names: NameReader) -> tuple[tuple[FilterPart, ...], dict[int, int]]:
    """The silent parts, and for each column of which that is said what makes it go missing."""
    parts = []
    because = said.get("rows_exist_because", [])
    columns = _columns(because, names, ("rows_exist_because",))
    if columns:
        written = {"rows_exist_because": because}
        parts.append(FilterPart(Part(columns, fixed=False, written=written), ("rows_exist_because",)))
    missing: dict[int, int] = {}
    for column, causes in said.get("missing_because", {}).items():
        place = ("missing_because", column)
        about = names.read(column, place)
        columns = _columns(causes, names, place)
        for named in about:
            missing[named.node] = missing.get(named.node, 0) | columns
        if columns:
            written = {"missing_because": {column: causes}}
            parts.append(FilterPart(Part(columns, fixed=False, written=written), place))
    return tuple(parts), missing


def _columns(value: str | Sequence[str], names: NameReader, place: tuple[str, ...]) -> int:
    return mask_of(named.node for named in names.read(value, place))
