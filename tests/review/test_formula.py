"""Formulas: what they multiply out to, which columns they read and how much of each."""

from __future__ import annotations

import contextlib
import re
from collections.abc import Callable
from decimal import Decimal, localcontext

import pytest
from formulaic.parser import DefaultFormulaParser
from hypothesis import example, given
from hypothesis import strategies as st

from pathgate.review.formula import Factor, Formula, read_formula
from pathgate.review.keeps import Keeps

Tree = str | tuple[str, "Tree", "Tree"] | tuple[str, "Tree", int]
Terms = set[frozenset[str]]


def written_terms(text: str) -> list[str]:
    return [term.written for term in read_formula(text).terms]


def only_factor(text: str) -> Factor:
    ((factor,),) = (term.factors for term in read_formula(f"refund ~ {text}").terms)
    return factor


# The operators by their definition, on sets of sets of names


def joined(left: Terms, right: Terms) -> Terms:
    return {one | other for one in left for other in right}


def nested(left: Terms, right: Terms) -> Terms:
    return left | joined({frozenset[str]().union(*left)}, right)


OPERATORS: dict[str, Callable[[Terms, Terms], Terms]] = {
    "+": lambda left, right: left | right,
    "-": lambda left, right: left - right,
    "*": lambda left, right: left | right | joined(left, right),
    "/": nested,
    ":": joined,
}
BINDING = {"+": 1, "-": 1, "*": 2, "/": 2, ":": 3, "**": 4}


def terms_by_definition(tree: Tree) -> Terms:
    if isinstance(tree, str):
        return {frozenset([tree])}
    sign, left, right = tree
    if sign == "**":
        assert isinstance(right, int)
        terms = power = terms_by_definition(left)
        for _ in range(right - 1):
            power = joined(power, terms)
        return power
    assert not isinstance(right, int)
    return OPERATORS[sign](terms_by_definition(left), terms_by_definition(right))


def with_fewest_brackets(tree: Tree, least: int = 0) -> str:
    if isinstance(tree, str):
        return tree
    sign, left, right = tree
    binding = BINDING[sign]
    after = str(right) if isinstance(right, int) else with_fewest_brackets(right, binding + 1)
    text = f"{with_fewest_brackets(left, binding + (sign == '**'))} {sign} {after}"
    return f"({text})" if binding < least else text


def trees() -> st.SearchStrategy[Tree]:
    return st.recursive(
        st.sampled_from("abcd"),
        lambda inner: (
            st.tuples(st.sampled_from(sorted(OPERATORS)), inner, inner)
            | st.tuples(st.just("**"), inner, st.integers(1, 4))
        ),
        max_leaves=6,
    )


@given(trees())
@example(("/", ("+", "a", "b"), ("/", "c", "d")))
@example(("-", ("*", "a", "b"), "a"))
@example(("-", "a", ("-", "b", "c")))
def test_a_formula_multiplies_out_to_what_its_operators_are_defined_as(tree: Tree) -> None:
    read = read_formula(f"y ~ {with_fewest_brackets(tree)}")
    found = [frozenset(factor.written for factor in term.factors) for term in read.terms]
    assert set(found) == terms_by_definition(tree)
    assert len(found) == len(set(found))
    assert read.has_intercept


@given(trees())
def test_the_parsers_own_expansion_is_the_same(tree: Tree) -> None:
    text = f"y ~ {with_fewest_brackets(tree)}"
    try:
        theirs = DefaultFormulaParser().get_terms(text).rhs
    except TypeError:  # theirs cannot nest within nothing, as in (a - a) / b
        return
    expected = {frozenset(factor.expr for factor in term.factors) for term in theirs}
    found = {frozenset(factor.written for factor in term.factors) for term in read_formula(text).terms}
    assert {frozenset(["1"])} | found == expected


def test_terms_come_in_the_order_in_which_the_formula_makes_them() -> None:
    assert written_terms("refund ~ van*locker + weather") == ["van", "locker", "van:locker", "weather"]
    assert written_terms("refund ~ b:a + a:b + (a + b)**2") == ["b:a", "a", "b"]


