"""Formulas: what they multiply out to, which columns they read and how much of each; what is refused."""

from __future__ import annotations

import contextlib
import re
import sys
from collections.abc import Callable
from decimal import Decimal, localcontext

import pytest
from formulaic.parser import DefaultFormulaParser
from hypothesis import example, given
from hypothesis import strategies as st

from pathgate.graphs import CausalGraph
from pathgate.review import InvalidConfig, read_config, review
from pathgate.review.formula import Factor, Formula, FormulaRefused, Keeps, read_formula
from pathgate.review.formula_bounds import MOST_CHARACTERS

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
        ("y ~ " + "x" * MOST_CHARACTERS, "too long"),
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


@pytest.mark.parametrize(
    "formula",
    [
        "refund ~ I(late + rain)",
        "refund ~ rain + I(late + rain)",
        "refund ~ late:rain",
        "refund ~ I(late * rain)",
        "refund ~ score",
    ],
)
def test_a_treatment_that_only_a_mixture_holds_has_no_term_of_its_own(formula: str):
    graph = CausalGraph.of(("late", "refund"), ("rain", "late"))
    derived = {"score": {"from": ["late", "rain"]}}
    with pytest.raises(InvalidConfig) as refused:
        read_config({"treatment": "late", "formula": formula, "derived": derived}, graph)
    assert "by itself" in str([fault.detail for fault in refused.value.faults])


def test_a_sum_of_columns_that_stand_alone_is_collinear_and_no_product():
    graph = CausalGraph.of(("late", "refund"), ("rain", "late"), ("rain", "refund"), ("locker", "refund"))
    told = {}
    for formula in (
        "refund ~ late + rain + I(late - 2 * rain)",
        "refund ~ late + rain + locker + I(rain - locker / 3)",
        "refund ~ late + rain + I(late * rain)",
    ):
        answer = review(graph, read_config({"treatment": "late", "formula": formula}, graph))
        told[formula] = [finding.rule for finding in answer.findings]
    assert list(told.values()) == [["no-variation-left"], ["redundant-covariate"], ["treatment-in-product"]]


def test_a_product_without_the_treatment_alone_says_what_it_takes_for_granted():
    graph = CausalGraph.of(("late", "refund"), ("rain", "refund"))
    config = read_config({"treatment": "late", "formula": "refund ~ rain + late:rain"}, graph)
    (finding,) = review(graph, config).findings
    assert finding.rule == "treatment-in-product"
    assert 'without a term of "late" alone' in finding.message
