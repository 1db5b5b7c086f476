"""Reads the list of edges into arrays of node indices.

Ends are looked up and compared as whole columns; single edges are visited only to say what is wrong with
them, or to read the few members most edges lack. O(edges log edges): they are sorted by their ends.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence, Sized
from dataclasses import dataclass, field
from operator import itemgetter
from typing import Any

import numpy as np

from pathgate.graphs.errors import Fault, Place
from pathgate.graphs.graph import Edge
from pathgate.graphs.masks import BoolArray, IntArray
from pathgate.graphs.names import hint_within, quoted
from pathgate.graphs.node_list import NodeList, check_attributes, json_type, name_fault

EDGE_MEMBERS = ("source", "target", "kind", "doubtful", "note", "key")
KINDS = ("directed", "bidirected")


def _empty() -> IntArray:
    return np.empty(0, dtype=np.int64)


@dataclass(slots=True)
class EdgeList:
    """The edges that could be read, each kind sorted by its ends; ``places`` are the arrows' positions."""

    sources: IntArray = field(default_factory=_empty)
    targets: IntArray = field(default_factory=_empty)
    places: IntArray = field(default_factory=_empty)
    lower_ends: IntArray = field(default_factory=_empty)
    upper_ends: IntArray = field(default_factory=_empty)
    doubtful: frozenset[Edge] = frozenset()
    notes: Mapping[Edge, str] = field(default_factory=dict)
    has_self_loop: bool = False


@dataclass(frozen=True, slots=True)
class _Columns:
    """Aligned columns of the edges still in play; of a bidirected edge the source is the lower index."""

    places: IntArray
    sources: IntArray
    targets: IntArray
    are_bidirected: BoolArray

    def __getitem__(self, wanted: BoolArray | IntArray) -> _Columns:
        return _Columns(
            self.places[wanted], self.sources[wanted], self.targets[wanted], self.are_bidirected[wanted]
        )


def read_edges(values: Sequence[object], nodes: NodeList, faults: list[Fault]) -> EdgeList:
    """The edges that a parsed list describes; what is wrong with it is added to ``faults``."""
    keys = check_attributes(values, "edges", EDGE_MEMBERS, faults)
    columns = _columns(values, keys, nodes, faults)
    columns, has_self_loop = _without_self_loops(columns, nodes, faults)
    columns = _sorted_without_repeats(columns, nodes, faults)
    edges = _split(columns)
    edges.has_self_loop = has_self_loop
    if keys & {"doubtful", "note"}:
        _read_remarks(values, columns, edges, faults)
    return edges


def _columns(values: Sequence[Any], keys: set[str], nodes: NodeList, faults: list[Fault]) -> _Columns:
    """The edges as columns: by whole lists where nothing is wrong, else one by one with a fault for each."""
    try:
        sources = list(map(nodes.index.__getitem__, map(itemgetter("source"), values)))
        targets = list(map(nodes.index.__getitem__, map(itemgetter("target"), values)))
        kinds = [value.get("kind", "directed") for value in values] if "kind" in keys else []
    except (KeyError, TypeError, AttributeError):
        return _columns_one_by_one(values, nodes, faults)
    if not all(kind in KINDS for kind in kinds):
        return _columns_one_by_one(values, nodes, faults)
    return _as_columns(np.arange(len(values)), sources, targets, kinds)


def _as_columns(places: IntArray, sources: list[int], targets: list[int], kinds: list[str]) -> _Columns:
    firsts, seconds = np.array(sources, dtype=np.int64), np.array(targets, dtype=np.int64)
    if not kinds:
        return _Columns(places, firsts, seconds, np.zeros(len(places), dtype=np.bool_))
    bidirected = np.array([kind == "bidirected" for kind in kinds])
    swapped = bidirected & (firsts > seconds)
    return _Columns(
        places, np.where(swapped, seconds, firsts), np.where(swapped, firsts, seconds), bidirected
    )


def _columns_one_by_one(values: Sequence[object], nodes: NodeList, faults: list[Fault]) -> _Columns:
    good: list[tuple[int, int, int, str]] = []
    for place, value in enumerate(values):
        wrong = _edge_faults(place, value, nodes, faults)
        faults.extend(wrong)
        if not wrong and isinstance(value, dict):
            ends = nodes.index[value["source"]], nodes.index[value["target"]]
            good.append((place, *ends, value.get("kind", "directed")))
    places = np.array([place for place, *_ in good], dtype=np.int64)
    return _as_columns(
        places, [edge[1] for edge in good], [edge[2] for edge in good], [edge[3] for edge in good]
    )


