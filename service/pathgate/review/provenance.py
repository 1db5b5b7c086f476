"""Which graph and which config was a verdict given on? Digests that name them, and the version that judged.

A digest is SHA-256 over the RFC 8785 form of what is read, with defaults filled in, so that it stays the same where
nothing that is read differs: neither the order of members, nodes and edges nor attributes of the caller's own count.
Linear in graph and config, but for sorting. Nothing is kept from one call to the next.
"""

from __future__ import annotations

import hashlib
import re
from collections import defaultdict
from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from typing import Any

import msgspec
import numpy as np
import rfc8785

from pathgate.graphs.graph import CausalGraph, Edge
from pathgate.graphs.masks import IntArray
from pathgate.review.schema import STANDARD_DIALECT
from pathgate.version import VERSION

Json = dict[str, Any]

# Beyond these, doubles (all that RFC 8785 knows of numbers) skip whole numbers.
_FIRST_UNSAFE = 2**53
# In UTF-8 just these bytes begin a character beyond the basic multilingual plane.
_BEYOND_BASIC_PLANE = re.compile(rb"[\xf0-\xf4]")
_ENCODER = msgspec.json.Encoder(order="sorted")
_NO_REMARK = ("false", "")


def provenance_document(
    graph: CausalGraph, config: Mapping[str, Any], *, known_digest: str | None = None
) -> dict[str, str]:
    """The ``provenance`` of a review: version, digest of the graph, digest of the config as it was written.

    ``graph`` is the team's own, without the columns that a config computes. Whoever reviews many configs against it
    hands over its digest as ``known_digest``.

    Raises:
        ValueError: a text holds a lone surrogate, which no JSON can carry.
    """
    return {
        "version": VERSION,
        "graph_digest": graph_digest(graph) if known_digest is None else known_digest,
        "config_digest": config_digest(config),
    }


def graph_digest(graph: CausalGraph) -> str:
    """``sha256:`` and the digest of all that is read of a graph, in hexadecimal.

    Of nodes: id, measured, cost, recorded, constant_within, columns; of edges: ends, kind, doubtful, note. Attributes
    of the caller's own do not count. Nodes stand by id; edges by kind, source, target, the ends of bidirected ones
    sorted; ``constant_within`` and ``columns`` sorted. All sorting is by UTF-16 units, as RFC 8785 sorts members. A
    ``recorded`` that a double cannot hold exactly is written as a string.

    >>> bare, said = {"nodes": ["rain"], "edges": []}, {"nodes": [{"id": "rain", "cost": 1.0}], "edges": []}
    >>> from pathgate.graphs.reading import read_graph
    >>> graph_digest(read_graph(bare)) == graph_digest(read_graph(said))
    True
    """
    return _digest(_graph_form(graph).encode())


def _graph_form(graph: CausalGraph) -> str:
    """The RFC 8785 form itself, put together from pieces: a fraction of the time that objects would take."""
    order = sorted(range(graph.size), key=_sort_key(graph.names, graph.names.__getitem__))
    texts = [_text(graph.names[node]) for node in order]
    edges, nodes = _edges(graph, order, texts), _nodes(graph, order, texts)
    return f'{{"edges":[{",".join(edges)}],"nodes":[{",".join(nodes)}]}}'


def _text(text: str) -> str:
    return _ENCODER.encode(text).decode()


def _nodes(graph: CausalGraph, order: Sequence[int], texts: Sequence[str]) -> Iterator[str]:
    aliases: dict[int, list[str]] = defaultdict(list)
    for alias, owner in graph.aliases.items():
        aliases[owner].append(alias)
    for node, text in zip(order, texts, strict=True):
        columns = _set_text(aliases[node]) if node in aliases else "[]"
        within = graph.constant_within.get(node)
        constant = _set_text([graph.names[each] for each in within]) if within else "[]"
        cost = rfc8785.dumps(graph.costs[node]).decode() if node in graph.costs else "1"
        measured = "true" if graph.measured >> node & 1 else "false"
        recorded = f',"recorded":{_moment(graph.recorded[node])}' if node in graph.recorded else ""
        yield (
            f'{{"columns":{columns},"constant_within":{constant},"cost":{cost},"id":{text},"measured":{measured}'
            f"{recorded}}}"
        )


def _set_text(names: Sequence[str]) -> str:
    return f"[{','.join(map(_text, _set(names)))}]"


def _moment(recorded: int) -> str:
    return str(recorded) if abs(recorded) < _FIRST_UNSAFE else f'"{recorded}"'


def _edges(graph: CausalGraph, order: Sequence[int], texts: Sequence[str]) -> list[str]:
    rank = np.empty(graph.size, dtype=np.int64)
    rank[order] = np.arange(graph.size)
    lower, upper = rank[graph.lower_ends], rank[graph.upper_ends]
    bows = _sorted_pairs(np.minimum(lower, upper), np.maximum(lower, upper))
    arrows = _sorted_pairs(rank[graph.sources], rank[graph.targets])
    remarks = _remarks(graph, rank.tolist()) if graph.doubtful or graph.notes else {}
    return [
        f'{{"doubtful":{doubtful},"kind":"{kind}",{note}"source":{texts[first]},"target":{texts[second]}}}'
        for kind, pairs in (("bidirected", bows), ("directed", arrows))
        for first, second in pairs
        for doubtful, note in (remarks.get((kind, first, second), _NO_REMARK) if remarks else _NO_REMARK,)
    ]


