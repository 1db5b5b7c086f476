"""Which node of a graph does a column in SQL mean, or which name that the config declares as outside of it?

A name means the node that bears it exactly, else the one node that it fits by the dialect's folding of
letters; a qualifier is dropped unless a node bears the qualified name. Names declared as outside the graph are
looked up in the same way, each spelling after the graph's own. Linear in the columns; the names of the graph
are folded once, where a name does not fit exactly.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass, field
from functools import cached_property

from sqlglot import exp
from sqlglot.dialects.dialect import Dialect, NormalizationStrategy

from pathgate.graphs.errors import Fault, Place
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.names import hint_within, quoted
from pathgate.review.sql_bounds import dialect_name
from pathgate.review.sql_select import Joined

# Where only the names of tables are told apart by the case of their letters, names of columns are not.
_TABLES_ALONE = {"mysql", "doris", "starrocks", "singlestore"}
_SENSITIVE_WHEN_QUOTED = (NormalizationStrategy.LOWERCASE, NormalizationStrategy.UPPERCASE)


@dataclass(frozen=True, slots=True)
class Reads:
    """What some columns of a SQL text are.

    Attributes:
        columns: mask of the nodes that they mean.
        outside: the declared names that others of them mean, as declared, in the order of the text.
        is_coarse: does one of them stand for less than its node?
    """

    columns: int = 0
    outside: tuple[str, ...] = ()
    is_coarse: bool = False


@dataclass(frozen=True, slots=True)
class Found:
    """What one column of a SQL text means: a node, or else a declared name.

    Attributes:
        node: the node.
        outside: the name that is declared as outside the graph.
        is_coarse: does the column stand for less than its node?
    """

    node: int | None = None
    outside: str = ""
    is_coarse: bool = False


@dataclass(frozen=True)
class ColumnFinder:
    """Finds what the columns of one SQL text mean.

    Attributes:
        graph: where the nodes are.
        dialect: whose folding of letters holds.
        faults: what is wrong is added here.
        place: where the text stands.
        joined: what the SELECT around them joins and computes, where there is one.
        outside: names that may be in no graph.
        coarse: other names of nodes that stand for less than the node (a bucket, a threshold).
    """

    graph: CausalGraph
    dialect: Dialect
    faults: list[Fault]
    place: Place
    joined: Joined | None = None
    outside: frozenset[str] = frozenset()
    coarse: frozenset[str] = frozenset()
    _told: set[str] = field(default_factory=set)

    def read(self, columns: Iterable[exp.Column], words: Iterable[str] = ()) -> Reads:
        """What the columns mean; those that mean nothing are faults, once for each name.

        ``words`` stand for functions without brackets: one that names a node not among the columns is a fault.
        """
        mask, outside, is_coarse = 0, dict[str, None](), False
        for column in columns:
            found = self.find(column)
            if found is None:
                self._tell(column)
            elif found.node is None:
                outside[found.outside] = None
            else:
                mask |= 1 << found.node
                is_coarse |= found.is_coarse
        for word in words:
            self._refuse_word(word, mask)
        return Reads(mask, tuple(outside), is_coarse)

    def find(self, column: exp.Column) -> Found | None:
        """The one node that a name fits, or the declared name where no node does."""
        spellings = () if self._is_hidden(column) else self._spellings(column)
        return next(filter(None, map(self._fit, spellings)), None)

    def _fit(self, spelling: list[exp.Identifier]) -> Found | None:
        name = ".".join(part.name for part in spelling)
        exact = self.graph.node_called(name)
        if exact is not None:
            return Found(exact, is_coarse=name in self.coarse)
        key = self._folded_spelling(spelling)
        fitting = self._folded.get(key, ())
        if len(fitting) == 1:
            return Found(fitting[0], is_coarse=key in self._coarse_folded)
        declared = name if name in self.outside else "" if fitting else self._outside_folded.get(key, "")
        return Found(outside=declared) if declared else None

    def _is_hidden(self, column: exp.Column) -> bool:
        if self.joined is None:
            return False
        return not column.table and column.name.casefold() in self.joined.aliases

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
        return self.joined.qualifiers.get(column.table.casefold(), "") if self.joined is not None else ""

    def _fitting(self, spelling: list[exp.Identifier]) -> tuple[int, ...]:
        return self._folded.get(self._folded_spelling(spelling), ())

    def _folded_spelling(self, spelling: list[exp.Identifier]) -> str:
        return ".".join(self._key(part.name, quoted_name=bool(part.quoted)) for part in spelling)

    @cached_property
    def _folded(self) -> Mapping[str, tuple[int, ...]]:
        known: dict[str, tuple[int, ...]] = {}
        names = [*zip(self.graph.names, range(self.graph.size), strict=True), *self.graph.aliases.items()]
        for name, node in names:
            key = self._key(name, quoted_name=False)
            if node not in known.get(key, ()):
                known[key] = (*known.get(key, ()), node)
        return known

    @cached_property
    def _outside_folded(self) -> Mapping[str, str]:
        """Of several that fold alike the first in the order of letters: none of them is read."""
        return {self._key(name, quoted_name=False): name for name in sorted(self.outside, reverse=True)}

    @cached_property
    def _coarse_folded(self) -> frozenset[str]:
        return frozenset(self._key(name, quoted_name=False) for name in self.coarse)

    def _key(self, name: str, *, quoted_name: bool) -> str:
        strategy = self.dialect.normalization_strategy
        if quoted_name and strategy in _SENSITIVE_WHEN_QUOTED:
            return name
        if strategy == NormalizationStrategy.UPPERCASE:
            return name.upper()
        is_sensitive = strategy == NormalizationStrategy.CASE_SENSITIVE
        return name if is_sensitive and dialect_name(self.dialect) not in _TABLES_ALONE else name.lower()

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
            known = (self.graph.names, self.graph.aliases, sorted(self.outside))
            hint = hint_within(self.faults, column.name, *known)
            detail = f"no node is named {quoted(name)}{hint}{_about_quotes(column)}"
        self.faults.append(Fault("unknown-node", self.place, detail, (name,)))

    def _refuse_word(self, word: str, columns: int) -> None:
        node = self.graph.node_called(word)
        if node is None:
            (node, *_) = self._fitting([exp.to_identifier(word)]) or (None,)
        if node is not None and not columns >> node & 1:
            detail = f"{quoted(word)} is a function here and not the column: put the column's name in quotes"
            self.faults.append(Fault("invalid-request", self.place, detail, (self.graph.name(node),)))


def _about_quotes(column: exp.Column) -> str:
    last = column.this
    is_quoted = isinstance(last, exp.Identifier) and bool(last.args.get("quoted"))
    return "; quotes of this kind hold a name here, and 'single ones' a text" if is_quoted else ""
