"""Which arrows can independencies speak about, and how many DAGs say the same?

For a DAG whose nodes are all measured. An arrow is compelled where every DAG with the same independencies has
it in this direction, and reversible elsewhere; which it is follows node by node from the arrows into the last
parent (Chickering 1995), O(nodes + edges). Arrows that independencies leave open and the times of recording
fix are told apart (``fixed_arrows``). The size of the class comes from its chordal parts (``class_size``).
"""

from __future__ import annotations

from dataclasses import dataclass

from pathgate.criteria.class_size import count_orientations
from pathgate.criteria.deadline import Deadline
from pathgate.criteria.fixed_arrows import sources_fixed_by_time
from pathgate.graphs.graph import CausalGraph

Arrow = tuple[str, str]


@dataclass(frozen=True, slots=True)
class Equivalence:
    """What independencies say of each arrow; every arrow is in exactly one of the three lists.

    Attributes:
        compelled: the arrows that every DAG with the same independencies has.
        reversible: those that some such DAG has the other way round, whatever the times.
        fixed_by_time: those that some such DAG has the other way round, but none in which no arrow leads from
            a later recorded column to an earlier one.
        class_size: how many DAGs have the same independencies, this one included, times aside.
    """

    compelled: tuple[Arrow, ...]
    reversible: tuple[Arrow, ...]
    fixed_by_time: tuple[Arrow, ...]
    class_size: int


def equivalence(graph: CausalGraph, deadline: Deadline) -> Equivalence:
    """What independencies tell of the arrows of a DAG; arrows by source, then target, in the graph's order.

    Args:
        graph: every node measured, no bidirected edge.
        deadline: how long it may take.

    Raises:
        OutOfTime: the deadline came first.

    >>> graph = CausalGraph.of(("promo", "visits"), ("rain", "visits"), ("visits", "sales"), ("rain", "mood"))
    >>> found = equivalence(graph, Deadline.never())
    >>> found.reversible, found.class_size
    ((('rain', 'mood'),), 2)
    """
    reversible = reversible_parents(graph, deadline)
    fixed = sources_fixed_by_time(graph, reversible, deadline)
    lists: dict[str, list[Arrow]] = {"compelled": [], "reversible": [], "fixed": []}
    for source, target in zip(graph.sources.tolist(), graph.targets.tolist(), strict=True):
        is_reversible = source in reversible[target]
        which = "compelled" if not is_reversible else "fixed" if source in fixed[target] else "reversible"
        lists[which].append((graph.name(source), graph.name(target)))
    return Equivalence(
        compelled=tuple(lists["compelled"]),
        reversible=tuple(lists["reversible"]),
        fixed_by_time=tuple(lists["fixed"]),
        class_size=count_orientations(graph.topological_order, reversible, deadline),
    )


def reversible_parents(graph: CausalGraph, deadline: Deadline) -> list[frozenset[int]]:
    """For each node the parents whose arrows into it some equivalent DAG has the other way round.

    Raises:
        OutOfTime: the deadline came first.
    """
    rank = {node: place for place, node in enumerate(graph.topological_order)}
    parents = list(map(frozenset, graph.parent_lists))
    compelled: list[frozenset[int]] = [frozenset()] * graph.size
    for node in graph.topological_order:
        deadline.poll()
        if parents[node]:
            last = max(parents[node], key=rank.__getitem__)
            # Either a compelled arrow leads on into the node, or two of its parents are not adjacent.
            is_led_on = not compelled[last] <= parents[node]
            is_collider = not parents[node] - {last} <= parents[last]
            compelled[node] = parents[node] if is_led_on or is_collider else compelled[last]
    return [every - fixed for every, fixed in zip(parents, compelled, strict=True)]
