"""May Python's parser see an expression in a formula, and what tree does it make of it?

The tree is only looked at: nothing is compiled, imported or run. Before the parser sees the text, strings and
backquoted names are taken out, and what is left is bounded: the parser and every walk over its tree recurse, and
it warns of numbers glued to words. Linear in the text.
"""

from __future__ import annotations

import ast
import re
import unicodedata
from collections.abc import Mapping
from dataclasses import dataclass

from pathgate.graphs.names import quoted
from pathgate.review.formula_bounds import FormulaRefused, unescaped

MOST_NESTING = 25
# Each operator can be one level of the tree, and so one frame of every walk over it.
MOST_OPERATORS = 100

_STRING_OR_NAME = re.compile(r"""(?P<string>"[^"]*"|'[^']*')|`(?P<name>(?:\\.|[^`\\])*)`""")
_NUMBER_LIKE = re.compile(r"(?<![\w.])\.?\d[\w.]*")
_NUMBER = re.compile(r"\d{1,300}|(\d{1,300}\.\d{0,300}|\.\d{1,300}|\d{1,300})([eE]\d{0,4})?")
_OPERATOR = re.compile(r"[-+*/%@<>=!&|^~.:]|\b(?:not|and|or|in|is)\b")
_UNREAD_WORD = re.compile(r"\b(lambda|if|else|for|await|async|yield)\b")


@dataclass(frozen=True, slots=True)
class Expression:
    """An expression in Python that was parsed.

    Attributes:
        tree: its syntax tree.
        names: what stands in it for a backquoted name → that name.
        written: its text.
    """

    tree: ast.expr
    names: Mapping[str, str]
    written: str

    @property
    def key(self) -> tuple[str, ...]:
        """The same for two expressions that differ in nothing but space and brackets."""
        return (ast.dump(self.tree), *self.names.values())


def parsed(text: str, written: str) -> Expression:
    """The syntax tree of an expression in Python.

    Raises:
        FormulaRefused: it is none, is nested too deeply, or holds what is not read.

    >>> ast.unparse(parsed("log( weight )", "log( weight )").tree)
    'log(weight)'
    """
    names: dict[str, str] = {}
    stem = _unused_stem(text)

    def stand_in(found: re.Match[str]) -> str:
        if found["name"] is None:
            return _plain_string(found[0], written)
        if not found["name"]:
            raise _refused("two backquotes next to each other name no column", written)
        word = f"{stem}{len(names)}"
        names[word] = unescaped(found["name"])
        return word

    replaced = re.sub(r"[\n\r\f]", " ", _STRING_OR_NAME.sub(stand_in, text)).strip()
    _refuse_unparsable(_STRING_OR_NAME.sub('""', replaced), written)
    try:
        tree = ast.parse(replaced, mode="eval").body
        expression = Expression(tree, names, written)
        hash(expression.key)
    except (SyntaxError, ValueError, RecursionError, MemoryError):
        raise _refused("this is no expression in Python", written) from None
    return expression


def _unused_stem(text: str) -> str:
    stem = "column_"
    while stem in text:
        stem += "_"
    return stem


def _plain_string(literal: str, written: str) -> str:
    """The tokenizer takes brackets and backquotes in strings for real ones, and would cut the text elsewhere."""
    if re.search(r"[()\[\]{}`\\\n\r\f]", literal):
        message = "a string in a formula cannot hold brackets, backquotes, backslashes or ends of lines"
        raise _refused(message, written)
    return literal


def _refuse_unparsable(skeleton: str, written: str) -> None:
    """``skeleton`` is the text with its strings emptied and its names replaced."""
    if skeleton.startswith("as."):
        raise _refused("functions are read as Python's: write C(…) for a column of categories", written)
    word = _UNREAD_WORD.search(skeleton)
    if word:
        raise _refused(f"a factor of a formula cannot hold {word[0]}", written)
    if re.search(r"[`\\#;\0]", skeleton) or re.search("[\"']", skeleton.replace('""', "")):
        raise _refused("this is no expression in Python", written)
    for number in _NUMBER_LIKE.findall(skeleton):
        if not _NUMBER.fullmatch(number):
            raise _refused(f"this is not read as a number: {quoted(number)}", written)
    if not unicodedata.is_normalized("NFKC", skeleton):
        raise _refused("Python reads some of these letters as others: write the name in backquotes", written)
    _refuse_nesting(skeleton, written)


def _refuse_nesting(skeleton: str, written: str) -> None:
    depth = deepest = 0
    for character in skeleton:
        depth += (character in "([{") - (character in ")]}")
        deepest = max(deepest, depth)
    if deepest > MOST_NESTING or len(_OPERATOR.findall(skeleton)) > MOST_OPERATORS:
        limits = f"at most {MOST_NESTING} brackets and {MOST_OPERATORS} operators"
        raise _refused(f"one factor of the formula is nested too deeply ({limits})", written)


def _refused(why: str, written: str) -> FormulaRefused:
    return FormulaRefused(f"{why}: {quoted(written)}")
