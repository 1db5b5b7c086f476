"""The independencies that a graph promises for its columns, in the forms that data can be held against.

Pairs: ``smallest`` and ``every_minimal`` separating sets, and the ``basis`` (one statement a separable pair:
given the parents of both in a fully measured DAG, Shipley 2000; else given the columns above the pair). Sets:
``basis_sets``, the ordered local Markov property over districts (Richardson 2003; Kang & Tian 2009; Jeong et
al. 2025). ``sequential``: statements whose tests do not overlap. A smallest statement costs a minimum cut, one of
the basis O(nodes + edges); the listings come with polynomial delay.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from pathgate.criteria.deadline import Deadline
from pathgate.criteria.disjoint import fewest_nodes_between
from pathgate.criteria.hubs import Cliques
from pathgate.criteria.projection import latent_projection
from pathgate.criteria.separable import Pairs, is_fully_measured
from pathgate.criteria.separators import Separators
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.kinship import ancestors, descendants
from pathgate.graphs.masks import mask_of, members


@dataclass(frozen=True, slots=True)
class Independency:
    """``x`` is independent of ``y`` (one column, or a set) given ``given``: indices and masks of the graph."""

    x: int
    y: int
    given: int


def separable_pairs(
    pairs: Pairs, deadline: Deadline, *, start: tuple[int, int] = (0, 0)
) -> Iterator[tuple[int, int]]:
    """Every pair of columns that some set of columns separates, in the graph's order; from ``start`` on.

    Raises:
        OutOfTime: the deadline came first.
    """
    first, second = start
    for node in members(pairs.columns >> first << first):
        others = pairs.separable(node, deadline)
        if node == first:
            others = others >> second << second
        yield from ((node, other) for other in members(others))


def separators_of(pairs: Pairs, first: int, second: int) -> Separators:
    """All sets of columns that separate a pair on the kept rows; the sets hold what these condition on."""
    kept = pairs.kept
    return Separators(kept.graph, 1 << first, 1 << second, kept.conditioned, pairs.columns)


def smallest(pairs: Pairs, first: int, second: int) -> Independency:
    """A statement for a separable pair with the fewest columns given."""
    kept = pairs.kept
    if not pairs.joined_alone(first) >> second & 1:
        return Independency(first, 1 << second, 0)
    if kept.graph.is_small:
        # What Separators would find, without finding out again what is known of the pair.
        above = pairs.above(first) | pairs.above(second)
        cliques = Cliques.within(kept.graph, above, pairs.known)
        choosable = above & pairs.columns & ~(1 << first | 1 << second)
        found = fewest_nodes_between(cliques, 1 << first, 1 << second, choosable, kept.conditioned)
    else:
        found = separators_of(pairs, first, second).smallest()
    if found is None:
        message = "a pair that can be separated has a smallest separating set"
        raise AssertionError(message)
    return Independency(first, 1 << second, found & ~kept.conditioned)


def every_minimal(pairs: Pairs, deadline: Deadline) -> Iterator[Independency]:
    """Every statement about a pair none of whose given columns can be left out with some others.

    Raises:
        OutOfTime: the deadline came first.
    """
    for first, second in separable_pairs(pairs, deadline):
        yield from minimal_about(pairs, first, second, deadline)


def minimal_about(pairs: Pairs, first: int, second: int, deadline: Deadline) -> Iterator[Independency]:
    """Those of them that are about one pair.

    Raises:
        OutOfTime: the deadline came first.
    """
    for found in separators_of(pairs, first, second).every_minimal(deadline):
        yield Independency(first, 1 << second, found & ~pairs.kept.conditioned)


def basis(pairs: Pairs, first: int, second: int) -> Independency:
    """The basis' statement for a separable pair.

    In a fully measured DAG the others follow from these by the graphoid rules with composition, so for linear
    Gaussian columns; not for every distribution (three columns of which each is the exclusive or of the other
    two keep every statement of the basis of three unlinked columns).
    """
    graph = pairs.kept.graph
    if is_fully_measured(graph) and not pairs.kept.conditioned:
        parents = mask_of([*graph.parents(first), *graph.parents(second)])
        return Independency(first, 1 << second, parents & ~(1 << first | 1 << second))
    return Independency(first, 1 << second, pairs.widest(first, second))


def basis_sets(graph: CausalGraph, deadline: Deadline) -> Iterator[Independency]:
    """For each column, statements about sets of earlier columns, given its Markov boundary among them.

    From these statements all others follow by the semigraphoid rules alone, so for every distribution. In a
    fully measured DAG there is at most one a column: earlier columns that are no parents, given the parents.
    Otherwise one for each district that the column can have in an ancestral set of earlier columns (Richardson
    2003), in the largest such set; the next always comes in polynomial time.

    Raises:
        OutOfTime: the deadline came first.
    """
    projected = latent_projection(graph)
    original = [graph.index[name] for name in projected.names]

    def back(mask: int) -> int:
        return mask_of(original[node] for node in members(mask))

    earlier = 0
    for node in projected.topological_order:
        for found in _boundaries(projected, node, earlier, deadline):
            if found.y:
                yield Independency(original[node], back(found.y), back(found.given))
        earlier |= 1 << node


def sequential(graph: CausalGraph) -> Iterator[Independency]:
    """For a fully measured DAG: each column and each earlier one that is no parent of it.

    Given are its parents and the earlier non-parents before that one. The statistics of the tests are
    asymptotically independent, so they can be added up to one overall test.
    """
    earlier = list[int]()
    for node in graph.topological_order:
        given = mask_of(graph.parents(node))
        for other in earlier:
            if not given >> other & 1:
                yield Independency(node, 1 << other, given)
                given |= 1 << other
        earlier.append(node)


def _boundaries(graph: CausalGraph, node: int, earlier: int, deadline: Deadline) -> Iterator[Independency]:
    """One statement for each district of ``node`` in an ancestral set of itself and earlier columns."""
    everything = earlier | 1 << node
    fixed = ancestors(graph, 1 << node)
    first = _district(graph, node, everything)
    seen, waiting = {first}, [(everything, first)]
    while waiting:
        deadline.poll()
        within, district = waiting.pop()
        boundary = _with_parents(graph, district) & ~(1 << node)
        largest = everything & ~descendants(graph, _siblings(graph, district) & everything)
        yield Independency(node, largest & ~boundary & ~(1 << node), boundary)
        # Without one of its members (and what descends from it) the district is a smaller one.
        for member in members(district & ~fixed):
            smaller = within & ~descendants(graph, 1 << member)
            left = _district(graph, node, smaller)
            if left not in seen:
                seen.add(left)
                waiting.append((smaller, left))


def _district(graph: CausalGraph, node: int, within: int) -> int:
    """The nodes of a set that bidirected edges between its nodes join to ``node``."""
    found = frontier = 1 << node
    while frontier:
        lowest = frontier & -frontier
        new = mask_of(graph.spouses(lowest.bit_length() - 1)) & within & ~found
        found |= new
        frontier = (frontier ^ lowest) | new
    return found


def _with_parents(graph: CausalGraph, nodes: int) -> int:
    found = nodes
    for node in members(nodes):
        found |= mask_of(graph.parents(node))
    return found


def _siblings(graph: CausalGraph, district: int) -> int:
    """What bidirected edges join to a district without being in it."""
    found = 0
    for node in members(district):
        found |= mask_of(graph.spouses(node))
    return found & ~district
