"""May a parser see this SQL text? What would exhaust one is refused before it does.

Nesting is counted over the dialect's own tokens, so that what stands in strings and comments never counts, and
so is how often the parser would come back to a token. The length is bounded by the config's schema. Linear.
"""

from __future__ import annotations

from collections.abc import Sequence

from sqlglot import Token, TokenType
from sqlglot.dialects.dialect import Dialect
from sqlglot.errors import TokenError

# The parser takes some 20 frames for a parenthesis, and Python allows a thousand.
MOST_NESTING = 25
# It reads a bracket after the name of a type twice, and so what stands in n of them 2**n times.
MOST_READINGS = 20_000

OPENING = {TokenType.L_PAREN, TokenType.L_BRACKET, TokenType.L_BRACE, TokenType.CASE}
CLOSING = {TokenType.R_PAREN, TokenType.R_BRACKET, TokenType.R_BRACE, TokenType.END}
_PREFIXES = {TokenType.NOT, TokenType.DASH, TokenType.PLUS, TokenType.TILDE, TokenType.INTERVAL}


class SqlRefused(Exception):
    """The text is not taken; ``slug`` and ``detail`` say why."""

    def __init__(self, detail: str, slug: str = "invalid-request") -> None:
        super().__init__(detail)
        self.detail = detail
        self.slug = slug


def tokens_of(text: str, dialect: Dialect, wanted: str = "condition") -> tuple[Token, ...]:
    """The words of a text that a parser can be trusted with, a last semicolon left out.

    Raises:
        SqlRefused: it has none, or is nested too deeply.
    """
    try:
        tokens = dialect.tokenize(text)
    except TokenError as error:
        detail = f"the SQL text cannot be read: a string, a quoted name or a comment is not closed ({error})"
        raise SqlRefused(detail.partition(" (")[0]) from None
    if tokens and tokens[-1].token_type == TokenType.SEMICOLON:
        tokens.pop()
    for token in tokens:
        if token.token_type == TokenType.SEMICOLON:
            raise SqlRefused(f"the SQL text goes on after the ; that ends it{_where(token)}")
    if not tokens:
        raise SqlRefused(f"the SQL text holds no {wanted}")
    _refuse_nesting(tokens)
    _refuse_rereading(tokens, dialect)
    _refuse_long_chains(tokens, dialect)
    return tuple(tokens)


def _refuse_nesting(tokens: Sequence[Token]) -> None:
    open_levels: list[tuple[bool, int]] = []
    depth = run = 0
    for token in tokens:
        if token.token_type in OPENING:
            open_levels.append((token.token_type == TokenType.CASE, run + 1))
            depth += run + 1
            run = 0
        elif token.token_type in _PREFIXES:
            run += 1
        else:
            run = 0
            # END closes a CASE alone: elsewhere it is a name.
            is_end = token.token_type == TokenType.END
            if token.token_type in CLOSING and open_levels and open_levels[-1][0] == is_end:
                depth -= open_levels.pop()[1]
        if depth + run > MOST_NESTING:
            raise too_nested(_where(token))


def _refuse_rereading(tokens: Sequence[Token], dialect: Dialect) -> None:
    types = dialect.parser_class.TYPE_TOKENS
    open_levels: list[bool] = []
    readings = doubled = 0
    for place, token in enumerate(tokens):
        readings += 1 << doubled
        if readings > MOST_READINGS:
            raise too_nested(_where(token))
        if token.token_type in OPENING:
            is_typed = place > 0 and tokens[place - 1].token_type in types
            open_levels.append(is_typed)
            doubled += is_typed
        elif token.token_type in CLOSING and open_levels:
            doubled -= open_levels.pop()


def _refuse_long_chains(tokens: Sequence[Token], dialect: Dialect) -> None:
    """Each [ after a value makes the parser go through all of that value again, so x[1][1]… is squared."""
    operators = dialect.parser_class.COLUMN_OPERATORS
    outer: list[int] = []
    chain, is_going_on = 0, False
    for token in tokens:
        kind = token.token_type
        is_operator = kind in operators
        if not (is_going_on or is_operator or kind in CLOSING or kind == TokenType.L_BRACKET):
            chain = 0
        if kind in OPENING:
            outer.append(chain + (kind == TokenType.L_BRACKET))
            chain = 0
        elif kind in CLOSING and outer:
            chain = outer.pop()
        if chain > MOST_NESTING:
            raise too_nested(_where(token))
        is_going_on = is_operator


def too_nested(where: str = "") -> SqlRefused:
    """What is said of such a text."""
    detail = f"the SQL text is nested too deeply: at most {MOST_NESTING} levels, fewer after names of types"
    return SqlRefused(detail + where)


def _where(token: Token) -> str:
    return f" (line {token.line}, column {first_column(token.col, token.text)})"


def first_column(last: int, word: str) -> int:
    """The library counts to the end of a word, people to its beginning."""
    return max(1, last - len(word) + 1)


def dialect_name(dialect: Dialect) -> str:
    """What the library calls a dialect; ``dialect`` for the standard one."""
    return type(dialect).__name__.lower()
