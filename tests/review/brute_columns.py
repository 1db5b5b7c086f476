"""What do the names in a config mean, and which columns are determined by others? Read off the config literally.

Works on plain values: a column computed from others is a new node, child of its inputs; a recode is another name.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace
from typing import Any

from tests.values import Graph, Names, as_set


@dataclass(frozen=True)
class Columns:
    """The columns that a config can name.

    Attributes:
        graph: the team's graph, grown by a measured node for each computed column.
        recodes: the column that each recode stands for.
        coarse: the recodes that keep only a part of their column.
        inputs: for each computed column, what it is computed from.
    """

    graph: Graph
    recodes: Mapping[str, str]
    coarse: frozenset[str]
    inputs: Mapping[str, frozenset[str]]

    def node(self, name: str) -> str:
        """The node that a name of the config means."""
        return self.recodes.get(name, name)

    def nodes(self, names: Names) -> frozenset[str]:
        """The same for several."""
        return frozenset(self.node(name) for name in as_set(names))

    def bases(self, node: str) -> frozenset[str]:
        """The nodes of the team's graph that a column is made of."""
        if node not in self.inputs:
            return frozenset({node})
        return frozenset(base for each in self.inputs[node] for base in self.bases(each))

    def determined(self, known: Iterable[str]) -> frozenset[str]:
        """What is known once these are: also every column that is computed from known ones alone."""
        found = frozenset(known)
        while True:
            wider = found | {node for node, made_of in self.inputs.items() if made_of <= found}
            if wider == found:
                return found
            found = wider

    def absorbed(self, fixed_effects: Iterable[str]) -> frozenset[str]:
        """The columns, and what has one value within each value of one of them."""
        return frozenset(node for column in fixed_effects for node in self._constant_within(column))

    def _constant_within(self, column: str) -> frozenset[str]:
        within = {
            node["id"]: set(node.get("constant_within", ()))
            for node in self.graph["nodes"]
            if isinstance(node, dict)
        }
        found = frozenset({column})
        while True:
            wider = self.determined(found | {node for node, columns in within.items() if columns & found})
            if wider == found:
                return found
            found = wider

    def without_variation(self, held: frozenset[str], treatments: frozenset[str]) -> frozenset[str]:
        """The computed columns held fixed that, given the others held fixed, only the treatments make vary."""
        return frozenset(
            node
            for node in held & set(self.inputs)
            if node in self.determined(held - {node} | treatments)
            and node not in self.determined(held - {node})
        )

    def recorded(self) -> dict[str, int]:
        """When each column is recorded, where that is said."""
        nodes = [node for node in self.graph["nodes"] if isinstance(node, dict)]
        return {node["id"]: node["recorded"] for node in nodes if "recorded" in node}


def columns_of(graph: Graph, derived: Mapping[str, Mapping[str, Any]]) -> Columns:
    """What the names in a config with these derived columns mean."""
    recodes: dict[str, str] = {}
    coarse: set[str] = set()
    for name, said in derived.items():
        at, is_coarse = name, False
        while "recodes" in derived.get(at, {}):
            is_coarse |= derived[at].get("coarse", False)
            at = derived[at]["recodes"]
        if "recodes" in said:
            recodes[name] = at
            coarse |= {name} if is_coarse else set()
    computed = {name: as_set(said["from"]) for name, said in derived.items() if "from" in said}
    inputs = {
        name: frozenset(recodes.get(each, each) for each in made_of) for name, made_of in computed.items()
    }
    arrows = [{"source": each, "target": name} for name in inputs for each in sorted(inputs[name])]
    grown = {**graph, "edges": [*graph["edges"], *arrows]}
    team = Columns(grown, recodes, frozenset(coarse), inputs)
    moments = team.recorded()
    nodes = list(graph["nodes"])
    for name in inputs:
        # A computed column is recorded when the latest of its inputs is.
        known = [moments[base] for base in team.bases(name) if base in moments]
        nodes.append({"id": name, "recorded": max(known)} if known else {"id": name})
    return replace(team, graph={**grown, "nodes": nodes})
