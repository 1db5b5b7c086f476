"""Reads the list of edges into arrays of node indices.

Ends are looked up and compared as whole columns; single edges are visited only to say what is wrong with
them, or to read the few members most edges lack.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np

from pathgate.graphs.errors import Fault
from pathgate.graphs.graph import Edge
from pathgate.graphs.masks import IntArray
from pathgate.graphs.names import did_you_mean, quoted
from pathgate.graphs.node_list import NodeList, check_attributes, json_type, name_fault

EDGE_MEMBERS = ("source", "target", "kind", "doubtful", "note", "key")
KINDS = ("directed", "bidirected")


def _empty() -> IntArray:
    return np.empty(0, dtype=np.int64)


@dataclass(slots=True)
class EdgeList:
    """The edges that could be read; ``places`` are the arrows' positions in the input."""

    sources: IntArray = field(default_factory=_empty)
    targets: IntArray = field(default_factory=_empty)
    places: list[int] = field(default_factory=list)
    lower_ends: IntArray = field(default_factory=_empty)
    upper_ends: IntArray = field(default_factory=_empty)
    doubtful: frozenset[Edge] = frozenset()
    notes: Mapping[Edge, str] = field(default_factory=dict)
    has_self_loop: bool = False


@dataclass(frozen=True, slots=True)
class _Columns:
    """Aligned columns of the edges still in play."""

    places: list[int]
    sources: IntArray
    targets: IntArray
    are_bidirected: IntArray

    def kept(self, wanted: np.ndarray[tuple[int], np.dtype[np.bool_]]) -> _Columns:
        places = np.asarray(self.places, dtype=np.int64)[wanted].tolist()
        return _Columns(places, self.sources[wanted], self.targets[wanted], self.are_bidirected[wanted])


def read_edges(values: Sequence[object], nodes: NodeList, faults: list[Fault]) -> EdgeList:
    """The edges that a parsed list describes; what is wrong with it is added to ``faults``."""
    keys = check_attributes(values, "edges", EDGE_MEMBERS, faults)
    columns = _columns(values, keys, nodes, faults)
    columns, has_self_loop = _without_self_loops(columns, nodes, faults)
    columns = _without_repeats(columns, nodes, faults)
    edges = _split(columns)
    edges.has_self_loop = has_self_loop
    if keys & {"doubtful", "note"}:
        _read_remarks(values, columns, edges, faults)
    return edges


def _columns(values: Sequence[object], keys: set[str], nodes: NodeList, faults: list[Fault]) -> _Columns:
    if set(map(type, values)) <= {dict}:
        sources = [value.get("source") for value in values]  # type: ignore[attr-defined] # all are dicts
        targets = [value.get("target") for value in values]  # type: ignore[attr-defined]
        if set(map(type, sources)) | set(map(type, targets)) <= {str}:
            starts = [nodes.index.get(name, -1) for name in sources]
            ends = [nodes.index.get(name, -1) for name in targets]
            kinds = [value.get("kind", "directed") for value in values] if "kind" in keys else []  # type: ignore[attr-defined]
            if -1 not in starts and -1 not in ends and all(kind in KINDS for kind in kinds):
                return _as_columns(list(range(len(values))), starts, ends, kinds)
    return _columns_one_by_one(values, nodes, faults)


def _as_columns(places: list[int], sources: list[int], targets: list[int], kinds: list[str]) -> _Columns:
    bidirected = np.array([kind == "bidirected" for kind in kinds] or np.zeros(len(places)), dtype=np.int64)
    return _Columns(places, np.array(sources, dtype=np.int64), np.array(targets, dtype=np.int64), bidirected)


def _columns_one_by_one(values: Sequence[object], nodes: NodeList, faults: list[Fault]) -> _Columns:
    good: list[tuple[int, int, int, str]] = []
    for place, value in enumerate(values):
        wrong = _edge_faults(place, value, nodes)
        faults.extend(wrong)
        if not wrong and isinstance(value, dict):
            ends = nodes.index[value["source"]], nodes.index[value["target"]]
            good.append((place, *ends, value.get("kind", "directed")))
    places, sources, targets, kinds = map(list, zip(*good, strict=True)) if good else ([], [], [], [])
    return _as_columns(places, sources, targets, kinds)


