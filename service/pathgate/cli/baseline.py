"""Which faults did a team know of when it turned the gate on? They are shown, but only others make it fail.

An entry names a rule, a config by its file and its name, and columns; never a line, so that editing a file above
a fault changes nothing. A file is written as JSON, by the command alone and only when told to.
"""

from __future__ import annotations

import os
from collections import Counter
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from pathgate.cli.files import Unreadable, read_file, shown
from pathgate.cli.writing import json_bytes, write_whole
from pathgate.web.settings import Settings

_MEMBER, _VERSION = "pathgate_baseline", 1
_TEXTS = ("rule", "file", "config")


@dataclass(frozen=True, slots=True, order=True)
class Entry:
    """A fault that was known.

    Attributes:
        file: seen from the folder of the baseline, with ``/`` between folders.
        config: what the config calls itself; empty where it has no name.
        rule: the rule that is broken.
        columns: the columns to blame, sorted.
    """

    file: str
    config: str
    rule: str
    columns: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Baseline:
    """The faults known, and how often each: two configs of one name must not hide behind one entry."""

    path: Path
    known: Counter[Entry]

    def entry(self, file: Path, config: str, rule: str, columns: Iterable[str]) -> Entry:
        """The entry that a finding in ``file`` would have here."""
        beside = os.path.relpath(os.path.realpath(file), os.path.realpath(self.path.parent))
        return Entry(Path(shown(Path(beside))).as_posix(), config, rule, tuple(sorted(columns)))

    def file_of(self, entry: Entry) -> Path:
        """Where the file of an entry would be."""
        return self.path.parent / entry.file

    def write(self) -> None:
        """Put it into its file, whole or not at all."""
        listed = [
            {"rule": entry.rule, "file": entry.file, "config": entry.config, "columns": list(entry.columns)}
            | ({"times": times} if times > 1 else {})
            for entry, times in sorted(self.known.items())
        ]
        write_whole(self.path, json_bytes({_MEMBER: _VERSION, "findings": listed}))


def read_baseline(path: Path, settings: Settings) -> Baseline:
    """The baseline that a file holds.

    Raises:
        Unreadable: it holds none, or is damaged anywhere: half a baseline would let through or hold up at random.
    """
    value = read_file(path, settings).value
    if not isinstance(value, dict) or value.keys() != {_MEMBER, "findings"}:
        raise Unreadable(f"no baseline: it has to hold {_MEMBER} and findings, and nothing else")
    if value[_MEMBER] != _VERSION or not isinstance(value["findings"], list):
        raise Unreadable(f"no baseline of version {_VERSION} with a list of findings")
    known: Counter[Entry] = Counter()
    for place, said in enumerate(value["findings"]):
        entry, times = _entry(said, place)
        if entry in known:
            raise Unreadable(f"damaged: #/findings/{place} stands there twice")
        known[entry] = times
    return Baseline(path, known)


def _entry(said: Any, place: int) -> tuple[Entry, int]:
    if not isinstance(said, Mapping) or said.keys() - {"times"} != {*_TEXTS, "columns"}:
        members = ", ".join([*_TEXTS, "columns"])
        raise Unreadable(f"damaged: #/findings/{place} has to hold {members}, and nothing else but times")
    columns, times = said["columns"], said.get("times", 1)
    are_texts = all(isinstance(said[member], str) for member in _TEXTS)
    if not are_texts or not isinstance(columns, list) or not all(isinstance(each, str) for each in columns):
        raise Unreadable(f"damaged: #/findings/{place} holds something else than text")
    if type(times) is not int or times < 1:
        raise Unreadable(f"damaged: #/findings/{place}/times is no count")
    return Entry(said["file"], said["config"], said["rule"], tuple(sorted(columns))), times
