"""Strict JSON: accepted exactly when a slow and careful reader accepts, and then the same value."""

from __future__ import annotations

import json
import math
from typing import Any

import pytest
from hypothesis import example, given
from hypothesis import strategies as some

from pathgate.web.body import read_json
from pathgate.web.json_faults import LONGEST_NUMBER, NotJson, find_fault

MAX_DEPTH = 12


class Refused(Exception):
    """The careful reader's no."""


def careful(body: bytes) -> Any:
    """The value by the standard library's parser, every strictness checked on what it hands over."""
    try:
        value = json.loads(
            body.decode(),
            object_pairs_hook=careful_members,
            parse_constant=refuse,
            parse_float=lambda written: float(careful_number(written)),
            parse_int=lambda written: int(careful_number(written)),
        )
        json.dumps(value, ensure_ascii=False).encode()
    except (UnicodeError, json.JSONDecodeError, RecursionError) as error:
        raise Refused(body) from error
    if depth(value) > MAX_DEPTH:
        raise Refused(value)
    return value


def refuse(written: str) -> Any:
    raise Refused(written)


def careful_number(written: str) -> str:
    if len(written) > LONGEST_NUMBER or math.isinf(float(written)):
        raise Refused(written)
    return written


def careful_members(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    if len({key for key, _ in pairs}) < len(pairs):
        raise Refused(pairs)
    return dict(pairs)


def depth(value: Any) -> int:
    inside = value.values() if isinstance(value, dict) else value if isinstance(value, list) else None
    return 0 if inside is None else 1 + max(map(depth, inside), default=0)


def same(left: Any, right: Any) -> bool:
    """Equal, and of equal types and signs all the way down."""
    return repr(left) == repr(right)


def check(body: bytes) -> None:
    try:
        wanted = careful(body)
    except Refused:
        with pytest.raises(NotJson):
            read_json(body, MAX_DEPTH)
        assert find_fault(body, MAX_DEPTH) is not None
    else:
        assert same(read_json(body, MAX_DEPTH), wanted)
        assert find_fault(body, MAX_DEPTH) is None


TEXTS = some.text(alphabet=some.characters(exclude_categories=["Cs"]), max_size=6) | some.sampled_from(
    ["a", "b", ":", "{", "}", "]", '"', "\\", '\\"', 'a":', "\\\\", "é", "😀", "\x00", "\u2028"]
)
NUMBERS = (
    some.integers() | some.floats(allow_nan=False, allow_infinity=False) | some.integers(-(10**310), 10**310)
)
VALUES = some.recursive(
    some.none() | some.booleans() | NUMBERS | TEXTS,
    lambda inner: some.lists(inner, max_size=4) | some.dictionaries(TEXTS, inner, max_size=4),
    max_leaves=20,
)


@given(value=VALUES, ascii_only=some.booleans(), indent=some.sampled_from([None, 0, 2]))
def test_what_a_json_library_writes_is_read_as_the_same_value(value, ascii_only, indent):
    check(json.dumps(value, ensure_ascii=ascii_only, indent=indent).encode())


PIECES = some.sampled_from(
    [
        *'{}[]:," \n\t\\-+.eE019/abu',
        *['"a"', '"b"', '"a":', '"\\u0061":', '"\\""', '"\\\\"', "true", "null", "NaN", "-Infinity", "1e400"],
        *[
            "1e308",
            "-0",
            "0.0",
            "9" * 301,
            '"\\ud800"',
            '"\\ud83d\\ude00"',
            '"\\udc00\\ud800"',
            "\ufeff",
            "é",
        ],
    ]
)


@given(pieces=some.lists(PIECES, max_size=12))
@example(pieces=['{"a"', ":", "1", ",", '"\\u0061":', "2", "}"])
def test_pieces_of_json_in_any_order_are_read_or_refused_as_by_the_careful_reader(pieces):
    check("".join(pieces).encode())


@given(value=VALUES, place=some.integers(0, 200), byte=some.integers(0, 255), instead=some.booleans())
def test_a_changed_byte_is_read_or_refused_as_by_the_careful_reader(value, place, byte, instead):
    body = bytearray(json.dumps(value, ensure_ascii=False).encode())
    place %= len(body) + 1
    body[place : place + instead] = bytes([byte])
    check(bytes(body))


@given(body=some.binary(max_size=12))
def test_any_bytes_are_read_or_refused_as_by_the_careful_reader(body):
    check(body)


@pytest.mark.parametrize(
    ("body", "line", "column", "word"),
    [
        (b"", 1, 1, "empty"),
        (b" \n ", 1, 1, "empty"),
        (b'{"a": 1,\n "a": 2}', 2, 2, "twice"),
        (b'{"a": {"b": 1}, "\\u0061": 2}', 1, 17, "twice"),
        (b"[1,\n2,\n NaN]", 3, 2, "NaN"),
        (b"[-Infinity]", 1, 2, "Infinity"),
        ('{"é": "é", "x": 1e400}'.encode(), 1, 17, "double"),
        (b"[" + b"1" * 301 + b"]", 1, 2, "longer"),
        (b'["ab\\ud800"]', 1, 5, "surrogate"),
        (b'["\\udc00\\ud83d\\ude00"]', 1, 3, "surrogate"),
        (b"[" * 500 + b"]" * 500, 1, MAX_DEPTH + 1, "deep"),
        (b'{"a":' * 100_000, 1, MAX_DEPTH * 5 + 1, "deep"),
        ('["é\n"'.encode() + b"\xff]", 2, 2, "UTF-8"),
        (b"\xef\xbb\xbf{}", 1, 1, "byte order mark"),
        ("{}".encode("utf-16"), 1, 1, "UTF-8"),
        (b'{"a": 1', 1, 8, "syntax"),
        (b"{'a': 1}", 1, 2, "syntax"),
        (b"[1, 2] tail", 1, 8, "syntax"),
        (b"[1 2, NaN]", 1, 4, "syntax"),
        (b'["a', 1, 2, "syntax"),
    ],
)
def test_a_fault_is_named_with_its_line_and_column(body, line, column, word):
    with pytest.raises(NotJson) as refused:
        read_json(body, MAX_DEPTH)
    assert (refused.value.line, refused.value.column) == (line, column)
    assert word in refused.value.detail


def test_long_digits_within_a_string_are_no_number():
    assert read_json(b'["' + b"7" * 5000 + b'"]', MAX_DEPTH) == ["7" * 5000]


@pytest.mark.parametrize(
    "hostile",
    [
        b'"' + b'\\"' * 1_000_000,
        b"1" * 2_000_000 + b"x",
        b'{"a":1,' * 200_000,
        b'["' + b"\\ud83d\\ude00" * 150_000 + b'\\ud800"]',
        b"{" + b",".join(b'"%d":1' % i for i in range(150_000)) + b',"0":2}',
    ],
    ids=["escaped quotes without end", "digits", "objects", "surrogate pairs", "keys"],
)
def test_a_hostile_body_of_two_megabytes_is_refused_by_a_walk_of_linear_length(hostile):
    # A quadratic walk over these would take hours, so coming back at all is the test.
    assert find_fault(hostile, MAX_DEPTH) is not None
