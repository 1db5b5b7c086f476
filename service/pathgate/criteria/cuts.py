"""Minimum vertex cuts of an augmented graph: flow through split nodes, hubs without bounds.

scipy's maximum flow over integer capacities finds the fewest nodes, and the cheapest where costs are whole numbers
or simple fractions; else networkx's minimum cut does over exact fractions. Where several cuts are least, the
smallest is the one nearest to x and the cheapest the one nearest to y, which are the same for every maximum flow.
The fewest nodes take at most one pass over the network each, O(nodes + edges); the cheapest take O(nodes² · edges)
at worst.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from math import lcm

import numpy as np
import numpy.typing as npt

from pathgate.criteria.hubs import Hubs
from pathgate.graphs.masks import BoolArray, mask_of, members

# Flows of scipy are 32-bit integers.
_MOST_CAPACITY = 2**31 - 1


def smallest_cut(hubs: Hubs, xs: int, ys: int, choosable: int, removed: int) -> int:
    """The fewest choosable nodes without which nothing leads from x to y, ``removed`` being gone already.

    Some set of choosable nodes must do it, else the answer means nothing.
    """
    network = _Network.of(hubs, xs, ys, dict.fromkeys(members(choosable & ~removed), 1), removed)
    near_x = network.reached(from_sink=False)
    return mask_of(node for k, node in enumerate(network.nodes) if near_x[2 * k] and not near_x[2 * k + 1])


def cheapest_cut(hubs: Hubs, xs: int, ys: int, costs: Mapping[int, Fraction], removed: int) -> int:
    """The choosable nodes (those with a cost) of the least total cost without which nothing leads from x to y."""
    scale = lcm(*(cost.denominator for cost in costs.values()))
    whole = {node: int(cost * scale) for node, cost in costs.items()}
    if 2 * sum(whole.values()) >= _MOST_CAPACITY:
        return _cheapest_exactly(hubs, xs, ys, costs, removed)
    network = _Network.of(hubs, xs, ys, whole, removed)
    near_y = network.reached(from_sink=True)
    return mask_of(node for k, node in enumerate(network.nodes) if near_y[2 * k + 1] and not near_y[2 * k])


@dataclass(frozen=True, slots=True)
class _Network:
    """A flow network: node k of ``nodes`` flows from state 2k into 2k + 1; then come the hubs, source and sink."""

    nodes: tuple[int, ...]
    steps: npt.NDArray[np.int32]
    source: int
    sink: int

    @classmethod
    def of(cls, hubs: Hubs, xs: int, ys: int, capacities: Mapping[int, int], removed: int) -> _Network:
        """The network in which each choosable node has its capacity, and every other node has no bound."""
        nodes = tuple(members(hubs.relevant & ~removed))
        first_hub = 2 * len(nodes)
        source = first_hub + len(hubs.hub_members)
        steps: list[tuple[int, int, int]] = []
        unbounded = sum(capacities.values()) + 1
        for k, node in enumerate(nodes):
            into, out = 2 * k, 2 * k + 1
            steps.append((into, out, capacities.get(node, unbounded)))
            steps.extend((out, first_hub + hub, unbounded) for hub in hubs.hubs_of[node])
            steps.extend((first_hub + hub, into, unbounded) for hub in hubs.hubs_of[node])
            if xs >> node & 1:
                steps.append((source, into, unbounded))
            if ys >> node & 1:
                steps.append((out, source + 1, unbounded))
        return cls(nodes, np.array(steps, dtype=np.int32), source, source + 1)

    def reached(self, *, from_sink: bool) -> BoolArray:
        """The states that a maximum flow leaves within reach of the source, or from which it leaves the sink so."""
        from scipy.sparse import csr_array  # noqa: PLC0415 - slow to import, and many questions do without
        from scipy.sparse.csgraph import breadth_first_order, maximum_flow  # noqa: PLC0415 - as above

        starts, ends, capacities = self.steps.T
        network = csr_array((capacities, (starts, ends)), shape=(self.sink + 1, self.sink + 1))
        left = csr_array(network - maximum_flow(network, self.source, self.sink).flow) > 0
        begin, ways = (self.sink, csr_array(left.T)) if from_sink else (self.source, left)
        near = np.zeros(self.sink + 1, dtype=np.bool_)
        near[breadth_first_order(ways, begin, directed=True, return_predecessors=False)] = True
        return near


def _cheapest_exactly(hubs: Hubs, xs: int, ys: int, costs: Mapping[int, Fraction], removed: int) -> int:
    """The same where costs are no small whole numbers, even scaled: slower by far."""
    import networkx  # noqa: PLC0415 - slow to import, and only odd costs need it

    network = networkx.DiGraph()
    for node in members(hubs.relevant & ~removed):
        bound = {"capacity": costs[node]} if node in costs else {}
        network.add_edge(("in", node), ("out", node), **bound)
        for hub in hubs.hubs_of[node]:
            network.add_edge(("out", node), ("hub", hub))
            network.add_edge(("hub", hub), ("in", node))
    for node in members(xs):
        network.add_edge("source", ("in", node))
    for node in members(ys):
        network.add_edge(("out", node), "sink")
    _value, (near, _far) = networkx.minimum_cut(network, "source", "sink")
    return mask_of(node for node in costs if ("in", node) in near and ("out", node) not in near)
