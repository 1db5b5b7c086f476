"""Can a running service be relied on from here? Each thing that a gate needs of it is tried once, without retries.

The last steps hold its answers against those of this process: the demo's reviews must be the same, and a gate must
let pass the one that is sound and stop another. So whatever stands in between and alters answers shows too.
"""

from __future__ import annotations

import json
import time
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, field
from typing import Any, Literal

from pathgate.client import Client, ClientError, FallsShort, NotAnAnswer
from pathgate.client.waiting import Budget
from pathgate.demo import demo_configs, demo_graph
from pathgate.graphs.reading import read_graph
from pathgate.review.visible import visible
from pathgate.version import VERSION
from pathgate.web.judging import judged
from pathgate.web.settings import Settings

Json = dict[str, Any]
Outcome = Literal["ok", "failed", "not tried"]

Clock = Callable[[], float]


@dataclass(frozen=True, slots=True)
class Seen:
    """What a step found: a sentence, and what machines are told beside it."""

    text: str
    facts: Mapping[str, Any] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class _Case:
    """Who is tried, how long it may take, and the demo's reviews in this process by the names of the configs."""

    client: Client
    budget: Budget
    here: Mapping[str, Json]


_Look = Callable[[_Case], Seen]


@dataclass(frozen=True, slots=True)
class Step:
    """One thing that was tried; ``seconds`` is how long it took."""

    name: str
    outcome: Outcome
    seen: Seen
    seconds: float = 0.0


@dataclass(frozen=True, slots=True)
class Diagnosis:
    """All steps, in order."""

    url: str
    steps: tuple[Step, ...]

    @property
    def failed(self) -> int:
        """How many steps did not end well."""
        return sum(step.outcome != "ok" for step in self.steps)

    @property
    def exit_status(self) -> int:
        """0 where every step ended well, else 2: nothing was judged wrongly, but nothing can be relied on."""
        return 2 if self.failed else 0


def diagnose(client: Client, clock: Clock = time.perf_counter) -> Diagnosis:
    """Try every step; where the service is not reached at all, the others are left alone."""
    # What is to be compared is made first: the times are the service's alone.
    here = dict(_in_process())
    case = _Case(client, Budget(client.timeout, client.surroundings.clock), here)
    steps: list[Step] = []
    for name, look in _STEPS.items():
        if steps and steps[0].outcome == "failed":
            steps.append(Step(name, "not tried", Seen("the service was not reached")))
        else:
            steps.append(_tried(name, look, case, clock))
    return Diagnosis(str(client.address), tuple(steps))


def diagnosis_text(diagnosis: Diagnosis) -> str:
    """A line for each step with its milliseconds, and one for all of them."""
    lines = [_line(step) for step in diagnosis.steps]
    end = "can be relied on" if not diagnosis.failed else "cannot be relied on"
    ended = len(lines) - diagnosis.failed
    return "\n".join([*lines, f"{diagnosis.url} {end}: {ended} of {len(lines)} steps ended well.", ""])


def _line(step: Step) -> str:
    lasted = "" if step.outcome == "not tried" else f"{1_000 * step.seconds:,.1f} ms"
    return f"{step.outcome:<10}{step.name:<10}{lasted:>11}  {visible(step.seen.text)}"


def diagnosis_document(diagnosis: Diagnosis) -> Json:
    """The same for machines."""
    steps = [
        {
            "step": step.name,
            "outcome": step.outcome,
            "milliseconds": round(1_000 * step.seconds, 3),
            "detail": step.seen.text,
            **step.seen.facts,
        }
        for step in diagnosis.steps
    ]
    return {
        "url": diagnosis.url,
        "exit_status": diagnosis.exit_status,
        "version_here": VERSION,
        "steps": steps,
    }


def _tried(name: str, look: _Look, case: _Case, clock: Clock) -> Step:
    begun = clock()
    outcome: Outcome = "ok"
    try:
        seen = look(case)
    except ClientError as error:
        outcome, seen = "failed", Seen(str(error))
    return Step(name, outcome, seen, clock() - begun)


def _reach(case: _Case) -> Seen:
    _expect(case.client.read("/healthz", timeout=case.budget.left()), "ok")
    return Seen(f"{case.client.address}/healthz answers")


def _ready(case: _Case) -> Seen:
    _expect(case.client.read("/readyz", timeout=case.budget.left()), "ready")
    return Seen("it takes requests")


def _expect(told: Json, status: str) -> None:
    if told.get("status") != status:
        raise NotAnAnswer(f"it calls itself {told.get('status')!r}, not {status!r}")


def _version(case: _Case) -> Seen:
    version = case.client.read("/version", timeout=case.budget.left()).get("version")
    if not isinstance(version, str):
        raise NotAnAnswer("it does not say which version it is")
    here = "the same as here" if version == VERSION else f"another than here ({VERSION})"
    return Seen(f"{version}, {here}", {"version": version})


def _limits(case: _Case) -> Seen:
    limits = case.client.read("/version", timeout=case.budget.left()).get("limits")
    if not isinstance(limits, dict) or not all(type(said) in (int, float) for said in limits.values()):
        raise NotAnAnswer("it does not say which limits are in force")
    return Seen(", ".join(f"{name} {said:,}" for name, said in limits.items()), {"limits": limits})


def _answers(case: _Case) -> Seen:
    """The demo, reviewed there and here."""
    configs = demo_configs()
    lines = case.client.reviews(demo_graph(), configs, hinges=True, timeout=case.budget.left())
    for line, (name, here) in zip(lines, case.here.items(), strict=True):
        if "problem" in line:
            raise NotAnAnswer(f"{name} is not reviewed: {line['problem']['detail']}")
        different = _different(_comparable(line["review"]), here)
        if different:
            raise NotAnAnswer(f"{name} is reviewed otherwise than here: {', '.join(different)}")
    return Seen(
        f"{len(configs)} configs of the demo are reviewed as they are here", {"configs": len(configs)}
    )


def _gate(case: _Case) -> Seen:
    """One that passes, and one that must not."""
    for config in demo_configs()[:2]:
        try:
            found = case.client.gate(demo_graph(), config, timeout=case.budget.left())
        except FallsShort as error:
            found = error.review
        here = case.here[config["name"]]["verdict"]
        if found["verdict"] != here:
            raise NotAnAnswer(f"{config['name']} is {found['verdict']} there, {here} here")
    return Seen("it lets pass what is sound, and stops what is not")


def _in_process() -> Iterator[tuple[str, Json]]:
    graph, settings = read_graph(demo_graph()), Settings()
    for config in demo_configs():
        yield config["name"], _comparable(judged(config, graph, settings, hinges=True)["review"])


def _comparable(review: Json) -> Json:
    """A review, but for the version: another one that says the same is as good."""
    provenance = {member: said for member, said in review["provenance"].items() if member != "version"}
    return {**review, "provenance": provenance}


def _different(there: Json, here: Json) -> list[str]:
    """The members in which two reviews differ, compared as what JSON tells apart."""
    members = dict.fromkeys([*here, *there])
    return [member for member in members if _written(there, member) != _written(here, member)]


def _written(review: Json, member: str) -> str:
    return json.dumps(review[member], sort_keys=True) if member in review else ""


_STEPS: Mapping[str, _Look] = {
    "reach": _reach,
    "ready": _ready,
    "version": _version,
    "limits": _limits,
    "answers": _answers,
    "gate": _gate,
}
