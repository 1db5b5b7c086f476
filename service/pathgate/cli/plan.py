"""What is one call of ``pathgate review`` to do, and who said so: its own words, the project file, or nobody?"""

from __future__ import annotations

import json
import os
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from pathgate.cli.project import Project
from pathgate.review.visible import visible


class NotPlanned(Exception):
    """A call that leaves open what to do; its text is one line."""


@dataclass(frozen=True, slots=True)
class Setting:
    """A value, and the file, option or default that set it."""

    value: Any
    said_by: str


_DEFAULTS: Mapping[str, Any] = {
    "graph": None,
    "configs": (),
    "outputs": {},
    "dialect": None,
    "fail_on": "error",
    "baseline": None,
}


@dataclass(frozen=True, slots=True)
class Plan:
    """The settings in force, by name, each with who set it; ``root`` is where the project is."""

    settings: Mapping[str, Setting]
    root: Path

    def value(self, name: str) -> Any:
        """What is in force."""
        return self.settings[name].value

    def shown(self) -> str:
        """All of them, a line each, as the project file would say them, with who set them."""
        return "\n".join(self._lines()) + "\n"

    def check(self) -> None:
        """Go on where they say all that is needed.

        Raises:
            NotPlanned: nobody said which graph, or which configs, or a document is to be written over another file.
        """
        _check(self.settings)

    def _lines(self) -> Iterator[str]:
        for name, setting in self.settings.items():
            if name == "outputs":
                outputs = setting.value or {None: Setting(None, setting.said_by)}
                for form, output in outputs.items():
                    yield _line(f"outputs.{form}" if form else name, output)
            else:
                yield _line(name, setting)


def make_plan(words: Mapping[str, tuple[Any, str]], project: Project, folder: Path) -> Plan:
    """The settings in force.

    Args:
        words: by name, what the call itself says and under which option; what it leaves open is not there.
        project: the project file.
        folder: the working folder.
    """
    file = os.path.relpath(project.file) if project.file else ""
    settings = {}
    for name, default in _DEFAULTS.items():
        said = words.get(name)
        if name == "outputs":
            settings[name] = _outputs(said, project, file)
        elif said is not None:
            settings[name] = Setting(*said)
        elif name in project.values:
            settings[name] = Setting(project.values[name], file)
        else:
            settings[name] = Setting(default, "default")
    return Plan(settings, project.file.parent if project.file else folder)


def _outputs(said: tuple[Any, str] | None, project: Project, file: str) -> Setting:
    """Form → setting: the call adds to what the project has, and changes it form by form."""
    listed = {form: Setting(path, file) for form, path in project.values.get("outputs", {}).items()}
    if said is not None:
        listed |= {form: Setting(path, said[1]) for form, path in said[0].items()}
    return Setting(listed, "default")


def _check(settings: Mapping[str, Setting]) -> None:
    for name, what in (("graph", "GRAPH"), ("configs", "CONFIG")):
        if not settings[name].value:
            raise NotPlanned(f"no {what}: name it, or set {name} in pathgate.toml (pathgate new writes one)")
    taken: dict[str, str] = {}
    inputs = {"the graph": settings["graph"], "the baseline": settings["baseline"]}
    for what, setting in inputs.items():
        if setting.value:
            taken[os.path.realpath(setting.value)] = what
    for form, output in settings["outputs"].value.items():
        real = os.path.realpath(output.value)
        if real in taken:
            raise NotPlanned(f"the output {form} would be written over {taken[real]}: {output.value}")
        taken[real] = f"the output {form}"


def _line(name: str, setting: Setting) -> str:
    return visible(f"{name} = {_toml(setting.value)}  # {setting.said_by}")


def _toml(value: Any) -> str:
    if value is None:
        return "(none)"
    if isinstance(value, tuple):
        return f"[{', '.join(map(_toml, value))}]"
    return json.dumps(str(value), ensure_ascii=False)