def _edge_faults(place: int, value: object, nodes: NodeList) -> list[Fault]:
    at: tuple[str | int, ...] = ("edges", place)
    if not isinstance(value, dict):
        return [
            Fault(
                "invalid-request", at, f"an edge is an object with source and target, not {json_type(value)}"
            )
        ]
    wrong = [fault for end in ("source", "target") for fault in _end_faults(at, end, value, nodes)]
    kind = value.get("kind", "directed")
    if kind not in KINDS:
        wrong.append(Fault("invalid-request", (*at, "kind"), '"kind" is "directed" or "bidirected"'))
    return wrong


def _end_faults(
    at: tuple[str | int, ...], end: str, value: Mapping[str, object], nodes: NodeList
) -> list[Fault]:
    if end not in value:
        return [Fault("invalid-request", at, f'an edge needs the member "{end}"')]
    name = value[end]
    fault = name_fault(name, (*at, end))
    if fault is not None:
        return [fault]
    if name in nodes.index:
        return []
    detail = f"no node is declared as {quoted(str(name))}{did_you_mean(str(name), nodes.names)}"
    return [Fault("unknown-node", (*at, end), detail, (str(name),), rule="undeclared-node")]


def _without_self_loops(columns: _Columns, nodes: NodeList, faults: list[Fault]) -> tuple[_Columns, bool]:
    loops = columns.sources == columns.targets
    if not loops.any():
        return columns, False
    looping = columns.kept(loops)
    for place, node in zip(looping.places, looping.sources.tolist(), strict=True):
        name = nodes.names[node]
        detail = f"the edge joins {quoted(name)} to itself"
        faults.append(Fault("invalid-graph", ("edges", place), detail, (name,), rule="self-loop"))
    return columns.kept(~loops), bool((looping.are_bidirected == 0).any())


def _without_repeats(columns: _Columns, nodes: NodeList, faults: list[Fault]) -> _Columns:
    lower = np.minimum(columns.sources, columns.targets)
    upper = np.maximum(columns.sources, columns.targets)
    is_bidirected = columns.are_bidirected == 1
    firsts = np.where(is_bidirected, lower, columns.sources)
    seconds = np.where(is_bidirected, upper, columns.targets)
    keys = (columns.are_bidirected * len(nodes.names) + firsts) * len(nodes.names) + seconds
    _unique, first_at = np.unique(keys, return_index=True)
    if len(first_at) == len(keys):
        return columns
    is_first = np.zeros(len(keys), dtype=np.bool_)
    is_first[first_at] = True
    repeated = columns.kept(~is_first)
    for place, source, target in zip(
        repeated.places, repeated.sources.tolist(), repeated.targets.tolist(), strict=True
    ):
        ends = (nodes.names[source], nodes.names[target])
        detail = f"the edge between {quoted(ends[0])} and {quoted(ends[1])} is already there"
        faults.append(Fault("invalid-graph", ("edges", place), detail, ends, rule="repeated-edge"))
    return columns.kept(is_first)


def _split(columns: _Columns) -> EdgeList:
    is_bidirected = columns.are_bidirected == 1
    arrows = columns.kept(~is_bidirected)
    bows = columns.kept(is_bidirected)
    return EdgeList(
        sources=arrows.sources,
        targets=arrows.targets,
        places=arrows.places,
        lower_ends=np.minimum(bows.sources, bows.targets),
        upper_ends=np.maximum(bows.sources, bows.targets),
    )


def _read_remarks(values: Sequence[object], columns: _Columns, edges: EdgeList, faults: list[Fault]) -> None:
    kinds = dict(zip(columns.places, columns.are_bidirected.tolist(), strict=True))
    ends = dict(
        zip(columns.places, zip(columns.sources.tolist(), columns.targets.tolist(), strict=True), strict=True)
    )
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
        if place in kinds:
            first, second = sorted(ends[place]) if kinds[place] else ends[place]
            edge = (KINDS[kinds[place]], first, second)
            if doubt is True:
                doubtful.add(edge)
            if isinstance(note, str):
                notes[edge] = note
    edges.doubtful, edges.notes = frozenset(doubtful), notes