def _sorted_pairs(firsts: IntArray, seconds: IntArray) -> Iterator[tuple[int, int]]:
    order = np.lexsort((seconds, firsts))
    return zip(firsts[order].tolist(), seconds[order].tolist(), strict=True)


def _remarks(graph: CausalGraph, rank: Sequence[int]) -> dict[Edge, tuple[str, str]]:
    """For the edges of which something is said, by places in the order: are they doubtful, and the note."""
    remarks: dict[Edge, tuple[str, str]] = {}
    for edge in graph.doubtful | graph.notes.keys():
        kind, *ends = edge
        first, second = (rank[end] for end in ends)
        if kind == "bidirected" and first > second:
            first, second = second, first
        note = f'"note":{_text(graph.notes[edge])},' if edge in graph.notes else ""
        remarks[kind, first, second] = ("true" if edge in graph.doubtful else "false", note)
    return remarks


def config_digest(config: Mapping[str, Any]) -> str:
    """``sha256:`` and the digest of a config of the right shape, as it was written, in hexadecimal.

    Left out are ``$schema``, ``name`` and ``meta``. A name and the list of it alone are the same, and lists of names
    are sorted, for they mean sets; so are a member that is left out and its default. SQL and formulas are the text
    that was written. Conditions on the rows and waivers keep their order; bare names of a row filter are the one
    condition that they make up.

    >>> config_digest({"treatment": "delay"}) == config_digest({"asks": "total", "treatment": ["delay"]})
    True
    """
    value = {
        member: _READERS[member](held) if member in _READERS else held
        for member, held in config.items()
        if member not in _LEFT_OUT
    }
    # What is not known here stands as it is, and may hold any number.
    return _digest(_canonical_bytes({**_DEFAULTS, **value}, is_plain=value.keys() <= _KNOWN))


def _sort_key(texts: Iterable[str], text_of: Callable[[Any], str]) -> Callable[[Any], Any]:
    """What to sort by, so that texts come in the order of their UTF-16 units."""
    if "".join(texts).isascii():
        return text_of
    return lambda each: text_of(each).encode("utf-16-be")


def _set(names: str | Iterable[str]) -> list[str]:
    """A name or names as the set they mean, in order."""
    listed = [names] if isinstance(names, str) else list(names)
    return sorted(set(listed), key=_sort_key(listed, str)) if len(listed) > 1 else listed


def _parts(row_filter: str | Sequence[Any]) -> str | list[Json]:
    if isinstance(row_filter, str):
        return row_filter
    bare = [item for item in row_filter if isinstance(item, str)]
    first = next((k for k, item in enumerate(row_filter) if isinstance(item, str)), None)
    return [
        {"columns": _set(bare), "fixed": False}
        if k == first
        else {"columns": _set(item["columns"]), "fixed": item.get("fixed", False)}
        for k, item in enumerate(row_filter)
        if k == first or not isinstance(item, str)
    ]


def _derived(derived: Mapping[str, Mapping[str, Any]]) -> Json:
    return {name: _derivation(said) for name, said in derived.items()}


def _derivation(said: Mapping[str, Any]) -> Json:
    if "from" in said:
        return {"from": _set(said["from"])}
    return {"coarse": False, **said} if "recodes" in said else dict(said)


def _causes(missing: Mapping[str, str | Sequence[str]]) -> Json:
    return {column: _set(causes) for column, causes in missing.items()}


def _waivers(accept: Sequence[Mapping[str, Any]]) -> list[Json]:
    return [
        {
            "why": "",
            "owner": "",
            **waiver,
            **({"columns": _set(waiver["columns"])} if "columns" in waiver else {}),
        }
        for waiver in accept
    ]


_LEFT_OUT = frozenset({"$schema", "name", "meta"})
_SETS = (
    *("treatment", "outcome", "covariates", "fixed_effects", "weighted_by", "matched_on"),
    *("rows_exist_because", "measured_everywhere", "outside_graph"),
)
_READERS: dict[str, Callable[[Any], Any]] = {
    **dict.fromkeys(_SETS, _set),
    "row_filter": _parts,
    "derived": _derived,
    "missing_because": _causes,
    "accept": _waivers,
}
# Outcome and covariates have none: where a formula says them, leaving them out is not saying that there are none.
_DEFAULTS: Json = {
    "asks": "total",
    "population": "kept",
    "dialect": STANDARD_DIALECT,
    "row_filter": [],
    "row_filter_fixed": False,
    "fixed_effects": [],
    "weighted_by": [],
    "matched_on": [],
    "rows_exist_because": [],
    "measured_everywhere": [],
    "outside_graph": [],
    "derived": {},
    "missing_because": {},
    "accept": [],
}
_KNOWN = _DEFAULTS.keys() | _READERS.keys() | {"formula"}


def _digest(form: bytes) -> str:
    return f"sha256:{hashlib.sha256(form).hexdigest()}"


def _canonical_bytes(value: Json, *, is_plain: bool) -> bytes:
    """The RFC 8785 form of a value; ``is_plain`` promises that it holds no number but whole ones exact in doubles.

    Then a native encoder writes the same bytes, and orders members by code points: the order of UTF-16 units
    wherever no character is beyond the basic multilingual plane.
    """
    if is_plain:
        written = _ENCODER.encode(value)
        if written.isascii() or not _BEYOND_BASIC_PLANE.search(written):
            return written
    return rfc8785.dumps(value)
