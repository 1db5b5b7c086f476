"""The columns that a config computes from others, as nodes of its graph.

A value computed from several columns is a child of its inputs, fully determined by them and by nothing else; one
that recodes a single column (a log, a unit, a bucket) takes that column's place and becomes another name of it.
So every other member of a config may name them like columns of the graph. Linear in what is declared.
"""

from __future__ import annotations

import graphlib
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field, replace
from functools import cached_property
from typing import Any

from pathgate.graphs.errors import Fault, Place
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import mask_of, members
from pathgate.graphs.names import quoted
from pathgate.graphs.node_list import MAX_NAME
from pathgate.review.names import NameReader
from pathgate.review.schema import STANDARD_DIALECT


@dataclass(frozen=True)
class Columns:
    """What the names of a config can mean.

    Attributes:
        graph: the team's graph, grown by the computed columns.
        inputs: for each computed column what it is computed from, mask.
        recodes: the names that stand for a column which they recode; true where only a part of it is kept.
        outside: names that are declared to be in no graph.
    """

    graph: CausalGraph
    inputs: Mapping[int, int] = field(default_factory=dict)
    recodes: Mapping[str, bool] = field(default_factory=dict)
    outside: frozenset[str] = frozenset()

    def bases(self, node: int) -> int:
        """The columns of the team's own graph that a column is computed from; itself where it is one of these."""
        return self._bases[node] if node in self.inputs else 1 << node

    @cached_property
    def _bases(self) -> list[int]:
        bases: list[int] = []
        # Inputs stand before what is computed from them.
        for node in range(self.graph.size):
            made_of = 0
            for each in members(self.inputs.get(node, 0)):
                made_of |= bases[each]
            bases.append(made_of or 1 << node)
        return bases

    def grown(self, computed: list[tuple[str, int]], recodes: Mapping[str, tuple[int, bool]]) -> Columns:
        """The same columns and more: computed ones by name and inputs, recodes by name and column."""
        if not computed and not recodes:
            return self
        aliases = {name: node for name, (node, _) in recodes.items()}
        graph = self.graph.with_columns(computed, aliases)
        inputs = {self.graph.size + k: made_of for k, (_, made_of) in enumerate(computed)}
        coarse = {name: is_coarse for name, (_, is_coarse) in recodes.items()}
        return Columns(graph, {**self.inputs, **inputs}, {**self.recodes, **coarse}, self.outside)


def understand_columns(said: Mapping[str, Any], graph: CausalGraph, faults: list[Fault]) -> Columns:
    """The columns that a config can name; what is wrong with ``derived`` and ``outside_graph`` is a fault."""
    outside = said.get("outside_graph", ())
    names = [outside] if isinstance(outside, str) else list(outside)
    for k, name in enumerate(names):
        if graph.node_called(name) is not None:
            place: Place = ("outside_graph",) if isinstance(outside, str) else ("outside_graph", k)
            detail = f"{quoted(name)} is in the graph, and so not outside it"
            faults.append(Fault("invalid-request", place, detail, (name,)))
    columns = Columns(graph, outside=frozenset(names))
    derived = said.get("derived", {})
    return _Deriving(said, columns, faults).columns() if derived else columns


