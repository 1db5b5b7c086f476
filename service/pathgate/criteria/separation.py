"""Does a set of nodes separate two others? If not, along which path are they joined; if so, what blocks them?

d-separation (Pearl 1988) and, where bidirected edges stand for unmeasured common causes, m-separation
(Richardson 2003). A verdict alone is linear-time reachability; its proof adds a shortest open path or the
blockers of the shortest paths, and a smallest separating set, which is a minimum cut.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from itertools import islice
from typing import Literal

from pathgate.criteria.batch import Statement
from pathgate.criteria.deadline import Deadline
from pathgate.criteria.errors import Overlapping
from pathgate.criteria.paths import OpenPath, Role, Trail, explain_path, find_open_path
from pathgate.criteria.reachability import Conditions
from pathgate.criteria.selection import keep_rows
from pathgate.criteria.separators import Separators
from pathgate.criteria.skeleton_paths import shortest_paths
from pathgate.criteria.verdict import are_separated
from pathgate.graphs.graph import CausalGraph

Names = str | Iterable[str]
Blocked = Literal["conditioned", "collider-not-conditioned"]

DEFAULT_PATHS = 3


@dataclass(frozen=True, slots=True)
class Blocker:
    """A path between x and y, and the first node on it that blocks it."""

    path: Trail
    node: int
    role: Role
    because: Blocked


@dataclass(frozen=True, slots=True)
class Separation:
    """Whether ``given`` separates ``x`` from ``y``, with the proof.

    Attributes:
        x, y, given: names, in the graph's order.
        separated: the verdict.
        open_path: where not separated, a shortest open path.
        blockers: where separated, a node that blocks each of the shortest paths; none where no path joins
            the two.
        separator: a smallest set of measured nodes that would separate x from y; None where none does.
    """

    x: tuple[str, ...]
    y: tuple[str, ...]
    given: tuple[str, ...]
    separated: bool
    open_path: OpenPath | None = None
    blockers: tuple[Blocker, ...] = ()
    separator: tuple[str, ...] | None = None


def separation(
    graph: CausalGraph,
    x: Names,
    y: Names,
    given: Names = (),
    *,
    paths: int = DEFAULT_PATHS,
    deadline: Deadline | None = None,
) -> Separation:
    """Is every path between ``x`` and ``y`` blocked by ``given``? Any node may be named, measured or not.

    Args:
        graph: the graph.
        x, y, given: disjoint sets of names; x and y not empty.
        paths: for how many of the shortest paths to name a blocker.
        deadline: when to give up.

    Raises:
        UnknownNode: a name is not in the graph.
        Overlapping: the three sets share a node, or x or y is empty.
        OutOfTime: the deadline came first.

    >>> graph = CausalGraph.of(("rain", "delay"), ("promo", "delay"))
    >>> found = separation(graph, "rain", "promo")
    >>> found.separated, found.blockers[0].because, found.separator
    (True, 'collider-not-conditioned', ())
    >>> separation(graph, "rain", "promo", ["delay"]).open_path.steps[0].because
    'conditioned'
    """
    xs, ys, conditioned = graph.mask(x), graph.mask(y), graph.mask(given)
    check_disjoint(graph, xs, ys, conditioned)
    return explained(graph, (xs, ys, conditioned), paths, deadline or Deadline.never())


def is_separated(graph: CausalGraph, x: Names, y: Names, given: Names = ()) -> bool:
    """The verdict alone, without its proof; see ``separation``.

    >>> is_separated(CausalGraph.of(("rain", "delay"), ("delay", "refund")), "rain", "refund", ["delay"])
    True
    """
    xs, ys, conditioned = graph.mask(x), graph.mask(y), graph.mask(given)
    check_disjoint(graph, xs, ys, conditioned)
    return are_separated(graph, xs, ys, conditioned)


def explained(graph: CausalGraph, statement: Statement, paths: int, deadline: Deadline) -> Separation:
    """The verdict on a statement with its proof.

    Raises:
        OutOfTime: the deadline came first.
    """
    xs, ys, given = statement
    deadline.poll()
    conditions = Conditions.on(graph, given)
    trail = find_open_path(graph, xs, ys, conditions)
    deadline.poll()
    smallest = Separators(graph, xs, ys, required=0, allowed=graph.measured).smallest()
    return Separation(
        x=graph.names_of(xs),
        y=graph.names_of(ys),
        given=graph.names_of(given),
        separated=trail is None,
        open_path=None if trail is None else explain_path(keep_rows(graph), trail, given),
        blockers=tuple(_blockers(graph, xs, ys, conditions, paths, deadline)) if trail is None else (),
        separator=None if smallest is None else graph.names_of(smallest),
    )


def _blockers(
    graph: CausalGraph, xs: int, ys: int, conditions: Conditions, paths: int, deadline: Deadline
) -> Iterator[Blocker]:
    for trail in islice(shortest_paths(graph, xs, ys, deadline), paths):
        for node, role in trail.inner:
            if role == "collider" and not conditions.opening >> node & 1:
                yield Blocker(trail, node, role, "collider-not-conditioned")
                break
            if role != "collider" and conditions.blocking >> node & 1:
                yield Blocker(trail, node, role, "conditioned")
                break


def on_two_sides(xs: int, ys: int, conditioned: int) -> int:
    """The nodes that more than one of the three sets holds."""
    return (xs & ys) | (xs & conditioned) | (ys & conditioned)


def check_disjoint(graph: CausalGraph, xs: int, ys: int, conditioned: int) -> None:
    """Refuse a question that means nothing.

    Raises:
        Overlapping: two of the sets share a node, or x or y is empty.
    """
    shared = on_two_sides(xs, ys, conditioned)
    if shared or not xs or not ys:
        raise Overlapping(graph.names_of(shared))
