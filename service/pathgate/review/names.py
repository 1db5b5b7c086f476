"""Which columns of a graph do the names in a request mean?

A name means the node that bears it, else (in configs) the column that goes by it or that it recodes. What
means nothing is a fault with the nearest known name, unless the config declares it as outside the graph.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

from pathgate.graphs.errors import Fault, Place
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import mask_of
from pathgate.graphs.names import hint_within, quoted


@dataclass(frozen=True, slots=True)
class Named:
    """A column and where the config names it.

    Attributes:
        node: the column.
        place: where its name stands.
        written: the name that stands there; empty where it is the node's own.
    """

    node: int
    place: Place
    written: str = ""


@dataclass(frozen=True, slots=True)
class NameReader:
    """Finds the columns that names mean, by id or by another name of the column.

    Attributes:
        graph: where the columns are.
        faults: what is wrong is added here.
        by_alias: do other names of a column count? They do in configs.
        refuse_repeats: is a column named twice a fault? It is in configs.
        recodes: names of values computed from one column each, which stand for it (true where they keep only a
            part of it): a column may be named beside them.
        outside: names that may be in no graph.
        passed_over: the names among these that were met, with their places.
        repeated: the columns that were named again by a recode, or after one.
    """

    graph: CausalGraph
    faults: list[Fault]
    by_alias: bool = True
    refuse_repeats: bool = True
    recodes: Mapping[str, bool] = field(default_factory=dict)
    outside: frozenset[str] = frozenset()
    passed_over: list[tuple[str, Place]] = field(default_factory=list)
    repeated: list[Named] = field(default_factory=list)

    @property
    def coarse(self) -> frozenset[str]:
        """The names that stand for less than their column."""
        return frozenset(name for name, is_coarse in self.recodes.items() if is_coarse)

    def read(self, value: str | Sequence[str], place: Place) -> tuple[Named, ...]:
        """The columns that a name or a list of names means; unknown and repeated names are faults."""
        if isinstance(value, str):
            return self.read_each([(value, place)])
        return self.read_each([(name, (*place, k)) for k, name in enumerate(value)])

    def read_each(self, listed: Sequence[tuple[str, Place]]) -> tuple[Named, ...]:
        """The same for names that are not next to each other in the input."""
        found: dict[int, list[Named]] = {}
        for name, at in listed:
            node = self.find(name)
            if node is None:
                self._unknown(name, at)
                continue
            before = found.setdefault(node, [])
            is_bare = name not in self.recodes and any(each.written not in self.recodes for each in before)
            if not is_bare and all(each.written != name for each in before):
                before.append(Named(node, at, name))
            elif self.refuse_repeats:
                detail = f"the column {quoted(self.graph.name(node))} is named twice"
                self.faults.append(Fault("invalid-request", at, detail, (self.graph.name(node),)))
        return tuple(self._fullest(several) for several in found.values())

    def _fullest(self, several: list[Named]) -> Named:
        """The name that keeps most of a column; the others only repeat it."""
        fullest = min(several, key=lambda named: self.recodes.get(named.written, False))
        self.repeated.extend(named for named in several if named is not fullest)
        return fullest

    def mask(self, value: str | Sequence[str], place: Place) -> int:
        """The same as a mask, for sets that are only computed with."""
        names = (value,) if isinstance(value, str) else value
        index = self.graph.index
        mask = 0
        for name in names:
            if name not in index:
                return mask_of(named.node for named in self.read(value, place))
            mask |= 1 << index[name]
        return mask

    def find(self, name: str) -> int | None:
        """The node that this name means."""
        return self.graph.node_called(name) if self.by_alias else self.graph.index.get(name)

    def _unknown(self, name: str, at: Place) -> None:
        if name in self.outside:
            self.passed_over.append((name, at))
            return
        aliases = self.graph.aliases if self.by_alias else ()
        hint = hint_within(self.faults, name, self.graph.names, aliases)
        self.faults.append(Fault("unknown-node", at, f"no node is named {quoted(name)}{hint}", (name,)))
