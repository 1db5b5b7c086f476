"""What /v1/adjustment tells about sets and columns, each with why."""

from __future__ import annotations

from math import fsum

from pathgate.criteria.adjustment import Effect
from pathgate.criteria.deadline import Deadline
from pathgate.criteria.diagnosis import forbidden_nodes
from pathgate.criteria.paths import explain_path, find_open_path
from pathgate.criteria.populations import InEverybody, Population
from pathgate.criteria.precision import precision_notes
from pathgate.criteria.reachability import Conditions
from pathgate.criteria.usability import unusable_columns
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import members
from pathgate.review.document import path_document
from pathgate.review.wording import arrow_text, listed, part_text
from pathgate.web.operations import Json


def set_told(graph: CausalGraph, columns: int) -> Json:
    """A covariate set and what it costs."""
    return {
        "columns": list(graph.names_of(columns)),
        "cost": fsum(map(graph.cost, members(columns))),
    }


def forbidden_told(effect: Effect, deadline: Deadline) -> list[Json]:
    """The nodes that no set can hold for the causal path they lie on or descend from.

    Raises:
        OutOfTime: the deadline came first.
    """
    told = []
    for found in forbidden_nodes(effect, effect.forbidden & ~effect.outcomes):
        deadline.poll()
        name = effect.kept.graph.name(found.node)
        if name:
            drawn = arrow_text(effect.kept, found.causal_path, 0)
            above = listed([effect.kept.graph.name(found.descends_from)])
            lies = "lies on" if found.is_on_path else f"is a consequence of {above} on"
            told.append({"column": name, "why": f"{lies} the causal path {drawn}"})
    return told


def unusable_told(population: Population, deadline: Deadline) -> list[Json]:
    """The other columns that no set can hold.

    Raises:
        OutOfTime: the deadline came first.
    """
    effect = population.effect
    graph = effect.kept.graph
    opening = {found.node: found.opens for found in unusable_columns(effect, deadline)}
    told = []
    for node in members(population.unusable(deadline)):
        why = "with it, nothing known of everybody undoes which rows are kept"
        if node in opening:
            drawn = arrow_text(effect.kept, opening[node], 1 << node)
            why = f"adjusting for it opens the path {drawn}, whatever else is adjusted for"
        told.append({"column": graph.name(node), "why": why})
    return told


def not_recovered_told(population: Population, covariates: int) -> Json:
    """Why a set that is valid among the rows kept does not carry the effect to everybody."""
    effect = population.effect
    kept = effect.kept
    known = population.known if isinstance(population, InEverybody) else 0
    conditions = Conditions.on(effect.back_door_graph, covariates & known & ~kept.conditioned)
    trail = find_open_path(effect.back_door_graph, effect.outcomes, kept.conditioned, conditions)
    columns = 0
    for part in kept.parts:
        columns |= part.columns
    rows = " and ".join(part_text(part.written) for part in kept.parts)
    told: Json = {
        "rule": "not-recovered",
        "columns": list(kept.graph.names_of(columns)),
        "message": (
            f"Keeping rows by {rows} makes the outcome among them unlike that in everybody, and no part of the"
            " set whose distribution over everybody is known undoes that: not recovered by adjusting."
        ),
    }
    if trail is not None:
        told["open_path"] = path_document(explain_path(kept, trail, covariates & known))
    return told


def precision_told(effect: Effect, covariates: int) -> list[Json]:
    """What the columns in a valid set and beside it do to the variance of the estimate."""
    notes = precision_notes(effect, covariates)
    said = (
        (
            "raises-variance",
            notes.wasted,
            "tells nothing more of the outcome: the estimate is no less precise without it",
        ),
        ("lowers-variance", notes.helpful, "is not needed for validity but makes the estimate more precise"),
        ("would-lower-variance", notes.missed, "could be added: that would make the estimate more precise"),
    )
    told = []
    for rule, columns, text in said:
        for node in members(columns):
            name = effect.kept.graph.name(node)
            told.append({"rule": rule, "columns": [name], "message": f"{listed([name])} {text}."})
    return told
