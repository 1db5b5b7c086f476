"""What does a SELECT do to the rows beside its conditions? It joins tables and groups rows.

An inner join keeps the rows that exist on both sides, and its ON may narrow them further; an outer join keeps
the rows of the side it is named after. Whatever else decides on rows (LIMIT, DISTINCT, QUALIFY …) is refused.
"""

from __future__ import annotations

from dataclasses import dataclass

from sqlglot import TokenType, exp

from pathgate.review.sql_bounds import SqlRefused
from pathgate.review.sql_text import SqlText, Stretch, clauses_of, says

_READ = {"expressions", "from_", "joins", "where", "group", "having", "order", "kind", "hint", "exclude"}
_JOIN_READ = {"this", "side", "kind", "method", "on", "using"}
_SIDES = {"", "LEFT", "RIGHT", "FULL"}
_KINDS = {"", "INNER", "OUTER", "CROSS"}


@dataclass(frozen=True, slots=True)
class Clause:
    """One condition of a SELECT: where it stands, its text and its tree."""

    kind: TokenType
    stretch: Stretch
    tree: exp.Expr


@dataclass(frozen=True, slots=True)
class Joined:
    """What a SELECT does beside its conditions.

    Attributes:
        clauses: its conditions that keep or drop rows, in the order of the text.
        qualifiers: each name or alias of a table, folded, with the name of that table.
        selecting: the tables whose absent rows make other rows go missing.
        has_joins: is there more than one table?
        groups: the columns of GROUP BY.
        aliases: names that the SELECT list gives to what it computes, folded.
    """

    clauses: tuple[Clause, ...]
    qualifiers: dict[str, str]
    selecting: tuple[str, ...]
    has_joins: bool
    groups: tuple[exp.Column, ...]
    aliases: frozenset[str]


def read_select(sql: SqlText) -> Joined:
    """The joins, groups and conditions of a SELECT.

    Raises:
        SqlRefused: something else in it decides on rows.
    """
    tree = sql.tree
    _refuse_others(tree, _READ, "SELECT")
    source = tree.args.get("from_")
    joins: list[exp.Join] = tree.args.get("joins") or []
    tables = [_table(source.this)] if source is not None else []
    selecting: dict[str, None] = {}
    for join in joins:
        side = _side(join)
        table = _table(join.this)
        if side == "RIGHT":
            selecting |= dict.fromkeys(_full_name(earlier) for earlier in tables)
        elif side == "":
            selecting[_full_name(table)] = None
        tables.append(table)
    return Joined(
        clauses=_clauses(sql, joins),
        qualifiers=_qualifiers(tables),
        selecting=tuple(selecting),
        has_joins=bool(joins),
        groups=_groups(tree),
        aliases=frozenset(_aliases(tree)),
    )


def _clauses(sql: SqlText, joins: list[exp.Join]) -> tuple[Clause, ...]:
    stretches = clauses_of(sql)
    trees = {TokenType.ON: [join.args["on"] for join in joins if join.args.get("on")]}
    for kind, name in ((TokenType.WHERE, "where"), (TokenType.HAVING, "having")):
        clause = sql.tree.args.get(name)
        trees[kind] = [] if clause is None else [clause.this]
    inner = {id(join.args.get("on")) for join in joins if _side(join) == ""}
    found = []
    for kind, those in trees.items():
        pairs = list(zip(stretches[kind], those, strict=False))
        agree = all(says(stretch, tree, sql.dialect) for stretch, tree in pairs)
        if len(stretches[kind]) != len(those) or not agree:
            message = (
                "the conditions of this SELECT cannot be told apart: give the condition alone, without SELECT"
            )
            raise SqlRefused(message, "not-supported")
        found += [Clause(kind, *pair) for pair in pairs if kind != TokenType.ON or id(pair[1]) in inner]
    return tuple(found)


def _side(join: exp.Join) -> str:
    """``LEFT``, ``RIGHT``, ``FULL``, or nothing where rows without a partner go missing."""
    _refuse_others(join, _JOIN_READ, "JOIN")
    is_known = join.side in _SIDES and join.kind in _KINDS and join.method in ("", "NATURAL")
    if not is_known:
        words = " ".join(word for word in (join.method, join.side, join.kind) if word)
        raise SqlRefused(f"{words} JOIN is not read by this version", "not-supported")
    return str(join.side)


def _table(node: exp.Expr) -> exp.Table:
    is_plain = isinstance(node, exp.Table) and isinstance(node.this, exp.Identifier)
    if not isinstance(node, exp.Table) or not is_plain:
        message = "only plain tables can be joined or selected from in this version"
        raise SqlRefused(message, "not-supported")
    _refuse_others(node, {"this", "alias", "db", "catalog"}, "a table")
    return node


def _full_name(table: exp.Table) -> str:
    return ".".join(part.name for part in table.parts)


def _qualifiers(tables: list[exp.Table]) -> dict[str, str]:
    known = {}
    for table in tables:
        known[table.alias_or_name.casefold()] = _full_name(table)
    return known


def _groups(tree: exp.Expr) -> tuple[exp.Column, ...]:
    group = tree.args.get("group")
    if group is None:
        return ()
    _refuse_others(group, {"expressions"}, "GROUP BY")
    if any(not list(one.find_all(exp.Column)) for one in group.expressions):
        message = "GROUP BY must name columns, not places in the SELECT list"
        raise SqlRefused(message, "not-supported")
    return tuple(group.find_all(exp.Column))


def _aliases(tree: exp.Expr) -> list[str]:
    """A name that only renames a column to itself hides nothing."""
    return [
        one.alias.casefold()
        for one in tree.expressions
        if isinstance(one, exp.Alias)
        and not (isinstance(one.this, exp.Column) and one.this.name == one.alias)
    ]


def _refuse_others(node: exp.Expr, read: set[str], of_what: str) -> None:
    for name, said in node.args.items():
        if said and name not in read:
            word = name.rstrip("_").replace("_", " ").upper()
            raise SqlRefused(f"{word} in {of_what} is not read by this version", "not-supported")
