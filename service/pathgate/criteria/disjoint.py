"""The fewest nodes that part two sets of a small augmented graph, by paths that share no choosable node.

Menger's theorem (1927) with augmenting paths (Ford & Fulkerson 1956) over bit masks. A choosable node lets one
path through; connected nodes that no cut may take are passed in one step. What lies beside the far end is known
before a search sets out, so most paths are found after few steps. O(answer · nodes) mask operations.
"""

from __future__ import annotations

from dataclasses import dataclass, field

from pathgate.criteria.hubs import Cliques
from pathgate.graphs.masks import members

# Stand for x and y where a path begins and ends.
_X, _Y = -1, -2


def fewest_nodes_between(cliques: Cliques, xs: int, ys: int, choosable: int, removed: int) -> int | None:
    """The smallest set of choosable nodes without which nothing leads from x to y, nearest to x.

    Something must lead from x to y as it is; else the answer means nothing.

    Args:
        cliques: the augmented graph.
        xs, ys: what is to be parted.
        choosable: the nodes that the set may hold; neither x nor y.
        removed: nodes that are gone already.

    Returns:
        The set, or None where choosable nodes cannot part the two.
    """
    ground = _Ground(cliques, cliques.relevant & ~(choosable | removed | xs | ys))
    near_x, near_y = ground.beside(xs), ground.beside(ys)
    if near_x & ys:
        return None
    near_x &= choosable & ~removed
    near_y &= choosable & ~removed
    # A node next to both is a way through by itself: every such set holds it.
    inevitable = near_x & near_y
    near_x ^= inevitable
    near_y ^= inevitable
    if not near_x or not near_y:
        return inevitable
    if not inevitable and near_x & (near_x - 1) == 0:
        return near_x
    paths = _Paths(ground, near_x, near_y, xs | ys | removed | inevitable)
    paths.take_short_ones()
    # As many paths as nodes nearest to x: these are the smallest set, and no other is as near.
    while paths.count < near_x.bit_count():
        last = paths.search()
        if last is None:
            return inevitable | (paths.entered & ~paths.left & choosable)
        paths.reroute(last)
    return inevitable | near_x


@dataclass(slots=True)
class _Ground:
    """The augmented graph with its fixed nodes, which neither end a path nor are taken by a cut.

    Attributes:
        cliques: the augmented graph.
        fixed: these nodes; paths pass a connected piece of them in one step.
        pieces: for the fixed nodes met so far (as masks) their piece with everything beside it.
    """

    cliques: Cliques
    fixed: int
    pieces: dict[int, int] = field(default_factory=dict)

    def beside(self, nodes: int) -> int:
        """What one step leads to from some nodes, these included."""
        cliques = self.cliques
        children, relevant, known = cliques.graph.child_masks, cliques.relevant, cliques.known
        near = 0
        while nodes:
            lowest = nodes & -nodes
            nodes ^= lowest
            # As ``Cliques.next_to`` does it, put on the spot for its speed.
            heads = children[lowest.bit_length() - 1] & relevant | lowest
            near |= known.get(heads) or cliques.look_at(heads, 0)[0]
        return near | self.past(near & self.fixed) if near & self.fixed else near

    def past(self, fixed: int) -> int:
        """The pieces of some fixed nodes with everything beside them."""
        found = 0
        while fixed:
            lowest = fixed & -fixed
            if lowest not in self.pieces:
                reached, stopped = self.cliques.spread(lowest, ~self.fixed)
                self.pieces.update(dict.fromkeys((1 << node for node in members(reached)), reached | stopped))
            found |= self.pieces[lowest]
            fixed &= ~found
        return found


