"""Reads the list of nodes: names, and what is said about each.

Names are checked as a set; only nodes that carry more than a name are visited one by one. O(nodes and whatever is
said of them).
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Sequence, Sized
from dataclasses import dataclass, field
from itertools import islice
from operator import itemgetter
from typing import Any, NamedTuple

from pathgate.graphs.errors import Fault, Place
from pathgate.graphs.masks import mask_of
from pathgate.graphs.names import did_you_mean, hint_within, misspelt_member, quoted

NODE_MEMBERS = ("id", "measured", "cost", "recorded", "constant_within", "columns")
MAX_NAME = 200
# Faults of one graph after which its attributes are no longer looked into: a list in one may be millions long.
MOST_FAULTS = 100_000


@dataclass(slots=True)
class NodeList:
    """The nodes as read; ``index`` finds a node by its id."""

    names: tuple[str, ...] = ()
    index: dict[str, int] = field(default_factory=dict)
    measured: int = 0
    costs: dict[int, float] = field(default_factory=dict)
    recorded: dict[int, int] = field(default_factory=dict)
    constant_within: dict[int, tuple[int, ...]] = field(default_factory=dict)
    aliases: dict[str, int] = field(default_factory=dict)


def read_nodes(values: Sequence[object], faults: list[Fault]) -> NodeList:
    """The nodes that a parsed list describes; what is wrong with it is added to ``faults``.

    A node that cannot be read keeps its place under the empty name, so that indices stay positions.
    """
    ids = _ids(values)
    if not _are_good_names(ids):
        ids = [_good_id(place, value, faults) for place, value in enumerate(values)]
    nodes = NodeList(names=tuple(ids))
    nodes.index = {name: place for place, name in enumerate(nodes.names) if name}
    if len(nodes.index) < len(nodes.names):
        _report_repeats(nodes, faults)
    _read_attributes(values, nodes, faults)
    return nodes


def _ids(values: Sequence[Any]) -> list[Any]:
    """What stands where an id should; whatever else stands there is looked at one by one later."""
    if set(map(type, values)) == {dict}:
        try:
            return list(map(itemgetter("id"), values))
        except KeyError:
            pass
    return [value.get("id") if isinstance(value, dict) else value for value in values]


def check_attributes(
    values: Sequence[object], member: str, known: tuple[str, ...], faults: list[Fault]
) -> set[str]:
    """The keys that occur in a list of objects; near misses of known members are faults, others are free."""
    are_all_objects = set(map(type, values)) <= {dict}
    objects: Any = values if are_all_objects else [value for value in values if isinstance(value, dict)]
    keys = set[str]().union(*objects)
    if not set(map(type, keys)) <= {str}:
        keys = _without_odd_keys(values, member, faults)
    for key in sorted(keys.difference(known)):
        meant = misspelt_member(key, known)
        if meant is not None:
            detail = (
                f"{quoted(key)} is too close to the member {quoted(meant)} to be an attribute of your own"
            )
            faults.extend(
                Fault("invalid-request", (member, place, key), detail)
                for place, value in enumerate(values)
                if isinstance(value, dict) and key in value
            )
    return keys


def _without_odd_keys(values: Sequence[object], member: str, faults: list[Fault]) -> set[str]:
    """The keys that are strings, as all are in JSON; in YAML or in networkx one can be anything."""
    keys = set()
    for place, value in enumerate(values):
        for key in value if isinstance(value, dict) else ():
            if isinstance(key, str):
                keys.add(key)
            else:
                detail = f"the name of an attribute is a string, not {json_type(key)}"
                faults.append(Fault("invalid-request", (member, place), detail))
    return keys


def _are_good_names(ids: Sequence[object]) -> bool:
    return not ids or (
        set(map(type, ids)) == {str} and "" not in ids and max(map(len, ids)) <= MAX_NAME  # type: ignore[arg-type] # all are strings by now
    )


def _good_id(place: int, value: object, faults: list[Fault]) -> str:
    """The node's id, or the empty string and a fault."""
    at: Place = ("nodes", place)
    if isinstance(value, dict):
        if "id" not in value:
            hint = did_you_mean("id", [key for key in value if isinstance(key, str)])
            faults.append(Fault("invalid-request", at, f'a node needs the member "id"{hint}'))
            return ""
        value, at = value["id"], (*at, "id")
    elif not isinstance(value, str):
        faults.append(Fault("invalid-request", at, "a node is a name or an object with the member id"))
        return ""
    fault = name_fault(value, at)
    if fault is None:
        return str(value)
    faults.append(fault)
    return ""


def name_fault(value: object, place: Place) -> Fault | None:
    """Why a value cannot be the name of a node, or None."""
    if not isinstance(value, str):
        return Fault("invalid-request", place, f"a name is a string, not {json_type(value)}")
    if not value:
        return Fault("invalid-request", place, "a name must not be empty")
    if len(value) > MAX_NAME:
        return Fault(
            "invalid-request", place, f"a name has at most {MAX_NAME} characters, this one {len(value)}"
        )
    return None


