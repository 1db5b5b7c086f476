"""Which columns of a graph does a row filter in SQL read, and what does it assume that it does not say?

A name means the node that bears it exactly, else the one node that it fits by the dialect's folding of
letters; a qualifier is dropped unless a node bears the qualified name. Linear in the filter; the names of the
graph are folded once, where a name does not fit exactly.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from functools import cached_property

from sqlglot import exp
from sqlglot.dialects.dialect import Dialect, NormalizationStrategy

from pathgate.criteria.selection import Part
from pathgate.graphs.errors import Fault, Place
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import mask_of
from pathgate.graphs.names import hint_within, quoted
from pathgate.review.sql_bounds import SqlRefused
from pathgate.review.sql_filter import Condition, Conditions, sql_conditions

# Where only the names of tables are told apart by the case of their letters, names of columns are not.
_TABLES_ALONE = {"mysql", "doris", "starrocks", "singlestore"}
_SENSITIVE_WHEN_QUOTED = (NormalizationStrategy.LOWERCASE, NormalizationStrategy.UPPERCASE)


@dataclass(frozen=True, slots=True)
class Assumed:
    """What a row filter leaves unsaid, and a review takes for granted.

    Attributes:
        kind: what the matter is.
        columns: mask of the nodes it is about.
        tables: the tables it is about.
        written: the part it is about, where it is about one.
        place: the row filter's.
    """

    kind: str
    columns: int
    place: Place
    tables: tuple[str, ...] = ()
    written: str | None = None


@dataclass(frozen=True, slots=True)
class SqlFilter:
    """A row filter in SQL against a graph.

    Attributes:
        parts: what it selects on.
        assumed: what is taken for granted about it.
        emptied: mask of the columns of which it keeps nothing but nulls.
    """

    parts: tuple[Part, ...] = ()
    assumed: tuple[Assumed, ...] = ()
    emptied: int = 0


def read_sql_filter(
    text: str, dialect: str, graph: CausalGraph, faults: list[Fault], place: Place
) -> SqlFilter:
    """The parts of a row filter in SQL; what is wrong with it is added to ``faults``."""
    try:
        found = sql_conditions(text, dialect)
    except SqlRefused as refused:
        faults.append(Fault(refused.slug, place, refused.detail))
        return SqlFilter()
    return _Resolving(graph, found, faults, place).filter()


@dataclass(frozen=True)
class _Resolving:
    graph: CausalGraph
    found: Conditions
    faults: list[Fault]
    place: Place
    _told: set[str] = field(default_factory=set)

    def filter(self) -> SqlFilter:
        parts: list[Part] = []
        assumed: list[Assumed] = []
        emptied = compared = 0
        for condition in self.found.parts:
            columns = self._read(condition)
            if condition.null_test and not columns & ~self.graph.measured:
                assumed.append(Assumed("null-test", columns, self.place, written=condition.written))
                emptied |= columns if condition.null_test == "missing" else 0
            elif columns:
                parts.append(Part(columns, condition.fixed, condition.written))
                compared |= columns & self.graph.measured
        if compared:
            assumed.append(Assumed("comparison", compared, self.place))
        return SqlFilter(tuple(parts), (*assumed, *self._of_select()), emptied)

    def _of_select(self) -> Iterator[Assumed]:
        joined = self.found.joined
        if joined is not None and joined.selecting:
            yield Assumed("join", 0, self.place, joined.selecting)
        if joined is not None and joined.groups:
            yield Assumed("group", mask_of(self._nodes(joined.groups)), self.place)

    def _read(self, condition: Condition) -> int:
        if condition.is_key:
            nodes = [self._find(column) for column in condition.columns]
            # The same column on both sides, or keys that the graph does not know: rows that belong together.
            if None in nodes or len(set(nodes)) == 1:
                return 0
        columns = mask_of(self._nodes(condition.columns))
        for word in condition.words:
            self._refuse_word(word, columns)
        return columns

    def _nodes(self, columns: tuple[exp.Column, ...]) -> Iterator[int]:
        for column in columns:
            node = self._find(column)
            if node is None:
                self._tell(column)
            else:
                yield node

    def _find(self, column: exp.Column) -> int | None:
        """The one node that a name fits."""
        if self._is_hidden(column):
            return None
        for spelling in self._spellings(column):
            name = ".".join(part.name for part in spelling)
            exact = self.graph.index.get(name, self.graph.aliases.get(name))
            if exact is not None:
                return exact
            fitting = self._fitting(spelling)
            if len(fitting) == 1:
                return fitting[0]
        return None

    def _is_hidden(self, column: exp.Column) -> bool:
        joined = self.found.joined
        if joined is None:
            return False
        return not column.table and column.name.casefold() in joined.aliases

    def _spellings(self, column: exp.Column) -> Iterator[list[exp.Identifier]]:
        """The name with all its qualifiers, with fewer and fewer of them, and with none."""
        parts = [part for part in column.parts if isinstance(part, exp.Identifier)]
        table = self._table_of(column)
        for start in range(len(parts)):
            if start == len(parts) - 1 and table:
                steps = table.split(".")
                for first in range(len(steps)):
                    yield [*map(exp.to_identifier, steps[first:]), parts[-1]]
            yield parts[start:]

    def _table_of(self, column: exp.Column) -> str:
        joined = self.found.joined
        return joined.qualifiers.get(column.table.casefold(), "") if joined is not None else ""

    def _fitting(self, spelling: list[exp.Identifier]) -> tuple[int, ...]:
        return self._folded.get(
            ".".join(self._key(part.name, quoted_name=bool(part.quoted)) for part in spelling), ()
        )

    @cached_property
    def _folded(self) -> Mapping[str, tuple[int, ...]]:
        known: dict[str, tuple[int, ...]] = {}
        names = [*zip(self.graph.names, range(self.graph.size), strict=True), *self.graph.aliases.items()]
        for name, node in names:
            key = self._key(name, quoted_name=False)
            if node not in known.get(key, ()):
                known[key] = (*known.get(key, ()), node)
        return known

    def _key(self, name: str, *, quoted_name: bool) -> str:
        strategy = self.found.dialect.normalization_strategy
        if quoted_name and strategy in _SENSITIVE_WHEN_QUOTED:
            return name
        if strategy == NormalizationStrategy.UPPERCASE:
            return name.upper()
        is_sensitive = strategy == NormalizationStrategy.CASE_SENSITIVE
        return (
            name if is_sensitive and _dialect_name(self.found.dialect) not in _TABLES_ALONE else name.lower()
        )

    def _tell(self, column: exp.Column) -> None:
        """Adds the fault of a name that means no node, once for each name."""
        name = ".".join(part.name for part in column.parts)
        if name in self._told:
            return
        self._told.add(name)
        several = {node for spelling in self._spellings(column) for node in self._fitting(spelling)}
        if self._is_hidden(column):
            detail = (
                f"{quoted(name)} is something the SELECT computes: write in the condition what it is made of"
            )
        elif len(several) > 1:
            fitting = " and ".join(quoted(self.graph.name(node)) for node in sorted(several))
            detail = f"{quoted(name)} fits {fitting}: write the name exactly"
        else:
            hint = hint_within(self.faults, column.name, self.graph.names, self.graph.aliases)
            detail = f"no node is named {quoted(name)}{hint}{self._about_quotes(column)}"
        self.faults.append(Fault("unknown-node", self.place, detail, (name,)))

    def _about_quotes(self, column: exp.Column) -> str:
        last = column.this
        is_quoted = isinstance(last, exp.Identifier) and bool(last.args.get("quoted"))
        return "; quotes of this kind hold a name here, and 'single ones' a text" if is_quoted else ""

    def _refuse_word(self, word: str, columns: int) -> None:
        node = self.graph.index.get(word, self.graph.aliases.get(word))
        if node is None:
            (node, *_) = self._fitting([exp.to_identifier(word)]) or (None,)
        if node is not None and not columns >> node & 1:
            detail = f"{quoted(word)} is a function here and not the column: put the column's name in quotes"
            self.faults.append(Fault("invalid-request", self.place, detail, (self.graph.name(node),)))


def _dialect_name(dialect: Dialect) -> str:
    return type(dialect).__name__.lower()
