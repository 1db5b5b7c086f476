"""What can be wrong with a graph, or with a name that should be in it.

A *fault* is one thing wrong at one place of the input; an *error* carries faults to whoever asked. Every
error has a stable slug, the one word that logs, metrics and HTTP problems share.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import ClassVar
from urllib.parse import quote

Place = tuple[str | int, ...]


def pointer(place: Place) -> str:
    """A place as a JSON pointer in URI fragment form (RFC 6901, section 6).

    >>> pointer(("graph", "edges", 3, "a/b c~"))
    '#/graph/edges/3/a~1b%20c~0'
    """
    steps = (str(step).replace("~", "~0").replace("/", "~1") for step in place)
    return "#" + "".join("/" + quote(step, safe="~!$&'()*+,;=:@") for step in steps)


@dataclass(frozen=True, slots=True)
class Fault:
    """One thing wrong with an input.

    Attributes:
        slug: the kind of problem it makes, stable across versions (``"cycle"``, ``"unknown-node"`` …).
        place: the steps from the root of the input to the value at fault.
        detail: one plain sentence.
        columns: the nodes it is about.
        cycle: for a directed cycle, its nodes in order, the first one repeated at the end.
        rule: a finer name where one slug covers several faults (``"self-loop"``); else the slug.
    """

    slug: str
    place: Place
    detail: str
    columns: tuple[str, ...] = ()
    cycle: tuple[str, ...] = ()
    rule: str = ""

    def below(self, prefix: Place) -> Fault:
        """The same fault in an input that holds this one at ``prefix``."""
        return replace(self, place=prefix + self.place)


class PathgateError(Exception):
    """Base of all errors a caller's input can cause; each layer derives its own base from it."""

    slug: ClassVar[str]

    def __init__(self, text: str, **details: object) -> None:
        super().__init__(text)
        self.details: Mapping[str, object] = details


class FaultyInput(PathgateError):
    """Base of the errors that name every fault of an input: ``faults`` holds them, at least one."""

    def __init__(self, faults: Sequence[Fault]) -> None:
        more = f" (and {len(faults) - 1} more)" if len(faults) > 1 else ""
        super().__init__(f"{faults[0].detail}{more}")
        self.faults = tuple(faults)


class GraphError(PathgateError):
    """Base of the errors of this layer."""


class InvalidGraph(FaultyInput, GraphError):
    """The input is not a causal graph; ``faults`` says all that is wrong with it."""

    slug = "invalid-graph"


class UnknownNode(GraphError):
    """Names that no node bears: ``details`` holds the ``nodes`` and the ``nearest`` known name of each."""

    slug = "unknown-node"

    def __init__(self, nodes: Iterable[str], nearest: Mapping[str, str]) -> None:
        names = list(nodes)
        hints = [
            f"{name!r}" + (f" (did you mean {nearest[name]!r}?)" if name in nearest else "") for name in names
        ]
        super().__init__(f"not in the graph: {', '.join(hints)}", nodes=names, nearest=dict(nearest))
