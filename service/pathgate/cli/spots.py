"""Where in a file does a value stand?

A ``Spot`` is the place of one value, with the spots of what it holds; JSON and YAML make the same kind. Lines and
columns count from 1, in characters. Finding a value is O(its depth).
"""

from __future__ import annotations

import re
from bisect import bisect_right
from dataclasses import dataclass, field
from functools import cached_property
from urllib.parse import unquote

from pathgate.cli.sql_spots import find_part


@dataclass(frozen=True, slots=True)
class Region:
    """Some characters of a file: from a line and column up to (not including) another; all count from 1.

    A list or an object has no end here: it is known by where it begins.
    """

    line: int
    column: int
    end_line: int | None = None
    end_column: int | None = None


@dataclass(slots=True)
class Spot:
    """Where one value stands.

    Attributes:
        start, end: characters before its first, and up to its last; ``end`` is None for lists and objects.
        inside: the spots of what it holds, by key or index.
    """

    start: int
    end: int | None = None
    inside: dict[str, Spot] = field(default_factory=dict)


@dataclass(frozen=True, eq=False)
class Map:
    """A text and where its values stand in it."""

    text: str
    root: Spot

    @cached_property
    def _line_starts(self) -> list[int]:
        return [0, *(match.end() for match in re.finditer("\r\n|[\n\r]", self.text))]

    def region(self, steps: tuple[str, ...], part: object = None) -> Region:
        """Where the value at ``steps`` stands, or the nearest one around it that does.

        Args:
            part: where it is a stretch of the text that the value is, only that stretch.
        """
        spot = self.root
        for step in steps:
            if step not in spot.inside:
                return self._between(spot.start, spot.end)
            spot = spot.inside[step]
        if isinstance(part, str) and spot.end is not None:
            found = find_part(self.text[spot.start : spot.end], part)
            if found is not None:
                return self._between(spot.start + found[0], spot.start + found[1])
        return self._between(spot.start, spot.end)

    def _between(self, start: int, end: int | None) -> Region:
        if end is None:
            return Region(*self._position(start))
        return Region(*self._position(start), *self._position(end))

    def _position(self, offset: int) -> tuple[int, int]:
        line = bisect_right(self._line_starts, offset)
        return line, offset - self._line_starts[line - 1] + 1


def steps_of(pointer: str) -> tuple[str, ...]:
    """The steps of a JSON pointer in URI fragment form.

    >>> steps_of("#/config/a~1b%20c~0/3")
    ('config', 'a/b c~', '3')
    """
    steps = pointer.removeprefix("#").split("/")[1:]
    return tuple(unquote(step).replace("~1", "/").replace("~0", "~") for step in steps)
