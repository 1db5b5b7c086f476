"""What has a project said about its reviews, once for all calls?

``pathgate.toml``, or the table ``tool.pathgate`` of a pyproject.toml, in the working folder or the nearest one above
it that has one. Paths in it count from its own folder. What it says wrongly is refused, all of it at once.
"""

from __future__ import annotations

import os
import tomllib
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from pathgate.cli.choices import FAIL_ON, FORMS

OWN_FILE, SHARED_FILE = "pathgate.toml", "pyproject.toml"


class InvalidProject(Exception):
    """A project file that cannot be used; its text is one line that names every fault."""


@dataclass(frozen=True, slots=True)
class Project:
    """A project file.

    Attributes:
        file: which; None where there is none.
        values: what it sets, by name; paths as seen from the working folder.
    """

    file: Path | None = None
    values: Mapping[str, Any] = field(default_factory=dict)


def find_project(folder: Path) -> Path | None:
    """The project file that holds in a folder.

    Raises:
        InvalidProject: two stand side by side, or one cannot be read.
    """
    for place in (folder, *folder.parents):
        own, shared = place / OWN_FILE, place / SHARED_FILE
        found = [own] if own.is_file() else []
        if shared.is_file() and _table(shared, is_ours=bool(found)) is not None:
            found.append(shared)
        if len(found) > 1:
            message = f"{own} and a table tool.pathgate in {shared.name} beside it: keep one of them"
            raise InvalidProject(message)
        if found:
            return found[0]
    return None


def read_project(file: Path) -> Project:
    """What a project file says.

    Raises:
        InvalidProject: it cannot be read, or says something that means nothing.
    """
    table = _table(file, is_ours=True)
    if table is None:
        raise InvalidProject(f"{file}: there is no table tool.pathgate in it")
    faults: list[str] = []
    values = {}
    for name, said in table.items():
        try:
            values[name] = _reader(name)(said, file.parent)
        except ValueError as error:
            faults.append(f"{name}: {error}")
    if faults:
        raise InvalidProject(f"{file}: {'; '.join(faults)}")
    return Project(file, values)


def _table(file: Path, *, is_ours: bool) -> Mapping[str, Any] | None:
    """The settings in a file; of a pyproject.toml that may not be meant for us, nothing where it is faulty."""
    try:
        content = file.read_bytes()
        value = tomllib.loads(content.decode())
    except OSError as error:
        raise InvalidProject(f"{file}: {(error.strerror or str(error)).lower()}") from None
    except ValueError as error:
        if not is_ours and b"pathgate" not in content:
            return None
        raise InvalidProject(f"{file}: no TOML: {error}") from None
    if file.name != SHARED_FILE:
        return value
    tools = value.get("tool")
    table = tools.get("pathgate") if isinstance(tools, dict) else None
    if table is not None and not isinstance(table, dict):
        raise InvalidProject(f"{file}: tool.pathgate is no table")
    return table


def _reader(name: str) -> Callable[[Any, Path], Any]:
    known = {
        "graph": _path,
        "configs": _paths,
        "outputs": _outputs,
        "dialect": _dialect,
        "fail_on": _fail_on,
        "baseline": _path,
    }
    if name not in known:
        from pathgate.graphs.names import did_you_mean  # noqa: PLC0415 - heavy, and rarely needed

        hint = did_you_mean(name, list(known)) or f" (there are {', '.join(known)})"
        raise ValueError(f"no such setting{hint}")
    return known[name]


def _path(said: Any, folder: Path) -> Path:
    if not isinstance(said, str) or not said:
        raise ValueError("a path is wanted, in quotes")
    # As it is seen from here, so that messages name files as one would open them.
    return Path(said) if Path(said).is_absolute() else Path(os.path.relpath(folder / said))


def _paths(said: Any, folder: Path) -> tuple[Path, ...]:
    listed = [said] if isinstance(said, str) else said
    if not isinstance(listed, list) or not listed:
        raise ValueError("a path, a pattern or a list of them is wanted")
    return tuple(_path(each, folder) for each in listed)


def _outputs(said: Any, folder: Path) -> dict[str, Path]:
    if not isinstance(said, dict):
        raise ValueError(f"a table from form to path is wanted (forms: {', '.join(FORMS)})")  # noqa: TRY004
    for form in said:
        _one_of(form, FORMS)
    return {form: _path(path, folder) for form, path in said.items()}


def _dialect(said: Any, _folder: Path) -> str:
    from pathgate.review.schema import DIALECTS  # noqa: PLC0415 - heavy, and rarely needed

    return _one_of(said, DIALECTS)


def _fail_on(said: Any, _folder: Path) -> str:
    return _one_of(said, FAIL_ON)


def _one_of(said: Any, known: tuple[str, ...]) -> str:
    if not isinstance(said, str) or said not in known:
        from pathgate.graphs.names import did_you_mean  # noqa: PLC0415

        hint = did_you_mean(said, known) if isinstance(said, str) else ""
        raise ValueError(f"{said!r} is none of {', '.join(known)}{hint}")
    return said
