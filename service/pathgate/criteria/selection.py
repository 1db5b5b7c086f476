"""What keeping rows does to a graph.

A condition on which rows are kept is a *part*; each part becomes a node of its own, a child of the columns
it reads, that is conditioned on (selection nodes: Bareinboim & Pearl 2012). A part that fixes one column at
one value conditions on that column itself. So a filter that merely narrows a column never blocks a path
through it. O(nodes + edges).
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, field

from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import mask_of, members


@dataclass(frozen=True, slots=True, eq=False)
class Part:
    """One condition on the rows; two that read the same are still two (and what was written may be unhashable).

    Attributes:
        columns: mask of the nodes it reads.
        fixed: does it hold its one column at one value?
        written: the part as its writer put it, shown wherever the part is meant.
    """

    columns: int
    fixed: bool
    written: object


Label = str | Part
"""How an answer names a node: by its name, or for a selection node by its part."""


@dataclass(frozen=True)
class Kept:
    """A graph together with the rows kept from it.

    Attributes:
        graph: the graph with a selection node for each part that does not fix a column.
        conditioned: mask of what keeping rows conditions on: selection nodes and fixed columns.
        parts: all parts, in order.
        part_of: for each conditioned node the part it stands for.
    """

    graph: CausalGraph
    conditioned: int = 0
    parts: tuple[Part, ...] = ()
    part_of: dict[int, Part] = field(default_factory=dict)

    def label(self, node: int) -> Label:
        """The node's name, or the part that a selection node stands for."""
        return self.graph.names[node] or self.part_of[node]


def keep_rows(graph: CausalGraph, parts: Iterable[Part] = ()) -> Kept:
    """The graph as it is seen through the rows that all the parts keep.

    >>> from pathgate.graphs.masks import members
    >>> graph = CausalGraph.of(("rain", "delay"))
    >>> kept = keep_rows(graph, [Part(graph.mask(["delay"]), fixed=False, written=["delay"])])
    >>> kept.graph.size, [kept.label(node).written for node in members(kept.conditioned)]
    (3, [['delay']])
    """
    listed = tuple(parts)
    widening = [part for part in listed if not part.fixed]
    extended = graph.with_leaves(part.columns for part in widening)
    part_of = {graph.size + place: part for place, part in enumerate(widening)}
    for part in listed:
        if part.fixed:
            part_of[part.columns.bit_length() - 1] = part
    return Kept(extended, mask_of(part_of), listed, part_of)


def fixed_by(parts: Iterable[Part]) -> int:
    """The columns that some of these parts hold at one value."""
    return mask_of(node for part in parts if part.fixed for node in members(part.columns))
