"""What does the service say of one config? Asked in this process; a judge of another kind answers alike."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any

from pathgate.cli.files import Source
from pathgate.cli.finding import Json, problem_document
from pathgate.criteria.deadline import Deadline
from pathgate.graphs.errors import Fault, PathgateError
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.node_list import json_type
from pathgate.graphs.reading import examine_graph
from pathgate.review.config import read_config
from pathgate.review.errors import InvalidConfig
from pathgate.review.hinge_document import whole_document
from pathgate.review.review import review
from pathgate.web.problems import problem_of, refusal
from pathgate.web.settings import Settings

Judge = Callable[[Any], Json]
"""From a config's value to ``{"review": …}`` or ``{"problem": …}``, as a line of /v1/reviews has it."""


class Unjudgeable(Exception):
    """Nothing can be judged, for one reason: ``problem`` is its document."""

    def __init__(self, problem: Json) -> None:
        super().__init__(problem["detail"])
        self.problem = problem


@dataclass(frozen=True, slots=True)
class LocalJudge:
    """Judges in this process.

    Attributes:
        graph: against which.
        settings: with which limits.
        hinges: is it to be said what sound verdicts hinge on?
        dialect: the SQL of configs that name none; None for the standard.
    """

    graph: CausalGraph
    settings: Settings
    hinges: bool = False
    dialect: str | None = None

    def __call__(self, value: Any) -> Json:
        """The review of a config, or its problem."""
        try:
            return {"review": self._review(value)}
        except InvalidConfig as error:
            problem = refusal([fault.below(("config",)) for fault in error.faults])
        except PathgateError as error:
            known = problem_of(error)
            if known is None:
                raise
            problem = known
        return {"problem": problem_document(problem, self.settings)}

    def _review(self, value: Any) -> Json:
        if not isinstance(value, Mapping):
            detail = f"a config is an object, not {json_type(value)}"
            raise InvalidConfig([Fault("invalid-request", (), detail)])
        if self.dialect is not None and "dialect" not in value:
            value = {**value, "dialect": self.dialect}
        deadline = Deadline(self.settings.time_budget_seconds)
        answer = review(self.graph, read_config(value, self.graph), deadline)
        return whole_document(answer, deadline, hinges=self.hinges)


def read_graph(source: Source, settings: Settings) -> CausalGraph:
    """The graph that a file holds.

    Raises:
        Unjudgeable: it holds none.
    """
    examined = examine_graph(without_schema(source.value))
    if examined.faults:
        problem = refusal([fault.below(("graph",)) for fault in examined.faults])
        raise Unjudgeable(problem_document(problem, settings))
    return examined.graph


def without_schema(value: Any) -> Any:
    """The graph without the member that tells an editor its schema, which only files have."""
    if not isinstance(value, dict):
        return value
    return {key: said for key, said in value.items() if key != "$schema"}
