"""What a causal graph is: nodes, arrows, bidirected edges, and what the team said about each.

The graph is immutable and indexed once: names become small integers at the edge, algorithms work on those
integers and on bit masks (``graphs.masks``). Neighbour lists and masks are built on first use, in O(nodes +
edges); per-node masks only for graphs small enough for them (``is_small``), since they need O(nodes²) bits.
"""

from __future__ import annotations

import graphlib
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass, field, replace
from functools import cached_property

import numpy as np

from pathgate.graphs.closures import Closures, LeafClosures
from pathgate.graphs.errors import UnknownNode
from pathgate.graphs.masks import IntArray, mask_of, members, unpack
from pathgate.graphs.names import nearest_names
from pathgate.graphs.rows import Rows

# Up to this many nodes one mask per node costs less than 128 KiB and beats arrays.
SMALL = 1024
# Up to this many nodes a mask is put together bit by bit.
_FEW = 64

Edge = tuple[str, int, int]
"""Kind (``"directed"`` or ``"bidirected"``) and the two ends; of a bidirected edge the lower index first."""


@dataclass(frozen=True, eq=False)
class CausalGraph:
    """A causal graph over named nodes; made by ``read_graph``, ``CausalGraph.of`` or ``from_networkx``.

    Attributes:
        names: the nodes' names, in the order of the input; a selection node bears the empty name.
        sources, targets: the arrows as two aligned arrays of indices, sorted by source, then target.
        lower_ends, upper_ends: the bidirected edges likewise, the lower index first.
        measured: mask of the nodes the platform holds as columns.
        costs: what using a column costs, where it is not 1.
        recorded: when a column is recorded, where that is known.
        constant_within: for a node, the columns within each of whose values it has one value.
        aliases: other names of columns.
        doubtful: the edges the team is not sure of.
        notes: what the team wrote beside an edge.
    """

    names: tuple[str, ...]
    sources: IntArray
    targets: IntArray
    lower_ends: IntArray
    upper_ends: IntArray
    measured: int
    costs: Mapping[int, float] = field(default_factory=dict)
    recorded: Mapping[int, int] = field(default_factory=dict)
    constant_within: Mapping[int, tuple[int, ...]] = field(default_factory=dict)
    aliases: Mapping[str, int] = field(default_factory=dict)
    doubtful: frozenset[Edge] = frozenset()
    notes: Mapping[Edge, str] = field(default_factory=dict)

    @classmethod
    def of(
        cls,
        *arrows: tuple[str, str],
        bidirected: Iterable[tuple[str, str]] = (),
        unmeasured: Iterable[str] = (),
        nodes: Iterable[str] = (),
    ) -> CausalGraph:
        """A graph from pairs of names; nodes come in the order in which they are first named.

        Raises:
            InvalidGraph: the pairs hold a cycle, a self-loop or a repeated edge.

        >>> CausalGraph.of(("rain", "delay"), bidirected=[("rain", "refund")]).names
        ('rain', 'delay', 'refund')
        """
        from pathgate.graphs.reading import read_graph  # noqa: PLC0415 - the reader is built on this class

        pairs = [*arrows, *bidirected]
        names = dict.fromkeys([*nodes, *(name for pair in pairs for name in pair), *unmeasured])
        hidden = set(unmeasured)
        kinds = ["directed"] * len(arrows) + ["bidirected"] * (len(pairs) - len(arrows))
        return read_graph(
            {
                "nodes": [{"id": name, "measured": name not in hidden} for name in names],
                "edges": [
                    {"source": source, "target": target, "kind": kind}
                    for (source, target), kind in zip(pairs, kinds, strict=True)
                ],
            }
        )

    @property
    def size(self) -> int:
        """Number of nodes."""
        return len(self.names)

    @property
    def everything(self) -> int:
        """The mask of all nodes."""
        return (1 << self.size) - 1

    @cached_property
    def is_small(self) -> bool:
        """Is one mask per node cheap here?"""
        return self.size <= SMALL

    @cached_property
    def index(self) -> Mapping[str, int]:
        """From name to index."""
        return {name: place for place, name in enumerate(self.names) if name}

    def node_called(self, name: str) -> int | None:
        """The node that bears this name, else the one that it is another name of; None where there is neither."""
        return self.index.get(name, self.aliases.get(name))

    def name(self, node: int) -> str:
        """The name of a node."""
        return self.names[node]

    def mask(self, names: Iterable[str]) -> int:
        """The set of the nodes that bear these names.

        Raises:
            UnknownNode: some are not in the graph; all of them are named, with the nearest known name.
        """
        index = self.index
        if isinstance(names, str) and names in index:
            return 1 << index[names]
        listed = (names,) if isinstance(names, str) else tuple(names)
        try:
            return self._mask(listed)
        except KeyError:
            unknown = [name for name in listed if name not in self.index]
            near = {name: nearest_names(name, self.names, most=1) for name in unknown}
            raise UnknownNode(unknown, {name: found[0] for name, found in near.items() if found}) from None

    def _mask(self, names: tuple[str, ...]) -> int:
        index = self.index
        if len(names) > _FEW:
            return mask_of(map(index.__getitem__, names))
        mask = 0
        for name in names:
            mask |= 1 << index[name]
        return mask

    def members(self, mask: int) -> Iterator[int]:
        """The nodes of a set, in the graph's order."""
        return members(mask)

    def names_of(self, mask: int) -> tuple[str, ...]:
        """The names of a set, in the graph's order."""
        return tuple(self.names[node] for node in members(mask))

    def cost(self, node: int) -> float:
        """What using this column costs."""
        return self.costs.get(node, 1.0)

    def has_arrow(self, source: str, target: str) -> bool:
        """Does an arrow lead from one named node to the other?"""
        return self.index[target] in self.children(self.index[source])

    def children(self, node: int) -> tuple[int, ...]:
        """Where the arrows from this node lead, in order."""
        return self.child_lists[node]

    def parents(self, node: int) -> tuple[int, ...]:
        """Where the arrows into this node come from, in order."""
        return self.parent_lists[node]

    def spouses(self, node: int) -> tuple[int, ...]:
        """The other ends of this node's bidirected edges, in order."""
        return self.spouse_lists[node]

    @cached_property
    def child_lists(self) -> tuple[tuple[int, ...], ...]:
        """For each node its children."""
        if self.is_small:
            return tuple(tuple(members(mask)) for mask in self.child_masks)
        return _grouped(self.size, self.sources, self.targets)

    @cached_property
    def parent_lists(self) -> tuple[tuple[int, ...], ...]:
        """For each node its parents."""
        if self.is_small:
            return tuple(tuple(members(mask)) for mask in self.parent_masks)
        return _grouped(self.size, self.targets, self.sources)

    @cached_property
    def spouse_lists(self) -> tuple[tuple[int, ...], ...]:
        """For each node the other ends of its bidirected edges."""
        if self.is_small:
            return tuple(tuple(members(mask)) for mask in self.spouse_masks)
        ends = np.concatenate([self.lower_ends, self.upper_ends])
        others = np.concatenate([self.upper_ends, self.lower_ends])
        order = np.lexsort((others, ends))
        return _grouped(self.size, ends[order], others[order])

    @cached_property
    def neighbour_lists(self) -> tuple[tuple[int, ...], ...]:
        """For each node all nodes that an edge joins to it, each once, in order."""
        lists = zip(self.parent_lists, self.child_lists, self.spouse_lists, strict=True)
        return tuple(tuple(sorted({*above, *below, *beside})) for above, below, beside in lists)

    @cached_property
    def child_masks(self) -> list[int]:
        """For each node the set of its children (small graphs only)."""
        return _masks(self.size, self.sources, self.targets)

    @cached_property
    def parent_masks(self) -> list[int]:
        """For each node the set of its parents (small graphs only)."""
        return _masks(self.size, self.targets, self.sources)

    @cached_property
    def spouse_masks(self) -> list[int]:
        """For each node the set at the other ends of its bidirected edges (small graphs only)."""
        upward = _masks(self.size, self.lower_ends, self.upper_ends)
        downward = _masks(self.size, self.upper_ends, self.lower_ends)
        return [up | down for up, down in zip(upward, downward, strict=True)]

    @cached_property
    def ancestor_closures(self) -> Closures:
        """What leads into sets of nodes (small graphs only)."""
        return Closures(self.parent_masks)

    @cached_property
    def descendant_closures(self) -> Closures:
        """What sets of nodes lead to (small graphs only)."""
        return Closures(self.child_masks)

    @cached_property
    def child_rows(self) -> Rows:
        """The arrows as compressed rows, from node to children."""
        return Rows.of(self.size, self.sources, self.targets)

    @cached_property
    def parent_rows(self) -> Rows:
        """The arrows as compressed rows, from node to parents."""
        order = np.argsort(self.targets)
        return Rows.of(self.size, self.targets[order], self.sources[order])

    @cached_property
    def topological_order(self) -> tuple[int, ...]:
        """All nodes, parents before children."""
        return tuple(graphlib.TopologicalSorter(dict(enumerate(self.parent_lists))).static_order())

    def without_edges(self) -> CausalGraph:
        """The same nodes, and nothing that joins them."""
        none = self.sources[:0]
        return replace(self, sources=none, targets=none, lower_ends=none, upper_ends=none)

    def without_arrows(self, sources: int, targets: int) -> CausalGraph:
        """The same graph less every arrow from a node of one set into a node of the other."""
        dropped = unpack(sources, self.size)[self.sources] & unpack(targets, self.size)[self.targets]
        if not dropped.any():
            return self
        lesser = replace(self, sources=self.sources[~dropped], targets=self.targets[~dropped])
        if self.is_small:
            # Few masks differ: cheaper to change a copy than to make all of them anew.
            children, parents = self.child_masks.copy(), self.parent_masks.copy()
            for node in members(sources):
                children[node] &= ~targets
            for node in members(targets):
                parents[node] &= ~sources
            vars(lesser).update(child_masks=children, parent_masks=parents, spouse_masks=self.spouse_masks)
        return lesser

    def without_edge(self, edge: Edge) -> CausalGraph:
        """The same graph less one edge."""
        kind, first, second = edge
        if kind == "directed":
            kept = (self.sources != first) | (self.targets != second)
            return replace(self, sources=self.sources[kept], targets=self.targets[kept])
        kept = (self.lower_ends != min(first, second)) | (self.upper_ends != max(first, second))
        return replace(self, lower_ends=self.lower_ends[kept], upper_ends=self.upper_ends[kept])

    def with_arrow_turned(self, source: int, target: int) -> CausalGraph:
        """The same graph with one of its arrows the other way round; whether that makes a cycle is not looked at."""
        kept = (self.sources != source) | (self.targets != target)
        sources, targets = np.append(self.sources[kept], target), np.append(self.targets[kept], source)
        order = np.lexsort((targets, sources))
        turned = replace(self, sources=sources[order], targets=targets[order])
        if self.is_small:
            # Four masks differ: cheaper to change a copy than to make all of them anew.
            children, parents = self.child_masks.copy(), self.parent_masks.copy()
            children[source] ^= 1 << target
            parents[target] ^= 1 << source
            children[target] |= 1 << source
            parents[source] |= 1 << target
            vars(turned).update(child_masks=children, parent_masks=parents, spouse_masks=self.spouse_masks)
        return turned

    def with_leaves(self, parents: Iterable[int]) -> CausalGraph:
        """The same graph with one more unmeasured, nameless node for each set of parents, at the end."""
        sets = list(parents)
        if not sets:
            return self
        pairs = [(source, self.size + k) for k, mask in enumerate(sets) for source in members(mask)]
        added = np.array(pairs, dtype=np.int64).reshape(-1, 2)
        sources = np.concatenate([self.sources, added[:, 0]])
        targets = np.concatenate([self.targets, added[:, 1]])
        order = np.lexsort((targets, sources))
        names = self.names + ("",) * len(sets)
        grown = replace(self, names=names, sources=sources[order], targets=targets[order])
        if grown.is_small and not any(mask >> self.size for mask in sets):
            vars(grown).update(self._with_leaf_masks(sets))
        return grown

    def _with_leaf_masks(self, sets: list[int]) -> dict[str, object]:
        """What is known of this graph, carried over to the one with leaves: cheaper than to make it anew."""
        children = [*self.child_masks, *(0 for _ in sets)]
        for place, parents in enumerate(sets):
            for node in members(parents):
                children[node] |= 1 << self.size + place
        return {
            "child_masks": children,
            "parent_masks": [*self.parent_masks, *sets],
            "spouse_masks": [*self.spouse_masks, *(0 for _ in sets)],
            "ancestor_closures": LeafClosures(self.ancestor_closures, self.size, sets, upward=True),
            "descendant_closures": LeafClosures(self.descendant_closures, self.size, sets, upward=False),
        }

    def with_columns(self, columns: Iterable[tuple[str, int]], aliases: Mapping[str, int]) -> CausalGraph:
        """The same graph with further columns at the end, each with its name and its parents, and further aliases.

        Parents may be columns added before. A column is recorded when the latest of its parents is.

        >>> graph = CausalGraph.of(("rain", "delay")).with_columns([("score", 0b11)], {"mm": 0})
        >>> graph.names, graph.has_arrow("delay", "score"), dict(graph.aliases)
        (('rain', 'delay', 'score'), True, {'mm': 0})
        """
        named = list(columns)
        grown = self.with_leaves(parents for _name, parents in named)
        recorded = dict(self.recorded)
        for node, (_name, parents) in enumerate(named, start=self.size):
            moments = [recorded[parent] for parent in members(parents) if parent in recorded]
            if moments:
                recorded[node] = max(moments)
        return replace(
            grown,
            names=self.names + tuple(name for name, _parents in named),
            measured=self.measured | ((1 << len(named)) - 1) << self.size,
            recorded=recorded,
            aliases={**self.aliases, **aliases},
        )


def _masks(size: int, keys: IntArray, values: IntArray) -> list[int]:
    masks = [0] * size
    for key, value in zip(keys.tolist(), values.tolist(), strict=True):
        masks[key] |= 1 << value
    return masks


def _grouped(size: int, keys: IntArray, values: IntArray) -> tuple[tuple[int, ...], ...]:
    groups: list[list[int]] = [[] for _ in range(size)]
    for key, value in zip(keys.tolist(), values.tolist(), strict=True):
        groups[key].append(value)
    return tuple(map(tuple, groups))
