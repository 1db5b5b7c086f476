"""Does an expression over one column give different results for all different values of it?

A step is one operation around the column: a function, an operation with a constant, a cast. Each is told by
itself, and steps that are one-to-one stay so together. Types are not known, so a step counts only where it is
one-to-one for whole numbers and for fractions alike. Linear in the expression, and without recursion.
"""

from __future__ import annotations

from dataclasses import dataclass
from decimal import Decimal, InvalidOperation
from enum import IntEnum

from sqlglot import exp
from sqlglot.dialects.dialect import Dialect

from pathgate.review.sql_bounds import dialect_name
from pathgate.review.sql_meaning import is_strict_about_truth, number_of

# Beyond these, constants drown the digits of what they meet.
_SMALLEST, _LARGEST = Decimal("1e-15"), Decimal("1e15")
_SMOOTH = (exp.Ln, exp.Exp, exp.Sqrt, exp.Cbrt)
_TEXTS = (exp.DType.TEXT, exp.DType.VARCHAR, exp.DType.NVARCHAR)
# Here a text without a length is a short one.
_SHORT_TEXTS = {"tsql", "fabric", "oracle", "teradata"}
_CHAR_IS_TEXT = {"mysql", "doris", "starrocks"}
_ENDLESS_DECIMALS = {"postgres", "materialize", "risingwave"}

# How `/` treats operands that are not known to be floating numbers. Always with a fraction:
_EXACT_DIVISION = {"bigquery", "databricks", "duckdb", "hive", "oracle", "spark", "spark2"}
# With enough of a fraction where one operand is written with a point, whichever operand that is:
_EXACT_WITH_POINT = {"dialect", "clickhouse", "materialize", "postgres", "risingwave", "sqlite"}
# Only where that is the divisor:
_EXACT_BY_POINT = {*_EXACT_WITH_POINT, "fabric", "redshift", "tsql"}
# With some more digits than the dividend has:
_ROUNDED_DIVISION = {"doris", "mysql", "snowflake", "starrocks"}
_LARGEST_OF_ROUNDED = Decimal(10_000)


class _Digits(IntEnum):
    """What is known of the digits of a number: nothing, that it has a point, that it is a floating one."""

    UNKNOWN = 0
    POINT = 1
    FLOATING = 2


@dataclass(frozen=True, slots=True)
class _Constant:
    size: Decimal
    digits: _Digits


@dataclass(frozen=True, slots=True)
class _Step:
    """One operation and the operand of it that leads to the column."""

    node: exp.Expr
    inner: exp.Expr
    constant: _Constant | None = None


def keeps_all(tree: exp.Expr, dialect: Dialect) -> bool:
    """Is the expression, in which one column occurs once, known to be one-to-one in it?"""
    steps: list[_Step] = []
    node = tree
    while not isinstance(node, exp.Column):
        step = _outermost(node)
        if step is None:
            return False
        steps.append(step)
        node = step.inner
    name = dialect_name(dialect)
    digits = _Digits.UNKNOWN
    for step in reversed(steps):
        if not _is_one_to_one(step, digits, dialect, name):
            return False
        digits = _digits_after(step, digits)
    return True


def _outermost(node: exp.Expr) -> _Step | None:
    """The step that a node is; None where it is of no known kind."""
    match node:
        case exp.Paren() | exp.Neg() | exp.Not() | exp.Cast():
            return _Step(node, node.this)
        case exp.Ln() | exp.Exp() | exp.Sqrt() | exp.Cbrt():
            return _Step(node, node.this)
        case exp.Log():
            return _of_log(node)
        case exp.Add() | exp.Sub() | exp.Mul() | exp.Div():
            for one, other in ((node.this, node.expression), (node.expression, node.this)):
                if (constant := _constant(other)) is not None:
                    return _Step(node, one, constant)
    return None


def _of_log(node: exp.Log) -> _Step | None:
    """A logarithm to a constant base; the library has the base first, or nothing but the number."""
    if node.expression is None:
        return _Step(node, node.this)
    base = number_of(node.this)
    return _Step(node, node.expression) if base is not None and base > 0 and base != 1 else None


def _constant(node: exp.Expr) -> _Constant | None:
    """A product of numbers, none of them zero."""
    size, digits = Decimal(1), _Digits.UNKNOWN
    for part in node.walk():
        if isinstance(part, exp.Literal) and not part.is_string:
            try:
                size *= abs(Decimal(part.this))
            except InvalidOperation:
                return None
            digits = _Digits.POINT if set(".eE") & set(part.this) else digits
        elif not isinstance(part, exp.Mul | exp.Neg | exp.Paren):
            return None
    return _Constant(size, digits)


def _is_one_to_one(step: _Step, digits: _Digits, dialect: Dialect, name: str) -> bool:
    match step.node:
        case exp.Not():
            return is_strict_about_truth(dialect)
        case exp.Cast():
            return _is_wide(step.node, name)
        case exp.Add() | exp.Sub():
            return step.constant is not None and step.constant.size <= _LARGEST
        case exp.Mul():
            return _is_in_range(step.constant)
        case exp.Div():
            return _is_in_range(step.constant) and _is_exact_division(step, digits, name)
    return True


def _is_in_range(constant: _Constant | None) -> bool:
    return constant is not None and _SMALLEST <= constant.size <= _LARGEST


def _is_exact_division(step: _Step, digits: _Digits, name: str) -> bool:
    constant = step.constant
    if digits == _Digits.FLOATING or name in _EXACT_DIVISION:
        return True
    is_divisor = step.node.this is step.inner
    has_point = constant is not None and max(constant.digits, digits) >= _Digits.POINT
    if has_point and name in (_EXACT_BY_POINT if is_divisor else _EXACT_WITH_POINT):
        return True
    is_small = constant is not None and constant.size <= _LARGEST_OF_ROUNDED
    return is_divisor and is_small and name in _ROUNDED_DIVISION


def _is_wide(node: exp.Cast, name: str) -> bool:
    """Does a cast keep every value: to a text of any length, or to the widest of numbers?"""
    to = node.args["to"]
    others = {key for key, said in node.args.items() if said and key not in ("this", "to", "safe")}
    if not isinstance(to, exp.DataType) or to.expressions or others or to.args.get("nested"):
        return False
    kind = to.this
    if kind in _TEXTS:
        return kind == exp.DType.TEXT or name not in _SHORT_TEXTS
    if kind == exp.DType.CHAR:
        return name in _CHAR_IS_TEXT
    if type(node) is not exp.Cast:
        return False  # a cast that may fail makes null of many
    return kind == exp.DType.DOUBLE or (kind == exp.DType.DECIMAL and name in _ENDLESS_DECIMALS)


def _digits_after(step: _Step, digits: _Digits) -> _Digits:
    match step.node:
        case exp.Paren() | exp.Neg():
            return digits
        case exp.Add() | exp.Sub() | exp.Mul() | exp.Div():
            return max(digits, step.constant.digits) if step.constant is not None else digits
        case exp.Cast(args={"to": exp.DataType(this=kind)}):
            known = {exp.DType.DOUBLE: _Digits.FLOATING, exp.DType.DECIMAL: _Digits.POINT}
            return known.get(kind, _Digits.UNKNOWN)
        case exp.Not():
            return _Digits.UNKNOWN
    return _Digits.FLOATING
