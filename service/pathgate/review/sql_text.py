"""Is a text SQL of a dialect, and which stretches of it do the parts of a condition come from?

sqlglot reads it. Parts are told apart twice, in its tree and among its words, so that each can be shown as it
was written; where the two do not agree, the cautious reading stands. Linear in the text.
"""

from __future__ import annotations

import logging
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from sqlglot import Token, TokenType, exp
from sqlglot.dialects.dialect import Dialect
from sqlglot.errors import ParseError, SqlglotError

from pathgate.graphs.names import quoted
from pathgate.review.schema import STANDARD_DIALECT
from pathgate.review.sql_bounds import CLOSING, OPENING, SqlRefused, first_column, tokens_of, too_nested

_WHOLE = {TokenType.SELECT, TokenType.WITH, TokenType.FROM}
_WHERE_ENDS = {
    *(TokenType.WHERE, TokenType.GROUP_BY, TokenType.HAVING, TokenType.ORDER_BY, TokenType.QUALIFY),
    *(TokenType.WINDOW, TokenType.LIMIT, TokenType.OFFSET, TokenType.FETCH, TokenType.FOR),
}
_JOIN_STARTS = {
    *(TokenType.JOIN, TokenType.INNER, TokenType.LEFT, TokenType.RIGHT, TokenType.FULL, TokenType.CROSS),
    *(TokenType.NATURAL, TokenType.STRAIGHT_JOIN, TokenType.COMMA, TokenType.ON),
}


@dataclass(frozen=True, slots=True)
class Stretch:
    """Some consecutive tokens of a text.

    Attributes:
        text: the whole text.
        tokens: at least one.
    """

    text: str
    tokens: tuple[Token, ...]

    @property
    def written(self) -> str:
        """What its writer put there."""
        return self.text[self.tokens[0].start : self.tokens[-1].end + 1]


@dataclass(frozen=True, slots=True)
class SqlText:
    """A text and its reading in a dialect.

    Attributes:
        dialect: the one it was read in.
        whole: all of it.
        tree: a condition, or a SELECT.
    """

    dialect: Dialect
    whole: Stretch
    tree: exp.Expr


def read_sql(text: str, dialect_name: str, *, wanted: str = "condition") -> SqlText:
    """What a SQL condition (in complaints: ``wanted``) or a SELECT says.

    Raises:
        SqlRefused: it is neither, or it is nested too deeply.

    >>> read_sql("a = 1 AND b", "standard").whole.written
    'a = 1 AND b'
    """
    # The library logs pieces of what it reads; what callers send belongs in no log.
    logging.getLogger("sqlglot").setLevel(logging.CRITICAL)
    dialect = Dialect.get_or_raise("" if dialect_name == STANDARD_DIALECT else dialect_name)
    tokens = tokens_of(text, dialect, wanted)
    stretch = Stretch(text, tokens)
    # A query in brackets is read as one, to be refused as one.
    first = next((token for token in tokens if token.token_type != TokenType.L_PAREN), tokens[0])
    wanted = "SELECT" if first.token_type in _WHOLE else wanted
    return SqlText(dialect, stretch, _tree(stretch, dialect, wanted))


def parts_of(stretch: Stretch, tree: exp.Expr, dialect: Dialect) -> list[tuple[Stretch, exp.Expr | None]]:
    """A condition split at its top-level ANDs, each part with its tree.

    Where tokens and tree do not agree on the parts, all is one part without a tree: of that nothing but the
    columns it reads may be believed.
    """
    conjuncts = list(_conjuncts(tree))
    stretches = list(_split(stretch, dialect))
    if len(conjuncts) != len(stretches):
        return [(stretch, None)]
    return list(zip(stretches, conjuncts, strict=True))


def clauses_of(sql: SqlText) -> dict[TokenType, list[Stretch]]:
    """The conditions after WHERE, HAVING and each ON of a SELECT."""
    found: dict[TokenType, list[Stretch]] = {TokenType.ON: [], TokenType.WHERE: [], TokenType.HAVING: []}
    tokens = sql.whole.tokens
    kind: TokenType | None = None
    start = 0
    for place, token in (*_at_the_top(tokens), (len(tokens), None)):
        is_end = token is None or token.token_type in _WHERE_ENDS or _starts_join(tokens, place, kind)
        if is_end and kind is not None and place > start:
            found[kind].append(Stretch(sql.whole.text, tokens[start:place]))
        if is_end and token is not None:
            kind = token.token_type if token.token_type in found else None
            start = place + 1
    return found


