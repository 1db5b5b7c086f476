"""Reads a request's body as strict JSON: the same value as any careful reader would see, or no value at all.

The parser is native code. Three things it does not mind are checked beside it, on the bytes and in bulk:
nesting (before the parser sees it), keys that stand twice in one object (then the text has more colons outside
strings than the value has members), and absurdly long numbers. Together they take about as long as the
standard library's parser alone. What is refused is explained by ``json_faults``, at leisure.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import msgspec
import numpy as np

from pathgate.web.json_faults import LONGEST_NUMBER, NotJson, find_fault

# Up to about here counting bytes is faster than setting up arrays.
_SMALL = 10_000
_QUOTE, _COLON = ord('"'), ord(":")
_KEPT = b'"{}[]:'
_DROPPED = bytes(set(range(256)) - set(_KEPT))
# How each byte changes the level of nesting, as signed bytes.
_STEPS = bytes(1 if byte in b"{[" else 255 if byte in b"}]" else 0 for byte in range(256))
# Every number longer than allowed covers at least two of the places looked at.
_STRIDE = LONGEST_NUMBER // 2
_DIGITS = b"0123456789+-.eE"
_DIGIT_FLAGS = bytes(ord("d") if byte in _DIGITS else 0 for byte in range(256))


@dataclass(frozen=True, slots=True)
class _Outline:
    """What stands outside strings: how many colons and opening brackets, and how deep they nest."""

    colons: int
    openings: int
    depth: int


def read_json(body: bytes, max_depth: int) -> Any:
    """The value that ``body`` holds.

    Raises:
        NotJson: it holds none; the fault is named with its place.

    >>> read_json(b'{"x": [1, 2.5]}', max_depth=3)
    {'x': [1, 2.5]}
    >>> read_json(b'{"x": 1, "x": 2}', max_depth=3)
    Traceback (most recent call last):
    pathgate.web.json_faults.NotJson: the key "x" stands twice in one object (line 1, column 10)
    """
    outline = _outline(body, max_depth)
    if outline.depth > max_depth or _may_hold_long_number(body):
        _raise_fault(body, max_depth)
    try:
        value = msgspec.json.decode(body)
    except (msgspec.MsgspecError, UnicodeError, RecursionError):
        _raise_fault(body, max_depth)
        raise NotJson("the body cannot be read as JSON", 1, 1) from None
    if _members(value, outline.openings) != outline.colons:
        exact = _exact_outline(body)
        if _members(value, exact.openings) != exact.colons:
            _raise_fault(body, max_depth)
    return value


def _raise_fault(body: bytes, max_depth: int) -> None:
    fault = find_fault(body, max_depth)
    if fault is not None:
        raise fault


def _outline(body: bytes, max_depth: int) -> _Outline:
    """For a small body bounds from above, where they suffice: brackets and colons counted in strings as well."""
    if len(body) <= _SMALL:
        openings = body.count(b"{") + body.count(b"[")
        if openings <= max_depth:
            return _Outline(body.count(b":"), openings, depth=openings)
    return _exact_outline(body)


def _exact_outline(body: bytes) -> _Outline:
    if b"\\" in body:
        # Same length, no escaped quote left: pairs first, so that the last quote of "\\" stays one.
        body = body.replace(b"\\\\", b"__").replace(b'\\"', b"__")
    marks = np.frombuffer(body.translate(None, _DROPPED), dtype=np.uint8)
    is_quote = marks == _QUOTE
    is_inside = np.logical_xor.accumulate(is_quote) if len(marks) else is_quote
    outside = marks.compress(~(is_quote | is_inside))
    steps = np.frombuffer(outside.tobytes().translate(_STEPS), dtype=np.int8)
    depth = int(np.cumsum(steps, dtype=np.int32).max(initial=0))
    return _Outline(int(np.count_nonzero(outside == _COLON)), int(np.count_nonzero(steps == 1)), depth)


def _may_hold_long_number(body: bytes) -> bool:
    """Do two of the places a stride apart both hold a character of a number, and all between them too?"""
    if len(body) <= LONGEST_NUMBER:
        return False
    samples = body[::_STRIDE].translate(_DIGIT_FLAGS)
    place = samples.find(b"dd")
    while place >= 0:
        if not body[place * _STRIDE : (place + 1) * _STRIDE].strip(_DIGITS):
            return True
        place = samples.find(b"dd", place + 1)
    return False


def _members(value: Any, containers: int) -> int:
    """The number of members of all objects in a value that holds ``containers`` objects and lists in all.

    Level by level, and no further than the last container: most values of a large body are strings in
    objects that hold nothing else, which need no looking at.
    """
    dicts = [value] if type(value) is dict else []
    lists = [value] if type(value) is list else []
    members = 0
    while dicts or lists:
        members += sum(map(len, dicts))
        containers -= len(dicts) + len(lists)
        if containers == 0:
            break
        dicts, lists = _one_level_down(dicts, lists)
    return members


def _one_level_down(
    dicts: list[dict[str, Any]], lists: list[list[Any]]
) -> tuple[list[dict[str, Any]], list[list[Any]]]:
    dicts_below: list[dict[str, Any]] = []
    lists_below: list[list[Any]] = []
    for values in lists:
        kinds = set(map(type, values))
        if kinds == {dict}:
            dicts_below.extend(values)
        elif dict in kinds or list in kinds:
            dicts_below.extend(each for each in values if type(each) is dict)
            lists_below.extend(each for each in values if type(each) is list)
    for holder in dicts:
        for each in holder.values():
            if type(each) is dict:
                dicts_below.append(each)
            elif type(each) is list:
                lists_below.append(each)
    return dicts_below, lists_below
