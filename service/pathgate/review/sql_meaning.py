"""What does one condition say: does it fix its column, ask for nulls, or say nothing of any column?

A condition fixes a column only where nothing but one constant can be left of it. In doubt it does not: taking a
part for one that narrows is the cautious reading. Linear in the condition.
"""

from __future__ import annotations

from decimal import Decimal, InvalidOperation
from operator import eq, ge, gt, le, lt, ne

from sqlglot import exp
from sqlglot.dialects.dialect import Dialect

from pathgate.review.sql_bounds import dialect_name

# Here a condition must be a truth value; elsewhere any number but zero counts as true.
_STRICT_TRUTH = {
    *("dialect", "athena", "bigquery", "databricks", "hive", "materialize", "postgres", "presto", "redshift"),
    *("risingwave", "spark", "spark2", "trino"),
}
_CONSTANTS = (
    *(exp.Literal, exp.Boolean, exp.National, exp.RawString, exp.HexString, exp.BitString, exp.Placeholder),
    *(exp.Parameter, exp.Neg, exp.Cast, exp.DataType, exp.DataTypeParam, exp.Paren, exp.Var, exp.Date),
)
_COMPARISONS = (exp.EQ, exp.NEQ, exp.LT, exp.LTE, exp.GT, exp.GTE)
_DECIDED = {exp.EQ: eq, exp.NEQ: ne, exp.LT: lt, exp.LTE: le, exp.GT: gt, exp.GTE: ge}


def is_strict_about_truth(dialect: Dialect) -> bool:
    """Must a condition be a truth value in this dialect?"""
    return dialect_name(dialect) in _STRICT_TRUTH


def is_key_of_join(node: exp.Expr) -> bool:
    """Does the condition equate columns of two tables?"""
    bare = node.unnest()
    if not isinstance(bare, exp.EQ):
        return False
    left, right = bare.this.unnest(), bare.expression.unnest()
    if not (isinstance(left, exp.Column) and isinstance(right, exp.Column)):
        return False
    return left.table != right.table


def null_test_of(node: exp.Expr) -> str:
    """``recorded`` for x IS NOT NULL, ``missing`` for x IS NULL, else nothing."""
    is_negated, bare = False, node.unnest()
    while isinstance(bare, exp.Not):
        is_negated, bare = not is_negated, bare.this.unnest()
    is_test = isinstance(bare, exp.Is | exp.NullSafeEQ) and isinstance(bare.expression.unnest(), exp.Null)
    if not is_test or not isinstance(bare.this.unnest(), exp.Column):
        return ""
    return "recorded" if is_negated else "missing"


def fixed_column(node: exp.Expr, *, is_strict: bool) -> exp.Column | None:
    """The column that the condition holds at one constant."""
    bare = node.unnest()
    found: exp.Column | None = None
    match bare:
        case exp.Column():
            found = bare if is_strict else None
        case exp.Not():
            found = _fixed_by_negation(bare.this.unnest(), is_strict=is_strict)
        case exp.EQ() | exp.NullSafeEQ():
            found = _column_beside_constant(bare)
        case exp.Is():
            is_true = isinstance(bare.expression, exp.Boolean) and bool(bare.expression.this)
            found = _column_beside_constant(bare) if is_strict or not is_true else None
        case exp.In():
            found = _only_choice(bare)
        case exp.Between():
            low, high = bare.args.get("low"), bare.args.get("high")
            found = _column(bare.this) if low == high and _is_constant(low) else None
    return found


def _fixed_by_negation(negated: exp.Expr, *, is_strict: bool) -> exp.Column | None:
    match negated:
        case exp.Column():
            # False is one value also where numbers count as truth values: it is zero.
            return negated
        case exp.Not():
            return fixed_column(negated.this, is_strict=is_strict)
        case exp.NEQ():
            return _column_beside_constant(negated)
    return None


def _column_beside_constant(node: exp.Binary | exp.Is) -> exp.Column | None:
    for one, other in ((node.this, node.expression), (node.expression, node.this)):
        if (found := _column(one)) is not None and _is_constant(other):
            return found
    return None


def _only_choice(node: exp.In) -> exp.Column | None:
    if any(said for name, said in node.args.items() if name not in ("this", "expressions") and said):
        return None
    choices = {choice for choice in node.expressions if not isinstance(choice.unnest(), exp.Null)}
    if any(choice.find(exp.Placeholder, exp.Parameter) for choice in choices):
        return None  # a parameter in a list may stand for several values
    return _column(node.this) if len(choices) == 1 and all(map(_is_constant, choices)) else None


def _column(node: exp.Expr) -> exp.Column | None:
    bare = node.unnest()
    return bare if isinstance(bare, exp.Column) else None


def _is_constant(node: object) -> bool:
    return isinstance(node, exp.Expr) and all(isinstance(part, _CONSTANTS) for part in node.walk())


def is_never_true(node: exp.Expr) -> bool:
    """Does the condition compare with NULL, which is never true?"""
    bare = node.unnest()
    if isinstance(bare, exp.In):
        choices = bare.expressions
        return bool(choices) and all(isinstance(choice.unnest(), exp.Null) for choice in choices)
    if not isinstance(bare, _COMPARISONS):
        return False
    return any(isinstance(side.unnest(), exp.Null) for side in (bare.this, bare.expression))


def is_always_true(node: exp.Expr) -> bool | None:
    """For a condition on constants alone; None where it cannot be told."""
    bare = node.unnest()
    if isinstance(bare, exp.Boolean):
        return bool(bare.this)
    if isinstance(bare, exp.Not):
        inner = is_always_true(bare.this)
        return None if inner is None else not inner
    if (number := number_of(bare)) is not None:
        return number != 0
    if isinstance(bare, exp.EQ) and bare.this == bare.expression and isinstance(bare.this, exp.Literal):
        return True
    if isinstance(bare, _COMPARISONS):
        left, right = number_of(bare.this), number_of(bare.expression)
        return None if left is None or right is None else bool(_DECIDED[type(bare)](left, right))
    return None


def number_of(node: exp.Expr) -> Decimal | None:
    """The number that a literal says, with its sign; None where it says none."""
    bare = node.unnest()
    sign = 1
    if isinstance(bare, exp.Neg):
        sign, bare = -1, bare.this.unnest()
    if not isinstance(bare, exp.Literal) or bare.is_string:
        return None
    try:
        return sign * Decimal(bare.this)
    except InvalidOperation:
        return None