def says(stretch: Stretch, tree: exp.Expr, dialect: Dialect) -> bool:
    """Is ``tree`` what this stretch says by itself?"""
    try:
        return _tree(stretch, dialect, "condition") == tree
    except SqlRefused:
        return False


def _starts_join(tokens: Sequence[Token], place: int, kind: TokenType | None) -> bool:
    if kind in (TokenType.WHERE, TokenType.HAVING) or tokens[place].token_type not in _JOIN_STARTS:
        return False
    # LEFT(…) and RIGHT(…) are functions, ON (…) is not.
    is_function = place + 1 < len(tokens) and tokens[place + 1].token_type == TokenType.L_PAREN
    return tokens[place].token_type == TokenType.ON or not is_function


def _tree(stretch: Stretch, dialect: Dialect, wanted: str) -> exp.Expr:
    parser = dialect.parser()
    tokens = list(stretch.tokens)
    try:
        if wanted == "SELECT":
            found = parser.parse(tokens, stretch.text)
        else:
            found = parser.parse_into(exp.Condition, tokens, stretch.text)
    except RecursionError:
        raise too_nested() from None
    except SqlglotError as error:
        raise SqlRefused(_complaint(error, stretch, wanted)) from None
    if len(found) != 1 or found[0] is None:
        raise SqlRefused(f"the SQL text holds no {wanted}")
    return found[0]


def _complaint(error: SqlglotError, stretch: Stretch, wanted: str) -> str:
    what = f"an {wanted}" if wanted == "expression" else f"a {wanted}"
    details = error.errors[0] if isinstance(error, ParseError) and error.errors else {}
    word, line, column = details.get("highlight"), details.get("line"), details.get("col")
    if not word or line is None or column is None:
        return f"the SQL text is not {what} in this dialect"
    near = f" near {quoted(word)}"
    hint = ""
    if stretch.tokens[0].token_type == TokenType.WHERE:
        hint = ": leave out the word WHERE"
    return f"the SQL text is not {what} in this dialect{near} (line {line}, column {first_column(column, word)}){hint}"


def _at_the_top(tokens: Sequence[Token]) -> Iterator[tuple[int, Token]]:
    """The tokens that stand in no bracket and no CASE, with their places."""
    depth = 0
    for place, token in enumerate(tokens):
        if token.token_type in CLOSING:
            depth -= 1
        elif token.token_type in OPENING:
            depth += 1
        elif depth == 0:
            yield place, token


def _split(stretch: Stretch, dialect: Dialect) -> Iterator[Stretch]:
    """The stretches between top-level ANDs, brackets around several of them taken off."""
    inner = _inside_brackets(stretch)
    if inner is not None:
        parts = list(_split(inner, dialect))
        yield from parts if len(parts) > 1 else [stretch]
        return
    ands = _and_places(stretch.tokens, dialect)
    for start, end in zip([-1, *ands], [*ands, len(stretch.tokens)], strict=True):
        if end > start + 1:
            part = Stretch(stretch.text, stretch.tokens[start + 1 : end])
            yield from _split(part, dialect) if ands else [part]


def _inside_brackets(stretch: Stretch) -> Stretch | None:
    tokens = stretch.tokens
    is_bracketed = tokens[0].token_type == TokenType.L_PAREN and tokens[-1].token_type == TokenType.R_PAREN
    if len(tokens) < 3 or not is_bracketed:
        return None
    depth = 0
    for token in tokens[:-1]:
        depth += (token.token_type == TokenType.L_PAREN) - (token.token_type == TokenType.R_PAREN)
        if depth == 0:
            return None
    return Stretch(stretch.text, tokens[1:-1])


def _and_places(tokens: Sequence[Token], dialect: Dialect) -> list[int]:
    """Where the ANDs of a conjunction stand; nowhere, if anything binds as loosely or more loosely than AND."""
    joins, pending, found = dialect.parser_class.CONJUNCTION, 0, []
    looser = {*dialect.parser_class.DISJUNCTION, TokenType.XOR}
    for place, token in _at_the_top(tokens):
        kind = token.token_type
        if kind in looser:
            return []
        if kind == TokenType.BETWEEN:
            pending += 1
        elif kind == TokenType.AND and pending:
            pending -= 1
        elif joins.get(kind) is exp.And:
            found.append(place)
    return found


def _conjuncts(tree: exp.Expr) -> Iterator[exp.Expr]:
    """The operands of a tree of ANDs, left to right, without recursion."""
    waiting = [tree]
    while waiting:
        node = waiting.pop()
        bare = node.unnest()
        if isinstance(bare, exp.And):
            waiting += [bare.expression, bare.this]
        else:
            yield node
