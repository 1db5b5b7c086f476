"""YAML 1.2, core schema, read to the same values as JSON; what JSON could not say is refused with its place."""

from __future__ import annotations

import json
import time

import pytest
from hypothesis import given
from hypothesis import strategies as some

from pathgate.cli.yaml_text import MOST_BY_ALIAS, NotYaml, read_yaml

DEPTH = 12

# Strings that YAML 1.1 or a lenient reader takes for something else.
STAYS_TEXT = [
    "no",
    "yes",
    "on",
    "off",
    "y",
    "No",
    "ON",
    "2026-01-01",
    "2026-01-01T10:00:00Z",
    "1_000",
    "0b11",
]
STAYS_TEXT += ["1:30", "12e", "=", "<<", "0o9", "0xg", "1.2.3", "TrUe", "nULL", "+", "-x", ".", "e3"]


@pytest.mark.parametrize("written", STAYS_TEXT)
def test_what_is_no_value_of_the_core_schema_stays_a_string(written):
    assert read_yaml(f"a: {written}", DEPTH) == {"a": written}
    assert read_yaml(f"{written}: a", DEPTH) == {written: "a"}


@pytest.mark.parametrize(
    ("written", "value"),
    [
        ("true", True),
        ("FALSE", False),
        ("~", None),
        ("", None),
        ("Null", None),
        ("012", 12),
        ("0o17", 15),
        ("0xFf", 255),
        ("-7", -7),
        ("+7", 7),
        ("1.", 1.0),
        (".5", 0.5),
        ("-1.5E-3", -0.0015),
        ("'12'", "12"),
        ('"true"', "true"),
        ("!!str 12", "12"),
        ("! 12", "12"),
        ("!!int '12'", 12),
        ("!!float 12", 12.0),
        ("|\n  no\n", "no\n"),
    ],
)
def test_what_is_a_value_of_the_core_schema_is_that_value(written, value):
    read = read_yaml(f"a: {written}", DEPTH)["a"]
    assert (read, type(read)) == (value, type(value))


@pytest.mark.parametrize(
    ("text", "line", "column", "words"),
    [
        ("a: 1\nb: 2\na: 3\n", 3, 1, 'the key "a" stands twice'),
        ('"a": 1\na: 2\n', 2, 1, 'the key "a" stands twice'),
        ("{x: {a: 1, a: 1}}", 1, 12, "stands twice"),
        ("&k a: 1\n*k : 2\n", 2, 1, "stands twice"),
        ("a:\n\t- b\n", 2, 1, "'\\t'"),
        ("1: a", 1, 1, "a key must be a string"),
        ("true: a", 1, 1, "a key must be a string"),
        ("? [a]\n: b", 1, 3, "a key must be a string"),
        ("", 1, 1, "holds no value"),
        ("# a comment alone\n", 1, 1, "holds no value"),
        ("--- a\n--- b\n", 2, 1, "a second document"),
        ("a: .inf", 1, 4, "not a number in JSON"),
        ("a: -.INF", 1, 4, "not a number in JSON"),
        ("a: .nan", 1, 4, "not a number in JSON"),
        ("a: 1e400", 1, 4, "beyond the range"),
        ("a: 0x" + "f" * 290, 1, 4, "beyond the range"),
        ("a: " + "1" * 301, 1, 4, "longer than 300"),
        ('a: "\\ud800"', 1, 4, "a lone surrogate"),
        ("a: \x01", 1, 4, "U+0001"),
        ("x\ny: \x00", 2, 4, "U+0000"),
        ("a: !!binary aGk=", 1, 4, "cannot have the tag"),
        ("a: !!timestamp 2026-01-01", 1, 4, "cannot have the tag"),
        ("a: !!bool no", 1, 4, "cannot have the tag"),
        ("!!set {a, b}", 1, 1, "what JSON cannot"),
        ("!!python/object:os.system {}", 1, 1, "what JSON cannot"),
        ("a: *b", 1, 4, 'nothing is called "b"'),
        ("&a [x, *a]", 1, 8, '"a" would hold itself'),
        ("a: [1, 2", 1, 9, "broken syntax"),
        ("a: 'x", 1, 6, "broken syntax"),
        ("a: b: c", 1, 5, "broken syntax"),
        ('a: "\\U7fffffff"', 1, 1, "names no character"),
        ('a: "\\Uffffffff"', 1, 1, "names no character"),
    ],
)
def test_what_json_could_not_say_is_refused_at_its_place(text, line, column, words):
    with pytest.raises(NotYaml) as refused:
        read_yaml(text, DEPTH)
    assert words in refused.value.detail
    assert (refused.value.line, refused.value.column) == (line, column)
    assert "\n" not in str(refused.value)


