"""What does a YAML scalar without quotes mean? By the core schema alone (YAML 1.2 specification, 10.3.2).

So ``no``, ``on``, ``1_000`` and ``2026-01-01`` are strings. Numbers are those that JSON could hold and the
service would take over HTTP. O(characters).
"""

from __future__ import annotations

import re
from math import isfinite
from typing import Any

from pathgate.graphs.names import quoted
from pathgate.web.json_faults import LONGEST_NUMBER

_TAG = "tag:yaml.org,2002:"
TEXT_TAGS = ("!", f"{_TAG}str")
LIST_TAGS = ("", "!", f"{_TAG}seq")
OBJECT_TAGS = ("", "!", f"{_TAG}map")

_WORDS: dict[str, bool | None] = {
    **dict.fromkeys(("", "~", "null", "Null", "NULL")),
    **dict.fromkeys(("true", "True", "TRUE"), True),
    **dict.fromkeys(("false", "False", "FALSE"), False),
}
_DECIMAL = re.compile(r"[-+]?[0-9]+")
_OCTAL_OR_HEXADECIMAL = re.compile(r"0o[0-7]+|0x[0-9a-fA-F]+")
_FLOAT = re.compile(r"[-+]?(?:\.[0-9]+|[0-9]+(?:\.[0-9]*)?)(?:[eE][-+]?[0-9]+)?")
_NO_NUMBER = re.compile(r"[-+]?\.(?:inf|Inf|INF)|\.(?:nan|NaN|NAN)")


def core_value(text: str, tag: str = "") -> Any:
    """The value of a plain scalar, whose tag may say what it has to be.

    Raises:
        ValueError: it has none that JSON could say, or not one of its tag; the text says why.

    >>> [core_value(text) for text in ("no", "on", "2026-01-01", "true", "~", "0x1F", "+12", "1e3")]
    ['no', 'on', '2026-01-01', True, None, 31, 12, 1000.0]
    """
    value = _untagged(text)
    if not tag or tag == _tag_of(value):
        return value
    if tag == f"{_TAG}float" and type(value) is int:
        return float(value)
    raise ValueError(f"{quoted(text)} cannot have the tag {quoted(tag)} here")


def _untagged(text: str) -> Any:
    if text in _WORDS:
        return _WORDS[text]
    if _NO_NUMBER.fullmatch(text):
        raise ValueError(f"{text} is not a number in JSON; put it in quotes if it is a name")
    for form, read in ((_DECIMAL, int), (_OCTAL_OR_HEXADECIMAL, _based), (_FLOAT, float)):
        if form.fullmatch(text):
            if len(text) > LONGEST_NUMBER:
                raise ValueError(f"a number longer than {LONGEST_NUMBER} characters")
            return _within_range(read(text))
    return text


def _based(text: str) -> int:
    return int(text, 0)


def _within_range(value: float) -> float:
    try:
        fits = isfinite(float(value))
    except OverflowError:
        fits = False
    if not fits:
        raise ValueError("a number beyond the range of a double")
    return value


def _tag_of(value: Any) -> str:
    kinds = {type(None): "null", bool: "bool", int: "int", float: "float", str: "str"}
    return _TAG + kinds[type(value)]
