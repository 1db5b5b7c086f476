"""How much of one column does an expression in a formula keep?

It is read from the outside in, down to its one column: one-to-one where every step is known to be so on all
values that it is defined for, numbers taken as exact; a basis of splines or powers counts as one-to-one where the
column itself is among what it spans. What is not known to be so is coarse, which is the cautious reading.
"""

from __future__ import annotations

import ast
import math
from collections.abc import Mapping, Sequence

from pathgate.review.formula_calls import called_by, column_named, is_aggregate, is_of_module
from pathgate.review.formula_python import Expression
from pathgate.review.keeps import Keeps

# Strictly monotone wherever they are defined.
_MONOTONE = frozenset(
    [
        "arcsinh",
        "arctan",
        "asinh",
        "atan",
        "cbrt",
        "exp",
        "exp2",
        "expit",
        "expm1",
        "log",
        "log10",
        "log1p",
        "log2",
        "logit",
        "negative",
        "sinh",
        "sqrt",
        "tanh",
    ]
)
# Whatever else they are given: these name, order or shift the values, and merge none.
_CODINGS = frozenset(["C", "Categorical", "category", "center", "factor", "scale", "standardize"])
_SAME = frozenset({"I", "str"})
# The cyclic one (cc) is left out: it gives the two ends of the column the same values.
_BASES = frozenset(["bs", "cr", "cs", "ns", "poly"])
_BASIS_KEYWORDS = frozenset(["constraints", "degree", "df", "include_intercept", "intercept", "knots", "raw"])


def keeps_of(expression: Expression, columns: Sequence[str]) -> Keeps:
    """How much an expression keeps; ``columns`` are those it reads, each as often as it occurs."""
    if len(set(columns)) > 1:
        return "computed"
    reading = _Steps(expression.names)
    if reading.is_column(expression.tree):
        return "column"
    return "one-to-one" if len(columns) == 1 and reading.keeps_all(expression.tree) else "coarse"


def is_sum_of_columns(expression: Expression) -> bool:
    """Is it a sum of columns, each perhaps times a number, and of numbers?"""
    reading = _Steps(expression.names)
    waiting = [expression.tree]
    while waiting:
        match waiting.pop():
            case ast.Call(func=ast.Name(id="I"), args=[inner], keywords=[]):
                waiting.append(inner)
            case ast.UnaryOp(op=ast.UAdd() | ast.USub(), operand=inner):
                waiting.append(inner)
            case ast.BinOp(left=left, op=ast.Add() | ast.Sub(), right=right):
                waiting += [left, right]
            case ast.BinOp(left=left, op=ast.Mult() | ast.Div(), right=right) if _number(right) is not None:
                waiting.append(left)
            case ast.BinOp(left=left, op=ast.Mult(), right=right) if _number(left) is not None:
                waiting.append(right)
            case other:
                if _number(other) is None and not reading.is_column(other):
                    return False
    return True


class _Steps:
    def __init__(self, names: Mapping[str, str]) -> None:
        self.names = names

    def is_column(self, node: ast.expr) -> bool:
        """Is its value that of the column?"""
        match node:
            case ast.Call(func=ast.Name(id="I"), args=[inner], keywords=[]):
                return self.is_column(inner)
            case ast.UnaryOp(op=ast.UAdd(), operand=inner):
                return self.is_column(inner)
        return column_named(node, self.names) is not None

    def keeps_all(self, node: ast.expr) -> bool:
        """Does each value of it stand for one value of the column?"""
        if self.is_column(node):
            return True
        match node:
            case ast.Call(args=[inner, *_]):
                return self._call_keeps(node) and self.keeps_all(inner)
            case ast.UnaryOp(op=ast.USub() | ast.UAdd(), operand=inner):
                return self.keeps_all(inner)
            case ast.BinOp(left=left, op=operator, right=right):
                return self._arithmetic_keeps(left, operator, right)
        return False

    def _call_keeps(self, call: ast.Call) -> bool:
        called = called_by(call, self.names)
        if called is None or called.is_method:
            return False
        if called.name in _MONOTONE | _SAME:
            has_base = called.name == "log" and len(call.args) == 2 and _is_base(call.args[1])
            return (len(call.args) == 1 or has_base) and not call.keywords
        return called.name in _CODINGS or (called.name in _BASES and _spans_the_column(call, called.name))

    def _arithmetic_keeps(self, left: ast.expr, operator: ast.operator, right: ast.expr) -> bool:
        if isinstance(operator, ast.Pow):
            power = _number(right)
            return isinstance(power, int) and power % 2 == 1 and self.keeps_all(left)
        is_after = self._is_constant(right)
        if not (is_after or self._is_constant(left)):
            return False
        column, constant = (left, right) if is_after else (right, left)
        is_shift = isinstance(operator, ast.Add | ast.Sub)
        is_unit = isinstance(operator, ast.Mult | ast.Div) and _number(constant) != 0
        return (is_shift or is_unit) and self.keeps_all(column)

    def _is_constant(self, node: ast.expr) -> bool:
        called = called_by(node, self.names) if isinstance(node, ast.Call) else None
        if isinstance(node, ast.Call) and called is not None and is_aggregate(node, called):
            return True
        return _number(node) is not None or is_of_module(node)


def _spans_the_column(call: ast.Call, name: str) -> bool:
    """Is a straight line in the column one of what the basis spans?"""
    if len(call.args) > 2 or any(keyword.arg not in _BASIS_KEYWORDS for keyword in call.keywords):
        return False
    degrees = [keyword.value for keyword in call.keywords if keyword.arg == "degree"]
    if name == "poly":
        degrees += call.args[1:]
    return all(_is_degree(degree) for degree in degrees)


def _is_base(node: ast.expr) -> bool:
    number = _number(node)
    return number is not None and number > 0 and number != 1


def _is_degree(node: ast.expr) -> bool:
    number = _number(node)
    return isinstance(number, int) and number >= 1


def _number(node: ast.expr) -> int | float | None:
    if isinstance(node, ast.UnaryOp) and isinstance(node.op, ast.USub | ast.UAdd):
        number = _number(node.operand)
        return -number if number is not None and isinstance(node.op, ast.USub) else number
    if not isinstance(node, ast.Constant) or isinstance(node.value, bool):
        return None
    value = node.value
    if isinstance(value, int) or (isinstance(value, float) and math.isfinite(value)):
        return value
    return None
