"""Conditions on the rows that a request gives as names of columns and objects.

Names that stand bare in a list make up one condition; an object is a condition of its own. Linear in the list.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from pathgate.criteria.selection import Part
from pathgate.graphs.errors import Fault, Place
from pathgate.graphs.masks import mask_of
from pathgate.review.names import NameReader


@dataclass(frozen=True, slots=True)
class FilterPart:
    """One condition on the rows and where the config puts it."""

    part: Part
    place: Place


def read_parts(value: str | Sequence[Any], names: NameReader, place: Place) -> tuple[FilterPart, ...]:
    """The conditions on the rows that a value of the right shape describes, bare names making up one."""
    items = [value] if isinstance(value, str) else list(value)
    bare = [(k, item) for k, item in enumerate(items) if isinstance(item, str)]
    parts: list[FilterPart] = []
    for k, item in enumerate(items):
        if not isinstance(item, str):
            parts.append(_object_part(item, names, (*place, k)))
        elif k == bare[0][0]:
            found = names.read_each([(name, (*place, at)) for at, name in bare])
            columns = mask_of(one.node for one in found)
            parts.append(FilterPart(Part(columns, fixed=False, written=[name for _, name in bare]), place))
    # What reads nothing of the graph selects on nothing that the graph knows.
    return tuple(each for each in parts if each.part.columns or not names.passed_over)


def _object_part(item: Mapping[str, Any], names: NameReader, place: Place) -> FilterPart:
    found = names.read(item["columns"], (*place, "columns"))
    fixed = item.get("fixed", False)
    if fixed and not isinstance(item["columns"], str) and len(item["columns"]) != 1:
        detail = "a condition that is fixed holds exactly one column at one value"
        names.faults.append(Fault("invalid-request", (*place, "fixed"), detail))
    # Within one bucket of a column it still varies.
    is_whole = not any(names.recodes.get(one.written) for one in found)
    columns = mask_of(one.node for one in found)
    return FilterPart(Part(columns, fixed=fixed and is_whole, written=dict(item)), place)