def test_outcomes_are_what_stands_before_the_tilde() -> None:
    read = read_formula("log(refund) + `late pickup` ~ van")
    assert read.outcomes == (
        Factor("log(refund)", ("refund",), "one-to-one"),
        Factor("`late pickup`", ("late pickup",), "column"),
    )


@pytest.mark.parametrize(
    ("text", "has_intercept"),
    [
        ("y ~ a", True),
        ("y ~ 1 + a", True),
        ("y ~ a + 1", True),
        ("y ~ +a", True),
        ("y ~ a - 1", False),
        ("y ~ -1 + a", False),
        ("y ~ a + -1", False),
        ("y ~ 0 + a", False),
        ("y ~ a + 0", False),
        ("y ~ a + 0 + 1", True),
    ],
)
def test_the_intercept_is_there_unless_it_is_taken_away(text: str, *, has_intercept: bool) -> None:
    read = read_formula(text)
    assert ([term.written for term in read.terms], read.has_intercept) == (["a"], has_intercept)


def test_a_formula_may_have_no_term_but_the_intercept() -> None:
    assert read_formula("y ~ 1") == Formula((Factor("y", ("y",), "column"),), (), has_intercept=True)


@pytest.mark.parametrize(
    ("written", "names", "keeps"),
    [
        ("van", ("van",), "column"),
        ("web.visits", ("web.visits",), "column"),
        ("orders.cat", ("orders.cat",), "column"),
        ("{van}", ("van",), "column"),
        ("I(van)", ("van",), "column"),
        ("I(+van)", ("van",), "column"),
        ('Q("late van")', ("late van",), "column"),
        ("log(van)", ("van",), "one-to-one"),
        ("np.log1p(van)", ("van",), "one-to-one"),
        ("log(van, 10)", ("van",), "one-to-one"),
        ("log(web.visits)", ("web.visits",), "one-to-one"),
        ("log(`late (van`)", ("late (van",), "one-to-one"),
        ("log(scale(van))", ("van",), "one-to-one"),
        ("I(-van)", ("van",), "one-to-one"),
        ("{van / 2}", ("van",), "one-to-one"),
        ("I(3 - van)", ("van",), "one-to-one"),
        ("I(1 / van)", ("van",), "one-to-one"),
        ("I(van * np.pi)", ("van",), "one-to-one"),
        ("I(van**3)", ("van",), "one-to-one"),
        ("I((van - np.mean(van)) / np.std(van))", ("van",), "one-to-one"),
        ("center(van)", ("van",), "one-to-one"),
        ("C(region)", ("region",), "one-to-one"),
        ("C(region, levels=['north', 'south'])", ("region",), "one-to-one"),
        ("C(region, Treatment(reference='north'))", ("region",), "one-to-one"),
        ("C(region, Sum)", ("region",), "one-to-one"),
        ("C(region, contr.helmert)", ("region",), "one-to-one"),
        ("bs(van, df=3)", ("van",), "one-to-one"),
        ("poly(van, 2, raw=TRUE)", ("van",), "one-to-one"),
        ("I(van**2)", ("van",), "coarse"),
        ("I(van**0)", ("van",), "coarse"),
        ("I(van * 0)", ("van",), "coarse"),
        ("I(van * 1e999)", ("van",), "coarse"),
        ("I(van - van)", ("van",), "coarse"),
        ("I(van > 3)", ("van",), "coarse"),
        ("abs(van)", ("van",), "coarse"),
        ("np.round(van, 1)", ("van",), "coarse"),
        ("pd.cut(van, 3)", ("van",), "coarse"),
        ("C(cut(van, 3))", ("van",), "coarse"),
        ("log(van, 1)", ("van",), "coarse"),
        ("scale(van, van)", ("van",), "coarse"),
        ("mystery(van)", ("van",), "coarse"),
        ("mystery.log(van)", ("mystery", "van"), "computed"),
        ("van.log()", ("van",), "coarse"),
        ("van.str.len()", ("van",), "coarse"),
        ("van.dt.year", ("van",), "coarse"),
        ("van.astype(int)", ("van",), "coarse"),
        ("bs(van, degree=0)", ("van",), "coarse"),
        ("poly(van, 0)", ("van",), "coarse"),
        ("cc(van, df=4)", ("van",), "coarse"),
        ("I(van * weather)", ("van", "weather"), "computed"),
        ("I(van / (weather + van))", ("van", "weather"), "computed"),
        ("bs(van, df=knots)", ("van", "knots"), "computed"),
        ("log(log)", ("log",), "one-to-one"),
    ],
)
def test_a_factor_reads_its_columns_and_keeps_some_of_one(
    written: str, names: tuple[str, ...], keeps: Keeps
) -> None:
    assert only_factor(written) == Factor(written, names, keeps)


