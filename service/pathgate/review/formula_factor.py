"""What is one factor of a formula: which columns does it read, and how much of one does it keep?

A bare or backquoted name is a column by that name; an expression in Python is parsed and looked at. Linear in
the text.
"""

from __future__ import annotations

from dataclasses import dataclass

from pathgate.review.formula_bounds import Piece
from pathgate.review.formula_calls import column_named, is_attribute
from pathgate.review.formula_columns import columns_of
from pathgate.review.formula_keeps import is_sum_of_columns, keeps_of
from pathgate.review.formula_python import parsed
from pathgate.review.keeps import Keeps


@dataclass(frozen=True, slots=True)
class Factor:
    """One factor of a term of a formula.

    Attributes:
        written: as the formula writes it first, backquotes and braces included.
        names: the columns that it reads, none twice, in the order of its text.
        keeps: how much of its one column it keeps, or ``computed`` of several.
        is_sum: is it a sum of several columns, each times a number?
    """

    written: str
    names: tuple[str, ...]
    keeps: Keeps
    is_sum: bool = False


def factor_of(piece: Piece) -> tuple[tuple[str, ...], Factor]:
    """The factor that a piece of a formula is, and a key that two ways of writing one factor share.

    Raises:
        FormulaRefused: it reads no column, or holds what is not read.
    """
    if piece.kind == "name" and not _has_attribute(piece):
        return ("column", piece.text), Factor(piece.written, (piece.text,), "column")
    expression = parsed(piece.text, piece.written)
    columns = columns_of(expression)
    keeps = keeps_of(expression, columns)
    is_sum = keeps == "computed" and is_sum_of_columns(expression)
    factor = Factor(piece.written, tuple(dict.fromkeys(columns)), keeps, is_sum)
    name = column_named(expression.tree, expression.names)
    return (("expression", *expression.key) if name is None else ("column", name)), factor


def _has_attribute(piece: Piece) -> bool:
    """Does a bare name take something of a column (``x.dt.year``)?"""
    return "." in piece.written and piece.written == piece.text and is_attribute(piece.text)
