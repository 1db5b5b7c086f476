"""Where in a file does a value stand, and where inside a SQL text does one of its conditions?

A ``Spot`` is the place of one value, with the spots of what it holds; JSON and YAML make the same kind. Lines and
columns count from 1, in characters. Finding a value is O(its depth), finding a condition O(text).
"""

from __future__ import annotations

import re
from bisect import bisect_right
from dataclasses import dataclass, field
from functools import cached_property
from urllib.parse import unquote

# What may stand before a condition that is one of several joined by AND, or the only one.
_JOINT = re.compile(r"(?:^|\b(?:and|where|having|on)|\()\s*$", re.IGNORECASE)
_WORD_BEFORE = r"(?<![\w.])"
_WORD_AFTER = r"(?!\w)"
# How far back from a condition its joint is looked for.
_JOINT_WITHIN = 200


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


def find_part(raw: str, part: str) -> tuple[int, int] | None:
    """From where to where a condition stands in a SQL text as a file holds it: quoted, escaped, over several lines.

    One that stands by itself goes before the same words inside another condition.

    >>> raw = '"data = 1 AND a = 1"'
    >>> start, end = find_part(raw, "a = 1")
    >>> start, raw[start:end]
    (14, 'a = 1')
    """
    if not part.strip():
        return None
    before = _WORD_BEFORE if _is_word(part[0]) else ""
    after = _WORD_AFTER if _is_word(part[-1]) else ""
    found = list(re.finditer(before + _loosely(part) + after, raw))
    alone = (each for each in found if _stands_alone(raw, each.start()))
    match = next(alone, found[0] if found else None)
    return match.span() if match else None


def _stands_alone(raw: str, start: int) -> bool:
    # The quotation mark or block sign that the value opens with says no more than the beginning of the text.
    before = raw[max(0, start - _JOINT_WITHIN) : start].replace("\\n", " ")
    return _JOINT.search(re.sub(r"^(?:[\"']|[|>][^\n]*\n)", "", before)) is not None


def _loosely(part: str) -> str:
    """The pattern of a text however a string in JSON or YAML may spell it."""
    pieces = re.findall(r"\s+|\S", part)
    return "".join(r"(?:\s|\\[nrt])+" if piece.isspace() else _spellings(piece) for piece in pieces)


def _spellings(character: str) -> str:
    numbers = "".join(f"\\\\u{unit:04x}" for unit in _utf_16(character))
    spelt = [re.escape(character), f"(?i:{numbers})"]
    if character in "\"/\\'":
        spelt[:0] = [re.escape("\\" + character)]
    if character == "'":
        spelt[:0] = ["''"]
    return f"(?:{'|'.join(spelt)})"


def _utf_16(character: str) -> list[int]:
    units = character.encode("utf-16-be", "surrogatepass")
    return [int.from_bytes(units[k : k + 2]) for k in range(0, len(units), 2)]


def _is_word(character: str) -> bool:
    return character == "_" or character.isalnum()
