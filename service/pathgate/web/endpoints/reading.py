"""What endpoints share in reading a call: its graphs within the limits, and the nodes its names mean."""

from __future__ import annotations

from typing import Any

from pathgate.graphs.errors import Fault
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.reading import Examined, examine_graph
from pathgate.review.names import NameReader
from pathgate.web.operations import Call
from pathgate.web.problems import Refused


def examine(call: Call, member: str = "graph") -> Examined:
    """The graph that a member holds and its faults, which are not yet among those of the call.

    Raises:
        Refused: the graph is over a limit; nothing else is looked at then.
    """
    said = call.graphs[member]
    called = "the graph" if member == "graph" else f'the graph "{member}"'
    over = [
        Fault("over-limit", (member, items), f"{called} has {len(held):,} {items}; the limit is {most:,}")
        for items, most in (("nodes", call.settings.max_nodes), ("edges", call.settings.max_edges))
        if len(held := _list_in(said, items)) > most
    ]
    if over:
        raise Refused(over)
    call.deadline.poll()
    return examine_graph(said)


def graph_of(call: Call, member: str = "graph") -> CausalGraph:
    """The graph that a member holds; what is wrong with it is added to the call's faults.

    Names can be looked up in it even where it has faults, so that all faults come in one answer.
    """
    if member not in call.graphs:
        return CausalGraph.of()
    examined = examine(call, member)
    call.faults.extend(fault.below((member,)) for fault in examined.faults)
    return examined.graph


def names_of(call: Call, graph: CausalGraph) -> NameReader:
    """Finds nodes by their ids; outside configs other names of a column do not count."""
    return NameReader(graph, call.faults, by_alias=False, refuse_repeats=False)


def mask_in(call: Call, names: NameReader, member: str) -> int:
    """The nodes that a member of the body names; none where it is absent or at fault already."""
    return names.mask(call.body.get(member, []), (member,))


def _list_in(graph: Any, member: str) -> list[Any]:
    held = graph.get(member) if isinstance(graph, dict) else None
    return held if isinstance(held, list) else []
