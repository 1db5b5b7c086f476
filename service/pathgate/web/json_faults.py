"""Why is a body not JSON, and where does it stop being so?

A walk over the tokens finds what the grammar allows and different readers understand differently: repeated
keys, numbers out of range, lone surrogates, deep nesting. The standard library's parser finds what the grammar
forbids. Whichever comes first in the text is the fault. O(bytes), and no more memory than the text and the
keys of the objects that are open.
"""

from __future__ import annotations

import json
import re
from dataclasses import dataclass, field
from math import isinf

from pathgate.graphs.names import quoted

# Short enough that no whole number accepted lies beyond the range of a double.
LONGEST_NUMBER = 300

_TOKEN = re.compile(
    r"""
      (?P<string> "[^"\\]*+(?:\\.[^"\\]*+)*+"? )
    | (?P<mark> [{}\[\]:] )
    | (?P<word> [^\s"{}\[\]:,]++ )
    """,
    re.VERBOSE | re.DOTALL,
)
# Both halves of a pair, one half alone, or any other escape.
_ESCAPE = re.compile(
    r"""
      \\u[Dd][89ABab][0-9A-Fa-f]{2} \\u[Dd][C-Fc-f][0-9A-Fa-f]{2}
    | (?P<lone> \\u[Dd][89A-Fa-f][0-9A-Fa-f]{2} )
    | \\.
    """,
    re.VERBOSE | re.DOTALL,
)
_NUMBER = re.compile(r"-?+(?:0|[1-9][0-9]*+)(?:\.[0-9]++)?+(?:[eE][-+]?[0-9]++)?+")
_NAMED_NUMBERS = ("NaN", "Infinity", "-Infinity")


class NotJson(Exception):
    """A body that is not JSON here: a sentence, and the line and column (from 1, in characters) of the fault."""

    def __init__(self, detail: str, line: int, column: int) -> None:
        super().__init__(f"{detail} (line {line}, column {column})")
        self.detail = detail
        self.line = line
        self.column = column


@dataclass(frozen=True, slots=True)
class _Finding:
    """A fault at a position of the text, within or at the token that starts at ``token``."""

    detail: str
    position: int
    token: int


def find_fault(body: bytes, max_depth: int) -> NotJson | None:
    """The first fault of a body, or None where it has none."""
    if not body.strip(b" \t\r\n"):
        return NotJson("the body is empty", 1, 1)
    try:
        text = body.decode()
    except UnicodeDecodeError as error:
        before = body[: error.start].decode()
        return _fault("a byte that is not UTF-8", before, len(before))
    if text.startswith("\ufeff"):
        return NotJson("the body starts with a byte order mark; send UTF-8 without one", 1, 1)
    meaning = _meaning_fault(text, max_depth)
    # What follows a fault of meaning is not looked at: it may nest too deep for any parser.
    syntax = _syntax_fault(text if meaning is None else text[: meaning.token])
    first = meaning if syntax is None or (meaning and meaning.token <= syntax.token) else syntax
    return None if first is None else _fault(first.detail, text, first.position)


def _fault(detail: str, text: str, position: int) -> NotJson:
    line_start = text.rfind("\n", 0, position) + 1
    return NotJson(detail, text.count("\n", 0, position) + 1, position - line_start + 1)


def _syntax_fault(text: str) -> _Finding | None:
    """What the grammar forbids. Builds no value worth keeping."""
    decoder = json.JSONDecoder(
        object_pairs_hook=lambda _pairs: None, parse_int=len, parse_float=len, parse_constant=len
    )
    try:
        decoder.decode(text)
    except json.JSONDecodeError as error:
        said = error.msg[:1].lower() + error.msg[1:].removesuffix(" at").removesuffix(" starting")
        return _Finding(f"broken syntax: {said}", error.pos, error.pos)
    return None


@dataclass(slots=True)
class _Walk:
    """Where a walk stands: the open containers (an object's keys so far, None for a list), the last string."""

    open: list[set[str] | None] = field(default_factory=list)
    last_string: str = '""'
    last_start: int = 0


def _meaning_fault(text: str, max_depth: int) -> _Finding | None:
    """What the grammar allows and this service refuses."""
    walk = _Walk()
    for token in _TOKEN.finditer(text):
        written, start = token.group(), token.start()
        found = None
        if token.lastgroup == "string":
            walk.last_string, walk.last_start = written, start
            found = _lone_surrogate(written, start) if "\\" in written else None
        elif token.lastgroup == "word":
            found = _number_fault(written, start)
        elif written == ":":
            found = _repeated_key(walk)
        else:
            found = _step(walk, written, start, max_depth)
        if found is not None:
            return found
    return None


def _step(walk: _Walk, bracket: str, start: int, max_depth: int) -> _Finding | None:
    if bracket in "{[":
        walk.open.append(set() if bracket == "{" else None)
        if len(walk.open) > max_depth:
            return _Finding(f"nested more than {max_depth} levels deep", start, start)
    elif walk.open:
        walk.open.pop()
    return None


def _repeated_key(walk: _Walk) -> _Finding | None:
    keys = walk.open[-1] if walk.open else None
    if keys is None:
        return None
    try:
        key = json.loads(walk.last_string)
    except json.JSONDecodeError:
        return None
    if key in keys:
        detail = f"the key {quoted(key)} stands twice in one object"
        return _Finding(detail, walk.last_start, walk.last_start)
    keys.add(key)
    return None


def _number_fault(word: str, start: int) -> _Finding | None:
    if word in _NAMED_NUMBERS:
        return _Finding(f"{word} is not a number in JSON", start, start)
    is_long = len(word) > LONGEST_NUMBER
    if (not is_long and "e" not in word and "E" not in word) or not _NUMBER.fullmatch(word):
        return None
    if is_long:
        return _Finding(f"a number longer than {LONGEST_NUMBER} characters", start, start)
    return _Finding("a number beyond the range of a double", start, start) if isinf(float(word)) else None


def _lone_surrogate(written: str, start: int) -> _Finding | None:
    """The first escaped surrogate in a string that stands without its other half."""
    lone = next((escape for escape in _ESCAPE.finditer(written) if escape["lone"]), None)
    if lone is None:
        return None
    return _Finding("a lone surrogate, which is no character", start + lone.start(), start)
