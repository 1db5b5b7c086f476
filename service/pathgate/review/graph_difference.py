"""How does one graph differ from another, change by change, and what is the graph with only some of the changes?

A change is the smallest step that somebody makes on purpose: an edge drawn, an edge rubbed out, an arrow turned
round, an edge of another kind, a node that comes or goes with its edges, or something else said of a node. What a
column costs, notes and doubts change no verdict, and count as no difference. O(nodes + edges).
"""

from __future__ import annotations

from collections import OrderedDict
from collections.abc import Iterable, Iterator, Mapping
from collections.abc import Set as AbstractSet
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any, Literal

from pathgate.graphs.convert import edges_of
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import mask_of, members
from pathgate.graphs.reading import examine_graph

NamedEdge = tuple[str, str, str]
"""Kind, source and target; of a bidirected edge the end that comes first in the new graph's order."""

Json = dict[str, Any]

SAID_OF_NODES = ("measured", "recorded", "constant_within", "columns")
"""What counts of all that is said of a node."""

# Graphs with only some of the changes that are held at a time, and their nodes, for all configs that are asked about.
MOST_GRAPHS = 64
MOST_NODES_DRAWN = 50_000


@dataclass(frozen=True, slots=True)
class EdgeChange:
    """One edge that is not what it was: as it is now, or as it was where it is gone."""

    change: Literal["added", "removed", "turned", "kind-changed"]
    edge: NamedEdge
    was: NamedEdge | None = None


@dataclass(frozen=True, slots=True)
class NodeChange:
    """One node that came or went with its edges, or of which the ``members`` say something else."""

    change: Literal["added", "removed", "changed"]
    node: str
    members: tuple[str, ...] = ()


Change = EdgeChange | NodeChange


