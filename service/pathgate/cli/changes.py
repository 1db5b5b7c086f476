"""What does replacing one graph's file by another do to the configs in some files?

All that is shown, in whatever format, is taken from ``ChangeRun``. Exit status: 0 no config is broken, 1 some config
is, 2 something could not be judged against the new graph, which outranks 1.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import Any

from pathgate.cli.files import Unreadable, read_file
from pathgate.cli.finding import Found, Json, faults_of, find_configs, problem_document, unreadable_problem
from pathgate.cli.judging import with_dialect, without_schema
from pathgate.cli.reviewing import Stopped
from pathgate.cli.run import FALLS_SHORT, NOT_JUDGED, NOTHING_SHORT, Fault, Place
from pathgate.criteria.deadline import Deadline
from pathgate.criteria.errors import OutOfTime
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.reading import examine_graph
from pathgate.review.changed_promises import lost_and_gained
from pathgate.review.graph_difference import Difference
from pathgate.web.changing import config_entry, difference_document, promise_document
from pathgate.web.problems import refusal
from pathgate.web.settings import Settings

OUTCOMES = ("broken", "mended", "other-reason", "same")


@dataclass(frozen=True, slots=True)
class Item:
    """One config, or one name that stands for none.

    Attributes:
        entry: what /v1/changes says of it.
        place: where it stands.
        faults: why it cannot be judged against the new graph; none where it can.
    """

    entry: Json
    place: Place
    faults: tuple[Fault, ...] = ()

    @property
    def is_judged(self) -> bool:
        """Does the new graph give a verdict on it?"""
        return self.entry["after"] is not None


@dataclass(frozen=True)
class ChangeRun:
    """All configs in order, and all that differs.

    Attributes:
        items: one for each config found, and for each name that stands for none.
        differences: the members of the answer of /v1/changes beside the configs.
        problem: why nothing could be judged at all; then there is nothing else.
        faults: what that problem is, with places.
    """

    items: tuple[Item, ...] = ()
    differences: Json | None = None
    problem: Json | None = None
    faults: tuple[Fault, ...] = ()

    @cached_property
    def counts(self) -> Counter[str]:
        """How many configs became what."""
        return Counter(item.entry["change"] for item in self.items)

    @property
    def not_judged(self) -> int:
        """How many could not be judged against the new graph."""
        return sum(not item.is_judged for item in self.items)

    @property
    def exit_status(self) -> int:
        """What the command ends with."""
        if self.problem or not self.items or self.not_judged:
            return NOT_JUDGED
        return FALLS_SHORT if self.counts["broken"] else NOTHING_SHORT


def compare(
    old: Path, new: Path, configs: tuple[Path, ...], settings: Settings, dialect: str | None
) -> ChangeRun:
    """What replacing one graph by another does to every config that the files hold.

    Args:
        old, new: the files of the graphs.
        configs: files, folders, patterns.
        settings: the limits.
        dialect: the SQL of configs that name none.
    """
    try:
        difference = Difference(_graph(old, "graph", settings), _graph(new, "other", settings))
    except Stopped as stopped:
        return ChangeRun(problem=stopped.problem, faults=stopped.faults)
    founds = [
        each for each in find_configs(configs, new, settings) if not _is_left_out(each.file, old, configs)
    ]
    search = Deadline(settings.time_budget_seconds)
    items = tuple(_item(found, difference, settings, search, dialect) for found in founds)
    promises = _promises(difference, Deadline(settings.time_budget_seconds))
    return ChangeRun(items, {**difference_document(difference), **promises})


def _graph(file: Path, member: str, settings: Settings) -> CausalGraph:
    try:
        source = read_file(file, settings)
    except Unreadable as error:
        raise Stopped(unreadable_problem(file, error), Found(file, unreadable=error)) from None
    examined = examine_graph(without_schema(source.value))
    if examined.faults:
        problem = refusal([fault.below((member,)) for fault in examined.faults])
        raise Stopped(problem_document(problem, settings), Found(file, source.value, source))
    return examined.graph


def _is_left_out(file: Path, old: Path, configs: Iterable[Path]) -> bool:
    """Is it the old graph, met in a folder or by a pattern and not named as a config?"""
    try:
        return file not in configs and file.samefile(old)
    except OSError:
        return False


def _item(
    found: Found, difference: Difference, settings: Settings, search: Deadline, dialect: str | None
) -> Item:
    if found.unreadable is not None:
        problem = unreadable_problem(found.file, found.unreadable)
        return Item(_unread_entry(found.name, problem), found.place(), faults_of(problem, found))
    value: Any = with_dialect(found.config, dialect)
    entry = config_entry(value, found.name, difference, settings, search, ("config",))
    entry["name"] = found.name
    faults = faults_of(entry["problem"], found) if "problem" in entry else ()
    return Item(entry, found.place(), faults)


def _unread_entry(name: str, problem: Json) -> Json:
    """What is said of a file from which no config comes: as of a value that is none."""
    return {
        "name": name,
        "before": None,
        "after": None,
        "change": "same",
        "edges": [],
        "nodes": [],
        "complete": True,
        "summary": f"{name}: not judged before and after ({problem['detail']}).",
        "problem_before": problem,
        "problem": problem,
    }


def _promises(difference: Difference, deadline: Deadline) -> Json:
    """All promises lost and gained that are found in time."""
    found: dict[str, list[Json]] = {"lost": [], "gained": []}
    is_complete = True
    try:
        for _place, (side, promise) in lost_and_gained(difference, deadline):
            found[side].append(promise_document(promise))
    except OutOfTime:
        is_complete = False
    return {"independencies": found, "complete": is_complete}


def told(run: ChangeRun) -> Iterator[Item]:
    """The configs worth a line: those that change, and those that could not be judged."""
    return (item for item in run.items if item.entry["change"] != "same" or not item.is_judged)
