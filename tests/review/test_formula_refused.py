"""Formulas of any text: read or refused in a sentence, soon, and nothing in them is run."""

from __future__ import annotations

import sys

import pytest
from hypothesis import example, given
from hypothesis import strategies as st

from pathgate.review.formula import FormulaRefused, read_formula
from pathgate.review.schema import MOST_FORMULA_CHARACTERS
from tests.review.test_formula import only_factor, written_terms


@pytest.mark.parametrize(
    ("text", "why"),
    [
        ("", "is empty"),
        (" \n", "is empty"),
        ("refund", "no ~"),
        ("refund ~ van ~ locker", "more than one ~"),
        ("~ van", "nothing stands before the ~"),
        ("refund ~", "nothing stands after"),
        ("refund ~ van +", "nothing stands after"),
        ("refund ~ * van", '"~ *" is not read'),
        ("refund ~ (* van)", "nothing stands between"),
        ("refund ~ ()", "nothing stands between"),
        ("refund ~ (van", "not closed"),
        ("refund ~ van)", "closes nothing"),
        ("refund ~ log(van", "not in place"),
        ("refund ~ van locker", "operator is missing"),
        ("refund ~ van (locker)", "operator is missing"),
        ("refund ~ van -- locker", "one sign is enough"),
        ("refund ~ van * -- locker", "one sign is enough"),
        ("(refund ~ van)", "in brackets"),
        ("refund ~ van + (1 | locker)", "fixed_effects"),
        ("refund ~ van | locker", "fixed_effects"),
        ("refund ~ .", "name the columns"),
        ("refund ~ . - van", "name the columns"),
        ("refund:van ~ locker", "outcome cannot be"),
        ("refund - van ~ locker", "outcome cannot be"),
        ("1 ~ van", '"1" has no place here'),
        ("refund ~ 2:van", '"2" has no place here'),
        ("refund ~ van * 1", '"1" has no place here'),
        ("refund ~ 1:van", '"1" has no place here'),
        ("refund ~ (van - 1)", '"1" has no place here'),
        ("refund ~ van - 0", "taking 0 away"),
        ("refund ~ van**0", "whole number"),
        ("refund ~ van**1.5", "whole number"),
        ("refund ~ van**locker", "whole number"),
        ("refund ~ van**(2)", "whole number"),
        ("refund ~ van**2**3", "whole number"),
        ("refund ~ van %in% locker", "%in%"),
        ("refund ~ van %x% locker", '"%x%" is not read'),
        ("refund ~ van $ locker", '"$" is not read'),
        ("refund ~ van[locker]", "only functions"),
        ("refund ~ [van]", '"[" is not read'),
        ("refund ~ 'late van'", "in backquotes"),
        ("refund ~ 2van", "in backquotes"),
        ("refund ~ log(van).mean", "in backquotes"),
        ("refund ~ ``", "cannot be read at"),
        ("refund ~ van `` + locker", "cannot be read at"),
        ("refund ~ van {} + locker", "cannot be read at"),
        ("refund ~ van + {}{locker}", "cannot be read at"),
        ("refund ~ van + locker {}", "cannot be read at"),
        ("refund ~ log(``)", "two backquotes"),
        ("refund ~ I(2)", "reads no column"),
        ("refund ~ np.mean(van)", "reads no column"),
        ("refund ~ np.log(np.pi)", "reads no column"),
        ("refund ~ lag(van)", "other rows"),
        ("refund ~ log(van.shift(1))", "other rows"),
        ("refund ~ np.random.rand(van)", "random value"),
        ("refund ~ offset(van)", "offset"),
        ("refund ~ f(lambda: van)", "cannot hold lambda"),
        ("refund ~ f(van if locker else 1)", "cannot hold if"),
        ("refund ~ f([van for van in locker])", "cannot hold for"),
        ("refund ~ f((van := 3))", "only functions"),
        ("refund ~ f(f'van')", "only functions"),
        ("refund ~ f(b'van', van)", "only functions"),
        ("refund ~ f(van, ...)", "only functions"),
        ("refund ~ f(*van)", "only functions"),
        ("refund ~ f(**van)", "no place"),
        ("refund ~ f({**van})", "only functions"),
        ("refund ~ I(van @ locker)", "only functions"),
        ("refund ~ I(van[0])", "only functions"),
        ("refund ~ f(van)(locker)", "not the name of a function"),
        ("refund ~ __import__('os').system(van)", "two leading underscores"),
        ("refund ~ van.__class__()", "two leading underscores"),
        ("refund ~ I(van.__class__.x)", "two leading underscores"),
        ("refund ~ C(van, '(') + C(locker, ')')", "string in a formula"),
        ("refund ~ f(van, '\\d')", "string in a formula"),
        ("refund ~ f(van \\\n)", "no expression"),
        ("refund ~ f(van # )\n)", "no expression"),
        ("refund ~ as.factor(van)", "write C(…)"),
        ("refund ~ f(van; locker)", "no expression"),
        ("refund ~ f(van\x00)", "no expression"),
        ("refund ~ f(1in van)", "not read as a number"),
        ("refund ~ f(van, 0x1f)", "not read as a number"),
        ("refund ~ f(ﬁve)", "in backquotes"),
        ("refund ~ v\u202ean", "in backquotes"),
        ("refund ~ van\x00", "in backquotes"),
    ],
)
def test_what_is_not_read_is_refused_in_a_sentence(text: str, why: str) -> None:
    with pytest.raises(FormulaRefused) as refused:
        read_formula(text)
    assert why in refused.value.detail
    assert refused.value.slug == "invalid-request"
    assert "\n" not in refused.value.detail
    assert "\x1b" not in refused.value.detail


