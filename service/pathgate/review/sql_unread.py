"""What in SQL is refused by name because this version does not read it, wherever in a text it stands?

Queries inside the text, set operations, functions written in place and statements: what they select or compute
cannot be told from their columns alone. Linear in the text.
"""

from __future__ import annotations

from sqlglot import exp

from pathgate.review.sql_bounds import SqlRefused

_UNREAD = (
    (exp.SetOperation, "UNION, INTERSECT or EXCEPT"),
    (exp.With, "WITH"),
    (exp.Lambda, "a function written in place (->)"),
    (exp.Command, "a statement that is no SELECT"),
)


def refuse_unread(tree: exp.Expr, *, inside: str, instead: str) -> None:
    """Refuses what is not read; the SELECT that a text may be as a whole is not looked at here.

    Raises:
        SqlRefused: ``inside`` says what it stands in, ``instead`` what can be written.
    """
    for node in tree.walk():
        is_inner = isinstance(node, exp.Query) and not isinstance(node, exp.SetOperation) and node is not tree
        what = f"a query inside {inside}" if is_inner or isinstance(node, exp.Exists) else _unread(node)
        if what:
            raise SqlRefused(f"{what} is not read by this version: {instead}", "not-supported")


def _unread(node: exp.Expr) -> str:
    if isinstance(node, exp.Column) and node.args.get("join_mark"):
        return "the outer join mark (+)"
    return next((words for kind, words in _UNREAD if isinstance(node, kind)), "")
