"""What comes of reviewing every config of some files against one graph?

One item for each config, with its review or with the problem that kept it from being judged; a file that cannot
be read is an item too, and never the end of the others. The exit status follows: 0 all sound, 1 some config
falls short, 2 something could not be judged, which outranks 1.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from pathgate.cli.files import Unreadable, config_files, read_file, shown
from pathgate.criteria.deadline import Deadline
from pathgate.graphs.errors import Fault, PathgateError
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.node_list import json_type
from pathgate.graphs.reading import examine_graph
from pathgate.review.config import read_config
from pathgate.review.errors import InvalidConfig
from pathgate.review.hinge_document import whole_document
from pathgate.review.review import review
from pathgate.web.problems import Problem, problem_of, refusal
from pathgate.web.settings import Settings

Json = dict[str, Any]

ALL_SOUND, FALLS_SHORT, NOT_JUDGED = 0, 1, 2


@dataclass(frozen=True, slots=True)
class Item:
    """One config, and exactly one of its review and its problem.

    Attributes:
        name: what the config calls itself, else where it stands.
        review: the document of /v1/review.
        problem: the document of the problem, without ``instance``: there was no request.
    """

    name: str
    review: Json | None = None
    problem: Json | None = None

    @property
    def outcome(self) -> str:
        """The verdict, or ``not judged``."""
        return "not judged" if self.review is None else str(self.review["verdict"])


@dataclass(frozen=True, slots=True)
class Outcome:
    """All items in order, or the problem of the graph, without which nothing can be judged."""

    items: tuple[Item, ...] = ()
    problem: Json | None = None

    @property
    def exit_status(self) -> int:
        """What the command ends with."""
        counts = self.counts
        if self.problem or not self.items or counts["not judged"]:
            return NOT_JUDGED
        return ALL_SOUND if counts["sound"] == len(self.items) else FALLS_SHORT

    @property
    def counts(self) -> Counter[str]:
        """How many items ended in each verdict, and ``not judged``."""
        return Counter(item.outcome for item in self.items)

    def document(self) -> Json:
        """The JSON document: an item for each config, in order."""
        count = len(self.items)
        reviews = [
            {"index": index, "count": count, "name": item.name}
            | ({"problem": item.problem} if item.review is None else {"review": item.review})
            for index, item in enumerate(self.items)
        ]
        return {"reviews": reviews, "problem": self.problem} if self.problem else {"reviews": reviews}


def review_files(
    graph: Path, configs: Iterable[Path], settings: Settings, *, hinges: bool = False
) -> Outcome:
    """Review every config that the files hold; ``hinges``: say what sound verdicts hinge on?"""
    try:
        value = _without_schema(read_file(graph, settings))
    except Unreadable as error:
        return Outcome(problem=_unreadable(graph, error))
    examined = examine_graph(value)
    if examined.faults:
        problem = refusal([fault.below(("graph",)) for fault in examined.faults])
        return Outcome(problem=_document(problem, settings))
    files = config_files(configs, graph)
    return Outcome(
        tuple(item for file in files for item in _items(file, examined.graph, settings, hinges=hinges))
    )


def _items(file: Path, graph: CausalGraph, settings: Settings, *, hinges: bool) -> Iterator[Item]:
    try:
        value = read_file(file, settings)
    except Unreadable as error:
        yield Item(shown(file), problem=_unreadable(file, error))
        return
    if value == []:
        yield Item(shown(file), problem=_unreadable(file, Unreadable("an empty list holds no config")))
    elif isinstance(value, list):
        for place, config in enumerate(value):
            yield _item(config, f"{shown(file)}#/{place}", graph, settings, hinges=hinges)
    else:
        yield _item(value, shown(file), graph, settings, hinges=hinges)


def _item(value: Any, where: str, graph: CausalGraph, settings: Settings, *, hinges: bool) -> Item:
    said = value.get("name") if isinstance(value, Mapping) else None
    name = said if said and isinstance(said, str) else where
    try:
        if not isinstance(value, Mapping):
            detail = f"a config is an object, not {json_type(value)}"
            raise InvalidConfig([Fault("invalid-request", (), detail)])  # noqa: TRY301 - as read_config would
        config = read_config(value, graph)
        deadline = Deadline(settings.time_budget_seconds)
        document = whole_document(review(graph, config, deadline), deadline, hinges=hinges)
    except InvalidConfig as error:
        problem = refusal([fault.below(("config",)) for fault in error.faults])
        return Item(name, problem=_document(problem, settings))
    except PathgateError as error:
        known = problem_of(error)
        if known is None:
            raise
        return Item(name, problem=_document(known, settings))
    return Item(name, review=document)


def _without_schema(value: Any) -> Any:
    """The graph without the member that tells an editor its schema, which only files have."""
    return (
        {key: said for key, said in value.items() if key != "$schema"} if isinstance(value, dict) else value
    )


def _document(problem: Problem, settings: Settings) -> Json:
    members = problem.members("", settings.max_errors)
    del members["instance"]
    return members


def _unreadable(file: Path, error: Unreadable) -> Json:
    detail = f"{shown(file)}: {error.detail}"
    if error.place is not None:
        line, column = error.place
        problem = Problem.of("not-json", detail, line=line, column=column)
        return _document(problem, Settings())
    # No such problem over HTTP, where nothing is read from files: a type without a page of its own.
    return {
        "type": "about:blank",
        "title": "The file could not be read",
        "status": 400,
        "detail": detail,
        "retryable": False,
    }