def json_type(value: object) -> str:
    """What a JSON writer would call a value.

    >>> json_type(True), json_type(3), json_type(None)
    ('a boolean', 'a number', 'null')
    """
    if value is None:
        return "null"
    kinds = ((bool, "a boolean"), (int | float, "a number"), (str, "a string"), (list, "a list"))
    return next((name for kind, name in kinds if isinstance(value, kind)), "an object")


def _report_repeats(nodes: NodeList, faults: list[Fault]) -> None:
    first: dict[str, int] = {}
    for place, name in enumerate(nodes.names):
        if name and first.setdefault(name, place) != place:
            detail = f"the id {quoted(name)} is already that of node {first[name]}"
            faults.append(Fault("invalid-graph", ("nodes", place), detail, (name,), rule="repeated-id"))
    nodes.index.update(first)


def _read_attributes(values: Sequence[object], nodes: NodeList, faults: list[Fault]) -> None:
    keys = check_attributes(values, "nodes", NODE_MEMBERS, faults)
    unmeasured: list[int] = []
    readers: dict[str, Callable[[int, object], Iterable[_Wrong]]] = {
        "measured": lambda node, said: _read_measured(node, said, unmeasured),
        "cost": lambda node, said: _read_cost(node, said, nodes),
        "recorded": lambda node, said: _read_recorded(node, said, nodes),
        "constant_within": lambda node, said: _read_constant_within(node, said, nodes, faults),
        "columns": lambda node, said: _read_aliases(node, said, nodes),
    }
    for member, reader in readers.items():
        if member in keys:
            for place, value in enumerate(values):
                if isinstance(value, dict) and member in value:
                    columns = (nodes.names[place],) if nodes.names[place] else ()
                    left = max(MOST_FAULTS - len(faults), 0)
                    for wrong in islice(reader(place, value[member]), left):
                        at: Place = ("nodes", place, member, *wrong.within)
                        faults.append(Fault(wrong.slug, at, wrong.detail, columns, rule=wrong.rule))
    nodes.measured = ((1 << len(nodes.names)) - 1) & ~mask_of(unmeasured)


class _Wrong(NamedTuple):
    """A fault in what is said of one node; ``within`` leads from the member to the value at fault."""

    detail: str
    within: tuple[int, ...] = ()
    slug: str = "invalid-request"
    rule: str = ""


def _read_measured(node: int, said: object, unmeasured: list[int]) -> Iterable[_Wrong]:
    if not isinstance(said, bool):
        return [_Wrong(f'"measured" is true or false, not {json_type(said)}')]
    if not said:
        unmeasured.append(node)
    return ()


def _read_cost(node: int, said: object, nodes: NodeList) -> Iterable[_Wrong]:
    if isinstance(said, bool) or not isinstance(said, int | float):
        return [_Wrong(f'"cost" is a number, not {json_type(said)}')]
    try:
        cost = float(said)
    except OverflowError:
        cost = math.inf
    if not (0 < cost < math.inf):
        return [_Wrong('"cost" must be greater than 0 and finite')]
    if cost != 1:
        nodes.costs[node] = cost
    return ()


def _read_recorded(node: int, said: object, nodes: NodeList) -> Iterable[_Wrong]:
    if isinstance(said, bool) or not isinstance(said, int | float):
        return [_Wrong(f'"recorded" is a whole number, not {json_type(said)}')]
    if said != said // 1:
        return [_Wrong('"recorded" must be a whole number')]
    nodes.recorded[node] = int(said)
    return ()


def _read_constant_within(node: int, said: object, nodes: NodeList, before: Sized) -> Iterable[_Wrong]:
    if not isinstance(said, list):
        yield _Wrong('"constant_within" is a list of names')
        return
    found: dict[int, None] = {}
    for place, name in enumerate(said):
        if not isinstance(name, str):
            yield _Wrong(f"a name is a string, not {json_type(name)}", (place,))
        elif name in nodes.index:
            found[nodes.index[name]] = None
        else:
            detail = f"no node is declared as {quoted(name)}{hint_within(before, name, nodes.names)}"
            yield _Wrong(detail, (place,), "unknown-node", "undeclared-node")
    nodes.constant_within[node] = tuple(found)


def _read_aliases(node: int, said: object, nodes: NodeList) -> Iterable[_Wrong]:
    if not isinstance(said, list):
        yield _Wrong('"columns" is a list of names')
        return
    for place, name in enumerate(said):
        fault = name_fault(name, ())
        if fault is not None:
            yield _Wrong(fault.detail, (place,))
            continue
        owner = nodes.index.get(name, nodes.aliases.get(name, node))
        if owner == node:
            nodes.aliases[name] = node
        else:
            detail = f"the name {quoted(name)} already belongs to {quoted(nodes.names[owner])}"
            yield _Wrong(detail, (place,), "invalid-graph", "ambiguous-name")