def _edge_faults(place: int, value: object, nodes: NodeList, before: Sized) -> list[Fault]:
    at: Place = ("edges", place)
    if not isinstance(value, dict):
        return [
            Fault(
                "invalid-request", at, f"an edge is an object with source and target, not {json_type(value)}"
            )
        ]
    wrong = [fault for end in ("source", "target") for fault in _end_faults(at, end, value, nodes, before)]
    kind = value.get("kind", "directed")
    if kind not in KINDS:
        wrong.append(Fault("invalid-request", (*at, "kind"), '"kind" is "directed" or "bidirected"'))
    return wrong


def _end_faults(
    at: Place, end: str, value: Mapping[str, object], nodes: NodeList, before: Sized
) -> list[Fault]:
    if end not in value:
        return [Fault("invalid-request", at, f'an edge needs the member "{end}"')]
    name = value[end]
    fault = name_fault(name, (*at, end))
    if fault is not None:
        return [fault]
    if name in nodes.index:
        return []
    detail = f"no node is declared as {quoted(str(name))}{hint_within(before, str(name), nodes.names)}"
    return [Fault("unknown-node", (*at, end), detail, (str(name),), rule="undeclared-node")]


def _without_self_loops(columns: _Columns, nodes: NodeList, faults: list[Fault]) -> tuple[_Columns, bool]:
    loops = columns.sources == columns.targets
    if not loops.any():
        return columns, False
    looping = columns[loops]
    for place, node in zip(looping.places.tolist(), looping.sources.tolist(), strict=True):
        name = nodes.names[node]
        detail = f"the edge joins {quoted(name)} to itself"
        faults.append(Fault("invalid-graph", ("edges", place), detail, (name,), rule="self-loop"))
    return columns[~loops], not looping.are_bidirected.all()


def _sorted_without_repeats(columns: _Columns, nodes: NodeList, faults: list[Fault]) -> _Columns:
    size = len(nodes.names)
    keys = (columns.are_bidirected * size + columns.sources) * size + columns.targets
    order = np.argsort(keys)
    in_order = keys[order]
    if not (in_order[1:] == in_order[:-1]).any():
        return columns[order]
    # Of equal edges the first one stays, which only a stable sort can tell.
    order = np.argsort(keys, kind="stable")
    columns, keys = columns[order], keys[order]
    repeats = np.zeros(len(keys), dtype=np.bool_)
    repeats[1:] = keys[1:] == keys[:-1]
    repeated = columns[repeats]
    for place, source, target in sorted(
        zip(repeated.places.tolist(), repeated.sources.tolist(), repeated.targets.tolist(), strict=True)
    ):
        ends = (nodes.names[source], nodes.names[target])
        detail = f"the edge between {quoted(ends[0])} and {quoted(ends[1])} is already there"
        faults.append(Fault("invalid-graph", ("edges", place), detail, ends, rule="repeated-edge"))
    return columns[~repeats]


def _split(columns: _Columns) -> EdgeList:
    arrows, bows = columns[~columns.are_bidirected], columns[columns.are_bidirected]
    return EdgeList(
        sources=arrows.sources,
        targets=arrows.targets,
        places=arrows.places,
        lower_ends=bows.sources,
        upper_ends=bows.targets,
    )


def _read_remarks(values: Sequence[object], columns: _Columns, edges: EdgeList, faults: list[Fault]) -> None:
    kinds = np.where(columns.are_bidirected, "bidirected", "directed").tolist()
    listed = zip(kinds, columns.sources.tolist(), columns.targets.tolist(), strict=True)
    edge_at: dict[int, Edge] = dict(zip(columns.places.tolist(), listed, strict=True))
    doubtful: set[Edge] = set()
    notes: dict[Edge, str] = {}
    for place, value in enumerate(values):
        if not isinstance(value, dict):
            continue
        doubt, note = value.get("doubtful", False), value.get("note")
        if not isinstance(doubt, bool):
            faults.append(
                Fault("invalid-request", ("edges", place, "doubtful"), '"doubtful" is true or false')
            )
        if "note" in value and not isinstance(note, str):
            faults.append(Fault("invalid-request", ("edges", place, "note"), '"note" is a string'))
        edge = edge_at.get(place)
        if edge is not None and doubt is True:
            doubtful.add(edge)
        if edge is not None and isinstance(note, str):
            notes[edge] = note
    edges.doubtful, edges.notes = frozenset(doubtful), notes
