"""What a row filter in SQL comes to: its parts, and what a review takes for granted about it.

Apart from the reading of SQL, so that a review without SQL need not load a parser.
"""

from __future__ import annotations

from dataclasses import dataclass

from pathgate.criteria.selection import Part
from pathgate.graphs.errors import Place


@dataclass(frozen=True, slots=True)
class Assumed:
    """What a row filter leaves unsaid, and a review takes for granted.

    Attributes:
        kind: what the matter is.
        columns: mask of the nodes it is about.
        tables: the tables it is about.
        written: the part it is about, where it is about one.
        place: the row filter's.
        names: the names it is about that the config declares as outside the graph.
    """

    kind: str
    columns: int
    place: Place
    tables: tuple[str, ...] = ()
    written: str | None = None
    names: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class SqlFilter:
    """A row filter in SQL against a graph.

    Attributes:
        parts: what it selects on.
        assumed: what is taken for granted about it.
        emptied: mask of the columns of which it keeps nothing but nulls.
    """

    parts: tuple[Part, ...] = ()
    assumed: tuple[Assumed, ...] = ()
    emptied: int = 0
