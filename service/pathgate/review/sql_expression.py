"""What is an expression in SQL computed from, and how much of one column does it keep?

It is read from the outside in, step by step down to its one column: one-to-one where every step is one of a
few known to be so on all values that it is defined for, numbers taken as exact. What is not known to be so is
coarse, which is the cautious reading. Linear in the text.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from sqlglot import exp
from sqlglot.dialects.dialect import Dialect

from pathgate.graphs.names import quoted
from pathgate.review.keeps import Keeps
from pathgate.review.sql_bounds import SqlRefused
from pathgate.review.sql_steps import keeps_all
from pathgate.review.sql_text import read_sql
from pathgate.review.sql_unread import refuse_unread

_INSTEAD = 'name its inputs with "from" instead'
_RANDOM = (exp.Rand, exp.Randn, exp.Randstr, exp.Uuid)


@dataclass(frozen=True, slots=True)
class Expression:
    """An expression in SQL.

    Attributes:
        columns: what it reads, each as often as it occurs.
        keeps: how much of one column it keeps, or ``computed`` of several.
        dialect: the one it is written in.
        words: what stands in it for a function without brackets (CURRENT_USER), though it might name a column.
    """

    columns: tuple[exp.Column, ...]
    keeps: Keeps
    dialect: Dialect
    words: tuple[str, ...] = ()


def read_expression(text: str, dialect: str) -> Expression:
    """What an expression in SQL is computed from.

    Raises:
        SqlRefused: it is none, or holds what cannot be told from single rows.

    >>> [read_expression(text, "standard").keeps for text in ("ln(weight) / 2.0", "weight > 5", "weight * size")]
    ['one-to-one', 'coarse', 'computed']
    """
    sql = read_sql(text, dialect, wanted="expression")
    try:
        columns = _columns(sql.tree, sql.whole.written)
        keeps = _keeps(sql.tree, columns, sql.dialect)
    except RecursionError:
        message = "the SQL text is nested too deeply"
        raise SqlRefused(message) from None
    functions = sql.dialect.parser_class.NO_PAREN_FUNCTIONS
    words = tuple(token.text for token in sql.whole.tokens if token.token_type in functions)
    return Expression(columns, keeps, sql.dialect, words)


def _columns(tree: exp.Expr, written: str) -> tuple[exp.Column, ...]:
    """What the expression reads; what has no place in a derived column is refused."""
    if isinstance(tree, exp.Query):
        raise SqlRefused(
            f"a derived column is one expression and no SELECT: write the expression, or {_INSTEAD}"
        )
    refuse_unread(tree, inside="the expression", instead=_INSTEAD)
    if tree.find(exp.Window):
        raise SqlRefused(f"a window function mixes rows; {_INSTEAD}: {quoted(written)}")
    if any(map(_is_aggregate, tree.find_all(exp.AggFunc))):
        raise SqlRefused(f"an aggregate mixes rows; {_INSTEAD}: {quoted(written)}")
    if tree.find(*_RANDOM):
        raise SqlRefused(f"a random value is not computed from columns: {quoted(written)}")
    if tree.find(exp.Star):
        raise SqlRefused(f"* stands for all columns: name those that are read: {quoted(written)}")
    columns = tuple(tree.find_all(exp.Column))
    if not columns:
        raise SqlRefused(f"this expression reads no column, so it is the same in all rows: {quoted(written)}")
    return columns


def _is_aggregate(node: exp.AggFunc) -> bool:
    """The largest and the smallest of several values of one row are called by the same names."""
    return not (isinstance(node, exp.Max | exp.Min) and node.args.get("expressions"))


def _keeps(tree: exp.Expr, columns: Sequence[exp.Column], dialect: Dialect) -> Keeps:
    if len(columns) > 1:
        is_one = len({tuple(part.name for part in column.parts) for column in columns}) == 1
        return "coarse" if is_one else "computed"
    if isinstance(tree.unnest(), exp.Column):
        return "column"
    return "one-to-one" if keeps_all(tree, dialect) else "coarse"
