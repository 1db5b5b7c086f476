"""The fewest nodes that part two sets of a small augmented graph, by paths that share no choosable node.

Menger's theorem (1927) with augmenting paths (Ford & Fulkerson 1956) over bit masks. A search goes from clique
to clique (``hubs``) and opens each once; a choosable node lets one path through, every other node any number.
O(answer · nodes) mask operations.
"""

from __future__ import annotations

from dataclasses import dataclass, field

from pathgate.criteria.hubs import Cliques
from pathgate.graphs.masks import mask_of, members

# Stand for x and y where a path begins and ends.
_X, _Y = -1, -2


def fewest_nodes_between(cliques: Cliques, xs: int, ys: int, choosable: int, removed: int) -> int | None:
    """The smallest set of choosable nodes without which nothing leads from x to y, nearest to x.

    Args:
        cliques: the augmented graph.
        xs, ys: what is to be parted.
        choosable: the nodes that the set may hold; neither x nor y.
        removed: nodes that are gone already.

    Returns:
        The set, or None where choosable nodes cannot part the two.
    """
    # A node next to both is a way through by itself: every such set holds it.
    near_x, near_y = (cliques.around(side) & choosable & ~removed for side in (xs, ys))
    inevitable = near_x & near_y
    paths = _Paths(cliques, xs, ys, choosable & ~inevitable, removed | inevitable, near_y & ~inevitable)
    paths.take_short_ones(near_x & ~inevitable)
    # Where what is nearest to x is no larger than the ways found, it is a smallest set already.
    if not cliques.around(xs) & ~(choosable | removed | xs):
        _reached, stopped = cliques.spread(ys, near_x | removed)
        nearest = stopped & ~removed
        if nearest.bit_count() == inevitable.bit_count() + len(paths.after) // 2:
            return nearest
    while (last := paths.search()) is not None:
        if last == _X:
            return None
        paths.reroute(last)
    return inevitable | (paths.entered & ~paths.left & choosable)


@dataclass(slots=True)
class _Paths:
    """Paths from x to y no two of which share a choosable node, and what the last search for one more reached.

    Attributes:
        next_to_y: the choosable nodes that share a clique with y.
        before, after: for each node on a path the choosable node before and after it there.
        passed: the nodes on paths.
        entered, left: the nodes whose entry and whose exit the last search reached.
        entry_from: for each choosable node entered, the one whose exit led there.
        exit_from: for each node left, the node entered that led there: itself, or the next on a path taken back.
    """

    cliques: Cliques
    xs: int
    ys: int
    choosable: int
    removed: int
    next_to_y: int
    before: dict[int, int] = field(default_factory=dict)
    after: dict[int, int] = field(default_factory=dict)
    passed: int = 0
    entered: int = 0
    left: int = 0
    entry_from: dict[int, int] = field(default_factory=dict)
    exit_from: dict[int, int] = field(default_factory=dict)

    def take_short_ones(self, next_to_x: int) -> None:
        """Begin with paths of two nodes, which need no search; later ones reroute them where they are in the way."""
        for first in members(next_to_x):
            _cliques, near = self.cliques.next_to(first, 0)
            ends = near & self.next_to_y & ~self.passed
            if ends and not self.passed >> first & 1:
                last = (ends & -ends).bit_length() - 1
                self.before.update({first: _X, last: first})
                self.after.update({first: last, last: _Y})
                self.passed |= 1 << first | 1 << last

    def search(self) -> int | None:
        """Look for one more path; the last choosable node on it (``_X`` for none), or None where there is none."""
        self.entry_from, self.exit_from = {}, {}
        self.left = opened = 0
        entered, leaving = self.xs | self.removed, self.xs
        # Who led to a node that lets any number of paths through: the last choosable one before it.
        led_to = dict.fromkeys(members(self.xs), _X)
        while leaving:
            lowest = leaving & -leaving
            leaving ^= lowest
            node = lowest.bit_length() - 1
            origin = led_to.get(node, node)
            new_cliques, new = self.cliques.next_to(node, opened)
            opened |= new_cliques
            new &= ~entered
            entered |= new
            if new & self.ys:
                return origin
            fixed = new & ~self.choosable
            leaving |= fixed
            while fixed:
                led_to[(fixed & -fixed).bit_length() - 1] = origin
                fixed &= fixed - 1
            leaving |= self._enter(new & self.choosable, origin)
            arrived = self.left & self.next_to_y & ~self.passed
            if arrived:
                return (arrived & -arrived).bit_length() - 1
        self.entered = entered
        return None

    def _enter(self, nodes: int, origin: int) -> int:
        """Enter choosable nodes for the first time; returns those whose exits that reaches for the first time.

        A free node is passed. A node on a path lets no other through, but the path's way to it can be taken
        back: that leads to the exit of the node before it.
        """
        reached = 0
        while nodes:
            lowest = nodes & -nodes
            nodes ^= lowest
            node = lowest.bit_length() - 1
            self.entry_from[node] = origin
            beyond = self.before.get(node, node)
            if beyond != _X and not self.left >> beyond & 1:
                self.left |= 1 << beyond
                self.exit_from[beyond] = node
                reached |= 1 << beyond
        return reached

    def reroute(self, last: int) -> None:
        """Put the path that was found into the others: steps taken back go first, then the new ones come."""
        added = [(last, _Y)]
        node = last
        while node != _X:
            entered = self.exit_from[node]
            if entered != node:
                # The exit was reached by taking back the step from this node to the one entered.
                del self.after[node], self.before[entered]
            node = self.entry_from[entered]
            if node != entered:
                added.append((node, entered))
        for first, second in added:
            self.after[first] = second
            self.before[second] = first
        self.after.pop(_X, None)
        self.before.pop(_Y, None)
        self.passed = mask_of(self.before)
