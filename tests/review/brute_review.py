"""What is the verdict on a config, and how far is the nearest sound one? By trying everything.

semantics read literally: a choice of covariates, fixed effects and filter parts is sound when every column is measured,
no treatment or outcome is held fixed, every treatment keeps variation of its own, and the adjustment criterion (for a
direct effect: its definition; for everybody: generalised adjustment) holds in the graph with the selection nodes. All
subsets of covariates, of the fixed effects to keep and of the droppable parts are tried.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any

from tests.brute import adjustment_criterion, direct_criterion, subsets, with_selection
from tests.criteria.recovering import recovery_by_paths
from tests.review.brute_columns import Columns, columns_of
from tests.strategies import Question as Asked
from tests.values import Graph, as_set, measured_names

Part = dict[str, Any]


@dataclass(frozen=True)
class Question:
    """A config in plain values, named as the config names things; each part of its filter is an object."""

    graph: Graph
    treatments: tuple[str, ...]
    outcomes: tuple[str, ...]
    covariates: tuple[str, ...]
    parts: tuple[Part, ...] = ()
    row_filter_fixed: bool = False
    asks: str = "total"
    fixed_effects: tuple[str, ...] = ()
    weighted_by: tuple[str, ...] = ()
    matched_on: tuple[str, ...] = ()
    derived: Mapping[str, Mapping[str, Any]] = field(default_factory=dict)
    rows_exist_because: tuple[str, ...] = ()
    missing_because: Mapping[str, tuple[str, ...]] = field(default_factory=dict)
    population: str = "kept"
    measured_everywhere: tuple[str, ...] = ()

    @cached_property
    def columns(self) -> Columns:
        """What its names mean."""
        return columns_of(self.graph, self.derived)

    @cached_property
    def treated(self) -> frozenset[str]:
        """The treatments that its effect is about: a computed one stands for what it is made of."""
        return frozenset(
            base for name in self.treatments for base in self.columns.bases(self.columns.node(name))
        )

    @cached_property
    def measured(self) -> frozenset[str]:
        """The columns that the platform holds, computed ones included."""
        return frozenset(measured_names(self.columns.graph))

    @cached_property
    def results(self) -> frozenset[str]:
        """The outcomes."""
        return self.columns.nodes(self.outcomes)

    @property
    def ends(self) -> frozenset[str]:
        return self.treated | self.results

    @property
    def adjusted_for(self) -> frozenset[str]:
        """What it adjusts for otherwise than by fixed effects."""
        return self.columns.nodes([*self.covariates, *self.weighted_by, *self.matched_on])

    @property
    def absorbing(self) -> frozenset[str]:
        """The columns whose fixed effects it absorbs."""
        return self.columns.nodes(self.fixed_effects)

    @property
    def silent_parts(self) -> list[Part]:
        """What keeps rows beside the filter, one part for each thing that reads anything."""
        parts = [{"columns": self.rows_exist_because}] if self.rows_exist_because else []
        return parts + [{"columns": causes} for causes in self.missing_because.values() if causes]

    def config(self) -> dict[str, Any]:
        """The config as callers send it."""
        config = {
            "treatment": list(self.treatments),
            "outcome": list(self.outcomes),
            "covariates": list(self.covariates),
            "row_filter": list(self.parts),
            "row_filter_fixed": self.row_filter_fixed,
            "asks": self.asks,
            "fixed_effects": list(self.fixed_effects),
            "weighted_by": list(self.weighted_by),
            "matched_on": list(self.matched_on),
            "derived": dict(self.derived),
            "rows_exist_because": list(self.rows_exist_because),
            "missing_because": {name: list(causes) for name, causes in self.missing_because.items()},
            "population": self.population,
            "measured_everywhere": list(self.measured_everywhere),
        }
        return {member: said for member, said in config.items() if said or member in _ALWAYS}


_ALWAYS = ("covariates", "row_filter", "row_filter_fixed")


def is_sound(question: Question, covariates: Sequence[str], parts: Sequence[Part]) -> bool:
    """Would these covariates on the rows that these parts keep review as sound, weights and the like as they are?"""
    beside = [*question.weighted_by, *question.matched_on]
    return is_sound_choice(
        question, question.columns.nodes([*covariates, *beside]), question.absorbing, parts
    )


def reviews_as_sound(question: Question, grown: Graph | None = None) -> bool:
    """Is the config sound as it stands? ``grown`` stands in for its graph, computed columns included."""
    return is_sound_choice(question, question.adjusted_for, question.absorbing, question.parts, grown)


def is_sound_choice(
    question: Question,
    covariates: frozenset[str],
    fixed_effects: frozenset[str],
    parts: Sequence[Part],
    grown: Graph | None = None,
) -> bool:
    """Would these covariates and fixed effects on the rows that these parts keep review as sound?"""
    if (covariates | fixed_effects) - question.measured or (covariates | fixed_effects) & question.ends:
        return False
    judge = judge_of(question, fixed_effects, parts, grown)
    return judge is not None and judge(covariates)


def judge_of(
    question: Question, fixed_effects: frozenset[str], parts: Sequence[Part], grown: Graph | None = None
) -> Callable[[frozenset[str]], bool] | None:
    """Whether sets of covariates are sound, for fixed effects and parts; None where none can be."""
    columns = question.columns
    absorbed = columns.absorbed(fixed_effects)
    if not can_be_asked(question, parts) or absorbed & question.ends:
        return None
    carries = _criterion(question, parts, grown)
    pinned = {node for part in meant_by(question, parts) if part["fixed"] for node in part["columns"]}

    def is_sound_set(covariates: frozenset[str]) -> bool:
        held = covariates | absorbed
        return not columns.without_variation(held | pinned, question.treated) and carries(held)

    return is_sound_set


def selected_graph(
    question: Question, parts: Sequence[Part], grown: Graph | None = None
) -> tuple[Graph, list[str]]:
    """The graph with a node for each part, silent ones last, and what keeping rows conditions on."""
    read = meant_by(question, [*parts, *question.silent_parts])
    return with_selection(grown or question.columns.graph, read)


def meant_by(question: Question, parts: Sequence[Part]) -> list[Part]:
    """The parts with the nodes that they read. One that holds a bucket of a column at one value merely narrows it."""
    columns = question.columns
    return [
        {
            "columns": columns.nodes(part["columns"]),
            "fixed": part.get("fixed", False) and not as_set(part["columns"]) & columns.coarse,
        }
        for part in parts
    ]


def _criterion(
    question: Question, parts: Sequence[Part], grown: Graph | None
) -> Callable[[frozenset[str]], bool]:
    selected, conditioned = selected_graph(question, parts, grown)
    if question.asks == "direct":
        (treatment,), (outcome,) = question.treated, question.results
        return direct_criterion(selected, treatment, outcome, conditioned)
    if question.population == "kept":
        return adjustment_criterion(selected, question.treated, question.results, conditioned)
    known = question.columns.nodes(question.measured_everywhere)
    asked = Asked(tuple(sorted(question.treated)), tuple(sorted(question.results)), ())
    recovers = recovery_by_paths(selected, conditioned, asked)
    return lambda held: recovers(held, known)


def can_be_asked(question: Question, parts: Sequence[Part]) -> bool:
    """Are treatments, outcomes and filter columns measured, and no treatment or outcome held at one value?"""
    if question.ends - question.measured:
        return False
    return all(
        part["columns"] <= question.measured and not (part["fixed"] and part["columns"] & question.ends)
        for part in meant_by(question, parts)
    )


def sound_choices(
    question: Question,
) -> Iterator[tuple[frozenset[str], frozenset[str], tuple[int, ...], int]]:
    """Every sound choice: covariates, fixed effects, places of the parts dropped, and how many changes it takes."""
    places = range(0 if question.row_filter_fixed else len(question.parts))
    free = [name for name in sorted(question.measured) if name not in question.ends]
    for dropped in subsets(map(str, places)):
        parts = [part for place, part in enumerate(question.parts) if str(place) not in dropped]
        for kept in subsets(sorted(question.absorbing & set(free))):
            judge = judge_of(question, kept, parts)
            for chosen in subsets(free) if judge else ():
                if judge(chosen):
                    changes = len(dropped) + _columns_changed(question, chosen, kept)
                    yield chosen, kept, tuple(sorted(map(int, dropped))), changes


def _columns_changed(question: Question, covariates: frozenset[str], fixed_effects: frozenset[str]) -> int:
    """Columns to adjust for anew, and columns to drop from wherever they stand; one may be both."""
    gone = (question.adjusted_for - covariates) | (question.absorbing - fixed_effects)
    added = covariates - question.adjusted_for
    return len(gone) + len(added)


def fewest_changes(question: Question) -> int | None:
    """Changes to the nearest sound choice; 0 where the config is sound, None where nothing is."""
    return min((changes for *_, changes in sound_choices(question)), default=None)


def verdict(question: Question) -> str:
    """``sound``, ``biased`` or ``unanswerable``."""
    if reviews_as_sound(question):
        return "sound"
    return "unanswerable" if next(sound_choices(question), None) is None else "biased"