def test_an_alias_stands_for_what_its_anchor_marks():
    text = "base: &base [weather, locker_full]\nfirst: *base\nname: &n late\nsecond: *n\n"
    read = read_yaml(text, DEPTH)
    assert read["first"] == ["weather", "locker_full"]
    assert read["second"] == "late"


def test_an_anchor_given_anew_means_the_newer_value():
    assert read_yaml("[&a 1, *a, &a 2, *a]", DEPTH) == [1, 1, 2, 2]
    assert read_yaml("[&a [&a x, *a], *a]", DEPTH) == [["x", "x"], "x"]


def test_aliases_of_aliases_are_refused_before_they_grow():
    lines = ["a0: &a0 [x, x, x, x, x, x, x, x, x, x]"]
    lines += [f"a{k}: &a{k} [{', '.join([f'*a{k - 1}'] * 10)}]" for k in range(1, 30)]
    began = time.process_time()
    with pytest.raises(NotYaml, match="aliases stand for more than"):
        read_yaml("\n".join(lines), DEPTH)
    assert time.process_time() - began < 5


def test_aliases_may_stand_for_as_many_values_as_said_and_no_more():
    # A list of 99 strings is 100 values.
    anchored = f"a: &a [{', '.join(['x'] * 99)}]\nb: ["
    fits = MOST_BY_ALIAS // 100
    assert len(read_yaml(f"{anchored}{'*a, ' * fits}]", DEPTH)["b"]) == fits
    with pytest.raises(NotYaml, match="aliases stand for more than"):
        read_yaml(f"{anchored}{'*a, ' * (fits + 1)}]", DEPTH)


def test_aliases_cannot_nest_deeper_than_the_text_may():
    lines = ["a0: &a0 [x]", *(f"a{k}: &a{k} [*a{k - 1}]" for k in range(1, 50))]
    with pytest.raises(NotYaml, match="nested more than 12 levels") as refused:
        read_yaml("\n".join(lines), DEPTH)
    # The object itself is one level, a10 eleven.
    assert refused.value.line == 12


@pytest.mark.parametrize(("opening", "closing"), [("[", "]"), ("{a: ", "}"), ("- ", "")])
def test_nesting_is_refused_one_level_past_the_limit(opening, closing):
    read_yaml(opening * DEPTH + "x" + closing * DEPTH, DEPTH)
    with pytest.raises(NotYaml, match="nested more than 12 levels"):
        read_yaml(opening * (DEPTH + 1) + "x" + closing * (DEPTH + 1), DEPTH)


TEXTS = some.text(some.characters(exclude_categories=["Cs", "Cc"], exclude_characters="\ufffe\uffff\ufeff"))
VALUES = some.recursive(
    some.none()
    | some.booleans()
    | some.integers(-(2**70), 2**70)
    | some.floats(allow_nan=False, allow_infinity=False)
    | TEXTS,
    lambda inner: some.lists(inner, max_size=4) | some.dictionaries(TEXTS, inner, max_size=4),
    max_leaves=12,
)


@given(value=VALUES)
def test_json_is_yaml_too_and_means_the_same(value):
    # YAML ends the search for a key's colon after 1024 characters; no text here is as long.
    assert read_yaml(json.dumps(value, ensure_ascii=False), max_depth=100) == value


@given(
    text=some.text(
        some.sampled_from(list("ab1 \n\t-?:,[]{}&*!|>'\"%@`#~\\x\0\x85\ufeff\ud800.e")), max_size=40
    )
)
def test_whatever_the_text_it_is_read_or_refused(text):
    refused = None
    try:
        value = read_yaml(text, DEPTH)
        json.dumps(value, allow_nan=False, ensure_ascii=False).encode()
    except NotYaml as error:
        refused = error
    assert refused is None or (refused.line >= 1 and refused.column >= 1)
