"""Minimum vertex cuts of an augmented graph: flow through split nodes, hubs without bounds.

The fewest nodes come from scipy's maximum flow over integer capacities; least cost from networkx's minimum
cut over exact fractions, since costs are any positive numbers. Where several cuts are least, the smallest is
the one nearest to x and the cheapest the one nearest to y, which are the same for every maximum flow.
"""

from __future__ import annotations

from collections.abc import Mapping
from fractions import Fraction

import numpy as np
from scipy.sparse import csr_array
from scipy.sparse.csgraph import breadth_first_order, maximum_flow

from pathgate.criteria.hubs import Hubs
from pathgate.graphs.masks import BoolArray, mask_of, members


def smallest_cut(hubs: Hubs, xs: int, ys: int, choosable: int, removed: int) -> int:
    """The fewest choosable nodes without which nothing leads from x to y, ``removed`` being gone already.

    Some set of choosable nodes must do it, else the answer means nothing.
    """
    nodes = list(members(hubs.relevant & ~removed))
    # Node k flows from state 2k into 2k + 1; then come the hubs, the source and the sink.
    first_hub = 2 * len(nodes)
    source, sink = first_hub + len(hubs.hub_members), first_hub + len(hubs.hub_members) + 1
    steps: list[tuple[int, int, int]] = []
    unbounded = len(nodes) + 1
    for k, node in enumerate(nodes):
        into, out = 2 * k, 2 * k + 1
        steps.append((into, out, 1 if choosable >> node & 1 else unbounded))
        steps.extend((out, first_hub + hub, unbounded) for hub in hubs.hubs_of[node])
        steps.extend((first_hub + hub, into, unbounded) for hub in hubs.hubs_of[node])
        if xs >> node & 1:
            steps.append((source, into, unbounded))
        if ys >> node & 1:
            steps.append((out, sink, unbounded))
    near = _source_side(steps, source, sink)
    return mask_of(node for k, node in enumerate(nodes) if near[2 * k] and not near[2 * k + 1])


def _source_side(steps: list[tuple[int, int, int]], source: int, sink: int) -> BoolArray:
    """The states that a maximum flow still leaves within reach of the source."""
    starts, ends, capacities = np.array(steps, dtype=np.int32).T
    network = csr_array((capacities, (starts, ends)), shape=(sink + 1, sink + 1))
    left = csr_array(network - maximum_flow(network, source, sink).flow) > 0
    near = np.zeros(sink + 1, dtype=np.bool_)
    near[breadth_first_order(left, source, directed=True, return_predecessors=False)] = True
    return near


def cheapest_cut(hubs: Hubs, xs: int, ys: int, costs: Mapping[int, Fraction], removed: int) -> int:
    """The choosable nodes (those with a cost) of the least total cost without which nothing leads from x to y."""
    import networkx  # noqa: PLC0415 - slow to import, and only costs need it

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