@dataclass(slots=True)
class _Paths:
    """Paths from x to y no two of which share a choosable node, and what the last search for one more reached.

    Attributes:
        ground: what they lead through.
        next_to_x, next_to_y: where they can begin and end.
        closed: nodes that no path may enter.
        count: how many there are.
        before, after: for each node on a path the choosable node before and after it there.
        passed: the nodes on paths.
        entered, left: the nodes whose entry and whose exit the last search reached.
        steps: each node whose exit it followed, with the nodes that it entered from there.
        exit_from: for each node on a path that was left, the next on it, the way to which was taken back.
    """

    ground: _Ground
    next_to_x: int
    next_to_y: int
    closed: int
    count: int = 0
    before: dict[int, int] = field(default_factory=dict)
    after: dict[int, int] = field(default_factory=dict)
    passed: int = 0
    entered: int = field(init=False)
    left: int = field(init=False)
    steps: list[tuple[int, int]] = field(init=False)
    exit_from: dict[int, int] = field(init=False)

    def take_short_ones(self) -> None:
        """Begin with paths of two and three nodes, which need no search; later ones reroute what is in the way."""
        beside, ends, starts = self.ground.beside, self.next_to_y, self.next_to_x
        waiting: list[tuple[int, int]] = []
        while starts:
            first = starts & -starts
            starts ^= first
            near = beside(first)
            found = near & ends
            if found:
                ends ^= found & -found
                self._take(first, found & -found)
            else:
                waiting.append((first, near))
        between = beside(ends) & ~(self.closed | self.ground.fixed | self.next_to_x)
        for first, near in waiting:
            middle = near & between & ~self.passed
            while middle and ends:
                found = beside(middle & -middle) & ends
                if found:
                    ends ^= found & -found
                    self._take(first, middle & -middle, found & -found)
                    break
                middle &= middle - 1

    def _take(self, *path: int) -> None:
        """Add a path, given by masks, that no other is in the way of."""
        previous = _X
        for mask in path:
            node = mask.bit_length() - 1
            self.before[node] = previous
            self.after[previous] = node
            self.passed |= mask
            previous = node
        self.after[previous] = _Y
        del self.after[_X]
        self.count += 1

    def search(self) -> int | None:
        """Look for one more path; the last choosable node on it, or None where there is none."""
        cliques, fixed, passed = self.ground.cliques, self.ground.fixed, self.passed
        children, relevant, known = cliques.graph.child_masks, cliques.relevant, cliques.known
        ends = self.next_to_y & ~passed
        goals = (self.ground.beside(ends) | ends) & ~passed
        steps: list[tuple[int, int]] = []
        self.steps, self.exit_from = steps, {}
        origin, new = _X, self.next_to_x
        unentered, left, leaving, opened = relevant & ~self.closed, 0, 0, 0
        while True:
            unentered ^= new
            steps.append((origin, new))
            occupied = new & passed
            new ^= occupied | new & fixed
            if occupied:
                new |= self._taken_back(occupied, left | new)
            left |= new
            leaving |= new
            if new & goals:
                return self._arrive(new & goals, ends)
            new = 0
            while leaving and unentered and not new:
                lowest = leaving & -leaving
                leaving ^= lowest
                origin = lowest.bit_length() - 1
                heads = children[origin] & relevant | lowest
                near = known.get(heads)
                if near is None:
                    near, opened = cliques.look_at(heads, opened)
                new = near & unentered
            if not new:
                self.entered, self.left = relevant & ~unentered, left
                return None
            if new & fixed:
                new = (new | self.ground.past(new & fixed)) & unentered

    def _taken_back(self, occupied: int, left: int) -> int:
        """The exits reached for the first time by entering nodes on paths.

        Such a node lets no other path through, but the path's way to it can be taken back: that leads to the
        exit of the node before it.
        """
        reached = 0
        while occupied:
            lowest = occupied & -occupied
            occupied ^= lowest
            node = lowest.bit_length() - 1
            beyond = self.before[node]
            if beyond != _X and not (left | reached) >> beyond & 1:
                self.exit_from[beyond] = node
                reached |= 1 << beyond
        return reached

    def _arrive(self, arrived: int, ends: int) -> int:
        """Go the last step, where there is one, from one of the nodes that lie beside the ends of paths."""
        at_end = arrived & ends
        if not at_end:
            node = (arrived & -arrived).bit_length() - 1
            at_end = self.ground.beside(1 << node) & ends
            at_end &= -at_end
            self.steps.append((node, at_end))
        return (at_end & -at_end).bit_length() - 1

    def reroute(self, last: int) -> None:
        """Put the path that was found into the others: steps taken back go first, then the new ones come."""
        before, after = self.before, self.after
        added = [(last, _Y)]
        node = last
        while node != _X:
            entered = self.exit_from.get(node, node)
            if entered != node:
                # The exit was reached by taking back the step from this node to the one entered.
                del after[node], before[entered]
            node = self._origin(entered)
            if node != entered:
                added.append((node, entered))
            else:
                # Entered from its own exit: both its steps are taken back.
                self.passed ^= 1 << node
        for first, second in added:
            if second != _Y:
                before[second] = first
            if first != _X:
                after[first] = second
                self.passed |= 1 << first
        self.count += 1

    def _origin(self, entered: int) -> int:
        """The node from whose exit the last search entered another."""
        for origin, new in self.steps:
            if new >> entered & 1:
                return origin
        message = "a node on the way found was not entered"
        raise AssertionError(message)