@dataclass(frozen=True)
class Difference:
    """All that differs between two graphs; ``old`` and ``new`` are not changed by anything here."""

    old: CausalGraph
    new: CausalGraph
    _drawn: OrderedDict[int, CausalGraph | None] = field(default_factory=OrderedDict, repr=False)

    @cached_property
    def order(self) -> dict[str, int]:
        """The places of all names: the new graph's order, then what only the old one has."""
        names = (*self.new.names, *(name for name in self.old.names if name not in self.new.index))
        return {name: place for place, name in enumerate(names)}

    @cached_property
    def added_nodes(self) -> tuple[str, ...]:
        """The nodes that only the new graph has, in its order."""
        return tuple(name for name in self.new.names if name not in self.old.index)

    @cached_property
    def removed_nodes(self) -> tuple[str, ...]:
        """The nodes that only the old graph has, in its order."""
        return tuple(name for name in self.old.names if name not in self.new.index)

    @cached_property
    def changed_nodes(self) -> tuple[NodeChange, ...]:
        """The nodes of both graphs of which something else is said, in the new graph's order."""
        before, after = self._facts_of
        found = []
        for name in self.new.names:
            if name in before:
                differing = (key for key in SAID_OF_NODES if before[name].get(key) != after[name].get(key))
                found.append(NodeChange("changed", name, tuple(differing)))
        return tuple(each for each in found if each.members)

    @cached_property
    def added_edges(self) -> tuple[NamedEdge, ...]:
        """All edges that only the new graph has, arrows first, in its order."""
        return tuple(self._sorted(self._new_edges - self._old_edges))

    @cached_property
    def removed_edges(self) -> tuple[NamedEdge, ...]:
        """All edges that only the old graph has, likewise."""
        return tuple(self._sorted(self._old_edges - self._new_edges))

    @cached_property
    def turned(self) -> tuple[EdgeChange, ...]:
        """The arrows that lead the other way round, as they are now."""
        return tuple(each for each in self._edge_changes if each.change == "turned")

    @cached_property
    def changes(self) -> tuple[Change, ...]:
        """Every change: those of edges, then those of nodes. A set of them is a mask over their places here."""
        return (
            *self._edge_changes,
            *(NodeChange("added", name) for name in self.added_nodes),
            *(NodeChange("removed", name) for name in self.removed_nodes),
            *self.changed_nodes,
        )

    @property
    def everything(self) -> int:
        """The mask of all changes."""
        return (1 << len(self.changes)) - 1

    @cached_property
    def before(self) -> CausalGraph:
        """The old graph in the new one's order, so that no tie is broken differently for that reason alone."""
        return self._known_sound(0)

    @cached_property
    def after(self) -> CausalGraph:
        """The new graph as ``graph_with`` all changes gives it."""
        return self._known_sound(self.everything)

    def _known_sound(self, chosen: int) -> CausalGraph:
        graph = self.graph_with(chosen)
        if graph is None:
            message = "a causal graph in another order is one too"
            raise AssertionError(message)
        return graph

    @cached_property
    def removals(self) -> int:
        """The mask of the edges that are only taken away."""
        return mask_of(
            place
            for place, each in enumerate(self.changes)
            if isinstance(each, EdgeChange) and each.change == "removed"
        )

    def edges_at(self, node: str) -> tuple[NamedEdge, ...]:
        """The edges with which a node came or went."""
        return self._edges_at.get(node, ())

    def graph_with(self, chosen: int) -> CausalGraph | None:
        """The old graph with some of the changes, in the new one's order; None where that is no causal graph.

        >>> old = CausalGraph.of(("rain", "delay"), ("delay", "refund"))
        >>> difference = Difference(old, CausalGraph.of(("delay", "rain"), ("refund", "delay"), ("refund", "rain")))
        >>> [each.change for each in difference.changes], difference.graph_with(0b100)
        (['turned', 'turned', 'added'], None)
        """
        if chosen in self._drawn:
            self._drawn.move_to_end(chosen)
            return self._drawn[chosen]
        examined = examine_graph(self._value(chosen))
        graph = None if examined.faults else examined.graph
        self._drawn[chosen] = graph
        if len(self._drawn) > max(2, min(MOST_GRAPHS, MOST_NODES_DRAWN // max(1, self.new.size))):
            self._drawn.popitem(last=False)
        return graph

    def _value(self, chosen: int) -> Json:
        """The node-link value of the old graph with some of the changes."""
        taken = [self.changes[place] for place in members(chosen)]
        nodes = dict.fromkeys(self.old.names)
        edges = set(self._old_edges)
        renewed = set()
        for each in taken:
            if isinstance(each, EdgeChange):
                edges -= {each.was or each.edge}
                edges |= set() if each.change == "removed" else {each.edge}
            elif each.change == "added":
                nodes[each.node] = None
                edges |= set(self.edges_at(each.node))
            elif each.change == "removed":
                del nodes[each.node]
            else:
                renewed.add(each.node)
        names = sorted(nodes, key=self.order.__getitem__)
        said = {name: self._said(name, is_renewed=name in renewed) for name in names}
        return {
            "nodes": [_node_value(name, said[name], nodes) for name in names],
            "edges": [_edge_value(edge) for edge in edges if edge[1] in nodes and edge[2] in nodes],
        }

    def _said(self, name: str, *, is_renewed: bool) -> Json:
        """What is said of a node: by the old graph unless it is new or its change is among those chosen."""
        return self._facts_of[is_renewed or name not in self.old.index][name]

    @cached_property
    def _edges_at(self) -> Mapping[str, tuple[NamedEdge, ...]]:
        found: dict[str, list[NamedEdge]] = {name: [] for name in (*self.added_nodes, *self.removed_nodes)}
        for edge in (*self.added_edges, *self.removed_edges):
            for end in edge[1:]:
                if end in found:
                    found[end].append(edge)
        return {name: tuple(edges) for name, edges in found.items()}

    @cached_property
    def _facts_of(self) -> tuple[dict[str, Json], dict[str, Json]]:
        return _facts(self.old), _facts(self.new)

    @cached_property
    def _old_edges(self) -> frozenset[NamedEdge]:
        return frozenset(self._named_edges(self.old))

    @cached_property
    def _new_edges(self) -> frozenset[NamedEdge]:
        return frozenset(self._named_edges(self.new))

    def _named_edges(self, graph: CausalGraph) -> Iterator[NamedEdge]:
        for kind, first, second in edges_of(graph):
            ends = [graph.name(first), graph.name(second)]
            if kind == "bidirected":
                ends.sort(key=self.order.__getitem__)
            yield kind, ends[0], ends[1]

    def _sorted(self, edges: Iterable[NamedEdge]) -> list[NamedEdge]:
        place = self.order
        return sorted(edges, key=lambda edge: (edge[0] != "directed", place[edge[1]], place[edge[2]]))

    @cached_property
    def _edge_changes(self) -> tuple[EdgeChange, ...]:
        """The changes of edges between nodes of both graphs, in the order of the edges as they are now."""
        both = self.old.index.keys() & self.new.index.keys()
        gone = {edge for edge in self.removed_edges if edge[1] in both and edge[2] in both}
        found = []
        for edge in self.added_edges:
            if edge[1] in both and edge[2] in both:
                change = self._change_to(edge, gone)
                gone -= {change.was}
                found.append(change)
        return (*found, *(EdgeChange("removed", edge) for edge in self._sorted(gone)))

    def _change_to(self, edge: NamedEdge, gone: AbstractSet[NamedEdge]) -> EdgeChange:
        """How an edge came to be: anew, or out of one that is gone from between the same two nodes."""
        kind, source, target = edge
        backward = ("directed", target, source)
        if kind == "bidirected":
            others = [("directed", source, target), backward]
        else:
            first, second = sorted((source, target), key=self.order.__getitem__)
            others = [backward, ("bidirected", first, second)]
        was = next((other for other in others if other in gone), None)
        if was is None:
            return EdgeChange("added", edge)
        return EdgeChange("turned" if was[0] == kind else "kind-changed", edge, was)


def _facts(graph: CausalGraph) -> dict[str, Json]:
    """What is said of each node beside its name and what it costs, in an order that lists can be compared in."""
    facts: dict[str, Json] = {
        name: {"measured": bool(graph.measured >> node & 1)} for node, name in enumerate(graph.names)
    }
    for node, moment in graph.recorded.items():
        facts[graph.name(node)]["recorded"] = moment
    for node, columns in graph.constant_within.items():
        if columns:
            facts[graph.name(node)]["constant_within"] = sorted(map(graph.name, columns))
    for alias, node in sorted(graph.aliases.items()):
        if alias != graph.name(node):
            facts[graph.name(node)].setdefault("columns", []).append(alias)
    return facts


def _node_value(name: str, said: Json, nodes: Iterable[str]) -> Json:
    if "constant_within" in said:
        said = {**said, "constant_within": [each for each in said["constant_within"] if each in nodes]}
    return {"id": name, **said}


def _edge_value(edge: NamedEdge) -> Json:
    return {"kind": edge[0], "source": edge[1], "target": edge[2]}
