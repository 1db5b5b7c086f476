"""Shapes: the schema library's yes and no, explained place by place and without end to its patience."""

from __future__ import annotations

from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as some
from jsonschema_rs import Draft202012Validator

from pathgate.review.shape import MOST_FAULTS, Shape

NAME = {"$ref": "#/components/schemas/Name"}
SCHEMA: dict[str, Any] = {
    "type": "object",
    "properties": {
        "x": {
            "title": "a name or a list of names",
            "anyOf": [NAME, {"type": "array", "items": NAME, "minItems": 1}],
        },
        "asks": {"enum": ["total", "least"], "x-not-yet": ["direct"]},
        "count": {"type": "integer", "minimum": 1, "maximum": 9},
        "cost": {"type": "number", "exclusiveMinimum": 0},
        "filter": {
            "type": "array",
            "x-not-yet-types": {"string": "text comes later"},
            "items": {"anyOf": [NAME, {"$ref": "#/components/schemas/Part"}]},
        },
        "free": {"type": "object", "additionalProperties": {"type": "boolean"}},
        "either": {
            "anyOf": [
                {
                    "title": "a box",
                    "type": "object",
                    "properties": {"box": {"type": "string"}},
                    "required": ["box"],
                },
                {
                    "title": "a bag",
                    "type": "object",
                    "properties": {"bag": {"type": "string"}},
                    "required": ["bag"],
                },
            ]
        },
        "never": {"const": True},
        "maybe": {"type": ["string", "null"]},
        "both": {"allOf": [{"type": "string"}, {"maxLength": 2}]},
    },
    "required": ["x"],
    "additionalProperties": False,
    "x-not-yet": ["sweeps"],
    "components": {
        "schemas": {
            "Name": {"title": "a name", "type": "string", "minLength": 1, "maxLength": 5},
            "Part": {
                "title": "a condition",
                "type": "object",
                "properties": {"columns": {"type": "array", "items": NAME}, "fixed": {"type": "boolean"}},
                "required": ["columns"],
                "additionalProperties": False,
            },
        }
    },
}
SHAPE = Shape(SCHEMA)
JUDGE = Draft202012Validator(SCHEMA)


@pytest.mark.parametrize(
    ("value", "place", "detail"),
    [
        ({}, (), 'the member "x" is missing'),
        ([], (), "the body must be an object, not a list"),
        ({"x": 3}, ("x",), '"x" must be a name or a list of names'),
        ({"x": ""}, ("x",), '"x" must not be empty'),
        ({"x": []}, ("x",), '"x" must not be empty'),
        ({"x": "abcdef"}, ("x",), '"x" has at most 5 characters, this one 6'),
        ({"x": ["a", 3]}, ("x", 1), 'an item of "x" must be a name, not a number'),
        ({"x": ["a", "", "b"]}, ("x", 1), 'an item of "x" must not be empty'),
        ({"x": "a", "asks": "totl"}, ("asks",), '"asks" must be "total" or "least" (did you mean "total"?)'),
        ({"x": "a", "asks": None}, ("asks",), '"asks" must be "total" or "least"'),
        ({"x": "a", "count": 0}, ("count",), '"count" must be at least 1'),
        ({"x": "a", "count": 10}, ("count",), '"count" must be at most 9'),
        ({"x": "a", "count": 1.5}, ("count",), '"count" must be a whole number, not a fraction'),
        ({"x": "a", "count": True}, ("count",), '"count" must be a whole number, not a boolean'),
        ({"x": "a", "cost": 0}, ("cost",), '"cost" must be greater than 0'),
        ({"x": "a", "never": False}, ("never",), '"never" must be true'),
        ({"x": "a", "maybe": 1}, ("maybe",), '"maybe" must be a string or null, not a number'),
        ({"x": "a", "both": "abc"}, ("both",), '"both" has at most 2 characters, this one 3'),
        ({"x": "a", "free": {"k": 1}}, ("free", "k"), '"k" must be true or false, not a number'),
        (
            {"x": "a", "filter": [{"columns": [1]}]},
            ("filter", 0, "columns", 0),
            'an item of "columns" must be a name, not a number',
        ),
        ({"x": "a", "filter": [{}]}, ("filter", 0), 'the member "columns" is missing'),
        ({"x": "a", "filter": [7]}, ("filter", 0), 'an item of "filter" must be a name or a condition'),
        ({"x": "a", "either": {"box": 1}}, ("either", "box"), '"box" must be a string, not a number'),
        ({"x": "a", "either": {}}, ("either",), '"either" must be a box or a bag'),
        ({"x": "a", "filtr": 1}, ("filtr",), '"filtr" is not a member of the body (did you mean "filter"?)'),
        (
            {"x": "a", "filter": [{"columns": [], "fixd": True}]},
            ("filter", 0, "fixd"),
            '"fixd" is not a member of an item of "filter" (did you mean "fixed"?)',
        ),
    ],
)
def test_a_fault_is_one_plain_sentence_at_its_place(value, place, detail):
    assert [(fault.slug, fault.place, fault.detail) for fault in SHAPE.faults(value)] == [
        ("invalid-request", place, detail)
    ]


