"""What does a file named on the command line hold, and where in it does each value stand?

JSON is read as strictly as over HTTP, and YAML to the same values. A file that cannot be read is one
``Unreadable`` with a sentence; who asked decides what becomes of the others.
"""

from __future__ import annotations

import os
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import Any

from pathgate.cli.json_spots import json_map
from pathgate.cli.spots import Map
from pathgate.cli.yaml_text import NotYaml, read_yaml_and_places
from pathgate.web.body import read_json
from pathgate.web.json_faults import NotJson
from pathgate.web.settings import Settings, environment_name

_YAML_SUFFIXES = (".yaml", ".yml")
SUFFIXES = (".json", *_YAML_SUFFIXES)


class Unreadable(Exception):
    """A file that gives no value; ``place`` is the line and column of the fault where it was read at all."""

    def __init__(self, detail: str, place: tuple[int, int] | None = None) -> None:
        super().__init__(detail)
        self.detail = detail
        self.place = place


@dataclass(frozen=True, eq=False)
class Source:
    """A file that was read.

    Attributes:
        path: as it was named.
        value: what it holds.
        text: all of it.
        mapped: the places of its values, where reading found them on the way.
    """

    path: Path
    value: Any
    text: str
    mapped: Map | None = None

    @cached_property
    def where(self) -> Map:
        """Where its values stand."""
        return self.mapped or json_map(self.text)


def shown(path: Path) -> str:
    """A path as text that can be written anywhere, whatever bytes it is made of."""
    return os.fsencode(path).decode("utf-8", "replace")


def read_file(path: Path, settings: Settings) -> Source:
    """The value that a file holds: YAML by its suffix, else JSON.

    Raises:
        Unreadable: it cannot be read, is larger than ``settings`` allow, or holds no such value.
    """
    content = _content(path, settings.max_body_bytes)
    try:
        if path.suffix.lower() in _YAML_SUFFIXES:
            text = _text(content)
            value, where = read_yaml_and_places(text, settings.max_depth)
            return Source(path, value, text, where)
        return Source(path, read_json(content, settings.max_depth), content.decode())
    except NotYaml as error:
        raise Unreadable(f"no YAML: {error}", (error.line, error.column)) from None
    except NotJson as error:
        raise Unreadable(f"no JSON: {error}", (error.line, error.column)) from None


def _content(path: Path, most: int) -> bytes:
    try:
        with path.open("rb") as file:
            content = file.read(most + 1)
    except IsADirectoryError:
        kinds = ", ".join(f"*{suffix}" for suffix in SUFFIXES)
        raise Unreadable(f"a folder without a config that can be read ({kinds})") from None
    except FileNotFoundError as error:
        is_pattern = any(mark in str(path) for mark in "*?[")
        raise Unreadable("no JSON or YAML file matches" if is_pattern else _reason(error)) from None
    except OSError as error:
        raise Unreadable(_reason(error)) from None
    if len(content) > most:
        limit = environment_name("max_body_bytes")
        raise Unreadable(f"larger than {most:,} bytes, the limit in force ({limit})")
    return content


def _reason(error: OSError) -> str:
    return (error.strerror or str(error)).lower()


def _text(content: bytes) -> str:
    try:
        return content.decode("utf-8")
    except UnicodeDecodeError as error:
        line = content.count(b"\n", 0, error.start) + 1
        column = error.start - (content.rfind(b"\n", 0, error.start) + 1) + 1
        raise NotYaml("a byte that is no UTF-8", line, column) from None
