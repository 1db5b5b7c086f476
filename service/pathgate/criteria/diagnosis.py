"""Why a covariate set does not carry an effect: which columns and filters break it, along which paths.

Forbidden columns are named with the causal path they lie on or descend from. Every other fault is an open
non-causal path. These are found one after the other: a path that needs no opened collider lacks a
covariate; one that does is the doing of the conditioned nodes that open its colliders. After each find the
fault is mended in thought (a missing node blocks, an opener ceases to open but goes on blocking) and the
search repeated, until no open path is left. At most one search a node: O(nodes · (nodes + edges) log nodes).
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from pathgate.criteria.adjustment import Effect
from pathgate.criteria.deadline import Deadline
from pathgate.criteria.paths import OpenPath, Trail, directed_path, explain_path, find_open_path, opened_by
from pathgate.criteria.reachability import Conditions
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.kinship import ancestors
from pathgate.graphs.masks import mask_of, members


@dataclass(frozen=True, slots=True)
class Forbidden:
    """A conditioned node that no valid set may hold.

    Attributes:
        node: its index.
        is_on_path: does it lie on a causal path itself, or descend from one?
        descends_from: the last node of a causal path above it; itself where it lies on one.
        causal_path: the causal path through that node, from a treatment to an outcome.
        descent: the directed path from that node to this one.
    """

    node: int
    is_on_path: bool
    descends_from: int
    causal_path: Trail
    descent: Trail


@dataclass(frozen=True, slots=True)
class Opened:
    """A non-causal path that conditioning opened.

    Attributes:
        descents: for each collider on it, the directed path down to the conditioned node to blame.
        trail, path: the path by indices and by names.
    """

    descents: tuple[Trail, ...]
    trail: Trail
    path: OpenPath


@dataclass(frozen=True, slots=True)
class Missing:
    """A non-causal path that is open for want of a covariate.

    Attributes:
        blocker: a measured node that would block it, or None where all its nodes are unmeasured.
        trail, path: the path by indices and by names.
    """

    blocker: int | None
    trail: Trail
    path: OpenPath


def forbidden_nodes(effect: Effect, nodes: int) -> Iterator[Forbidden]:
    """Those of the nodes that no valid set may hold, each with the causal path that forbids it."""
    graph = effect.kept.graph
    for node in members(nodes & effect.forbidden):
        descent = directed_path(graph, effect.on_causal_paths, 1 << node)
        if descent is None:
            continue
        above = descent.nodes[0]
        yield Forbidden(node, above == node, above, _causal_path_through(effect, above), descent)


def open_paths(effect: Effect, covariates: int, deadline: Deadline) -> Iterator[Opened | Missing]:
    """What leaves treatments and outcomes joined by non-causal paths, given the covariates on the rows kept.

    Forbidden nodes are to be left out of ``covariates`` by the caller: they are faults of their own.

    Raises:
        OutOfTime: the deadline came first.
    """
    graph = effect.back_door_graph
    blocking = openers = covariates | effect.kept.conditioned
    while True:
        deadline.poll()
        # Edges taken out on the way only make ancestors fewer, and none of what opens a collider is forbidden.
        above = ancestors(effect.kept.graph if graph is effect.back_door_graph else graph, openers)
        conditions = Conditions(blocking, above, above | effect.above_ends)
        trail = find_open_path(graph, effect.treatments, effect.outcomes, conditions, fewest_colliders=True)
        if trail is None:
            return
        path = explain_path(effect.kept, trail, openers)
        colliders = tuple(node for node, role in trail.inner if role == "collider")
        if colliders:
            descents = tuple(opened_by(effect.kept.graph, node, openers) for node in colliders)
            yield Opened(descents, trail, path)
            openers &= ~mask_of(descent.nodes[-1] for descent in descents)
        else:
            blocker = _blocker(effect, trail)
            yield Missing(blocker, trail, path)
            graph, blocking = _mended(graph, trail, blocker, blocking)


def _causal_path_through(effect: Effect, node: int) -> Trail:
    graph = effect.kept.graph
    before = directed_path(graph, effect.treatments, 1 << node)
    after = directed_path(graph, 1 << node, effect.outcomes, avoiding=effect.treatments)
    if before is None or after is None:
        message = "a node on a causal path has a treatment above it and an outcome below"
        raise AssertionError(message)
    return Trail(before.nodes + after.nodes[1:], before.arrows + after.arrows)


def _blocker(effect: Effect, trail: Trail) -> int | None:
    """The measured node that would best block a path without colliders: its fork, else the first."""
    usable = [node for node, _role in trail.inner if effect.usable >> node & 1]
    forks = [node for node, role in trail.inner if role == "fork" and node in usable]
    return next(iter(forks + usable), None)


def _mended(graph: CausalGraph, trail: Trail, blocker: int | None, blocking: int) -> tuple[CausalGraph, int]:
    """The graph and the blocking nodes as if this path had been blocked."""
    if blocker is not None:
        return graph, blocking | 1 << blocker
    inner = [node for node, _role in trail.inner]
    if inner:
        return graph, blocking | mask_of(inner)
    return graph.without_edge(trail.edge(0)), blocking
