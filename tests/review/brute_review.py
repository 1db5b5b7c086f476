"""What is the verdict on a config, and how far is the nearest sound one? By trying everything.

semantics read literally: a choice of covariates and filter parts is sound when every column is measured, no
treatment or outcome is adjusted for or held at one value, and the adjustment criterion (for a direct effect:
its definition) holds in the graph with the selection nodes. All subsets of covariates and of droppable parts are tried.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import combinations
from typing import Any

from tests.brute import is_valid_adjustment, is_valid_direct, valid_sets, with_selection
from tests.values import Graph, as_set, measured_names

Part = dict[str, Any]


@dataclass(frozen=True, slots=True)
class Question:
    """A config in plain values; each part of its filter is an object."""

    graph: Graph
    treatments: tuple[str, ...]
    outcomes: tuple[str, ...]
    covariates: tuple[str, ...]
    parts: tuple[Part, ...] = ()
    row_filter_fixed: bool = False
    asks: str = "total"

    @property
    def ends(self) -> frozenset[str]:
        return frozenset(self.treatments + self.outcomes)

    def config(self) -> dict[str, Any]:
        """The config as callers send it."""
        return {
            "treatment": list(self.treatments),
            "outcome": list(self.outcomes),
            "covariates": list(self.covariates),
            "row_filter": list(self.parts),
            "row_filter_fixed": self.row_filter_fixed,
            "asks": self.asks,
        }


def is_sound(question: Question, covariates: Sequence[str], parts: Sequence[Part]) -> bool:
    """Would these covariates on the rows that these parts keep review as sound?"""
    if not _can_be_asked(question, parts) or set(covariates) - set(measured_names(question.graph)):
        return False
    if set(covariates) & question.ends:
        return False
    selected, conditioned = with_selection(question.graph, parts)
    if question.asks == "direct":
        (treatment,), (outcome,) = question.treatments, question.outcomes
        return is_valid_direct(selected, treatment, outcome, covariates, conditioned)
    return is_valid_adjustment(selected, question.treatments, question.outcomes, covariates, conditioned)


def _can_be_asked(question: Question, parts: Sequence[Part]) -> bool:
    measured = set(measured_names(question.graph))
    if question.ends - measured:
        return False
    columns = [(as_set(part["columns"]), part.get("fixed", False)) for part in parts]
    return all(read <= measured and not (fixed and read & question.ends) for read, fixed in columns)


def sound_choices(question: Question) -> Iterator[tuple[frozenset[str], tuple[int, ...], int]]:
    """Every sound choice: covariates, places of the parts dropped, and how many changes it takes."""
    places = range(0 if question.row_filter_fixed else len(question.parts))
    for count in range(len(places) + 1):
        for dropped in combinations(places, count):
            parts = [part for place, part in enumerate(question.parts) if place not in dropped]
            if not _can_be_asked(question, parts):
                continue
            selected, conditioned = with_selection(question.graph, parts)
            ends = (question.treatments, question.outcomes)
            for chosen in valid_sets(selected, *ends, conditioned, asks=question.asks):
                yield chosen, dropped, count + len(chosen ^ set(question.covariates))


def fewest_changes(question: Question) -> int | None:
    """Changes to the nearest sound choice; 0 where the config is sound, None where nothing is."""
    return min((changes for _, _, changes in sound_choices(question)), default=None)


def verdict(question: Question) -> str:
    """``sound``, ``biased`` or ``unanswerable``."""
    if is_sound(question, question.covariates, question.parts):
        return "sound"
    return "unanswerable" if next(sound_choices(question), None) is None else "biased"
