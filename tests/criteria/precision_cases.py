"""Random questions about the most precise set, and the candidates by definition.

A case knows its valid sets by brute force, their exact variances in linear worlds, and what the production
code answers.
"""

from __future__ import annotations

import random
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from pathgate.criteria import Deadline, Effect
from pathgate.criteria.precision import MostPrecise, most_precise
from tests.brute import separated, valid_sets, with_selection
from tests.criteria.asking import effect_of
from tests.many_worlds import draw_worlds, variances
from tests.strategies import random_graph, random_parts
from tests.values import Graph, measured_names, node_names


@dataclass(frozen=True)
class Case:
    """A question about a small random graph, often with bidirected edges, filters and bounds."""

    seed: int
    value: Graph
    treatments: list[str]
    outcomes: list[str]
    parts: list[dict]
    required: frozenset[str]
    allowed: frozenset[str]

    @classmethod
    def drawn(cls, seed: int, most: int = 7) -> Case:
        rng = random.Random(seed)
        hidden = {"bidirected": rng.choice([0.0, 0.15, 0.3]), "unmeasured": rng.choice([0.0, 0.15, 0.3])}
        value = random_graph(rng, rng.randint(3, most), arrow=rng.choice([0.2, 0.3, 0.5]), **hidden)
        names = node_names(value)
        rng.shuffle(names)
        count = rng.choice([1, 1, 1, 2])
        treatments, outcomes = names[:count], names[count : count + rng.choice([1, 1, 1, 2])]
        parts = random_parts(rng, value, rng.choice([0, 0, 1, 2]))
        others, bound = [name for name in measured_names(value) if name not in names[:4]], rng.random() < 0.3
        required = frozenset(name for name in others if bound and rng.random() < 0.2)
        allowed = frozenset(name for name in measured_names(value) if not bound or rng.random() < 0.8)
        return cls(seed, value, treatments, outcomes, parts, required, allowed | required)

    def unbound(self) -> Case:
        """The same question without bounds."""
        return replace(self, required=frozenset(), allowed=frozenset(measured_names(self.value)))

    @cached_property
    def effect(self) -> Effect:
        return effect_of(self.value, self.treatments, self.outcomes, self.parts)

    @cached_property
    def selected(self) -> tuple[Graph, list[str]]:
        return with_selection(self.value, self.parts)

    @cached_property
    def valid(self) -> list[frozenset[str]]:
        """Within the bounds; a column held at one value is conditioned on anyway, and in none but as required."""
        selected, conditioned = self.selected
        every = valid_sets(selected, self.treatments, self.outcomes, conditioned)
        free = self.allowed - frozenset(conditioned) | self.required
        return [one for one in every if self.required <= one <= free]

    def found(self) -> tuple[MostPrecise, list[frozenset[str]]]:
        graph = self.effect.kept.graph
        bounds = {"required": graph.mask(self.required), "allowed": graph.mask(self.allowed)}
        answer = most_precise(self.effect, Deadline.never(), **bounds)
        return answer, [frozenset(graph.names_of(mask)) for mask in answer.sets]

    def variances(self, count: int) -> dict[tuple[str, str], np.ndarray]:
        """For each treatment and outcome a row for each valid set and a column for each of some worlds."""
        selected, conditioned = self.selected
        worlds = draw_worlds(selected, np.random.default_rng(self.seed), count)
        sets = [one | frozenset(conditioned) for one in self.valid]
        turned = [[name, *(t for t in self.treatments if t != name)] for name in self.treatments]
        return {(xs[0], y): variances(worlds, xs, y, sets) for xs in turned for y in self.outcomes}


def never_improved(case: Case) -> list[frozenset[str]]:
    """The smallest of each class of valid sets from which steps that cost no precision lead nowhere else."""
    selected, conditioned = case.selected
    treatments, fixed = frozenset(case.treatments), frozenset(conditioned)
    steps: dict[frozenset[str], list[frozenset[str]]] = {one: [] for one in case.valid}
    columns = case.allowed - treatments - frozenset(case.outcomes) - fixed - case.required
    for one in case.valid:
        for column in columns:
            other = one ^ {column}
            if column in one:
                is_step = separated(selected, column, case.outcomes, other | fixed | treatments)
                assert other in steps or not is_step
            else:
                is_step = other in steps and separated(selected, column, treatments, one | fixed)
            if is_step:
                steps[one].append(other)
    reached = {one: _closure(steps, one) for one in steps}
    ends = [reached[one] for one in steps if all(one in reached[other] for other in reached[one])]
    return [next(one for one in case.valid if one in end) for end in dict.fromkeys(map(frozenset, ends))]


def _closure(steps: dict[frozenset[str], list[frozenset[str]]], start: frozenset[str]) -> set[frozenset[str]]:
    seen, waiting = {start}, [start]
    while waiting:
        fresh = set(steps[waiting.pop()]) - seen
        seen |= fresh
        waiting += fresh
    return seen
