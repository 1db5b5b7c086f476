"""Which DAGs say the same independencies as a small one, and how many are there?

The rule of Verma & Pearl 1990 applied to every way to direct the edges (the published oracles hold that rule
against separations), and a count for larger chordal graphs by the method of He, Jia & Yu 2015: one source after
the other. Neither shares a step with the code under test.
"""

from __future__ import annotations

import random
from collections.abc import Mapping
from itertools import combinations, permutations, product
from math import prod

from tests.brute import colliders
from tests.strategies import PLAIN_NAMES
from tests.values import Graph, arrows_of, graph_of, is_adjacent, node_names, topological_names

Signature = frozenset[tuple[frozenset[str], frozenset[str]]]
Neighbours = Mapping[str, frozenset[str]]


def signature(graph: Graph) -> Signature:
    """Skeleton and unshielded colliders: equal exactly for equivalent DAGs (Verma & Pearl 1990)."""
    skeleton = {(frozenset(arrow), frozenset[str]()) for arrow in arrows_of(graph)}
    unshielded = {
        (pair, frozenset([node])) for node, pair in colliders(graph) if not is_adjacent(graph, *pair)
    }
    return frozenset(skeleton | unshielded)


def orientations(graph: Graph) -> list[Graph]:
    """Every DAG with the same pairs joined."""
    choices = [((source, target), (target, source)) for source, target in arrows_of(graph)]
    candidates = (graph_of(*arrows, isolated=node_names(graph)) for arrows in product(*choices))
    return [candidate for candidate in candidates if topological_names(candidate) is not None]


def class_members(graph: Graph) -> list[Graph]:
    """Every DAG with the same independencies, the graph itself among them."""
    own = signature(graph)
    return [candidate for candidate in orientations(graph) if signature(candidate) == own]


def chordal_dag(rng: random.Random, nodes: int, most_parents: int = 4) -> Graph:
    """A random connected DAG none of whose arrows is compelled: the parents of each node are a clique."""
    names = rng.sample(PLAIN_NAMES, nodes)
    cliques = [[names[0]]]
    arrows = []
    for name in names[1:]:
        clique = rng.choice(cliques)
        above = rng.sample(clique, min(len(clique), rng.randint(1, most_parents)))
        arrows += [(parent, name) for parent in above]
        cliques.append([*above, name])
    return graph_of(*arrows, isolated=names)


def count_by_sources(graph: Graph) -> int:
    """Acyclic orientations without unshielded colliders of a chordal graph, whichever way it is directed."""
    pairs = [*arrows_of(graph), *(arrow[::-1] for arrow in arrows_of(graph))]
    neighbours = {name: frozenset(other for one, other in pairs if one == name) for name in node_names(graph)}
    return prod(_count_connected(part) for part in _parts(neighbours))


def _count_connected(neighbours: Neighbours) -> int:
    """Every such orientation has one source; from each, what is not forced falls apart into smaller parts."""
    if len(neighbours) == 1:
        return 1
    return sum(prod(map(_count_connected, _parts(_left_open(neighbours, source)))) for source in neighbours)


def _left_open(neighbours: Neighbours, source: str) -> Neighbours:
    """The edges that a first node leaves undirected: no arrow leads on from, or round to, either end."""
    forced = {(source, name) for name in neighbours[source]}
    while True:
        undirected = {
            (one, other)
            for one in neighbours
            for other in neighbours[one]
            if (one, other) not in forced and (other, one) not in forced
        }
        new = {
            (one, other)
            for one, other in undirected
            if any(
                (before not in neighbours[other] and (before, one) in forced)
                or {(one, before), (before, other)} <= forced
                for before in neighbours
            )
        }
        if not new:
            return {
                one: frozenset(other for other in neighbours[one] if (one, other) in undirected)
                for one in neighbours
            }
        forced |= new


def _parts(neighbours: Neighbours) -> list[Neighbours]:
    left = set(neighbours)
    parts = []
    while left:
        part = {min(left)}
        while wider := {other for one in part for other in neighbours[one]} - part:
            part |= wider
        left -= part
        parts.append({name: neighbours[name] for name in sorted(part)})
    return parts


def all_permutations_of(graph: Graph) -> set[frozenset[tuple[str, str]]]:
    """The same orientations from every order of the nodes, for graphs of up to six: each order directs the
    edges one way, and those without an unshielded collider count."""
    pairs = [frozenset(arrow) for arrow in arrows_of(graph)]
    found = set()
    for order in permutations(node_names(graph)):
        arrows = frozenset(
            (one, other) for one, other in combinations(order, 2) if frozenset((one, other)) in pairs
        )
        is_apart = (
            frozenset((one, other)) not in pairs
            for (one, end), (other, same) in combinations(arrows, 2)
            if end == same
        )
        if not any(is_apart):
            found.add(arrows)
    return found
