"""Reads YAML 1.2 as what JSON could have said: the same value as any careful reader would see, or none at all.

ruamel.yaml finds the syntax and hands over events; the values are made here, since only here it is plain that
keys are strings that stand once, and that nesting and what aliases stand for are counted while reading: no
file of a few lines grows into gigabytes. O(characters), about 0.1 MB a second.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass, field
from typing import Any

from ruamel.yaml import YAML
from ruamel.yaml.error import MarkedYAMLError, YAMLError
from ruamel.yaml.events import (
    AliasEvent,
    CollectionEndEvent,
    DocumentStartEvent,
    Event,
    MappingStartEvent,
    NodeEvent,
    ScalarEvent,
)
from ruamel.yaml.reader import ReaderError

from pathgate.cli.core_schema import LIST_TAGS, OBJECT_TAGS, TEXT_TAGS, core_value
from pathgate.cli.spots import Map
from pathgate.cli.yaml_spots import YamlSpotting
from pathgate.graphs.names import quoted

# Values that aliases may stand for in one file, all told.
MOST_BY_ALIAS = 100_000

_SURROGATE = re.compile("[\ud800-\udfff]")


class NotYaml(Exception):
    """A text that is not YAML here: a sentence, and the line and column (from 1) of the fault."""

    def __init__(self, detail: str, line: int, column: int) -> None:
        super().__init__(f"{detail} (line {line}, column {column})")
        self.detail = detail
        self.line = line
        self.column = column


def read_yaml(text: str, max_depth: int) -> Any:
    """The value that ``text`` holds.

    Raises:
        NotYaml: it holds none, several, or one that JSON could not say; the fault is named with its place.

    >>> read_yaml("outcome: refund\\nmeta: {since: 2026-01-01, live: no}", max_depth=3)
    {'outcome': 'refund', 'meta': {'since': '2026-01-01', 'live': 'no'}}
    """
    value, _where = read_yaml_and_places(text, max_depth)
    return value


def read_yaml_and_places(text: str, max_depth: int) -> tuple[Any, Map]:
    """The value that ``text`` holds, and where in it each value stands.

    Raises:
        NotYaml: as for ``read_yaml``.
    """
    building, spotting = _Building(max_depth), YamlSpotting(text)
    for event in _events(text):
        building.take(event)
        spotting.take(event)
    if not building.has_value:
        raise NotYaml("the file holds no value", 1, 1)
    return building.value, spotting.map()


def _events(text: str) -> Iterator[Event]:
    line, column = 1, 1
    try:
        for event in YAML(typ="safe", pure=True).parse(text):
            line, column = event.start_mark.line + 1, event.start_mark.column + 1
            yield event
    except ReaderError as error:
        line_start = text.rfind("\n", 0, error.position) + 1
        detail = f"the character U+{ord(text[error.position]):04X} does not belong in a text"
        raise NotYaml(
            detail, text.count("\n", 0, error.position) + 1, error.position - line_start + 1
        ) from None
    except MarkedYAMLError as error:
        mark = error.problem_mark or error.context_mark
        line, column = (mark.line + 1, mark.column + 1) if mark else (line, column)
        raise NotYaml(f"broken syntax: {error.problem or error.context}", line, column) from None
    except (YAMLError, ValueError, OverflowError):
        # The library lets an escape through that names no character, and says no place.
        detail = "broken syntax: what follows cannot be read (an escape that names no character?)"
        raise NotYaml(detail, line, column) from None


@dataclass(frozen=True, slots=True, eq=False)
class _Meant:
    """What an alias stands for: a value, how many values that is in all, and how many levels.

    Not ``is_complete`` while it is still open: then its alias would put it into itself.
    """

    value: Any = None
    size: int = 1
    height: int = 0
    is_complete: bool = True


@dataclass(slots=True)
class _Open:
    """A list or an object that is not complete yet.

    Attributes:
        made: the value so far.
        anchor: the name that aliases call it by, with what that name means until it is complete.
        key: for an object, the key that waits for its value.
        size, height: of what it holds, aliases followed.
    """

    made: list[Any] | dict[str, Any]
    anchor: tuple[str | None, _Meant]
    key: str | None = None
    size: int = 1
    height: int = 1


@dataclass(slots=True)
class _Building:
    """A value being made from events."""

    max_depth: int
    value: Any = None
    has_value: bool = False
    open: list[_Open] = field(default_factory=list)
    anchors: dict[str | None, _Meant] = field(default_factory=dict)
    by_alias: int = 0

    def take(self, event: Event) -> None:
        """Go one event further."""
        if isinstance(event, AliasEvent):
            self._alias(event)
        elif isinstance(event, ScalarEvent):
            meant = _Meant(_scalar(event))
            self.anchors[event.anchor] = meant
            self._put(meant, event)
        elif isinstance(event, NodeEvent):
            self._open(event)
        elif isinstance(event, CollectionEndEvent):
            self._close()
        elif isinstance(event, DocumentStartEvent) and self.has_value:
            raise _fault("a second document begins; a file holds one", event)

    def _open(self, event: Any) -> None:
        is_object = isinstance(event, MappingStartEvent)
        tag = _tag(event)
        if tag not in (OBJECT_TAGS if is_object else LIST_TAGS):
            raise _fault(f"the tag {quoted(tag)} says what JSON cannot", event)
        if len(self.open) >= self.max_depth:
            raise self._too_deep(event)
        opened = _Open({} if is_object else [], (event.anchor, _Meant(is_complete=False)))
        # Counted when it is complete, since its size is not known before.
        self._put(_Meant(opened.made, size=0), event)
        self.anchors[event.anchor] = opened.anchor[1]
        self.open.append(opened)

    def _close(self) -> None:
        done = self.open.pop()
        name, unfinished = done.anchor
        # Its name may have been given to something inside it meanwhile.
        if self.anchors.get(name) is unfinished:
            self.anchors[name] = _Meant(done.made, done.size, done.height)
        if self.open:
            self._count(done.size, done.height)

    def _alias(self, event: AliasEvent) -> None:
        meant = self.anchors.get(event.anchor)
        if meant is None:
            raise _fault(f"nothing is called {quoted(event.anchor)} before this alias", event)
        if not meant.is_complete:
            raise _fault(f"{quoted(event.anchor)} would hold itself", event)
        if len(self.open) + meant.height > self.max_depth:
            raise self._too_deep(event)
        self.by_alias += meant.size
        if self.by_alias > MOST_BY_ALIAS:
            raise _fault(f"aliases stand for more than {MOST_BY_ALIAS:,} values", event)
        self._put(meant, event)

    def _put(self, meant: _Meant, event: Event) -> None:
        """Place a value where it belongs."""
        if not self.open:
            self.value, self.has_value = meant.value, True
            return
        holder = self.open[-1]
        if isinstance(holder.made, list):
            holder.made.append(meant.value)
        elif holder.key is None:
            holder.key = _key(meant.value, holder.made, event)
        else:
            holder.made[holder.key] = meant.value
            holder.key = None
        self._count(meant.size, meant.height)

    def _count(self, size: int, height: int) -> None:
        holder = self.open[-1]
        holder.size += size
        holder.height = max(holder.height, height + 1)

    def _too_deep(self, event: Event) -> NotYaml:
        return _fault(f"nested more than {self.max_depth} levels deep", event)


def _key(value: Any, made: dict[str, Any], event: Event) -> str:
    if not isinstance(value, str):
        raise _fault("a key must be a string; put it in quotes", event)
    if value in made:
        raise _fault(f"the key {quoted(value)} stands twice in one object", event)
    return value


def _scalar(event: ScalarEvent) -> Any:
    text: str = event.value
    if _SURROGATE.search(text):
        raise _fault("a lone surrogate, which is no character", event)
    tag, is_plain = _tag(event), not event.style
    if tag in TEXT_TAGS or (not tag and not is_plain):
        return text
    try:
        return core_value(text, tag)
    except ValueError as error:
        raise _fault(str(error), event) from None


def _tag(event: Any) -> str:
    return str(event.tag) if event.tag else ""


def _fault(detail: str, event: Any) -> NotYaml:
    return NotYaml(detail, event.start_mark.line + 1, event.start_mark.column + 1)
