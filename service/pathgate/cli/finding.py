"""Which configs do the files hold? Every name and every file counts for at least one, readable or not."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from pathgate.cli.files import Source, Unreadable, read_file, shown
from pathgate.cli.naming import config_files
from pathgate.cli.run import Fault, Place
from pathgate.cli.spots import Region, steps_of
from pathgate.web.problems import Problem
from pathgate.web.settings import Settings

Json = dict[str, Any]


@dataclass(frozen=True, slots=True, eq=False)
class Found:
    """A config as it was found.

    Attributes:
        file: where it was looked for.
        config: the value that should be a config.
        source: the file as it was read; None where it could not be.
        steps: from the file's value to the config.
        unreadable: why there is no value.
    """

    file: Path
    config: Any = None
    source: Source | None = None
    steps: tuple[str, ...] = ()
    unreadable: Unreadable | None = None

    @property
    def own_name(self) -> str:
        """What it calls itself; empty where it does not."""
        said = self.config.get("name") if isinstance(self.config, Mapping) else None
        return said if isinstance(said, str) else ""

    @property
    def name(self) -> str:
        """What it is called: by itself, else by where it stands."""
        return self.own_name or "#/".join([shown(self.file), *self.steps])

    def place(self, pointer: str = "#", part: object = None) -> Place:
        """Where a value of it stands, by a pointer from ``#/config`` or ``#/configs/3`` on."""
        if self.unreadable and self.unreadable.place:
            return Place(self.file, Region(*self.unreadable.place))
        if self.source is None:
            return Place(self.file)
        steps = steps_of(pointer)
        below = steps[2:] if steps[:1] == ("configs",) else steps[1:]
        return Place(self.file, self.source.where.region((*self.steps, *below), part))


def find_configs(paths: Iterable[Path], graph: Path, settings: Settings) -> Iterator[Found]:
    """Every config that the paths stand for, in order."""
    for file in config_files(paths, graph):
        try:
            source = read_file(file, settings)
        except Unreadable as error:
            yield Found(file, unreadable=error)
            continue
        if source.value == []:
            yield Found(file, unreadable=Unreadable("an empty list holds no config"))
        elif isinstance(source.value, list):
            for index, config in enumerate(source.value):
                yield Found(file, config, source, (str(index),))
        else:
            yield Found(file, source.value, source)


def unreadable_problem(file: Path, error: Unreadable, title: str = "The file could not be read") -> Json:
    """The problem that a file is from which no value comes."""
    detail = f"{shown(file)}: {error.detail}"
    if error.place is not None:
        line, column = error.place
        return problem_document(Problem.of("not-json", detail, line=line, column=column), Settings())
    return plain_problem(title, detail)


def plain_problem(title: str, detail: str) -> Json:
    """A problem that does not occur over HTTP, where nothing is read from files: a type without a page of its own."""
    return {"type": "about:blank", "title": title, "status": 400, "detail": detail, "retryable": False}


def problem_document(problem: Problem, settings: Settings) -> Json:
    """The document of a problem that no request had."""
    members = problem.members("", settings.max_errors)
    del members["instance"]
    return members


def faults_of(problem: Json, found: Found) -> tuple[Fault, ...]:
    """Each fault that a problem names, with its place in the file; the problem's own sentence where it names none."""
    errors = problem.get("errors", ())
    if not errors:
        return (Fault(problem["detail"], found.place()),)
    faults = [Fault(f"{each['pointer']}: {each['detail']}", found.place(each["pointer"])) for each in errors]
    omitted = problem.get("errors_omitted", 0)
    return (*faults, *([Fault(f"{omitted:,} more faults", found.place())] if omitted else []))
