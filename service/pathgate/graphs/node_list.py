"""Reads the list of nodes: names, and what is said about each.

Names are checked as a set; only nodes that carry more than a name are visited one by one.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from operator import itemgetter
from typing import Any

from pathgate.graphs.errors import Fault
from pathgate.graphs.masks import mask_of
from pathgate.graphs.names import did_you_mean, misspelt_member, quoted

NODE_MEMBERS = ("id", "measured", "cost", "recorded", "constant_within", "columns")
MAX_NAME = 200


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


def _are_good_names(ids: Sequence[object]) -> bool:
    return not ids or (
        set(map(type, ids)) == {str} and "" not in ids and max(map(len, ids)) <= MAX_NAME  # type: ignore[arg-type] # all are strings by now
    )


def _good_id(place: int, value: object, faults: list[Fault]) -> str:
    """The node's id, or the empty string and a fault."""
    at: tuple[str | int, ...] = ("nodes", place)
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


def name_fault(value: object, place: tuple[str | int, ...]) -> Fault | None:
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
    readers: dict[str, Callable[[int, object], str | None]] = {
        "measured": lambda node, said: _read_measured(node, said, unmeasured),
        "cost": lambda node, said: _read_cost(node, said, nodes),
        "recorded": lambda node, said: _read_recorded(node, said, nodes),
        "constant_within": lambda node, said: _read_constant_within(node, said, nodes),
        "columns": lambda node, said: _read_aliases(node, said, nodes),
    }
    for member, reader in readers.items():
        if member in keys:
            for place, value in enumerate(values):
                if isinstance(value, dict) and member in value:
                    wrong = reader(place, value[member])
                    if wrong is not None:
                        faults.append(_attribute_fault(place, member, wrong, nodes))
    nodes.measured = ((1 << len(nodes.names)) - 1) & ~mask_of(unmeasured)


def _attribute_fault(place: int, member: str, wrong: str, nodes: NodeList) -> Fault:
    columns = (nodes.names[place],) if nodes.names[place] else ()
    if wrong.startswith("names "):
        return Fault("unknown-node", ("nodes", place, member), wrong, columns, rule="undeclared-node")
    if wrong.startswith("the name "):
        return Fault("invalid-graph", ("nodes", place, member), wrong, columns, rule="ambiguous-name")
    return Fault("invalid-request", ("nodes", place, member), wrong, columns)


def _read_measured(node: int, said: object, unmeasured: list[int]) -> str | None:
    if not isinstance(said, bool):
        return f'"measured" is true or false, not {json_type(said)}'
    if not said:
        unmeasured.append(node)
    return None


def _read_cost(node: int, said: object, nodes: NodeList) -> str | None:
    if isinstance(said, bool) or not isinstance(said, int | float):
        return f'"cost" is a number, not {json_type(said)}'
    try:
        cost = float(said)
    except OverflowError:
        cost = math.inf
    if not (0 < cost < math.inf):
        return '"cost" must be greater than 0 and finite'
    if cost != 1:
        nodes.costs[node] = cost
    return None


def _read_recorded(node: int, said: object, nodes: NodeList) -> str | None:
    if isinstance(said, bool) or not isinstance(said, int | float):
        return f'"recorded" is a whole number, not {json_type(said)}'
    if said != said // 1:
        return '"recorded" must be a whole number'
    nodes.recorded[node] = int(said)
    return None


def _read_constant_within(node: int, said: object, nodes: NodeList) -> str | None:
    if not isinstance(said, list) or not all(isinstance(name, str) for name in said):
        return '"constant_within" is a list of names'
    unknown = [name for name in said if name not in nodes.index]
    if unknown:
        return f"names {quoted(unknown[0])}, which no node bears{did_you_mean(unknown[0], nodes.names)}"
    nodes.constant_within[node] = tuple(nodes.index[name] for name in dict.fromkeys(said))
    return None


def _read_aliases(node: int, said: object, nodes: NodeList) -> str | None:
    if not isinstance(said, list) or any(name_fault(name, ()) for name in said):
        return f'"columns" is a list of names of 1 to {MAX_NAME} characters'
    for name in said:
        owner = nodes.index.get(name, nodes.aliases.get(name, node))
        if owner != node:
            return f"the name {quoted(name)} already belongs to {quoted(nodes.names[owner])}"
        nodes.aliases[name] = node
    return None
