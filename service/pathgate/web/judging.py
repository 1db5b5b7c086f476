"""One config among many: its review, or the problem that it has; never the end of the others.

Over HTTP, at the shell and inside a team's own engine the same function answers, and so with the same bytes.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from pathgate.criteria.deadline import Deadline
from pathgate.graphs.errors import Fault, PathgateError, Place
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.node_list import json_type
from pathgate.review.config import read_config
from pathgate.review.errors import InvalidConfig
from pathgate.review.hinge_document import whole_document
from pathgate.review.review import review
from pathgate.web.problems import Problem, problem_of, refusal
from pathgate.web.settings import Settings

Json = dict[str, Any]


def judged(
    value: Any,
    graph: CausalGraph,
    settings: Settings,
    *,
    hinges: bool,
    place: Place = ("config",),
    known_digest: str | None = None,
) -> Json:
    """The review of a config as ``{"review": …}``, or ``{"problem": …}``; each has the whole time budget.

    Args:
        value: the config as it came.
        graph: against which.
        settings: the limits.
        hinges: is it to be said what a sound verdict hinges on?
        place: where the config stands in the input, for the pointers of a problem.
        known_digest: the graph's, where it is known.
    """
    try:
        return {"review": _review(value, graph, settings, hinges=hinges, known_digest=known_digest)}
    except PathgateError as error:
        return {"problem": problem_members(error, settings, place)}


def problem_members(error: PathgateError, settings: Settings, place: Place) -> Json:
    """The problem document of a config that stands at ``place``; an error that is no problem is raised again."""
    if isinstance(error, InvalidConfig):
        problem: Problem | None = refusal([fault.below(place) for fault in error.faults])
    else:
        problem = problem_of(error)
    if problem is None:
        raise error
    members = problem.members("", settings.max_errors)
    # A config among others had no request of its own.
    del members["instance"]
    return members


def _review(
    value: Any, graph: CausalGraph, settings: Settings, *, hinges: bool, known_digest: str | None
) -> Json:
    if not isinstance(value, Mapping):
        detail = f"a config is an object, not {json_type(value)}"
        raise InvalidConfig([Fault("invalid-request", (), detail)])
    deadline = Deadline(settings.time_budget_seconds)
    answer = review(graph, read_config(value, graph), deadline)
    return whole_document(answer, deadline, hinges=hinges, known_digest=known_digest)
