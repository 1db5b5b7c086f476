"""Which columns does an expression in a formula read, each as often as it occurs?

Every name is a column unless it is called, stands for a module, or is one of the few words that arguments take.
What mixes rows or is not known to be a function of one row's values is refused: it is not the column it reads,
and the review would take it for that. Linear in the tree.
"""

from __future__ import annotations

import ast
from collections.abc import Iterator, Mapping

from pathgate.graphs.names import quoted
from pathgate.review.formula_bounds import FormulaRefused
from pathgate.review.formula_calls import (
    Called,
    called_by,
    column_named,
    column_with_attribute,
    is_aggregate,
    is_of_module,
)
from pathgate.review.formula_python import Expression

_OTHER_ROWS = frozenset(
    [
        "lag",
        "lead",
        "shift",
        "diff",
        "roll",
        "rolling",
        "expanding",
        "ewm",
        "pct_change",
        "cumsum",
        "cumprod",
        "cummax",
        "cummin",
        "groupby",
        "ffill",
        "bfill",
        "interpolate",
        "resample",
        "transform",
    ]
)
_RANDOM = frozenset(["random", "rand", "randn", "randint", "permutation", "shuffle", "sample", "choice"])
_CONTRASTS = frozenset(["Diff", "Helmert", "Poly", "Sum", "Treatment"])
_TYPES = frozenset(["bool", "float", "int", "object", "str"])
_CONSTANTS_OF_R = frozenset(["FALSE", "NULL", "TRUE"])
_GROUPS = (ast.BinOp, ast.BoolOp, ast.Compare, ast.Dict, ast.List, ast.Set, ast.Tuple, ast.UnaryOp)


def columns_of(expression: Expression) -> tuple[str, ...]:
    """The columns that an expression reads, in the order of its text, each as often as it occurs.

    Raises:
        FormulaRefused: it reads none, or holds what is not read.
    """
    reading = _Reading(expression.names, expression.written)
    reading.refuse_private(expression.tree)
    found = tuple(reading.columns(expression.tree))
    if not found:
        message = "this factor of the formula reads no column, so it is the same in all rows"
        raise FormulaRefused(f"{message}: {quoted(expression.written)}")
    return found


class _Reading:
    def __init__(self, names: Mapping[str, str], written: str) -> None:
        self.names = names
        self.written = written

    def columns(self, node: ast.expr) -> Iterator[str]:
        column = column_named(node, self.names) or column_with_attribute(node, self.names)
        if column is not None:
            yield column
        elif isinstance(node, ast.Call):
            yield from self._call(node)
        elif isinstance(node, _GROUPS) and self._is_read(node):
            for child in ast.iter_child_nodes(node):
                if isinstance(child, ast.expr):
                    yield from self.columns(child)
        elif not is_of_module(node) and not _is_plain_constant(node):
            raise self._refused("only functions, arithmetic and comparisons of columns are read in a formula")

    def _call(self, call: ast.Call) -> Iterator[str]:
        called = called_by(call, self.names)
        if called is None:
            raise self._refused("what is called here is not the name of a function")
        self._refuse_called(called)
        found = tuple(self._arguments(call, called))
        if not is_aggregate(call, called):
            yield from found

    def _arguments(self, call: ast.Call, called: Called) -> Iterator[str]:
        if called.column is not None:
            yield called.column
        if called.on is not None:
            yield from self.columns(called.on)
        for position, argument in enumerate(call.args):
            if not _is_word(argument, called, is_first=position == 0):
                yield from self.columns(argument)
        for keyword in call.keywords:
            if keyword.arg is None:
                raise self._refused("** has no place among the arguments of a function")
            if not _is_word(keyword.value, called, is_keyword=True):
                yield from self.columns(keyword.value)

    def _refuse_called(self, called: Called) -> None:
        if called.name in _OTHER_ROWS:
            raise self._refused(
                f"{called.name} takes values of other rows, which are not this column: give them a column of"
                " their own in the graph and name that"
            )
        if not _RANDOM.isdisjoint((called.name, *called.path[1:])):
            raise self._refused("a random value is not computed from columns")
        if called.name == "offset":
            raise self._refused("an offset is not read: no coefficient is estimated for it")

    def refuse_private(self, tree: ast.expr) -> None:
        """What Python keeps for itself is no column, unless it stands in backquotes."""
        for node in ast.walk(tree):
            name = node.id if isinstance(node, ast.Name) else getattr(node, "attr", "")
            if name.startswith("__"):
                raise self._refused("names with two leading underscores are not read")

    def _is_read(self, node: ast.expr) -> bool:
        if isinstance(node, ast.Dict):
            return all(key is not None for key in node.keys)
        return not (isinstance(node, ast.BinOp) and isinstance(node.op, ast.MatMult))

    def _refused(self, why: str) -> FormulaRefused:
        return FormulaRefused(f"{why}: {quoted(self.written)}")


def _is_word(node: ast.expr, called: Called, *, is_first: bool = False, is_keyword: bool = False) -> bool:
    """Is this argument a word that the function knows, and no column?"""
    if not isinstance(node, ast.Name):
        return False
    if called.name == "astype":
        return node.id in _TYPES
    if called.name == "C" and not is_first and node.id in _CONTRASTS:
        return True
    return is_keyword and node.id in _CONSTANTS_OF_R


def _is_plain_constant(node: ast.expr) -> bool:
    return isinstance(node, ast.Constant) and (
        node.value is None or isinstance(node.value, str | int | float | bool)
    )
