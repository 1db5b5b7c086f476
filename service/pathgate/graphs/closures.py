"""Everything that arrows lead to from a set of nodes, over one mask of next nodes for each node.

The first few questions about a graph are searched for by spreading a mask. A graph that is asked about more
often than that, as one that is served is, notes what each node leads to, so that a question becomes a few
unions. O(nodes + edges) operations on masks either way; the notes take nodes² bits at most.
"""

from __future__ import annotations

from collections.abc import Sequence

# Noting costs several searches: a graph made for one or two questions is better off without.
_PATIENCE = 2


class Closures:
    """Answers for one direction of one graph; notes are only ever added, each always the same.

    >>> leads_to = Closures([0b010, 0b100, 0b000])
    >>> bin(leads_to.reached(0b001)), bin(leads_to.reached(0b001, avoiding=0b010))
    ('0b111', '0b1')
    """

    __slots__ = ("_asked", "_known", "_next")

    def __init__(self, next_nodes: Sequence[int]) -> None:
        self._next = next_nodes
        self._asked = 0
        # Zero where not known yet: every node leads to itself.
        self._known = [0] * len(next_nodes)

    def reached(self, nodes: int, avoiding: int = 0) -> int:
        """``nodes`` and all they lead to by ways that enter nothing to be avoided."""
        if self._asked < _PATIENCE:
            self._asked += 1
            return self._spread(nodes, avoiding)
        found, rest = 0, nodes
        while rest:
            node = rest.bit_length() - 1
            found |= self._known[node] or self._note(node)
            rest &= ~found
        return self._spread(nodes, avoiding) if found & avoiding & ~nodes else found

    def _spread(self, nodes: int, avoiding: int) -> int:
        next_nodes, found, frontier = self._next, nodes | avoiding, nodes
        while frontier:
            node = frontier.bit_length() - 1
            new = next_nodes[node] & ~found
            found |= new
            frontier = frontier ^ 1 << node | new
        return found & ~avoiding | nodes

    def _note(self, node: int) -> int:
        """What a node leads to, noted for it and for all nodes on the way; deepest first, without recursion.

        On a cycle nothing is noted: what its nodes lead to is searched for each time.
        """
        start, next_nodes, known = node, self._next, self._known
        # Of each node being worked out: what it leads to as far as known, and the next nodes still to be added.
        waiting = [(node, 1 << node, next_nodes[node])]
        begun = 1 << node
        while waiting:
            node, found, rest = waiting.pop()
            while rest:
                below = rest.bit_length() - 1
                if not known[below]:
                    if begun >> below & 1:
                        return self._spread(1 << start, 0)
                    begun |= 1 << below
                    waiting += (node, found, rest), (below, 1 << below, next_nodes[below])
                    break
                found |= known[below]
                rest &= ~known[below]
            else:
                known[node] = found
        return known[node]


class LeafClosures:
    """The same for a graph with leaves added: answered by the closures of the graph without them.

    >>> grown = LeafClosures(Closures([0b10, 0b00]), 2, [0b10], upward=False)
    >>> bin(grown.reached(0b001))
    '0b111'
    """

    __slots__ = ("_below", "_inside", "_leaves", "_upward")

    def __init__(
        self, inside: Closures | LeafClosures, size: int, parents: Sequence[int], *, upward: bool
    ) -> None:
        self._inside = inside
        self._leaves = [(1 << size + place, mask) for place, mask in enumerate(parents)]
        self._below = (1 << size) - 1
        self._upward = upward

    def reached(self, nodes: int, avoiding: int = 0) -> int:
        """``nodes`` and all they lead to by ways that enter nothing to be avoided."""
        starts = nodes & self._below
        if self._upward:
            for leaf, parents in self._leaves:
                if nodes & leaf:
                    starts |= parents & ~avoiding
            return self._inside.reached(starts, avoiding & self._below) | nodes
        found = self._inside.reached(starts, avoiding & self._below)
        met = nodes
        for leaf, parents in self._leaves:
            if parents & found and not avoiding & leaf:
                met |= leaf
        return found | met
