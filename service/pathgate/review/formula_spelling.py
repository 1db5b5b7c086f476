"""Is this sequence of pieces a formula, and how is it spelled in words that any parser reads alike?

Each factor becomes a plain word (``f0``, ``f1`` …) and the intercept a summand of its own, so that the parser
never meets a user's text, nor the signs and numbers on which implementations differ: these are refused here, each
with its own sentence. Linear in the pieces.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass

from pathgate.graphs.names import quoted
from pathgate.review.formula_bounds import FormulaRefused, Piece
from pathgate.review.formula_factor import Factor, factor_of

MOST_NESTING = 50

_INFIX = {**{sign: sign for sign in ("+", "-", "*", "/", ":", "**")}, "^": "**", "+-": "-"}
_TILDES = {"~": "+", "~+": "+", "~-": "-"}
# A column to a power beyond the number of columns says nothing more, and no parser should read thousands of digits.
_MOST_POWER = 9999


@dataclass(frozen=True, slots=True)
class Spelling:
    """A formula in plain words.

    Attributes:
        text: the formula; the word ``f3`` is its factor 3, and 1 the intercept.
        factors: what the words stand for.
    """

    text: str
    factors: tuple[Factor, ...]


def spelled(pieces: Sequence[Piece]) -> Spelling:
    """The same formula in plain words.

    Raises:
        FormulaRefused: it is no formula, or means different things to different readers.

    >>> spelled((Piece("name", "refund", "refund"), Piece("operator", "~-", "~ -"), Piece("value", "1", "1"))).text
    'f0 ~ 1 - 1'
    """
    _refuse_shape(pieces)
    speller = _Speller()
    for piece in pieces:
        speller.take(piece)
    return speller.done()


def _refuse_shape(pieces: Sequence[Piece]) -> None:
    """What the formula as a whole is not, before any of its pieces is looked into."""
    operators = "".join(piece.text for piece in pieces if piece.kind == "operator")
    if "|" in operators:
        raise FormulaRefused(
            "a | is not read: for a random effect like (1 | locker), name the column in fixed_effects instead"
        )
    tildes = operators.count("~")
    if tildes != 1:
        why = (
            "the formula has no ~ between outcome and terms"
            if not tildes
            else "the formula has more than one ~"
        )
        raise FormulaRefused(why)


class _Speller:
    """Takes piece after piece, and always knows whether a factor or an operator has to come next."""

    def __init__(self) -> None:
        self.words: list[str] = []
        self.numbers: dict[tuple[str, ...], int] = {}
        self.factors: list[Factor] = []
        self.depth = 0
        self.wants_factor = True
        self.is_after_tilde = False
        self.last: Piece | None = None

    def take(self, piece: Piece) -> None:
        match piece.kind:
            case "operator" if "~" in piece.text:
                self._tilde(piece)
            case "operator":
                self._operator(piece)
            case "context":
                self._bracket(piece)
            case "value":
                self._value(piece)
            case _:
                self._factor(piece)
        self.last = piece

    def done(self) -> Spelling:
        if self.depth:
            raise FormulaRefused("a ( in the formula is not closed")
        if self.wants_factor:
            raise FormulaRefused(f"nothing stands after the {self._last_written()} that ends the formula")
        return Spelling(" ".join(self.words), tuple(self.factors))

    def _tilde(self, piece: Piece) -> None:
        sign = _TILDES.get(piece.text)
        if sign is None:
            raise _unread_operator(piece)
        if self.depth:
            raise FormulaRefused(
                "the ~ stands in brackets: it parts the whole formula into outcome and terms"
            )
        if self.wants_factor:
            raise FormulaRefused("nothing stands before the ~: the outcome is missing")
        # The intercept is written out, so that a sign after the ~ has something before it.
        self.words += ["~", "1", sign]
        self.wants_factor = self.is_after_tilde = True

    def _operator(self, piece: Piece) -> None:
        sign = _INFIX.get(piece.text)
        if sign is None:
            raise _unread_operator(piece)
        if self.wants_factor:
            raise FormulaRefused(f"nothing stands between {self._last_written()} and {quoted(piece.written)}")
        if not self.is_after_tilde and sign != "+":
            raise FormulaRefused(
                f"an outcome cannot be an interaction or a difference: {quoted(piece.written)} before the ~ is not"
                " read; to compute one outcome from several columns write I(…)"
            )
        if self._last_is_number() and sign not in {"+", "-"}:
            raise _unread_number(self.last)
        self.words.append(sign)
        self.wants_factor = True

    def _bracket(self, piece: Piece) -> None:
        if piece.text not in {"(", ")"}:
            raise FormulaRefused(f"{quoted(piece.text)} is not read in a formula")
        is_opening = piece.text == "("
        self._expect(piece, wants_factor=is_opening)
        if is_opening and self.words[-1:] == ["**"]:
            raise _unread_power(piece)
        self.depth += 1 if is_opening else -1
        if self.depth < 0:
            raise FormulaRefused("a ) in the formula closes nothing")
        if self.depth > MOST_NESTING:
            raise FormulaRefused(f"the formula is nested too deeply: at most {MOST_NESTING} brackets")
        self.words.append(piece.text)

    def _value(self, piece: Piece) -> None:
        self._expect(piece, wants_factor=True)
        self.wants_factor = False
        if self.words[-1:] == ["**"]:
            self._power(piece)
        elif set(piece.text) == {"."}:
            raise FormulaRefused("a . for all other columns is not read: name the columns")
        elif piece.text[0] in "\"'":
            raise FormulaRefused(
                f"a string is no term: write a column's name in backquotes: {quoted(piece.text)}"
            )
        else:
            self._intercept(piece)

    def _power(self, piece: Piece) -> None:
        if not re.fullmatch("[1-9][0-9]*", piece.text) or self.words[-3:-2] == ["**"]:
            raise _unread_power(piece)
        power = int(piece.text) if len(piece.text) < 5 else _MOST_POWER
        self.words.append(str(power))

    def _intercept(self, piece: Piece) -> None:
        sign = self.words[-1] if self.words else ""
        if piece.text not in {"0", "1"} or sign not in {"+", "-"} or self.depth or not self.is_after_tilde:
            raise _unread_number(piece)
        if piece.text == "0":
            if sign == "-":
                raise FormulaRefused("taking 0 away is not read: write + 1 for an intercept, + 0 for none")
            self.words[-1] = "-"
        self.words.append("1")

    def _factor(self, piece: Piece) -> None:
        self._expect(piece, wants_factor=True)
        if self.words[-1:] == ["**"]:
            raise _unread_power(piece)
        key, factor = factor_of(piece)
        number = self.numbers.setdefault(key, len(self.factors))
        if number == len(self.factors):
            self.factors.append(factor)
        self.words.append(f"f{number}")
        self.wants_factor = False

    def _expect(self, piece: Piece, *, wants_factor: bool) -> None:
        if self.wants_factor == wants_factor:
            return
        if piece.text == ")":
            raise FormulaRefused(f"nothing stands between {self._last_written()} and the )")
        raise FormulaRefused(
            f"an operator is missing between {self._last_written()} and {quoted(piece.written)}"
        )

    def _last_is_number(self) -> bool:
        return self.last is not None and self.last.kind == "value" and self.words[-2:-1] != ["**"]

    def _last_written(self) -> str:
        return quoted(self.last.written) if self.last else "the beginning"


def _unread_operator(piece: Piece) -> FormulaRefused:
    if any(sign in piece.text for sign in ("++", "--", "-+")):
        return FormulaRefused(f"one sign is enough between two terms: {quoted(piece.written)}")
    if piece.text == "%in%":
        return FormulaRefused("%in% means different things to different readers: write a:b or a/b instead")
    return FormulaRefused(
        f"{quoted(piece.written)} is not read in a formula; a name that is more than letters, digits and _ stands"
        " in backquotes"
    )


def _unread_number(piece: Piece | None) -> FormulaRefused:
    number = quoted(piece.written) if piece else "a number"
    return FormulaRefused(
        f"{number} has no place here: only + 0, + 1 and - 1 outside brackets say something of the intercept; to"
        " compute with a column write I(…)"
    )


def _unread_power(piece: Piece) -> FormulaRefused:
    return FormulaRefused(f"after ** stands one whole number from 1 on, not {quoted(piece.written)}")