def test_a_factor_is_the_same_however_it_is_spaced() -> None:
    assert written_terms("y ~ log(van) + log( van ) + {van} + van + I(van)") == [
        "log(van)",
        "{van}",
        "I(van)",
    ]


def test_a_column_that_is_named_like_an_expression_is_not_that_expression() -> None:
    assert written_terms("y ~ log(van) + `log(van)`") == ["log(van)", "`log(van)`"]


def of_van() -> st.SearchStrategy[str]:
    numbers = st.sampled_from(["0", "2", "-3", "0.25", "1"])
    return st.recursive(
        st.just("van"),
        lambda inner: (
            st.builds("{}({})".format, st.sampled_from(["log", "sqrt", "cbrt", "abs", "round", "-"]), inner)
            | st.builds("({} {} {})".format, inner, st.sampled_from("+-*/%"), numbers)
            | st.builds("({} {} {})".format, numbers, st.sampled_from("+-*/"), inner)
            | st.builds("({})**{}".format, inner, st.sampled_from(["-1", "0", "1", "2", "3", "0.5", "van"]))
        ),
        max_leaves=3,
    )


def values_where_defined(expression: str) -> list[Decimal]:
    """Enough digits keep apart what only rounding would make the same."""
    functions = {
        "log": lambda x: Decimal(x).ln(),
        "sqrt": lambda x: Decimal(x).sqrt(),
        "cbrt": lambda x: (abs(Decimal(x)) ** (Decimal(1) / 3)).copy_sign(Decimal(x)),
    }
    exact = re.sub(r"[0-9.]+", r'Decimal("\g<0>")', expression)
    values = []
    for van in map(Decimal, ("-2", "-1", "-0.5", "0", "0.25", "0.5", "1", "1.5", "2", "3")):
        with localcontext(prec=150), contextlib.suppress(ArithmeticError, TypeError):
            values.append(eval(exact, {**functions, "Decimal": Decimal, "van": van}))  # noqa: S307
    return values


@given(of_van())
@example("(2 - (van)**3)")
@example("log((van * -3))")
def test_what_is_called_one_to_one_never_gives_two_values_the_same(expression: str) -> None:
    values = values_where_defined(expression)
    keeps = only_factor(f"I({expression})").keeps
    assert keeps != "computed"
    if len(set(values)) < len(values):
        assert keeps == "coarse"


@given(st.text(min_size=1))
@example("a\"b'c")
@example("\u202eنافذة")
@example("a\n\r\x00\x1bb")
@example("\\`\\")
@example("{(")
def test_backquotes_take_any_name(name: str) -> None:
    inside = name.replace("\\", "\\\\").replace("`", "\\`")
    read = read_formula(f"y ~ `{inside}` : van")
    assert [factor.names for factor in read.terms[0].factors] == [(name,), ("van",)]
    (factor,) = read_formula(f"y ~ log(`{inside}`)").terms[0].factors
    assert (factor.names, factor.keeps) == ((name,), "one-to-one")
