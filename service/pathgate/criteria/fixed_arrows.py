"""Which arrows that independencies leave open does the time of recording fix?

An arrow between columns recorded at different times cannot be turned round. Such arrows force others: Meek's
rules, closed under his rule for background knowledge (Meek 1995, rules 1, 2 and 4), find all that are the same
in every equivalent DAG with these arrows. His rule 3 never adds one here: it asks for two fixed arrows into a
node from nodes that are not adjacent, and no two reversible arrows form such a collider. At worst O(edges ·
largest number of neighbours²); nothing to do where no times are known.
"""

from __future__ import annotations

from collections.abc import Sequence

from pathgate.criteria.deadline import Deadline
from pathgate.graphs.graph import CausalGraph


def sources_fixed_by_time(
    graph: CausalGraph, reversible: Sequence[frozenset[int]], deadline: Deadline
) -> Sequence[set[int]]:
    """For each node the sources of those of its reversible arrows that times fix.

    Args:
        graph: a DAG with no arrow back in time.
        reversible: for each node the sources of the arrows into it that independencies leave open.
        deadline: polled at every arrow that is fixed.

    Raises:
        OutOfTime: the deadline came first.
    """
    closure = _Closure(reversible)
    times = graph.recorded
    if len(set(times.values())) > 1:
        for target, sources in enumerate(reversible):
            for source in sources if target in times else ():
                if times.get(source, times[target]) != times[target]:
                    closure.fix(source, target)
        closure.close(deadline)
    return closure.fixed_parents


class _Closure:
    """The reversible arrows, those still open and those fixed; ``fix`` takes one from open to fixed."""

    def __init__(self, reversible: Sequence[frozenset[int]]) -> None:
        self.adjacent: list[set[int]] = [set(sources) for sources in reversible]
        for target, sources in enumerate(reversible):
            for source in sources:
                self.adjacent[source].add(target)
        self.open = [set(each) for each in self.adjacent]
        self.fixed_parents: list[set[int]] = [set() for _ in reversible]
        self.fixed_children: list[set[int]] = [set() for _ in reversible]
        self._waiting: list[tuple[int, int]] = []

    def fix(self, source: int, target: int) -> None:
        if target in self.open[source]:
            self.open[source].remove(target)
            self.open[target].remove(source)
            self.fixed_parents[target].add(source)
            self.fixed_children[source].add(target)
            self._waiting.append((source, target))

    def close(self, deadline: Deadline) -> None:
        """Fix all that the fixed arrows force."""
        while self._waiting:
            deadline.poll()
            source, target = self._waiting.pop()
            self._away_from_colliders(source, target)
            self._away_from_cycles(source, target)
            self._away_from_both(source, target)

    def _away_from_colliders(self, source: int, target: int) -> None:
        """Rule 1: an arrow into a node leads on to whatever its source is not adjacent to."""
        for beyond in self.open[target] - self.adjacent[source]:
            self.fix(target, beyond)

    def _away_from_cycles(self, source: int, target: int) -> None:
        """Rule 2: where two fixed arrows lead, an open one leads too; the new arrow is the first or the second."""
        for beyond in self.open[source] & self.fixed_children[target]:
            self.fix(source, beyond)
        for before in self.open[target] & self.fixed_parents[source]:
            self.fix(before, target)

    def _away_from_both(self, source: int, target: int) -> None:
        """Rule 4: two fixed arrows in a row, their ends not adjacent but both openly joined to one node: it
        leads to the second end. The new arrow is the first or the second of the row."""
        if self.open[source]:
            for end in self.fixed_children[target] - self.adjacent[source]:
                for node in self.open[source] & self.open[end]:
                    self.fix(node, end)
        if self.open[target]:
            for start in self.fixed_parents[source] - self.adjacent[target]:
                for node in self.open[start] & self.open[target]:
                    self.fix(node, target)
