"""What does the service say of one config? Asked in this process; a judge of another kind answers alike."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property
from typing import Any

from pathgate.cli.files import Source
from pathgate.cli.finding import Json, problem_document
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.reading import examine_graph
from pathgate.review.provenance import graph_digest
from pathgate.web.judging import judged
from pathgate.web.problems import refusal
from pathgate.web.settings import Settings

Judge = Callable[[Any], Json]
"""From a config's value to ``{"review": …}`` or ``{"problem": …}``, as a line of /v1/reviews has it."""


class Unjudgeable(Exception):
    """Nothing can be judged, for one reason: ``problem`` is its document."""

    def __init__(self, problem: Json) -> None:
        super().__init__(problem["detail"])
        self.problem = problem


@dataclass(frozen=True)
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

    def __call__(self, config: Any) -> Json:
        """The review of a config, or its problem."""
        if self.dialect is not None and isinstance(config, dict) and "dialect" not in config:
            config = {**config, "dialect": self.dialect}
        return judged(config, self.graph, self.settings, hinges=self.hinges, known_digest=self._graph_digest)

    @cached_property
    def _graph_digest(self) -> str:
        return graph_digest(self.graph)


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
