"""How a fault of shape reads: one plain sentence in this project's words, whatever library found it."""

from __future__ import annotations

import json
from collections.abc import Callable, Iterator, Mapping
from types import MappingProxyType
from typing import Any

from pathgate.graphs.errors import Fault, Place
from pathgate.graphs.names import did_you_mean, quoted
from pathgate.graphs.node_list import json_type

_TYPES: Mapping[str, str] = MappingProxyType(
    {
        "string": "a string",
        "number": "a number",
        "integer": "a whole number",
        "boolean": "true or false",
        "array": "a list",
        "object": "an object",
        "null": "null",
    }
)

# For each keyword the end of a sentence that starts with what the value is called.
_ENDINGS: Mapping[str, Callable[[Any, Any], str]] = MappingProxyType(
    {
        "maxLength": lambda limit, value: f"has at most {limit:,} characters, this one {len(value):,}",
        "maxItems": lambda limit, value: f"holds at most {limit:,} items, this one {len(value):,}",
        "maxProperties": lambda limit, value: f"holds at most {limit:,} members, this one {len(value):,}",
        "minLength": lambda limit, _value: _at_least(limit, "character"),
        "minItems": lambda limit, _value: _at_least(limit, "item"),
        "minProperties": lambda limit, _value: _at_least(limit, "member"),
        "minimum": lambda limit, _value: f"must be at least {limit:g}",
        "maximum": lambda limit, _value: f"must be at most {limit:g}",
        "exclusiveMinimum": lambda limit, _value: f"must be greater than {limit:g}",
        "exclusiveMaximum": lambda limit, _value: f"must be less than {limit:g}",
        "multipleOf": lambda limit, _value: f"must be a multiple of {limit:g}",
        "uniqueItems": lambda _limit, _value: "holds the same item twice",
        "const": lambda only, _value: f"must be {_shown(only)}",
    }
)


def expected(schema: Any) -> str:
    """What a schema asks for, as a noun with its article.

    >>> expected({"type": ["string", "null"]}), expected({"title": "a name", "type": "string"})
    ('a string or null', 'a name')
    """
    if not isinstance(schema, Mapping):
        return "left out"
    if "title" in schema:
        return str(schema["title"])
    if "enum" in schema:
        return " or ".join(map(_shown, schema["enum"]))
    types = schema.get("type", "object")
    return " or ".join(_TYPES[each] for each in ([types] if isinstance(types, str) else types))


def named(place: Place) -> str:
    """What a sentence calls the value at a place: the pointer beside the sentence says where exactly.

    >>> named(()), named(("config", "asks")), named(("statements", 3, "given", 0))
    ('the body', '"asks"', 'an item of "given"')
    """
    if not place:
        return "the body"
    if isinstance(place[-1], str):
        return quoted(place[-1])
    holder = next((step for step in reversed(place) if isinstance(step, str)), None)
    return f"an item of {quoted(holder)}" if holder is not None else "an item"


def level_faults(kind: Any, schema: Any, value: Any, place: Place) -> Iterator[Fault]:
    """The faults that one finding of the schema library is; ``kind`` is its structured account."""
    match kind.name:
        case "additionalProperties":
            for member in kind.unexpected:
                yield _unknown_member(member, schema, place)
        case "type" if (later := _later_type(schema, value)) is not None:
            yield Fault("not-supported", place, later)
        case "enum" if value in schema.get("x-not-yet", ()):
            detail = f"the value {_shown(value)} of {named(place)} is not supported by this version"
            yield Fault("not-supported", place, detail)
        case _:
            yield Fault("invalid-request", place, _sentence(kind, schema, value, place))


def _sentence(kind: Any, schema: Any, value: Any, place: Place) -> str:
    match kind.name:
        case "required" | "dependentRequired":
            return f"the member {quoted(kind.property)} is missing"
        case "type":
            found = "a fraction" if isinstance(value, float) and "integer" in kind.types else json_type(value)
            return f"{named(place)} must be {expected(schema)}, not {found}"
        case "enum":
            known = [each for each in kind.options if isinstance(each, str)]
            hint = did_you_mean(value, known) if isinstance(value, str) else ""
            return f"{named(place)} must be {' or '.join(map(_shown, kind.options))}{hint}"
        case keyword if keyword in _ENDINGS:
            return f"{named(place)} {_ENDINGS[keyword](kind.value, value)}"
    return f"{named(place)} must be {expected(schema)}"


def _unknown_member(member: str, schema: Any, place: Place) -> Fault:
    """The fault of a member that its object does not have, or that this version does not support yet."""
    at = (*place, member)
    if member in schema.get("x-not-yet", ()):
        return Fault("not-supported", at, f"{quoted(member)} is not supported by this version")
    known = [*schema.get("properties", {}), *schema.get("x-not-yet", ())]
    detail = f"{quoted(member)} is not a member of {named(place)}{did_you_mean(member, known)}"
    return Fault("invalid-request", at, detail)


def _later_type(schema: Any, value: Any) -> str | None:
    """The sentence for a value of a type (string, number, array, object) that only a later version takes."""
    later = schema.get("x-not-yet-types", {})
    return next((text for written, text in later.items() if _TYPES[written] == json_type(value)), None)


def _at_least(limit: int, kind: str) -> str:
    return "must not be empty" if limit == 1 else f"must hold at least {limit:,} {kind}s"


def _shown(value: Any) -> str:
    return quoted(value) if isinstance(value, str) else json.dumps(value)
