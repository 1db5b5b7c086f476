"""What each column is to the effect claimed, and what to do with it.

The roles are exclusive; the first that fits in this order holds: treatment, outcome, mediator (on a proper
causal path), descendant-of-outcome and descendant-of-mediator, confounder (a cause of the treatment that
also reaches the outcome past the treatments), collider and descendant-of-collider (conditioning on it joins
treatment and outcome where a minimal valid set had kept them apart), cause-of-treatment, cause-of-outcome,
descendant-of-treatment, proxy (dependent on treatment or outcome in another way), unrelated.
"""

from __future__ import annotations

from dataclasses import dataclass
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
Advice = Literal["keep", "drop", "add", "optional", "leave-out"]


@dataclass(frozen=True, slots=True)
class ColumnRole:
    """A column's role for the effect, and what the config should do with it."""

    column: str
    role: Role
    advice: Advice


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
        advice = _advice(claim, node, remedy, is_sound=is_sound)
        answers.append(ColumnRole(claim.graph.name(node), roles.of(node), advice))
    return tuple(answers)


class _Roles:
    """The sets that decide roles, computed once for all columns."""

    def __init__(self, effect: Effect) -> None:
        graph = effect.kept.graph
        self._effect = effect
        self._apart = valid_set(effect) or 0
        self._ends = effect.treatments | effect.outcomes
        to_treatment = ancestors(graph, effect.treatments)
        to_outcome = ancestors(graph, effect.outcomes, avoiding=effect.treatments)
        self._sets: tuple[tuple[Role, int], ...] = (
            ("treatment", effect.treatments),
            ("outcome", effect.outcomes),
            ("mediator", effect.on_causal_paths),
            ("descendant-of-outcome", descendants(graph, effect.outcomes & effect.on_causal_paths)),
            ("descendant-of-mediator", effect.forbidden),
            ("confounder", to_treatment & to_outcome),
        )
        self._later: tuple[tuple[Role, int], ...] = (
            ("cause-of-treatment", to_treatment),
            ("cause-of-outcome", to_outcome),
            ("descendant-of-treatment", descendants(graph, effect.treatments)),
            ("proxy", connected(graph, self._ends, Conditions())),
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
        conditions = Conditions.on(graph, self._apart | 1 << node)
        trail = find_open_path(graph, self._effect.treatments, self._effect.outcomes, conditions)
        colliders = [passed for passed, role in trail.inner if role == "collider"] if trail else []
        if not colliders:
            return None
        return "collider" if node in colliders else "descendant-of-collider"


def _advice(claim: Claim, node: int, remedy: Remedy | None, *, is_sound: bool) -> Advice:
    if claim.ends >> node & 1:
        return "keep"
    is_covariate = bool(claim.adjusted_for >> node & 1)
    is_used = is_covariate or any(part.columns >> node & 1 for part in (*claim.parts, *claim.silent))
    if is_sound:
        if not is_covariate:
            return "keep" if is_used else "leave-out"
        without = Choice(claim.covariates & ~(1 << node), claim.fixed_effects & ~(1 << node), claim.parts)
        return "optional" if claim.is_carried_by(without) else "keep"
    if remedy is None:
        return "keep" if is_used and not claim.effect.forbidden >> node & 1 else "leave-out"
    if remedy.adjusted_for >> node & 1:
        return "keep" if is_covariate else "add"
    is_dropped = is_covariate or any(part.columns >> node & 1 for part in remedy.drop_parts)
    return "drop" if is_dropped else "keep" if is_used else "leave-out"
