"""What does a running service say of many configs? Asked in requests of bounded size, each review with its bytes.

Nothing that goes wrong on the way is ever a pass: what is not answered is not judged. Only where the call says so
are configs let pass, and only where the service could not be reached or gave no answer in time; each says so then.
"""

from __future__ import annotations

import json
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any, TypeGuard

from pathgate.cli.finding import Found, Json, plain_problem
from pathgate.cli.judging import with_dialect, without_schema
from pathgate.cli.reviewing import Judging, Question, Stopped, read_graph_file
from pathgate.client import Client, ClientError, Refused
from pathgate.client.waiting import Budget
from pathgate.web.settings import Settings

# So many configs, or so many bytes of them, go into one request; the graph goes into each.
MOST_CONFIGS = 100
MOST_BYTES = 1_000_000

_TOO_LARGE = 413


@dataclass(frozen=True, slots=True)
class RemoteJudge:
    """Has a service judge.

    Attributes:
        client: the service; its timeout is that of all requests together.
        graph: against which, as it was found.
        hinges: is it to be said what sound verdicts hinge on?
        dialect: the SQL of configs that name none; None for the standard.
        lets_pass: are configs to pass unjudged where the service is out of reach?
    """

    client: Client
    graph: Found
    hinges: bool = False
    dialect: str | None = None
    lets_pass: bool = False

    def __call__(self, configs: Sequence[Any]) -> Iterator[Json]:
        """The review of each config, or its problem, in order.

        Raises:
            Stopped: the service judged none of them, and they are not to pass for that.
        """
        budget = Budget(self.client.timeout, self.client.surroundings.clock)
        answered = 0
        try:
            for batch in batches([with_dialect(config, self.dialect) for config in configs]):
                for answer in self._asked(batch, budget):
                    yield answer
                    answered += 1
        except ClientError as error:
            left = self._unanswered(error)
            if not answered and not left.get("let_pass"):
                raise Stopped(left["problem"], self.graph) from None
            yield from (left for _ in range(answered, len(configs)))

    def _asked(self, batch: Sequence[Any], budget: Budget) -> Iterator[Json]:
        try:
            yield from self._answers(batch, budget)
        except Refused as refused:
            if refused.status != _TOO_LARGE:
                raise
            if len(batch) == 1:
                yield {"problem": _without_request(refused.problem)}
                return
            # A service may take less at a time than others do; each config still gets its turn.
            half = len(batch) // 2
            yield from self._asked(batch[:half], budget)
            yield from self._asked(batch[half:], budget)

    def _answers(self, batch: Sequence[Any], budget: Budget) -> Iterator[Json]:
        """The answers of one request; the last one only once it has ended as it should."""
        graph = without_schema(self.graph.config)
        held: Json | None = None
        for line in self.client.reviews(graph, batch, hinges=self.hinges, timeout=budget.left()):
            if held is not None:
                yield held
            held = _answer_of(line)
        if held is not None:
            yield held

    def _unanswered(self, error: ClientError) -> Json:
        """What stands in place of each answer that did not come."""
        if _is_refusal(error):
            return {"problem": _without_request(error.problem)}
        if not error.is_out_of_reach:
            problem = plain_problem(
                "No answer of the service", f"what came is no answer of the service: {error}"
            )
            return {"problem": {**problem, "status": 502}}
        detail = f"the service is out of reach: {error}"
        if self.lets_pass:
            detail += "; not judged and let pass all the same, as the call says (--if-unreachable pass)"
        problem = plain_problem("The service is out of reach", detail)
        problem |= {"status": 503, "retryable": True}
        return {"problem": problem, "let_pass": self.lets_pass}


def remote_judge(client: Client, *, lets_pass: bool) -> Judging:
    """Has a service judge whatever is asked; ``lets_pass`` as the judge has it."""

    def judging(asked: Question, settings: Settings) -> RemoteJudge:
        source = read_graph_file(asked.graph, settings)
        found = Found(asked.graph, source.value, source)
        return RemoteJudge(client, found, asked.hinges, asked.dialect, lets_pass)

    return judging


def batches(configs: Iterable[Any]) -> Iterator[list[Any]]:
    """The configs in order, as many together as one request holds."""
    batch: list[Any] = []
    total = 0
    for config in configs:
        size = len(json.dumps(config, ensure_ascii=False).encode())
        if batch and (len(batch) == MOST_CONFIGS or total + size > MOST_BYTES):
            yield batch
            batch, total = [], 0
        batch.append(config)
        total += size
    if batch:
        yield batch


def _answer_of(line: Json) -> Json:
    if "review" in line:
        return {"review": line["review"]}
    return {"problem": _of_one_config(line["problem"], line["index"])}


def _of_one_config(problem: Json, index: int) -> Json:
    """A problem with places that count from the config, as where it was asked about alone."""
    if "errors" not in problem:
        return problem
    beginning = f"#/configs/{index}"
    return {**problem, "errors": [_moved(error, beginning) for error in problem["errors"]]}


def _moved(error: Mapping[str, Any], beginning: str) -> Json:
    pointer = error["pointer"]
    if pointer.startswith(beginning):
        pointer = "#/config" + pointer.removeprefix(beginning)
    return {**error, "pointer": pointer}


def _without_request(problem: Json) -> Json:
    """A problem without the id of a request, which differs each time."""
    return {member: said for member, said in problem.items() if member != "instance"}


def _is_refusal(error: ClientError) -> TypeGuard[Refused]:
    return isinstance(error, Refused) and not error.is_out_of_reach
