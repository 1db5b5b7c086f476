"""What each column is to the effect claimed, and what to do with it.

The roles are exclusive: ``ROLES`` holds them in the order in which they are tried, each with what it means.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from types import MappingProxyType
from typing import Literal

from pathgate.criteria.adjustment import Effect, total_effect, valid_set
from pathgate.criteria.deadline import Deadline
from pathgate.criteria.paths import find_open_path
from pathgate.criteria.reachability import Conditions, connected
from pathgate.criteria.selection import keep_rows
from pathgate.criteria.verdict import are_separated
from pathgate.graphs.kinship import ancestors, descendants
from pathgate.graphs.masks import members
from pathgate.review.claims import Choice, Claim
from pathgate.review.optional import Precision, precision_of
from pathgate.review.remedies import Remedy

Role = Literal[
    "treatment",
    "outcome",
    "mediator",
    "descendant-of-outcome",
    "descendant-of-mediator",
    "confounder",
    "collider",
    "descendant-of-collider",
    "cause-of-treatment",
    "cause-of-outcome",
    "descendant-of-treatment",
    "proxy",
    "unrelated",
]
ROLES: Mapping[Role, str] = MappingProxyType(
    {
        "treatment": "the column whose effect is claimed",
        "outcome": "the column on which it is claimed",
        "mediator": "lies on a directed path from a treatment to an outcome that meets no treatment again",
        "descendant-of-outcome": "comes about by way of an outcome that a treatment leads to",
        "descendant-of-mediator": "comes about by way of a mediator",
        "confounder": "a cause of a treatment that also leads to an outcome past the treatments",
        "collider": "adjusting for it joins treatment and outcome, which were kept apart: it is a common consequence"
        " on the path that opens",
        "descendant-of-collider": "adjusting for it joins treatment and outcome, since it comes about by way of a"
        " common consequence",
        "cause-of-treatment": "a cause of a treatment alone",
        "cause-of-outcome": "a cause of an outcome alone",
        "descendant-of-treatment": "a consequence of a treatment that leads to no outcome",
        "proxy": "dependent on treatment or outcome in another way",
        "unrelated": "independent of treatment and outcome",
    }
)
Advice = Literal["keep", "drop", "add", "optional", "leave-out"]


@dataclass(frozen=True, slots=True)
class ColumnRole:
    """A column's role for the effect, and what the config should do with it.

    Attributes:
        column: its name.
        role: the first in ``ROLES`` that fits.
        advice: what to do with it.
        precision: what adjusting for it does to the precision of a linear model, where it may be in or out.
    """

    column: str
    role: Role
    advice: Advice
    precision: Precision | None = None


def column_roles(
    claim: Claim, columns: int, remedy: Remedy | None, deadline: Deadline, *, is_sound: bool
) -> tuple[ColumnRole, ...]:
    """Role and advice for each of the columns, in the graph's order; advice follows the first remedy.

    Raises:
        OutOfTime: the deadline came first.
    """
    # Roles tell how columns stand to the effect as a whole, whichever effect is asked for.
    if claim.asks == "total":
        roles = _Roles(claim.effect_among(()))
    else:
        roles = _Roles(total_effect(keep_rows(claim.graph), claim.treatments, claim.outcomes))
    answers = []
    for node in members(columns):
        deadline.poll()
        if is_sound and not claim.ends >> node & 1:
            advice, precision = _advice_where_sound(claim, node)
        else:
            advice, precision = _advice(claim, node, remedy), None
        answers.append(ColumnRole(claim.graph.name(node), roles.of(node), advice, precision))
    return tuple(answers)


class _Roles:
    """The sets that decide roles, each computed once for all columns, and only where one gets that far."""

    def __init__(self, effect: Effect) -> None:
        graph = effect.kept.graph
        self._effect = effect
        self._to_treatment = ancestors(graph, effect.treatments)
        self._to_outcome = ancestors(graph, effect.outcomes, avoiding=effect.treatments)
        self._sets: tuple[tuple[Role, int], ...] = (
            ("treatment", effect.treatments),
            ("outcome", effect.outcomes),
            ("mediator", effect.on_causal_paths),
            ("descendant-of-outcome", descendants(graph, effect.outcomes & effect.on_causal_paths)),
            ("descendant-of-mediator", effect.forbidden),
            ("confounder", self._to_treatment & self._to_outcome),
        )

    @cached_property
    def _apart(self) -> int:
        return valid_set(self._effect) or 0

    @cached_property
    def _later(self) -> tuple[tuple[Role, int], ...]:
        graph, effect = self._effect.kept.graph, self._effect
        return (
            ("cause-of-treatment", self._to_treatment),
            ("cause-of-outcome", self._to_outcome),
            ("descendant-of-treatment", descendants(graph, effect.treatments)),
            ("proxy", connected(graph, effect.treatments | effect.outcomes, Conditions())),
        )

    def of(self, node: int) -> Role:
        for role, nodes in self._sets:
            if nodes >> node & 1:
                return role
        as_collider = self._as_collider(node)
        if as_collider is not None:
            return as_collider
        return next((role for role, nodes in self._later if nodes >> node & 1), "unrelated")

    def _as_collider(self, node: int) -> Role | None:
        graph = self._effect.back_door_graph
        # Where a valid set keeps treatment and outcome apart, whatever joins them again is this node's doing.
        if self._apart >> node & 1 or are_separated(
            graph, self._effect.treatments, self._effect.outcomes, self._apart | 1 << node
        ):
            return None
        conditions = self._effect.conditioning(self._apart | 1 << node)
        trail = find_open_path(graph, self._effect.treatments, self._effect.outcomes, conditions)
        colliders = [passed for passed, role in trail.inner if role == "collider"] if trail else []
        if not colliders:
            return None
        return "collider" if node in colliders else "descendant-of-collider"


def _advice_where_sound(claim: Claim, node: int) -> tuple[Advice, Precision | None]:
    """A column that may be in or out is optional where it is in, or where putting it in would help."""
    is_covariate, is_used = _uses(claim, node)
    if (is_used and not is_covariate) or claim.graph.measured >> node & 1 == 0:
        return "keep" if is_used else "leave-out", None
    column = 1 << node
    covariates = claim.covariates & ~column if is_covariate else claim.covariates | column
    other = Choice(covariates, claim.fixed_effects & ~column, claim.parts)
    if not claim.is_carried_by(other):
        return "keep" if is_covariate else "leave-out", None
    precision = precision_of(claim.effect, claim.held_fixed(other), node)
    return "optional" if is_covariate or precision == "raises" else "leave-out", precision


def _uses(claim: Claim, node: int) -> tuple[bool, bool]:
    """Does the config adjust for a column, and does it use it at all?"""
    is_covariate = bool(claim.adjusted_for >> node & 1)
    return is_covariate, is_covariate or any(
        part.columns >> node & 1 for part in (*claim.parts, *claim.silent)
    )


def _advice(claim: Claim, node: int, remedy: Remedy | None) -> Advice:
    if claim.ends >> node & 1:
        return "keep"
    is_covariate, is_used = _uses(claim, node)
    if remedy is None:
        return "keep" if is_used and not claim.effect.forbidden >> node & 1 else "leave-out"
    if remedy.adjusted_for >> node & 1:
        return "keep" if is_covariate else "add"
    is_dropped = is_covariate or any(part.columns >> node & 1 for part in remedy.drop_parts)
    return "drop" if is_dropped else "keep" if is_used else "leave-out"
