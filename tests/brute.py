"""What is true of a small graph, by definition alone?

Separation and separating sets, what a row filter conditions on, the adjustment criterion (Shpitser,
VanderWeele & Robins 2010; Perković et al. 2018) and the direct effect, each read off its definition by
listing all paths or all subsets. Free of any shortcut that the code under test might share.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Sequence
from itertools import chain, combinations
from typing import Any

from tests.brute_paths import (
    Path,
    all_directed_paths,
    all_paths,
    ancestors,
    colliders,
    descendants,
    is_open,
    is_open_given,
)
from tests.values import (
    Graph,
    Names,
    arrows_of,
    as_set,
    fresh_name,
    is_adjacent,
    measured_names,
    node_names,
    without_arrow,
)

__all__ = [
    "Path",
    "adjustment_criterion",
    "all_directed_paths",
    "all_paths",
    "ancestors",
    "colliders",
    "descendants",
    "direct_criterion",
    "forbidden",
    "inclusion_minimal",
    "induced_pairs",
    "inseparable_pairs",
    "is_open",
    "is_valid_adjustment",
    "is_valid_direct",
    "minimal_separators",
    "open_paths",
    "proper_paths",
    "separated",
    "separating_sets",
    "shortest_open_length",
    "subsets",
    "valid_sets",
    "with_selection",
]


def open_paths(graph: Graph, xs: Names, ys: Names, given: Names = ()) -> Iterator[Path]:
    """Every open path from a node of ``xs`` to one of ``ys``; the three sets must not meet."""
    starts, ends, fixed = as_set(xs), as_set(ys), as_set(given)
    if starts & ends or starts & fixed or ends & fixed:
        raise ValueError("x, y and given must be disjoint")
    opening = ancestors(graph, fixed)
    for start in starts:
        for end in ends:
            yield from (path for path in all_paths(graph, start, end) if is_open_given(path, fixed, opening))


def separated(graph: Graph, xs: Names, ys: Names, given: Names = ()) -> bool:
    """Is every path between the two sets blocked?"""
    return next(open_paths(graph, xs, ys, given), None) is None


def shortest_open_length(graph: Graph, xs: Names, ys: Names, given: Names = ()) -> int | None:
    """Edges on a shortest open path; None where the sets are separated."""
    return min((len(path.arrows) for path in open_paths(graph, xs, ys, given)), default=None)


def subsets(names: Iterable[str]) -> Iterator[frozenset[str]]:
    """Every subset, smaller ones first."""
    pool = list(names)
    sizes = (combinations(pool, size) for size in range(len(pool) + 1))
    return (frozenset(chosen) for chosen in chain.from_iterable(sizes))


def separating_sets(graph: Graph, xs: Names, ys: Names, conditioned: Names = ()) -> list[frozenset[str]]:
    """Every set of other measured nodes that, with ``conditioned``, separates; smaller ones first."""
    starts, ends, fixed = as_set(xs), as_set(ys), as_set(conditioned)
    paths = [path for start in starts for end in ends for path in all_paths(graph, start, end)]
    free = [name for name in measured_names(graph) if name not in starts | ends | fixed]

    def is_separating(chosen: frozenset[str]) -> bool:
        opening = ancestors(graph, chosen | fixed)
        return not any(is_open_given(path, chosen | fixed, opening) for path in paths)

    return [chosen for chosen in subsets(free) if is_separating(chosen)]


def minimal_separators(graph: Graph, xs: Names, ys: Names, conditioned: Names = ()) -> list[frozenset[str]]:
    """The separating sets that hold no smaller separating set."""
    return inclusion_minimal(separating_sets(graph, xs, ys, conditioned))


def inclusion_minimal(sets: Sequence[frozenset[str]]) -> list[frozenset[str]]:
    """Those of the sets that hold none of the others."""
    return [one for one in sets if not any(other < one for other in sets)]


def inseparable_pairs(graph: Graph) -> set[frozenset[str]]:
    """The pairs of measured nodes with no edge between them that no measured set separates."""
    pairs = (pair for pair in combinations(measured_names(graph), 2) if not is_adjacent(graph, *pair))
    return {frozenset(pair) for pair in pairs if not separating_sets(graph, *pair)}


def with_selection(graph: Graph, selected_on: Iterable[Any]) -> tuple[Graph, list[str]]:
    """The graph with a selection node for each part, and the nodes that the rows kept condition on.

    ``selected_on`` is what a request sends: names (together one part), ``{"columns": …, "fixed": …}``, or
    both. A fixed part adds no node: it conditions on its one column.
    """
    items = list(selected_on)
    named = [item for item in items if isinstance(item, str)]
    parts = [*([{"columns": named}] if named else []), *(item for item in items if not isinstance(item, str))]
    nodes, edges, conditioned = list(graph["nodes"]), list(graph["edges"]), []
    for part in parts:
        columns = sorted(as_set(part["columns"]))
        if part.get("fixed", False):
            (column,) = columns
            conditioned.append(column)
            continue
        node = fresh_name("selection", [*node_names(graph), *conditioned])
        nodes.append({"id": node, "measured": False})
        edges += [{"source": column, "target": node} for column in columns]
        conditioned.append(node)
    return {"nodes": nodes, "edges": edges}, list(dict.fromkeys(conditioned))


def induced_pairs(graph: Graph, given: Names = (), selected_on: Iterable[Any] = ()) -> set[frozenset[str]]:
    """Pairs of measured nodes, separated given nothing and joined given ``given`` and the selection."""
    selected, conditioned = with_selection(graph, selected_on)
    fixed = as_set(given) | as_set(conditioned)
    free = [name for name in measured_names(graph) if name not in fixed]
    apart = (pair for pair in combinations(free, 2) if separated(graph, *pair))
    return {frozenset(pair) for pair in apart if not separated(selected, *pair, fixed)}


def proper_paths(graph: Graph, treatments: Names, outcomes: Names) -> list[Path]:
    """Every path from a treatment to an outcome that meets no treatment after its first node."""
    starts, ends = as_set(treatments), as_set(outcomes)
    if starts & ends or not starts or not ends:
        raise ValueError("treatments and outcomes must be disjoint and not empty")
    pairs = ((start, end) for start in starts for end in ends)
    return [path for start, end in pairs for path in all_paths(graph, start, end, avoiding=starts)]


def _on_or_below_causal_paths(graph: Graph, paths: Iterable[Path]) -> frozenset[str]:
    on_paths = {node for path in paths if path.is_causal for node in path.nodes[1:]}
    return descendants(graph, on_paths)


def forbidden(graph: Graph, treatments: Names, outcomes: Names) -> frozenset[str]:
    """Nodes on proper causal paths and their descendants, less the treatments and outcomes themselves.

    Unmeasured nodes are among them, and so are selection nodes where the graph holds some.
    """
    everything = _on_or_below_causal_paths(graph, proper_paths(graph, treatments, outcomes))
    return everything - as_set(treatments) - as_set(outcomes)


def adjustment_criterion(
    graph: Graph, treatments: Names, outcomes: Names, conditioned: Names
) -> Callable[[frozenset[str]], bool]:
    """:func:`is_valid_adjustment` for many covariate sets: paths are listed once."""
    starts, ends, fixed = as_set(treatments), as_set(outcomes), as_set(conditioned)
    paths = proper_paths(graph, starts, ends)
    barred = _on_or_below_causal_paths(graph, paths) | starts | ends
    non_causal = [path for path in paths if not path.is_causal]

    def is_valid(covariates: frozenset[str]) -> bool:
        given = covariates | fixed
        if given & barred:
            return False
        opening = ancestors(graph, given)
        return not any(is_open_given(path, given, opening) for path in non_causal)

    return is_valid


def is_valid_adjustment(
    graph: Graph, treatments: Names, outcomes: Names, covariates: Names = (), conditioned: Names = ()
) -> bool:
    """The adjustment criterion: nothing given is forbidden, every proper non-causal path is blocked.

    ``graph`` and ``conditioned`` are those of :func:`with_selection` where rows are filtered. A treatment or
    outcome that is itself given (a covariate, or held at one value) is never valid.
    """
    return adjustment_criterion(graph, treatments, outcomes, conditioned)(as_set(covariates))


def is_valid_direct(
    graph: Graph, treatment: str, outcome: str, covariates: Names = (), conditioned: Names = ()
) -> bool:
    """The direct effect's definition: nothing given descends from the outcome where the arrow exists, and
    the two are separated once the arrow is removed; where there is no arrow, separation alone."""
    given = as_set(covariates) | as_set(conditioned)
    if given & {treatment, outcome}:
        return False
    has_arrow = (treatment, outcome) in arrows_of(graph)
    if has_arrow and given & descendants(graph, outcome):
        return False
    # The first open path is enough: on larger graphs there is no room for all of them.
    return separated(without_arrow(graph, treatment, outcome), treatment, outcome, given)


def direct_criterion(
    graph: Graph, treatment: str, outcome: str, conditioned: Names
) -> Callable[[frozenset[str]], bool]:
    """:func:`is_valid_direct` for many covariate sets: paths are listed once."""
    has_arrow = (treatment, outcome) in arrows_of(graph)
    barred = {treatment, outcome} | (descendants(graph, outcome) if has_arrow else set())
    fixed = as_set(conditioned)
    paths = list(all_paths(without_arrow(graph, treatment, outcome), treatment, outcome))

    def is_valid(covariates: frozenset[str]) -> bool:
        given = covariates | fixed
        if given & barred:
            return False
        opening = ancestors(graph, given)
        return not any(is_open_given(path, given, opening) for path in paths)

    return is_valid


def valid_sets(
    graph: Graph, treatments: Names, outcomes: Names, conditioned: Names = (), *, asks: str = "total"
) -> list[frozenset[str]]:
    """Every valid set of measured nodes, smaller ones first, judged one by one."""
    ends = as_set(treatments) | as_set(outcomes)
    free = [name for name in measured_names(graph) if name not in ends]
    if asks == "direct":
        (treatment,), (outcome,) = as_set(treatments), as_set(outcomes)
        is_valid = direct_criterion(graph, treatment, outcome, conditioned)
    else:
        is_valid = adjustment_criterion(graph, treatments, outcomes, conditioned)
    return [chosen for chosen in subsets(free) if is_valid(chosen)]