@pytest.mark.parametrize(
    ("text", "why"),
    [
        ("y ~ " + "x" * MOST_FORMULA_CHARACTERS, "too long"),
        ("y ~ " + "+".join(f"a{k}" for k in range(1_000)), "too much"),
        ("y ~ (a+b+c+d+e+f+g+h+i+j+k)**6", "too much"),
        ("y ~ " + "*".join(f"a{k}" for k in range(11)), "too much"),
        ("y ~ " + ":".join(["(a+b+c+d+e+f+g+h+i)**9"] * 300), "too much"),
        ("y ~ " + "(" * 51 + "a" + ")" * 51, "nested too deeply"),
        ("y ~ " + "(" * 4_000 + "a" + ")" * 4_000, "nested too deeply"),
        ("y ~ " + "-" * 9_000 + "a", "one sign"),
        ("y ~ " + "- " * 4_000 + "a", "one sign"),
        ("y ~ I(" + "-" * 9_000 + "a)", "nested too deeply"),
        ("y ~ I(" + "not " * 2_000 + "a)", "nested too deeply"),
        ("y ~ I(" + "(" * 4_000 + "a" + ")" * 4_000 + ")", "nested too deeply"),
        ("y ~ I(" + "+".join(["a"] * 4_000) + ")", "nested too deeply"),
        ("y ~ I(a" + ".a" * 4_000 + ")", "nested too deeply"),
        ("y ~ I(a * " + "9" * 9_000 + ")", "not read as a number"),
        ("y ~ f(" + "lambda:" * 1_000 + "a)", "lambda"),
    ],
)
def test_what_would_take_long_is_refused_before_it_does(text: str, why: str) -> None:
    with pytest.raises(FormulaRefused, match=why):
        read_formula(text)


def test_powers_are_read_however_high() -> None:
    assert written_terms("y ~ a**99999") == ["a"]
    assert written_terms("y ~ a**" + "9" * 9_000) == ["a"]
    assert written_terms("y ~ ((a + b)^9)**9") == ["a", "a:b", "b"]
    # 847 = the sum of C(10, k) for k from 1 to 6
    assert len(written_terms("y ~ (a+b+c+d+e+f+g+h+i+j)**6")) == 847
    assert len(written_terms("y ~ " + "+".join(f"a{k}" for k in range(999)))) == 999
    assert written_terms("y ~ " + "+".join(["a"] * 4_000)) == ["a"]


SIGNS = "+ - -- * / : ** ^ ~ | % %in% ( ) [ ] { } ` ' \" \\ . , = == := @ # \x00 \u202e"
WORDS = "y a b é ﬁ log( np. C( I( .str. __x__ lambda not if else for in 0 1 2 9999 1e 0x \n"
PIECES = tuple(f"{SIGNS} {WORDS}".split(" "))


@given(st.lists(st.sampled_from(PIECES), max_size=25).map("".join) | st.text(max_size=30))
@example("a~I(0_)")
@example("a~I(\ud800)")
@example("a~`\ud800`")
@example("a~I('\ud800')")
@example("a~I(1_000*b)")
@example("y~{a`}")
def test_any_text_is_a_formula_or_refused(text: str) -> None:
    for said in (text, f"y ~ {text}", f"y ~ I({text})", f"y ~ {{{text}}}"):
        try:
            read = read_formula(said)
        except FormulaRefused:
            continue
        assert read.outcomes
        for factor in (*read.outcomes, *(factor for term in read.terms for factor in term.factors)):
            assert factor.names
            assert all(factor.names)
            assert (factor.keeps == "computed") == (len(factor.names) > 1)
            assert factor.written in said


def test_nothing_that_a_formula_names_is_imported_or_run() -> None:
    sys.modules.pop("antigravity", None)
    before = set(sys.modules)
    assert only_factor("antigravity.fly(van)").names == ("antigravity", "van")
    assert only_factor("exec('raise SystemExit', van)").keeps == "coarse"
    assert set(sys.modules) == before
