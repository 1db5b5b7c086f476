"""Does a set of nodes separate two others, and if not, along which path are they joined?

d-separation (Pearl 1988) and, where bidirected edges stand for unmeasured common causes, m-separation
(Richardson 2003), by linear-time reachability. O(nodes + edges) a verdict.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from pathgate.criteria.deadline import Deadline
from pathgate.criteria.errors import Overlapping
from pathgate.criteria.paths import OpenPath, explain_path, find_open_path
from pathgate.criteria.reachability import Conditions, connected
from pathgate.criteria.selection import keep_rows
from pathgate.graphs.graph import CausalGraph

Names = str | Iterable[str]


@dataclass(frozen=True, slots=True)
class Separation:
    """Whether ``given`` separates ``x`` from ``y``; where not, a shortest open path shows it."""

    x: tuple[str, ...]
    y: tuple[str, ...]
    given: tuple[str, ...]
    separated: bool
    open_path: OpenPath | None = None


def separation(
    graph: CausalGraph, x: Names, y: Names, given: Names = (), *, deadline: Deadline | None = None
) -> Separation:
    """Is every path between ``x`` and ``y`` blocked by ``given``? Any node may be named, measured or not.

    Raises:
        UnknownNode: a name is not in the graph.
        Overlapping: the three sets share a node, or x or y is empty.
        OutOfTime: the deadline came first.

    >>> graph = CausalGraph.of(("rain", "delay"), ("promo", "delay"))
    >>> separation(graph, "rain", "promo").separated
    True
    >>> separation(graph, "rain", "promo", ["delay"]).open_path.steps[0].because
    'conditioned'
    """
    xs, ys, conditioned = graph.mask(x), graph.mask(y), graph.mask(given)
    check_disjoint(graph, xs, ys, conditioned)
    if deadline is not None:
        deadline.poll()
    return separation_of(graph, xs, ys, conditioned, explain=True)


def separation_of(graph: CausalGraph, xs: int, ys: int, conditioned: int, *, explain: bool) -> Separation:
    """The verdict over masks that are known to be disjoint, with the open path only where asked to explain."""
    named = (graph.names_of(xs), graph.names_of(ys), graph.names_of(conditioned))
    if are_separated(graph, xs, ys, conditioned):
        return Separation(*named, separated=True)
    if not explain:
        return Separation(*named, separated=False)
    trail = find_open_path(graph, xs, ys, Conditions.on(graph, conditioned))
    path = explain_path(keep_rows(graph), trail, conditioned) if trail else None
    return Separation(*named, separated=False, open_path=path)


def are_separated(graph: CausalGraph, xs: int, ys: int, conditioned: int) -> bool:
    """The verdict alone, over masks that are known to be disjoint."""
    return not connected(graph, xs, Conditions.on(graph, conditioned), stop=ys) & ys


def check_disjoint(graph: CausalGraph, xs: int, ys: int, conditioned: int) -> None:
    """Refuse a question that means nothing.

    Raises:
        Overlapping: two of the sets share a node, or x or y is empty.
    """
    shared = (xs & ys) | (xs & conditioned) | (ys & conditioned)
    if shared or not xs or not ys:
        raise Overlapping(graph.names_of(shared))
