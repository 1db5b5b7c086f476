"""What does a formula in Wilkinson notation say: its outcomes, its terms, and what each factor of them reads?

Read with formulaic's tokenizer and operator parser and with Python's own parser, and never evaluated; the terms
are multiplied out here, over bit masks and within bounds. Names are not looked up: which columns they are is
for others to say. Importing this module imports pandas, so it is imported where a formula is met.
"""

from __future__ import annotations

from dataclasses import dataclass

from pathgate.review.formula_bounds import FormulaRefused, pieces_of
from pathgate.review.formula_factor import Factor
from pathgate.review.formula_spelling import spelled
from pathgate.review.formula_terms import expanded

__all__ = ["Factor", "Formula", "FormulaRefused", "Term", "read_formula"]


@dataclass(frozen=True, slots=True)
class Term:
    """One term of a formula: a factor, or an interaction of several.

    Attributes:
        written: its factors with ``:`` between them.
        factors: what it multiplies, in the order in which the formula first names them.
    """

    written: str
    factors: tuple[Factor, ...]

    @classmethod
    def of(cls, factors: tuple[Factor, ...]) -> Term:
        """The interaction of these factors."""
        return cls(":".join(factor.written for factor in factors), factors)


@dataclass(frozen=True, slots=True)
class Formula:
    """What a formula says.

    Attributes:
        outcomes: what stands before the ``~``, at least one.
        terms: what stands after it, multiplied out, none twice, without the intercept.
        has_intercept: is an intercept estimated? It is unless the formula takes it away.
    """

    outcomes: tuple[Factor, ...]
    terms: tuple[Term, ...]
    has_intercept: bool


def read_formula(text: str) -> Formula:
    """The outcomes and terms of a formula.

    Raises:
        FormulaRefused: it is none, holds what is not read, or has too many terms.

    >>> read = read_formula("refund ~ late_van * log(order_value) - 1")
    >>> [term.written for term in read.terms], read.has_intercept
    (['late_van', 'log(order_value)', 'late_van:log(order_value)'], False)
    >>> [(factor.names, factor.keeps) for factor in read.terms[1].factors]
    [(('order_value',), 'one-to-one')]
    """
    spelling = spelled(pieces_of(text))
    expansion = expanded(spelling.text)
    factors = spelling.factors
    outcomes = tuple(factors[number] for (number,) in expansion.outcomes)
    terms = tuple(Term.of(tuple(factors[number] for number in term)) for term in expansion.terms if term)
    return Formula(outcomes, terms, () in expansion.terms)
