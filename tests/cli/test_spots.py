"""Where values stand in files: held against the text itself, for JSON and YAML alike."""

from __future__ import annotations

import json
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from pathgate.cli.json_spots import json_map
from pathgate.cli.spots import Map, Region, steps_of
from pathgate.cli.sql_spots import find_part
from pathgate.cli.yaml_text import read_yaml_and_places
from pathgate.graphs.errors import pointer

TEXTS = st.text(st.characters(exclude_categories=["Cs"]), max_size=8)
# YAML knows more line breaks than JSON, and no pairs of surrogates: both read these alike.
PLAIN_TEXTS = st.text(st.characters(min_codepoint=32, max_codepoint=126), max_size=8)


def values(texts: st.SearchStrategy[str]) -> st.SearchStrategy[Any]:
    return st.recursive(
        st.none() | st.booleans() | st.integers(-99, 99) | texts,
        lambda inner: st.lists(inner, max_size=3) | st.dictionaries(texts, inner, max_size=3),
        max_leaves=8,
    )


def cut(where: Map, region: Region) -> str:
    """The characters of a region, found by counting lines the slow way."""
    lines = where.text.split("\n")
    if region.line == region.end_line:
        return lines[region.line - 1][region.column - 1 : region.end_column - 1]
    first, last = (
        lines[region.line - 1][region.column - 1 :],
        lines[region.end_line - 1][: region.end_column - 1],
    )
    return "\n".join([first, *lines[region.line : region.end_line - 1], last])


def leaves(value: Any, steps: tuple[str, ...] = ()) -> list[tuple[tuple[str, ...], Any]]:
    if isinstance(value, dict):
        return [leaf for key, held in value.items() for leaf in leaves(held, (*steps, key))]
    if isinstance(value, list):
        return [leaf for index, held in enumerate(value) for leaf in leaves(held, (*steps, str(index)))]
    return [(steps, value)]


@given(values(TEXTS), st.sampled_from([None, 2]))
def test_every_value_of_a_json_text_is_found_where_it_stands(value, indent):
    where = json_map(json.dumps(value, indent=indent))
    for steps, held in leaves(value):
        assert json.loads(cut(where, where.region(steps))) == held


@given(values(PLAIN_TEXTS), st.sampled_from([None, 2]))
def test_yaml_finds_the_same_places_in_the_same_text(value, indent):
    text = json.dumps(value, indent=indent)
    read, where = read_yaml_and_places(text, 100)
    assert read == value
    for steps, _held in leaves(value):
        assert where.region(steps) == json_map(text).region(steps)


YAML = """\
# a comment
- &first
  name: late refunds
  covariates:
  - weather
  - "order value"
  row_filter: |
    ticket = 1

- again: *first
  'plain text': over
    two lines
  empty:
"""


@pytest.mark.parametrize(
    ("steps", "line", "column", "shown"),
    [
        (("0", "name"), 3, 9, "late refunds"),
        (("0", "covariates", "0"), 5, 5, "weather"),
        (("0", "covariates", "1"), 6, 5, '"order value"'),
        (("0", "row_filter"), 7, 15, "|\n    ticket = 1"),
        (("1", "again", "name"), 3, 9, "late refunds"),
        (("1", "plain text"), 11, 17, "over\n    two lines"),
        (("1", "empty"), 13, 9, ""),
    ],
)
def test_a_value_in_block_style_is_found(steps, line, column, shown):
    _value, where = read_yaml_and_places(YAML, 100)
    region = where.region(steps)
    assert (region.line, region.column) == (line, column)
    assert cut(where, region) == shown


def test_a_list_is_known_by_where_it_begins_and_what_is_not_there_by_what_is_around_it():
    _value, where = read_yaml_and_places(YAML, 100)
    assert where.region(("0", "covariates")) == Region(5, 3)
    assert where.region(("0", "treatment")) == where.region(("0",)) == Region(2, 3)
    assert where.region(("7", "x", "y")) == where.region(()) == Region(2, 1)


@given(st.lists(TEXTS | st.integers(0, 99), max_size=4))
def test_steps_are_those_that_a_pointer_was_made_of(steps):
    assert steps_of(pointer(tuple(steps))) == tuple(map(str, steps))


@pytest.mark.parametrize(
    ("raw", "part", "shown"),
    [
        ("'a = ''x'' AND b'", "a = 'x'", "a = ''x''"),
        ('"a = \\"x\\" AND b"', 'a = "x"', 'a = \\"x\\"'),
        ("\"n = 'Stra\\u00DFe'\"", "n = 'Straße'", "n = 'Stra\\u00DFe'"),
        (">-\n    c = 1\n    AND a\n      > 2", "a > 2", "a\n      > 2"),
        ('"x\\nAND y = 1"', "y = 1", "y = 1"),
        ('"x = \\U0001F600 \\x41 AND y = 1"', "y = 1", "y = 1"),
        ("\"x = '\\ud83d\\ude00' AND y\"", "x = '😀'", "x = '\\ud83d\\ude00'"),
        ("'it''s = 1'", "it's = 1", "it''s = 1"),
        ("SELECT * FROM t WHERE a > 1", "a > 1", "a > 1"),
    ],
)
def test_a_condition_is_found_however_the_file_spells_it(raw, part, shown):
    start, end = find_part(raw, part)
    assert raw[start:end] == shown


@pytest.mark.parametrize(
    ("raw", "part", "start"),
    [
        ('"data = 1 AND a = 1"', "a = 1", 14),
        ('"a = 1 AND data = 1"', "a = 1", 1),
        ("'NOT b = 2 AND b = 2'", "b = 2", 15),
        ("t.a > 1 AND a > 1", "a > 1", 12),
        ('"x = 1 OR a = 1"', "a = 1", 10),
    ],
)
def test_a_condition_of_its_own_goes_before_the_same_words_in_another(raw, part, start):
    assert find_part(raw, part) == (start, start + len(part))


@pytest.mark.parametrize("part", ["", "  ", "z = 1", "dat"])
def test_a_condition_that_is_not_there_is_not_found(part):
    assert find_part('"data = 1"', part) is None


@given(
    st.lists(
        st.sampled_from(["a = 'x'", 'b = "ä"', "c > 1", "d\\e < 2"]), min_size=1, max_size=4, unique=True
    )
)
def test_every_condition_of_a_json_string_is_found(parts):
    text = json.dumps({"row_filter": " AND ".join(parts)})
    where = json_map(text)
    for part in parts:
        assert json.loads(f'"{cut(where, where.region(("row_filter",), part))}"') == part
