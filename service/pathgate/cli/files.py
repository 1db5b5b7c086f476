"""Which values do the files named on the command line hold?

JSON is read as strictly as over HTTP, and YAML to the same values. A file that cannot be read is one
``Unreadable`` with a sentence; who asked decides what becomes of the others.
"""

from __future__ import annotations

import os
from collections.abc import Iterable, Iterator
from pathlib import Path
from typing import Any

from pathgate.cli.yaml_text import NotYaml, read_yaml
from pathgate.web.body import read_json
from pathgate.web.json_faults import NotJson
from pathgate.web.settings import Settings, environment_name

_YAML_SUFFIXES = (".yaml", ".yml")
_SUFFIXES = (".json", *_YAML_SUFFIXES)


class Unreadable(Exception):
    """A file that gives no value; ``place`` is the line and column of the fault where it was read at all."""

    def __init__(self, detail: str, place: tuple[int, int] | None = None) -> None:
        super().__init__(detail)
        self.detail = detail
        self.place = place


def shown(path: Path) -> str:
    """A path as text that can be written anywhere, whatever bytes it is made of."""
    return os.fsencode(path).decode("utf-8", "replace")


def read_file(path: Path, settings: Settings) -> Any:
    """The value that a file holds: YAML by its suffix, else JSON.

    Raises:
        Unreadable: it cannot be read, is larger than ``settings`` allow, or holds no such value.
    """
    content = _content(path, settings.max_body_bytes)
    try:
        if path.suffix.lower() in _YAML_SUFFIXES:
            return read_yaml(_text(content), settings.max_depth)
        return read_json(content, settings.max_depth)
    except NotYaml as error:
        raise Unreadable(f"no YAML: {error}", (error.line, error.column)) from None
    except NotJson as error:
        raise Unreadable(f"no JSON: {error}", (error.line, error.column)) from None


def config_files(paths: Iterable[Path], graph: Path) -> Iterator[Path]:
    """The files that paths stand for: a folder for its JSON and YAML files, the graph's own left out."""
    for path in paths:
        if not path.is_dir():
            yield path
            continue
        # A folder without any is passed on: reading it says what is wrong.
        yield from _held(path, graph) or [path]


def _held(folder: Path, graph: Path) -> list[Path]:
    try:
        found = [each for each in folder.iterdir() if each.suffix.lower() in _SUFFIXES and each.is_file()]
        return sorted(each for each in found if not each.samefile(graph))
    except OSError:
        return []


def _content(path: Path, most: int) -> bytes:
    try:
        with path.open("rb") as file:
            content = file.read(most + 1)
    except IsADirectoryError:
        kinds = ", ".join(f"*{suffix}" for suffix in _SUFFIXES)
        raise Unreadable(f"a folder without a config that can be read ({kinds})") from None
    except OSError as error:
        raise Unreadable((error.strerror or str(error)).lower()) from None
    if len(content) > most:
        limit = environment_name("max_body_bytes")
        raise Unreadable(f"larger than {most:,} bytes, the limit in force ({limit})")
    return content


def _text(content: bytes) -> str:
    try:
        return content.decode("utf-8")
    except UnicodeDecodeError as error:
        line = content.count(b"\n", 0, error.start) + 1
        column = error.start - (content.rfind(b"\n", 0, error.start) + 1) + 1
        raise NotYaml("a byte that is no UTF-8", line, column) from None