class _Deriving:
    """Reads the declared columns, each after those that it is computed from."""

    def __init__(self, said: Mapping[str, Any], columns: Columns, faults: list[Fault]) -> None:
        self._derived: Mapping[str, Mapping[str, Any]] = said["derived"]
        self._dialect = said.get("dialect", STANDARD_DIALECT)
        self._before = columns
        # To be read, names need no edges, which would be copied with each column that comes.
        self._columns = replace(columns, graph=columns.graph.without_edges())
        self._faults = faults

    def columns(self) -> Columns:
        known = {name: said for name, said in self._derived.items() if self._may_bear(name)}
        for name in self._in_order(known):
            self._add(name, known[name])
        read = self._columns
        columns = self._before.grown(
            [(read.graph.names[node], made_of) for node, made_of in read.inputs.items()],
            {name: (read.graph.aliases[name], is_coarse) for name, is_coarse in read.recodes.items()},
        )
        # What a faulty declaration was to be called is no further fault where it is used.
        faulty = [
            each for each in self._derived if each not in columns.graph.index and each not in columns.recodes
        ]
        return replace(columns, outside=columns.outside | set(faulty)) if faulty else columns

    def _may_bear(self, name: str) -> bool:
        graph = self._columns.graph
        detail = ""
        if not name or len(name) > MAX_NAME:
            detail = f"the name of a column has 1 to {MAX_NAME} characters"
        elif graph.node_called(name) is not None:
            detail = (
                f"{quoted(name)} is a column of the graph already: give what is derived a name of its own"
            )
        elif name in self._columns.outside:
            detail = f"{quoted(name)} is declared as outside the graph as well"
        if detail:
            self._faults.append(Fault("invalid-request", ("derived", name), detail, (name,)))
        return not detail

    def _in_order(self, known: Mapping[str, Mapping[str, Any]]) -> Iterator[str]:
        """The names, inputs first; in the order of the config where that leaves a choice."""
        spelled = {name.casefold(): name for name in known}
        needs = {
            name: [
                spelled[need.casefold()] for _, need in self._mentioned(said) if need.casefold() in spelled
            ]
            for name, said in known.items()
        }
        try:
            yield from list(graphlib.TopologicalSorter(needs).static_order())
        except graphlib.CycleError as error:
            circle = list(reversed(error.args[1]))
            shown = " from ".join(map(quoted, circle))
            detail = f"nothing is computed from itself: {shown}"
            self._faults.append(Fault("invalid-request", ("derived", circle[0]), detail, tuple(circle[1:])))

    def _mentioned(self, said: Mapping[str, Any]) -> Iterator[tuple[str, str]]:
        """Member and name of each column that a declaration names."""
        if "sql" in said:
            from pathgate.review.sql_names import names_in_expression  # noqa: PLC0415 - as in rows_kept

            yield from (("sql", name) for name in names_in_expression(said["sql"], self._dialect))
        if "recodes" in said:
            yield "recodes", said["recodes"]
        inputs = said.get("from", ())
        for name in [inputs] if isinstance(inputs, str) else inputs:
            yield "from", name

    def _add(self, name: str, said: Mapping[str, Any]) -> None:
        place: Place = ("derived", name)
        names = NameReader(self._columns.graph, self._faults, recodes=self._columns.recodes)
        if "sql" in said:
            self._add_expression(name, said["sql"])
        elif "recodes" in said:
            for named in names.read(said["recodes"], (*place, "recodes")):
                is_coarse = said.get("coarse", False) or self._columns.recodes.get(said["recodes"], False)
                self._columns = self._columns.grown([], {name: (named.node, is_coarse)})
        else:
            inputs = mask_of(named.node for named in names.read(said["from"], (*place, "from")))
            if inputs:
                self._grow(name, inputs)

    def _grow(self, name: str, inputs: int) -> None:
        """One computed column more, without its arrows as yet."""
        columns = self._columns
        grown = columns.grown([(name, 0)], {})
        self._columns = replace(grown, inputs={**columns.inputs, columns.graph.size: inputs})

    def _add_expression(self, name: str, text: str) -> None:
        from pathgate.review.sql_names import read_sql_expression  # noqa: PLC0415 - as in rows_kept

        columns = self._columns
        names = NameReader(columns.graph, self._faults, recodes=columns.recodes, outside=columns.outside)
        inputs, keeps = read_sql_expression(text, self._dialect, names, ("derived", name, "sql"))
        if keeps == "computed" and inputs:
            self._grow(name, inputs)
        elif inputs:
            self._columns = columns.grown([], {name: (inputs.bit_length() - 1, keeps == "coarse")})
