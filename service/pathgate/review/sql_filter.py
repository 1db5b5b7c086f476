"""What does a row filter in SQL select on? Its conditions, each with the columns it reads.

Conditions are those of WHERE and HAVING and those that an inner join adds in its ON. A condition fixes a
column only where nothing but one constant can be left of it; in doubt it does not, which is the cautious
reading (semantics: a part that narrows never blocks). What cannot be read so is refused by name.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from sqlglot import TokenType, exp
from sqlglot.dialects.dialect import Dialect

from pathgate.graphs.names import quoted
from pathgate.review.sql_bounds import SqlRefused
from pathgate.review.sql_meaning import (
    fixed_column,
    is_always_true,
    is_key_of_join,
    is_never_true,
    is_strict_about_truth,
    null_test_of,
)
from pathgate.review.sql_select import Joined, read_select
from pathgate.review.sql_text import SqlText, Stretch, parts_of, read_sql
from pathgate.review.sql_unread import refuse_unread


@dataclass(frozen=True, slots=True)
class Condition:
    """One part of a filter.

    Attributes:
        written: its SQL text.
        columns: what it reads, apart from what its rows are grouped by.
        fixed: does it hold its one column at one constant?
        null_test: what it asks, where it does nothing but ask whether its one column is null.
        is_grouped: does it read what its rows are grouped by?
        is_key: does it only say which rows of two tables belong together?
        words: what stands in it for a function without brackets (CURRENT_USER), though it might name a column.
    """

    written: str
    columns: tuple[exp.Column, ...]
    fixed: bool = False
    null_test: str = ""
    is_grouped: bool = False
    is_key: bool = False
    words: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Conditions:
    """What a row filter in SQL says.

    Attributes:
        dialect: the one it is written in.
        parts: its conditions in the order of the text, none twice.
        joined: what its SELECT joins; None for a bare condition.
    """

    dialect: Dialect
    parts: tuple[Condition, ...]
    joined: Joined | None = None


def sql_conditions(text: str, dialect_name: str) -> Conditions:
    """The parts of a row filter in SQL.

    Raises:
        SqlRefused: it is no condition, or holds what is not read.

    >>> found = sql_conditions("region = 'north' AND weight BETWEEN 1 AND 5", "standard")
    >>> [(part.written, part.fixed) for part in found.parts]
    [("region = 'north'", True), ('weight BETWEEN 1 AND 5', False)]
    """
    sql = read_sql(text, dialect_name)
    try:
        return _conditions(sql)
    except RecursionError:
        message = "the SQL text is nested too deeply"
        raise SqlRefused(message) from None


def _conditions(sql: SqlText) -> Conditions:
    refuse_unread(sql.tree, inside="the row filter", instead="write the condition itself")
    if not isinstance(sql.tree, exp.Select):
        parts = _Reading(sql.dialect).conditions(sql.whole, sql.tree)
        return Conditions(sql.dialect, _each_once(parts))
    joined = read_select(sql)
    listed: list[Condition] = []
    for clause in joined.clauses:
        is_having = clause.kind == TokenType.HAVING
        has_groups = is_having and bool(joined.groups)
        reading = _Reading(
            sql.dialect, joins=joined.has_joins, may_aggregate=is_having, has_groups=has_groups
        )
        listed += reading.conditions(clause.stretch, clause.tree)
    return Conditions(sql.dialect, _each_once(listed), joined)


@dataclass(frozen=True, slots=True)
class _Reading:
    """How the conditions of one clause are to be read."""

    dialect: Dialect
    joins: bool = False
    may_aggregate: bool = False
    has_groups: bool = False

    def conditions(self, stretch: Stretch, tree: exp.Expr) -> Iterator[Condition]:
        for part, conjunct in parts_of(stretch, tree, self.dialect):
            read = self._condition(part, conjunct, tree)
            if read is not None:
                yield read

    def _condition(self, part: Stretch, conjunct: exp.Expr | None, tree: exp.Expr) -> Condition | None:
        node = tree if conjunct is None else conjunct
        columns = tuple(node.find_all(exp.Column))
        if node.find(exp.Window):
            raise _refused("a window function has no place in a condition", part.written)
        is_aggregate = node.find(exp.AggFunc) is not None
        if is_aggregate and not self.may_aggregate:
            raise _refused("an aggregate has no place in a condition on single rows", part.written)
        is_grouped = is_aggregate and self.has_groups
        if not columns and not is_grouped:
            if is_always_true(node) is not True:
                raise _refused("this condition reads no column, so it keeps all rows or none", part.written)
            return None
        functions = self.dialect.parser_class.NO_PAREN_FUNCTIONS
        words = tuple(token.text for token in part.tokens if token.token_type in functions)
        if conjunct is None:
            return Condition(part.written, columns, is_grouped=is_grouped, words=words)
        if is_never_true(node):
            raise _refused("nothing compares with NULL, so no row is kept; write IS NULL", part.written)
        fixed = fixed_column(node, is_strict=is_strict_about_truth(self.dialect)) is not None
        is_key = self.joins and is_key_of_join(node)
        return Condition(part.written, columns, fixed, null_test_of(node), is_grouped, is_key, words)


def _each_once(conditions: Iterator[Condition] | list[Condition]) -> tuple[Condition, ...]:
    """A condition that is written twice says nothing new the second time."""
    return tuple({condition.written: condition for condition in conditions}.values())


def _refused(why: str, written: str) -> SqlRefused:
    return SqlRefused(f"{why}: {quoted(written)}")
