"""Does a parsed JSON value have the shape that a JSON Schema asks for, and if not, what is wrong and where?

A schema library in native code judges (JSON Schema, draft 2020-12). Only where it says no are the faults
looked for, by going down value and schema together and asking it about one level at a time. That way they
are found in order and reading stops at ``MOST_FAULTS``: the library's own list of errors for a body of four
million wrong items takes minutes and gigabytes.

A schema says in its ``title`` what it expects, as a noun with its article ("a list of names"). It may name in
``x-not-yet`` the members (of an object) or the values (of an enumeration) that the interface has and this
version has not, and hold under ``x-not-yet-types`` a sentence for each type of which the same is true.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from itertools import islice
from typing import Any

from jsonschema_rs import Draft202012Validator

from pathgate.graphs.errors import Fault, Place
from pathgate.review.shape_words import expected, level_faults, named

Schema = Mapping[str, Any] | bool

MOST_FAULTS = 10_000
# What these say is checked one level further down, and not by the level that holds them.
_BRANCHES = ("anyOf", "oneOf")
_NESTING = ("$ref", "items", "allOf", *_BRANCHES)


class Shape:
    """A JSON Schema ready to judge many values. It compiles a part of the schema when it first needs it.

    >>> shape = Shape({"type": "object", "properties": {"x": {"title": "a name", "type": "string"}}})
    >>> [(fault.place, fault.detail) for fault in shape.faults({"x": 3})]
    [(('x',), '"x" must be a name, not a number')]
    """

    def __init__(self, schema: Mapping[str, Any]) -> None:
        self.schema = schema
        self._components = {"components": schema["components"]} if "components" in schema else {}
        self._whole = self._compiled(schema)
        # At most two entries for each part of the schema; keyed by identity, as the schema keeps them alive.
        self._parts: dict[tuple[int, bool], Draft202012Validator] = {}

    def faults(self, value: Any) -> list[Fault]:
        """All that is wrong with ``value``, in its own order; the first ``MOST_FAULTS`` where it is more."""
        if self._whole.is_valid(value):
            return []
        found = list(islice(_each_once(self._faults(self.schema, value, ())), MOST_FAULTS))
        return found or [Fault("invalid-request", (), f"the body must be {expected(self.schema)}")]

    def _faults(self, schema: Schema, value: Any, place: Place) -> Iterator[Fault]:
        schema = self._resolved(schema)
        if self._part(schema, is_shallow=False).is_valid(value):
            return
        for error in self._part(schema, is_shallow=True).iter_errors(value):
            yield from level_faults(error.kind, schema, value, place)
        if isinstance(schema, Mapping):
            for step, below, part in _parts_below(schema, value):
                yield from self._faults(part, below, (*place, step))
            for part in schema.get("allOf", ()):
                yield from self._faults(part, value, place)
            for keyword in _BRANCHES:
                if keyword in schema:
                    yield from self._branch_faults(schema, schema[keyword], value, place)

    def _branch_faults(
        self, schema: Mapping[str, Any], branches: list[Schema], value: Any, place: Place
    ) -> Iterator[Fault]:
        """The faults of the one branch that can be meant, or a sentence that names them all."""
        resolved = [self._resolved(branch) for branch in branches]
        if any(self._part(branch, is_shallow=False).is_valid(value) for branch in resolved):
            return
        meant = [branch for branch in resolved if self._admits_type(branch, value)]
        if len(meant) > 1 and isinstance(value, Mapping):
            meant = [branch for branch in meant if _has_required(branch, value)]
        if len(meant) == 1:
            yield from self._faults(meant[0], value, place)
        else:
            words = schema.get("title") or " or ".join(dict.fromkeys(map(expected, resolved)))
            yield Fault("invalid-request", place, f"{named(place)} must be {words}")

    def _admits_type(self, schema: Schema, value: Any) -> bool:
        """Is a value of this type possible under the schema, as far as its first level says?"""
        if not isinstance(schema, Mapping):
            return schema
        if "type" in schema:
            return Draft202012Validator({"type": schema["type"]}).is_valid(value)
        return any(self._admits_type(self._resolved(part), value) for part in schema.get("anyOf", (True,)))

    def _resolved(self, schema: Schema) -> Schema:
        while isinstance(schema, Mapping) and "$ref" in schema:
            found: Any = self.schema
            for step in schema["$ref"].removeprefix("#/").split("/"):
                found = found[step]
            schema = found
        return schema

    def _part(self, schema: Schema, *, is_shallow: bool) -> Draft202012Validator:
        key = (id(schema), is_shallow)
        if key not in self._parts:
            self._parts[key] = self._compiled(_shallow(schema) if is_shallow else schema)
        return self._parts[key]

    def _compiled(self, schema: Schema) -> Draft202012Validator:
        return Draft202012Validator(schema if isinstance(schema, bool) else {**schema, **self._components})


def are_cut_off(faults: Sequence[Fault]) -> bool:
    """Were faults of a shape left out? Then what none of them names may be at fault as well."""
    return len(faults) >= MOST_FAULTS


def _each_once(faults: Iterator[Fault]) -> Iterator[Fault]:
    seen = set[Fault]()
    for fault in faults:
        if fault not in seen:
            seen.add(fault)
            yield fault


def _shallow(schema: Schema) -> Schema:
    """What a schema says of a value itself and not of what the value holds."""
    if isinstance(schema, bool):
        return schema
    level = {keyword: said for keyword, said in schema.items() if keyword not in _NESTING}
    if "properties" in level:
        level["properties"] = dict.fromkeys(level["properties"], True)
    if isinstance(level.get("additionalProperties"), Mapping):
        del level["additionalProperties"]
    return level


def _parts_below(schema: Mapping[str, Any], value: Any) -> Iterator[tuple[str | int, Any, Schema]]:
    """Each value one level down that some part of the schema speaks of: its step, itself, that part."""
    if isinstance(value, Mapping):
        properties = schema.get("properties", {})
        others = schema.get("additionalProperties", True)
        for member, said in value.items():
            part = properties.get(member, others if isinstance(others, Mapping) else True)
            if part is not True:
                yield member, said, part
    elif isinstance(value, list) and "items" in schema:
        for index, item in enumerate(value):
            yield index, item, schema["items"]


def _has_required(schema: Schema, value: Mapping[str, Any]) -> bool:
    return isinstance(schema, Mapping) and all(member in value for member in schema.get("required", ()))
