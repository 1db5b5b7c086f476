"""What does the service say of each config? Asked in this process; a judge of another kind answers alike."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from typing import Any

from pathgate.cli.files import Source
from pathgate.cli.finding import Json, problem_document
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.reading import examine_graph
from pathgate.review.provenance import graph_digest
from pathgate.web.judging import judged
from pathgate.web.problems import refusal
from pathgate.web.settings import Settings

Judge = Callable[[Sequence[Any]], Iterator[Json]]
"""From the values of configs to ``{"review": …}`` or ``{"problem": …}`` for each, in order, as /v1/reviews has it.

Beside a problem, ``let_pass`` says that the config is to pass although nobody judged it.
"""


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

    def __call__(self, configs: Sequence[Any]) -> Iterator[Json]:
        """The review of each config, or its problem."""
        digest = graph_digest(self.graph)
        for config in configs:
            asked = with_dialect(config, self.dialect)
            yield judged(asked, self.graph, self.settings, hinges=self.hinges, known_digest=digest)


def with_dialect(config: Any, dialect: str | None) -> Any:
    """A config that names the dialect of its SQL, where one is given and it names none."""
    if dialect is None or not isinstance(config, dict) or "dialect" in config:
        return config
    return {**config, "dialect": dialect}


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
