"""Where inside a SQL text does one of its conditions stand, as a file spells that text?

The text may be quoted, escaped and broken over lines; what is looked for is plain. Both are read as characters with
each run of white space as one, so that they can be compared. O(text).
"""

from __future__ import annotations

import json
import re
from collections.abc import Iterator
from dataclasses import dataclass

_WHITE = re.compile(r"\s+")
_ESCAPED = re.compile(r"(?:\\u[dD][89abAB][0-9a-fA-F]{2})?\\u[0-9a-fA-F]{4}|\\.|\s+|.", re.DOTALL)
_DOUBLED = re.compile(r"''|\s+|.", re.DOTALL)
_LITERAL = re.compile(r"\s+|.", re.DOTALL)
_BLOCK_SIGN = re.compile(r"[|>][^\n]*\n\s*")
# What stands before a condition that is one of several joined by AND, or the only one.
_JOINT = re.compile(r"(?:^ ?|\b(?:and|where|having|on) |\( ?)$", re.IGNORECASE)
_LONGEST_JOINT = 8


def find_part(raw: str, part: str) -> tuple[int, int] | None:
    """From where to where a condition stands in a SQL text as a file holds it; None where it does not.

    One that stands by itself goes before the same words inside another condition.

    >>> raw = '"data = 1 AND a = 1"'
    >>> start, end = find_part(raw, "a = 1")
    >>> start, raw[start:end]
    (14, 'a = 1')
    """
    wanted = _WHITE.sub(" ", part.strip())
    if not wanted:
        return None
    plain = _plain(raw)
    found = list(_occurrences(plain.text, wanted))
    alone = (place for place in found if _stands_alone(plain.text, place))
    place = next(alone, found[0] if found else None)
    return None if place is None else (plain.starts[place], plain.ends[place + len(wanted) - 1])


@dataclass(frozen=True, slots=True)
class _Plain:
    """What a spelling means, and from where to where each of its characters is spelt."""

    text: str
    starts: list[int]
    ends: list[int]


def _plain(raw: str) -> _Plain:
    begin, spelling = _spelling(raw)
    characters: list[str] = []
    starts: list[int] = []
    ends: list[int] = []
    for match in spelling.finditer(raw, begin):
        character = _meaning(match[0])
        if character == " " and characters[-1:] == [" "]:
            ends[-1] = match.end()
            continue
        characters.append(character)
        starts.append(match.start())
        ends.append(match.end())
    return _Plain("".join(characters), starts, ends)


def _spelling(raw: str) -> tuple[int, re.Pattern[str]]:
    """Where the text begins in its spelling, and what spells one character of it."""
    if raw.startswith('"'):
        return 1, _ESCAPED
    if raw.startswith("'"):
        return 1, _DOUBLED
    sign = _BLOCK_SIGN.match(raw)
    return sign.end() if sign else 0, _LITERAL


def _meaning(spelt: str) -> str:
    """The one character that is spelt so; white space of any kind is a blank."""
    if len(spelt) > 2 and spelt[0] == "\\":
        spelt = json.loads(f'"{spelt}"')
    elif len(spelt) == 2 and spelt[0] == "\\":
        spelt = " " if spelt[1] in "nrt\n" else spelt[1]
    return " " if spelt.isspace() else spelt[0]


def _occurrences(text: str, wanted: str) -> Iterator[int]:
    """Where it stands, not as a piece of a longer name or number."""
    place = text.find(wanted)
    while place >= 0:
        before, after = text[place - 1 : place], text[place + len(wanted) :][:1]
        is_cut = _is_word(wanted[0]) and (_is_word(before) or before == ".")
        if not is_cut and not (_is_word(wanted[-1]) and _is_word(after)):
            yield place
        place = text.find(wanted, place + 1)


def _stands_alone(text: str, place: int) -> bool:
    return _JOINT.search(text, max(0, place - _LONGEST_JOINT), place) is not None


def _is_word(character: str) -> bool:
    return character == "_" or character.isalnum()
