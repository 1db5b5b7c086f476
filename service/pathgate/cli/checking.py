"""Is a file a causal graph, and what is wrong with it? The answer of /v1/graph-check, with places in the file."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from pathgate.cli.files import Source, Unreadable, read_file, shown
from pathgate.cli.finding import Found, faults_of, problem_document, unreadable_problem
from pathgate.cli.judging import without_schema
from pathgate.cli.run import Fault, Place
from pathgate.criteria.deadline import Deadline
from pathgate.graphs.errors import PathgateError
from pathgate.review.visible import visible
from pathgate.web.endpoints.graph_check import OPERATION
from pathgate.web.operations import envelope_shape, open_call
from pathgate.web.problems import Refused, problem_of, refusal
from pathgate.web.settings import Settings

Json = dict[str, Any]


@dataclass(frozen=True, slots=True)
class Checked:
    """A graph's file, and exactly one of the answer and the problem.

    Attributes:
        answer: as /v1/graph-check gives it.
        places: where each of its findings stands.
        problem: why there is no answer.
        faults: what that problem is.
    """

    answer: Json | None = None
    places: tuple[Place, ...] = ()
    problem: Json | None = None
    faults: tuple[Fault, ...] = ()

    @property
    def exit_status(self) -> int:
        """0 for a graph without a fault, 1 for one with some, 2 for what is no graph at all."""
        if self.answer is None:
            return 2
        return int(bool(self.answer["findings"]))


def check_file(file: Path, settings: Settings) -> Checked:
    """What the service says of the graph in a file."""
    try:
        source = read_file(file, settings)
    except Unreadable as error:
        problem = unreadable_problem(file, error)
        return Checked(problem=problem, faults=faults_of(problem, Found(file, unreadable=error)))
    found = Found(file, source.value, source)
    try:
        answer = _answer(source, settings)
    except Refused as error:
        problem = problem_document(refusal(error.faults), settings)
        return Checked(problem=problem, faults=faults_of(problem, found))
    except PathgateError as error:
        known = problem_of(error)
        if known is None:
            raise
        problem = problem_document(known, settings)
        return Checked(problem=problem, faults=faults_of(problem, found))
    return Checked(answer, tuple(found.place(each["pointer"]) for each in answer["findings"]))


def checked_text(file: Path, checked: Checked) -> str:
    """A line for each finding, and one that counts."""
    return "".join(f"{line}\n" for line in _lines(file, checked))


def _answer(source: Source, settings: Settings) -> Json:
    request = {"graph": without_schema(source.value)}
    deadline = Deadline(settings.time_budget_seconds)
    return OPERATION.answer(open_call(OPERATION, envelope_shape(OPERATION), request, settings, deadline))


def _lines(file: Path, checked: Checked) -> Iterator[str]:
    if checked.answer is None:
        return
    findings = checked.answer["findings"]
    for finding, place in zip(findings, checked.places, strict=True):
        yield visible(f"{place}: {finding['severity']} {finding['rule']}: {finding['message']}")
    counts = checked.answer["counts"]
    listed = f"{counts['nodes']:,} nodes ({counts['measured']:,} measured)"
    edges = f"{counts['edges']:,} edges ({counts['bidirected']:,} bidirected)"
    found = "1 finding" if len(findings) == 1 else f"{len(findings):,} findings"
    yield visible(f"{shown(file)}: {listed}, {edges}; {found}.")
