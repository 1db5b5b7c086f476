"""Which terms does a formula multiply out to?

By the definition of Wilkinson and Rogers (1973): a term is a set of factors, here a bit mask (the intercept is the
empty one), and each operator makes one set of terms of two. formulaic parses; its own expansion forms n**k products
for a power and so takes seconds for a line of text. Here a power is a repeated product, each without repeats and
within two bounds that are checked before the product is formed.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import reduce
from operator import or_

from formulaic.parser import DefaultFormulaParser
from formulaic.parser.types import ASTNode, Token

from pathgate.graphs.masks import members
from pathgate.review.formula_bounds import FormulaRefused

MOST_TERMS = 1_000
# Some 30 ms.
MOST_PRODUCTS = 100_000

_Terms = dict[int, None]
"""A set of terms in the order in which they came."""


@dataclass(frozen=True, slots=True)
class Expansion:
    """The terms on both sides of a formula, each as the numbers of its factors.

    Attributes:
        outcomes: before the ``~``.
        terms: after it; the empty one is the intercept.
    """

    outcomes: tuple[tuple[int, ...], ...]
    terms: tuple[tuple[int, ...], ...]


def expanded(text: str) -> Expansion:
    """The terms of a formula in plain words (see ``formula_spelling``), each once.

    Raises:
        FormulaRefused: there are too many.

    >>> expanded("f0 ~ 1 + f1 * f2 - f2").terms
    ((), (1,), (1, 2))
    """
    parser = DefaultFormulaParser(include_intercept=False, feature_flags={"twosided"})
    tree = parser.get_ast_from_tokens([_token(word) for word in text.split()], context={})
    if not isinstance(tree, ASTNode):
        raise TypeError(text)
    before, after = (_Expander().expand(side) for side in tree.args)
    return Expansion(tuple(map(_numbers, before)), tuple(map(_numbers, after)))


def _token(word: str) -> Token:
    if word.startswith("f"):
        return Token(word, kind="name")
    return Token(word, kind="value" if word.isdigit() else "context" if word in "()" else "operator")


def _numbers(term: int) -> tuple[int, ...]:
    return tuple(members(term))


class _Expander:
    def __init__(self) -> None:
        self.products = 0

    def expand(self, tree: ASTNode[Token] | Token) -> _Terms:
        """The terms of a tree; sums of thousands of terms are as many levels deep, so it does not recurse."""
        done: list[_Terms] = []
        for node in _children_first(tree):
            if isinstance(node, Token):
                done.append({_mask_of_word(node.token): None})
                continue
            if node.operator.symbol == "**":
                done.append(self._power(done.pop(), int(node.args[1].token)))
                continue
            right, left = done.pop(), done.pop()
            done.append(self._joined(left, node.operator.symbol, right))
        return done.pop()

    def _joined(self, left: _Terms, symbol: str, right: _Terms) -> _Terms:
        match symbol:
            case "+":
                return _bounded(left, right)
            case "-":
                for term in right:
                    left.pop(term, None)
                return left
            case ":":
                return self._product(left, right)
            case "*":
                product = self._product(left, right)
                return _bounded(_bounded(left, right), product)
            case "/":
                product = self._product({reduce(or_, left, 0): None}, right)
                return _bounded(left, product)
        raise ValueError(symbol)

    def _product(self, left: _Terms, right: _Terms) -> _Terms:
        self.products += len(left) * len(right)
        if self.products > MOST_PRODUCTS:
            raise _too_many()
        found: _Terms = {}
        for one in left:
            _bounded(found, {one | other: None for other in right})
        return found

    def _power(self, base: _Terms, power: int) -> _Terms:
        """A product of a term with itself is the term, so powers only grow, and have ended once they do not."""
        grown = base
        for _ in range(power - 1):
            size = len(grown)
            grown = self._product(grown, base)
            if len(grown) == size:
                break
        return grown


def _mask_of_word(word: str) -> int:
    return 0 if word == "1" else 1 << int(word[1:])


def _bounded(left: _Terms, right: _Terms) -> _Terms:
    left.update(right)
    if len(left) > MOST_TERMS:
        raise _too_many()
    return left


def _too_many() -> FormulaRefused:
    return FormulaRefused(
        f"the formula multiplies out to too much: at most {MOST_TERMS:,} terms, of {MOST_PRODUCTS:,} products"
    )


def _children_first(tree: ASTNode[Token] | Token) -> Iterator[ASTNode[Token] | Token]:
    """The nodes of a tree, operands before their operator and from left to right; powers' numbers are left out."""
    waiting = [tree]
    found: list[ASTNode[Token] | Token] = []
    while waiting:
        node = waiting.pop()
        found.append(node)
        if isinstance(node, ASTNode):
            waiting += node.args[:1] if node.operator.symbol == "**" else node.args
    yield from reversed(found)
