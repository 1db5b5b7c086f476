"""Which promised independency would an edge between two columns break, so that data could show the edge?

That of the two themselves, where both are measured, vary among the rows kept, and are separated there by some set
of columns: an edge breaks it whatever is given. It is told as the basis states it for the rows kept. Whether a pair
can be separated is seen at once where not even a path with every collider open joins the two; the rest is asked
pair by pair, or for very many partners of a node at once (``separable``).

A column that is computed from others is settled once they are given, and a statement about it then holds whatever
the graph: so one of them is left out, where the pair can be separated without it.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from functools import cached_property

from pathgate.criteria.deadline import Deadline
from pathgate.criteria.determined import determined_by, made_of
from pathgate.criteria.independencies import Independency, basis
from pathgate.criteria.reachability import Conditions, connected
from pathgate.criteria.selection import Kept, keep_rows
from pathgate.criteria.separable import Pairs, is_fully_measured
from pathgate.criteria.verdict import are_separated
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.kinship import ancestors
from pathgate.graphs.masks import mask_of, members

# More partners of a node than these are cheaper to ask about all at once.
FEW = 8


@dataclass(frozen=True)
class Exposing:
    """The promised independencies of the pairs of a small graph, as they are asked for.

    Attributes:
        graph: the graph that promises them.
        deadline: when to stop.
        hubs: nodes that many pairs have in common; these are asked about from there.
        kept: the same graph as it is seen through the rows kept, where rows are left out.
        inputs: for each computed column the mask of what it is computed from, inputs before what uses them.

    >>> from pathgate.criteria.selection import Part
    >>> graph = CausalGraph.of(("rain", "ticket"), ("promotion", "ticket"))
    >>> kept = keep_rows(graph, [Part(graph.mask("ticket"), fixed=False, written="ticket")])
    >>> exposing = Exposing(graph, Deadline.never()), Exposing(graph, Deadline.never(), kept=kept)
    >>> [each.statements(0, graph.mask("promotion"))[2] for each in exposing]
    [Independency(x=0, y=4, given=0), None]
    """

    graph: CausalGraph
    deadline: Deadline
    hubs: int = 0
    kept: Kept | None = None
    inputs: Mapping[int, int] = field(default_factory=dict)
    _joined: dict[int, int] = field(default_factory=dict, repr=False)
    _above: dict[int, int] = field(default_factory=dict, repr=False)
    _separable: dict[int, tuple[int, int]] = field(default_factory=dict, repr=False)

    def above(self, node: int) -> int:
        """A node and its ancestors."""
        found = self._above.get(node)
        if found is None:
            found = self._above[node] = ancestors(self.graph, 1 << node)
        return found

    def statements(self, node: int, others: int) -> dict[int, Independency | None]:
        """For each of some other nodes the statement about it and ``node``; None where there is none.

        Raises:
            OutOfTime: the deadline came first.
        """
        separable = self._separable_from(node, others)
        return {
            other: self._statement(node, other) if separable >> other & 1 else None
            for other in members(others)
        }

    def _statement(self, node: int, other: int) -> Independency | None:
        first, second = (node, other) if node < other else (other, node)
        stated = basis(self._pairs, first, second)
        ends = 1 << first | 1 << second
        return self._unsettled(first, second) if self._settled(stated.given) & ends else stated

    def _settled(self, given: int) -> int:
        """What has one value once these columns are given on the rows kept."""
        return determined_by(given | self._pairs.kept.conditioned, self.inputs)

    def _unsettled(self, first: int, second: int) -> Independency | None:
        """A statement about two separable columns, one of them computed, under which both still vary."""
        kept, widest = self._pairs.kept, self._pairs.widest(first, second)
        ends = 1 << first | 1 << second
        for left_out in self._left_out(ends & mask_of(self.inputs)):
            self.deadline.poll()
            given = widest & ~left_out
            if self._settled(given) & ends:
                continue
            if are_separated(kept.graph, 1 << first, 1 << second, given | kept.conditioned):
                return Independency(first, 1 << second, given)
        return None

    def _left_out(self, computed: int) -> Iterator[int]:
        """For each column that some computed ones come from: it and whatever is computed from it."""
        for source in members(made_of(computed, self.inputs) & ~mask_of(self.inputs)):
            left_out = 1 << source
            for node, needed in self.inputs.items():
                if needed & left_out:
                    left_out |= 1 << node
            yield left_out

    def _separable_from(self, node: int, others: int) -> int:
        """Which of these can be separated from ``node`` by columns? What is found is remembered."""
        columns = self._pairs.columns
        if not columns >> node & 1:
            return 0
        asked = others & columns
        known, separable = self._separable.get(node, (0, 0))
        if asked & ~known:
            separable |= self._found_separable(node, asked & ~known)
            self._separable[node] = known | asked, separable
        return separable & asked

    def _found_separable(self, node: int, asked: int) -> int:
        graph = self.graph
        asked &= ~(graph.child_masks[node] | graph.parent_masks[node] | graph.spouse_masks[node])
        doubted = self._doubted(node, asked)
        if self._is_fully_measured:
            # Nothing unmeasured lies on a path, so that every doubt is right.
            return asked & ~doubted
        separable = asked & ~doubted
        later = doubted >> node << node
        if later.bit_count() > FEW:
            separable |= self._pairs.separable(node, self.deadline) & later
            doubted &= ~later
        kept = self._pairs.kept
        for other in members(doubted):
            self.deadline.poll()
            given = self._pairs.widest(node, other) | kept.conditioned
            if are_separated(kept.graph, 1 << node, 1 << other, given):
                separable |= 1 << other
        return separable

    def _doubted(self, node: int, asked: int) -> int:
        """The nodes asked about that may be inseparable from this one."""
        if self._is_fully_measured and not self._pairs.kept.conditioned:
            return 0
        others = asked & ~self.hubs
        doubted = others and others & self._joined_to(node)
        for hub in members(asked & self.hubs):
            if self._joined_to(hub) >> node & 1:
                doubted |= 1 << hub
        return doubted

    def _joined_to(self, node: int) -> int:
        """What a path joins to the node on which only colliders are columns; without one nothing is inseparable."""
        if node not in self._joined:
            kept = self._pairs.kept
            hopeful = Conditions(kept.graph.measured & ~(1 << node), self._opening)
            self._joined[node] = connected(kept.graph, 1 << node, hopeful)
        return self._joined[node]

    @cached_property
    def _opening(self) -> int:
        """Where a collider may be open for a pair: above it, or above what is conditioned on."""
        kept = self._pairs.kept
        # Without anything unmeasured a collider above an end closes a cycle.
        return ancestors(kept.graph, kept.conditioned) if self._is_fully_measured else kept.graph.everything

    @cached_property
    def _pairs(self) -> Pairs:
        return Pairs(self.kept or keep_rows(self.graph))

    @cached_property
    def _is_fully_measured(self) -> bool:
        return is_fully_measured(self.graph)
