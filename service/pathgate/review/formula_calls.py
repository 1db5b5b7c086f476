"""What does a call or a dotted name in a formula mean: a function of a module, a method of a column, a column?

``np.log(x)`` calls a module's function, ``x.str.len()`` a method of x, and ``web.visits`` that nobody calls is a
column by that name. Nothing is looked up: modules are told by their usual names.
"""

from __future__ import annotations

import ast
from collections.abc import Mapping
from dataclasses import dataclass

_MODULES = frozenset({"contr", "math", "np", "numpy", "pandas", "pd", "scipy", "sp", "special"})
_ACCESSORS = frozenset({"cat", "dt", "str"})
_AGGREGATES = frozenset(["len", "max", "mean", "median", "min", "nunique", "std", "sum", "var"])


@dataclass(frozen=True, slots=True)
class Called:
    """What a call calls.

    Attributes:
        name: the function's or method's own name.
        column: the column whose method it is, if it is one's.
        on: the expression whose method it is, if it is another's.
        path: the whole dotted name.
        is_of_each: is it called on each value (``x.str.len()``)?
    """

    name: str
    column: str | None = None
    on: ast.expr | None = None
    path: tuple[str, ...] = ()
    is_of_each: bool = False

    @property
    def is_method(self) -> bool:
        """Is it called on a value?"""
        return self.column is not None or self.on is not None


def called_by(call: ast.Call, names: Mapping[str, str]) -> Called | None:
    """What a call calls; None where that is no name. ``names`` are the backquoted ones."""
    path = _path(call.func)
    if path is None:
        return Called(call.func.attr, on=call.func.value) if isinstance(call.func, ast.Attribute) else None
    if len(path) == 1:
        return None if path[0] in names else Called(path[0], path=path)
    if path[0] in _MODULES:
        return Called(path[-1], path=path)
    before = _before_accessor(path)
    return Called(
        path[-1], column=_column(before or path[:-1], names), path=path, is_of_each=before is not None
    )


def is_aggregate(call: ast.Call, called: Called) -> bool:
    """Is it one value for all rows (``np.mean(x)``)? By that a column is shifted or scaled, and no more read."""
    arguments = len(call.args) + len(call.keywords)
    is_reducing = called.name in _AGGREGATES and not called.is_of_each
    return is_reducing and arguments == (0 if called.is_method else 1)


def column_named(node: ast.expr, names: Mapping[str, str]) -> str | None:
    """The column that a name, dotted or not, or ``Q("name")`` stands for; None where it is something else."""
    path = _path(node)
    if path is not None:
        return None if is_of_module(node) or _before_accessor(path) else _column(path, names)
    match node:
        case ast.Call(func=ast.Name(id="Q"), args=[ast.Constant(value=str(name))], keywords=[]):
            return name
    return None


def column_with_attribute(node: ast.expr, names: Mapping[str, str]) -> str | None:
    """The column that something is taken of without a call (x in ``x.dt.year``); None where there is no such."""
    path = _path(node)
    before = None if path is None else _before_accessor(path)
    return None if before is None else _column(before, names)


def is_attribute(written: str) -> bool:
    """Does a dotted name mean something taken of a column?"""
    return _before_accessor(tuple(written.split("."))) is not None


def is_of_module(node: ast.expr) -> bool:
    """Is this something that a module holds (``np.pi``)?"""
    path = _path(node)
    return path is not None and len(path) > 1 and path[0] in _MODULES


def _before_accessor(path: tuple[str, ...]) -> tuple[str, ...] | None:
    """What stands before ``.str.``, ``.dt.`` or ``.cat.``; a last ``.cat`` is a column's own name."""
    if path[0] in _MODULES:
        return None
    return next((path[:at] for at in range(1, len(path) - 1) if path[at] in _ACCESSORS), None)


def _column(path: tuple[str, ...], names: Mapping[str, str]) -> str:
    return ".".join((names.get(path[0], path[0]), *path[1:]))


def _path(node: ast.expr) -> tuple[str, ...] | None:
    parts: list[str] = []
    while isinstance(node, ast.Attribute):
        parts.append(node.attr)
        node = node.value
    return (node.id, *reversed(parts)) if isinstance(node, ast.Name) else None
