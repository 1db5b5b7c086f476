"""Which files do the names on a command line or in a project file stand for?

A name is a file, a folder (its JSON and YAML files) or a pattern with ``*``, ``?`` or ``[`` (those among its
matches). The graph's own file is left out, and no file counts twice. A name that stands for nothing is kept, so
that reading it says what is wrong: what was named is never passed over in silence.
"""

from __future__ import annotations

import glob
import os
from collections.abc import Iterable, Iterator
from pathlib import Path

from pathgate.cli.files import SUFFIXES


def config_files(paths: Iterable[Path], graph: Path | None = None) -> Iterator[Path]:
    """The files that paths stand for, in the order of the paths, each folder's in the order of their names."""
    seen: set[str] = set()
    for path in paths:
        for found in _files_of(path, graph):
            # Two names of one file, by whatever way through the folders, are one file.
            real = os.path.realpath(found)
            if real not in seen:
                seen.add(real)
                yield found


def _files_of(path: Path, graph: Path | None) -> list[Path]:
    if path.is_dir():
        return _held(path, graph) or [path]
    if _is_pattern(path):
        # Path.glob takes no pattern from the root, and lets hidden files in.
        matches = map(Path, sorted(glob.glob(str(path), recursive=True)))  # noqa: PTH207
        return [each for each in matches if _is_config(each, graph)] or [path]
    return [path]


def _is_pattern(path: Path) -> bool:
    """Is it no file's name, but one for several?"""
    return glob.has_magic(str(path)) and not os.path.lexists(path)


def _held(folder: Path, graph: Path | None) -> list[Path]:
    try:
        return sorted(each for each in folder.iterdir() if _is_config(each, graph))
    except OSError:
        return []


def _is_config(path: Path, graph: Path | None) -> bool:
    """Is it meant as one? A link that leads nowhere is too: it must not drop out unseen."""
    if path.suffix.lower() not in SUFFIXES or path.is_dir():
        return False
    try:
        return graph is None or not path.samefile(graph)
    except OSError:
        return True