@pytest.mark.parametrize(
    ("value", "place", "detail"),
    [
        ({"x": "a", "sweeps": []}, ("sweeps",), '"sweeps" is not supported by this version'),
        (
            {"x": "a", "asks": "direct"},
            ("asks",),
            'the value "direct" of "asks" is not supported by this version',
        ),
        ({"x": "a", "filter": "a = 1"}, ("filter",), "text comes later"),
    ],
)
def test_what_only_a_later_version_takes_is_said_to_be_so(value, place, detail):
    assert [(fault.slug, fault.place, fault.detail) for fault in SHAPE.faults(value)] == [
        ("not-supported", place, detail)
    ]


def test_all_faults_are_found_at_once():
    value = {"x": ["", 1], "count": 0, "filter": ["a", {"columns": 3}], "z": 1}
    assert [fault.place for fault in SHAPE.faults(value)] == [
        ("z",),
        ("x", 0),
        ("x", 1),
        ("count",),
        ("filter", 1, "columns"),
    ]


SCALARS = some.sampled_from([None, True, 0, 1, 1.5, 10, "", "a", "abcdef", "total", "direct"])
NESTED = some.recursive(
    SCALARS,
    lambda inner: (
        some.lists(inner, max_size=3)
        | some.dictionaries(some.sampled_from(["columns", "fixed", "box", "bag", "z"]), inner, max_size=2)
    ),
    max_leaves=5,
)
VALUES = NESTED | some.dictionaries(
    some.sampled_from([*SCHEMA["properties"], "sweeps", "z", ""]), NESTED, max_size=5
).map(lambda members: {"x": "a", **members})


@given(value=VALUES)
def test_faults_are_found_exactly_where_the_schema_library_says_no(value):
    faults = SHAPE.faults(value)
    assert (not faults) == JUDGE.is_valid(value)
    for fault in faults:
        assert reaches(value, fault.place)
        assert fault.detail
        assert len(fault.detail) < 300


def reaches(value: Any, place: tuple[str | int, ...]) -> bool:
    for step in place:
        if step not in (range(len(value)) if isinstance(value, list) else value):
            return False
        value = value[step]
    return True


@pytest.mark.parametrize(
    "hostile",
    [
        {"x": [1] * 1_000_000},
        {"x": "a", "filter": [{"columns": [""], "fixed": 1}] * 100_000},
        {f"member {count}": 1 for count in range(100_000)},
        {"x": "a", "free": {f"member {count}": 1 for count in range(100_000)}},
    ],
    ids=["items", "objects", "unknown members", "free members"],
)
def test_the_search_for_faults_ends_after_a_bounded_number(hostile):
    # The schema library's own list of errors for the first of these takes gigabytes.
    assert 0 < len(SHAPE.faults(hostile)) <= MOST_FAULTS


def test_parts_compiled_on_the_way_are_no_more_than_the_schema_has():
    shape = Shape(SCHEMA)
    for count in range(200):
        shape.faults({"x": [count, ""], "filter": [{"columns": count}], "free": {str(count): count}})
    assert len(shape._parts) < 60
