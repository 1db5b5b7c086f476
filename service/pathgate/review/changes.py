"""What does replacing one graph by another do to a config's verdict, and which of the changes did it?

A config is ``broken`` where it was sound and is not any more, ``mended`` where it is the other way round, and has an
``other-reason`` where it is sound neither time, but by another verdict, other errors or another problem of being
read. The culprits are a least set of changes with which the old graph gives what the new one gives (``culprits``);
each set that is tried costs a review.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from itertools import islice
from typing import Literal

from pathgate.criteria.deadline import Deadline
from pathgate.criteria.errors import OutOfTime
from pathgate.graphs.errors import PathgateError
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import members
from pathgate.review.claims import Claim
from pathgate.review.config import read_config
from pathgate.review.culprits import Culprits, least_changes
from pathgate.review.errors import InvalidConfig
from pathgate.review.findings import Finding, Verdict
from pathgate.review.graph_difference import Change, Difference
from pathgate.review.review import verdict_and_findings

# Of a set of changes that could not be made smaller than that, no more are told.
MOST_CULPRITS = 100

Outcome = Literal["broken", "mended", "same", "other-reason"]


@dataclass(frozen=True, slots=True)
class Judgement:
    """What one graph makes of a config.

    Attributes:
        verdict: None where it could not be judged.
        errors: what it is not sound by, in the order of the review.
        problem: why it could not be judged; None where it was.
    """

    verdict: Verdict | None = None
    errors: tuple[Finding, ...] = ()
    problem: PathgateError | None = None

    @property
    def is_sound(self) -> bool:
        """Was it judged, and found sound?"""
        return self.verdict == "sound"

    @property
    def reason(self) -> tuple[object, ...]:
        """What has to be equal for two judgements to be the same for the same reason."""
        errors = frozenset((each.rule, frozenset(each.columns)) for each in self.errors)
        faults = self.problem.faults if isinstance(self.problem, InvalidConfig) else ()
        slug = getattr(self.problem, "slug", None)
        return self.verdict, errors, slug, frozenset((fault.slug, fault.place) for fault in faults)


@dataclass(frozen=True, slots=True)
class ConfigChange:
    """What a change of graph does to one config.

    Attributes:
        before, after: what the old and the new graph make of it.
        outcome: how the two compare.
        culprits: a set of changes that does it, in their order; empty where the outcome is ``same``.
        is_complete: is it known that no proper subset does it, and is none left out past ``MOST_CULPRITS``?
    """

    before: Judgement
    after: Judgement
    outcome: Outcome
    culprits: tuple[Change, ...] = ()
    is_complete: bool = True


def judge(value: object, graph: CausalGraph, deadline: Deadline) -> Judgement:
    """What a graph makes of a config that was parsed from JSON or YAML; raises nothing that is the config's fault."""
    try:
        config = read_config(value, graph)
        verdict, findings = verdict_and_findings(Claim.of(config), config, deadline)
    except (InvalidConfig, OutOfTime) as error:
        return Judgement(problem=error)
    return Judgement(verdict, tuple(finding for finding in findings if finding.severity == "error"))


def change_of(
    value: object,
    difference: Difference,
    deadline: Deadline | None = None,
    search_until: Deadline | None = None,
) -> ConfigChange:
    """What replacing the old graph of a difference by the new one does to a config.

    Args:
        value: the config as it was parsed.
        difference: between the two graphs.
        deadline: for the reviews against the two.
        search_until: for the search for what did it; the same where it is not given.

    >>> old = CausalGraph.of(("delay", "refund"), ("rain", "delay"))
    >>> new = CausalGraph.of(("delay", "refund"), ("rain", "delay"), ("rain", "refund"), ("delay", "ticket"))
    >>> config = {"treatment": "delay", "outcome": "refund", "covariates": []}
    >>> found = change_of(config, Difference(old, new))
    >>> found.outcome, [each.edge for each in found.culprits]
    ('broken', [('directed', 'rain', 'refund')])
    """
    deadline = deadline or Deadline.never()
    before = judge(value, difference.before, deadline)
    after = judge(value, difference.after, deadline)
    outcome = _outcome(before, after)
    if outcome == "same":
        return ConfigChange(before, after, outcome)
    found = _culprits(value, difference, before, after, search_until or deadline)
    places = islice(members(found.changes), MOST_CULPRITS)
    culprits = tuple(difference.changes[place] for place in places)
    is_complete = found.is_least and found.changes.bit_count() <= MOST_CULPRITS
    return ConfigChange(before, after, outcome, culprits, is_complete)


def _outcome(before: Judgement, after: Judgement) -> Outcome:
    if before.is_sound != after.is_sound:
        return "broken" if before.is_sound else "mended"
    return "same" if before.reason == after.reason else "other-reason"


def _culprits(
    value: object, difference: Difference, before: Judgement, after: Judgement, deadline: Deadline
) -> Culprits:
    if any(isinstance(each.problem, OutOfTime) for each in (before, after)):
        return Culprits(0, is_least=False)
    is_like_after = _likeness(before, after)

    def has_outcome(chosen: int) -> bool:
        deadline.poll()
        graph = difference.graph_with(chosen)
        if graph is None:
            return False
        found = judge(value, graph, deadline)
        if isinstance(found.problem, OutOfTime):
            raise found.problem
        return is_like_after(found)

    # Without an edge a sound config stays sound, so one that is gone breaks nothing by itself; it may have had to
    # go for another change to be possible.
    unlikely = difference.removals if before.is_sound else 0
    return least_changes(difference.everything, has_outcome, first=unlikely)


def _likeness(before: Judgement, after: Judgement) -> Callable[[Judgement], bool]:
    """What a judgement must be for the changes that led to it to be what did it."""
    if before.is_sound:
        return lambda found: not found.is_sound
    if after.is_sound:
        return lambda found: found.is_sound
    return lambda found: found.reason == after.reason
