"""Which pieces is the text of a formula made of, and may a parser see them?

The pieces are those of formulaic's tokenizer. It drops what is empty (two backquotes, two braces) without a word,
so the pieces are held against the text: what is not wholly covered by them is refused. Linear in the text.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Literal

from formulaic.errors import FormulaSyntaxError
from formulaic.parser.algos.tokenize import tokenize
from formulaic.parser.types import Token

from pathgate.graphs.names import quoted
from pathgate.review.schema import MOST_FORMULA_CHARACTERS

Kind = Literal["name", "python", "value", "operator", "context"]

_SPACE = re.compile(r"\s+")
_AROUND = {"name": ("`", "`"), "python": ("{", "}"), "operator": ("%", "%")}
# Other bare words (2x, .5x, x.) read as a number or as a piece of Python elsewhere.
_BARE_NAME = re.compile(r"[^\W\d]\w*(\.\w+)*")
_ESCAPED = re.compile(r"\\([\\`])")


class FormulaRefused(Exception):
    """The text is not taken; ``slug`` and ``detail`` say why."""

    def __init__(self, detail: str, slug: str = "invalid-request") -> None:
        super().__init__(detail)
        self.detail = detail
        self.slug = slug


@dataclass(frozen=True, slots=True)
class Piece:
    """One word of a formula.

    Attributes:
        kind: a column's name, an expression in Python, a number or string, an operator, or a bracket.
        text: what it says, without backquotes, braces, or space between operators.
        written: as it stands in the formula.
    """

    kind: Kind
    text: str
    written: str


def pieces_of(text: str) -> tuple[Piece, ...]:
    """The words of a formula, in order; at least one.

    Raises:
        FormulaRefused: the text is empty or too long, or something in it is not closed.

    >>> [(piece.kind, piece.text) for piece in pieces_of("refund ~ log(weight) + `late van`")][2:]
    [('python', 'log(weight)'), ('operator', '+'), ('name', 'late van')]
    """
    if len(text) > MOST_FORMULA_CHARACTERS:
        raise FormulaRefused(
            f"the formula is too long: {len(text):,} characters, at most {MOST_FORMULA_CHARACTERS:,}"
        )
    try:
        tokens = list(tokenize(text))
    except FormulaSyntaxError:
        message = "the formula cannot be read: a bracket, a brace, a quote or a backquote is not in place"
        raise FormulaRefused(message) from None
    pieces = tuple(_pieces(text, tokens))
    if not pieces:
        raise FormulaRefused("the formula is empty")
    return pieces


def _pieces(text: str, tokens: list[Token]) -> Iterator[Piece]:
    at = 0
    for token in tokens:
        start, end = token.source_loc
        if start is None or end is None or token.kind is None:
            raise _not_covered(text[at:])
        piece, after = _piece(text, start, end + 1, token)
        if text[at:start].strip():
            raise _not_covered(text[at:after])
        yield piece
        at = after
    if text[at:].strip():
        raise _not_covered(text[at:])


def _piece(text: str, start: int, end: int, token: Token) -> tuple[Piece, int]:
    """A word, and where the text goes on after it."""
    kind: Kind = token.kind.value if token.kind else "operator"
    covered = text[start:end]
    if covered == token.token:
        if kind == "name" and not _BARE_NAME.fullmatch(covered):
            raise FormulaRefused(f"write a name like this in backquotes: {quoted(covered)}")
        return Piece(kind, token.token, covered), end
    if kind == "operator" and _SPACE.sub("", covered) == token.token:
        return Piece(kind, token.token, covered), end
    opening, closing = _AROUND.get(kind, ("", ""))
    if opening and covered == opening + token.token and text[end : end + 1] == closing:
        written = text[start : end + 1]
        said = {"name": unescaped(token.token), "operator": written}.get(kind, token.token)
        return Piece(kind, said, written), end + 1
    raise _not_covered(text[start : end + 1])


def _not_covered(written: str) -> FormulaRefused:
    return FormulaRefused(f"the formula cannot be read at {quoted(written.strip())}")


def unescaped(name: str) -> str:
    r"""A name as it is meant inside backquotes, where ``\``` is a backquote and ``\\`` a backslash."""
    return _ESCAPED.sub(r"\1", name)
