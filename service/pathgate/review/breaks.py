"""Which columns and filter parts break a claim, along which path: the criteria's diagnosis put into words.

What is forbidden has to go in any case, so the paths are looked at as they are once it has gone. ``criteria.diagnosis``
finds the nodes and paths; here they are traced back to the members of the config that condition on them.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from pathgate.criteria.adjustment import is_valid
from pathgate.criteria.deadline import Deadline
from pathgate.criteria.diagnosis import Forbidden, Missing, Opened, forbidden_nodes, open_paths
from pathgate.criteria.paths import Trail
from pathgate.criteria.selection import Kept, Part
from pathgate.graphs.errors import Place
from pathgate.graphs.masks import mask_of
from pathgate.review.adjusting import adjustments
from pathgate.review.claims import Claim
from pathgate.review.config import Config
from pathgate.review.findings import Finding
from pathgate.review.parts import FilterPart
from pathgate.review.wording import arrow_text, capital, listed, names_in, part_text, silent_text


def breaking_findings(claim: Claim, config: Config, deadline: Deadline) -> Iterator[Finding]:
    """Everything that keeps the covariates, on the rows kept, from carrying the effect.

    Raises:
        OutOfTime: the deadline came first.
    """
    effect = claim.effect
    if is_valid(effect, claim.usable_covariates):
        return
    conditioned = claim.usable_covariates | effect.kept.conditioned
    for forbidden in forbidden_nodes(effect, conditioned):
        deadline.poll()
        yield from _Blame(claim, config, effect.kept, conditioned).forbidden(forbidden)
    # What is forbidden has to go in any case, so the rest is judged as if it were gone already.
    harmless = [part for node, part in effect.kept.part_of.items() if not effect.forbidden >> node & 1]
    remaining = claim.effect_on_rows(harmless)
    covariates = claim.usable_covariates & ~remaining.forbidden
    let_go = conditioned & effect.forbidden & claim.graph.measured
    blame = _Blame(claim, config, remaining.kept, covariates | remaining.kept.conditioned, let_go)
    for found in open_paths(remaining, covariates, deadline):
        yield from blame.opened(found) if isinstance(found, Opened) else blame.missing(found)


_ADVICE = {
    "unmeasured-cause": "Record something on it; until then the number is a link between two columns, no effect.",
    "unblockable-path": "Check which way its arrows point, or ask about another treatment or outcome.",
}


@dataclass(frozen=True, slots=True)
class _Cause:
    """What in the config conditions on a node.

    Attributes:
        kind: a covariate, a part of the row filter, or rows that go missing without it.
        doing: what the config does with it, as the subject of a sentence.
        undone: what stops it, as a request.
        columns: the columns to blame.
        about: what a sentence is about that says where on the path these are: the columns, or what they hold fixed.
        distance: arrows from the node in question down to the column that is adjusted for or filtered by;
            -1 where a part of the filter is that node itself.
        place, part: where in the config, and for a filter its condition.
    """

    kind: str
    doing: str
    undone: str
    columns: tuple[str, ...]
    about: tuple[str, ...]
    distance: int
    place: Place
    part: object = None

    @property
    def harm(self) -> str:
        if self.kind == "covariate":
            return "takes away part of the effect"
        return "lets the effect decide who is compared"

    def rule(self, about: str) -> str:
        return f"{self.kind}-{'below' if self.distance > 0 else 'on'}-{about}"


class _Blame:
    """Turns what was diagnosed on some kept rows into findings at the places in the config that cause it.

    ``conditioned`` is what was conditioned on; ``let_go`` are the columns that the config conditions on and
    that were left out, as they must be.
    """

    def __init__(self, claim: Claim, config: Config, kept: Kept, conditioned: int, let_go: int = 0) -> None:
        self._claim = claim
        self._config = config
        self._kept = kept
        self._conditioned = conditioned
        self._let_go = let_go

    def forbidden(self, found: Forbidden) -> Iterator[Finding]:
        above = listed([self._kept.graph.name(found.descends_from)])
        drawn = arrow_text(self._kept, found.causal_path, self._conditioned)
        for cause in self._causes(found.node, found.descent, found.descent.nodes):
            which = listed(cause.about)
            if cause.distance == 0:
                lies = (
                    "is the outcome, at the end of"
                    if self._claim.outcomes >> found.descends_from & 1
                    else "lies on"
                )
                message = f"{which} {lies} the causal path {drawn}: {cause.doing} {cause.harm}."
            else:
                message = (
                    f"{which} is a consequence of {above} on the causal path {drawn}: {cause.doing}"
                    f" {cause.harm}, or joins what should stay apart."
                )
            label = self._kept.label
            yield Finding(
                rule=cause.rule("causal-path"),
                columns=cause.columns,
                message=f"{capital(message)} {capital(cause.undone)}.",
                place=cause.place,
                part=cause.part,
                causal_path=tuple(map(label, found.causal_path.nodes)),
                descent=tuple(map(label, found.descent.nodes)),
            )

    def opened(self, found: Opened) -> Iterator[Finding]:
        drawn = arrow_text(self._kept, found.trail, self._conditioned)
        graph = self._kept.graph
        for descent in found.descents:
            collider = descent.nodes[0]
            for cause in self._causes(descent.nodes[-1], descent, found.trail.nodes):
                which = listed(cause.about)
                if cause.distance < 0:
                    why = f"it {'reads' if cause.kind == 'filter' else 'depends on'} {which} together"
                elif cause.distance == 0:
                    why = f"{which} is a common consequence on it"
                else:
                    why = f"{which} is a consequence of {listed([graph.name(collider)])}, a common consequence on it"
                what = f"{self._claim.effect_name}{self._once(found.trail)}"
                message = (
                    f"{capital(cause.doing)} opens the path {drawn}, which is not {what}: {why}."
                    f" {capital(cause.undone)}{self._or_block(found.trail)}."
                )
                rule = cause.rule("collider")
                yield Finding(rule, cause.columns, message, cause.place, cause.part, found.path)

    def missing(self, found: Missing) -> Iterator[Finding]:
        drawn = arrow_text(self._kept, found.trail, self._conditioned)
        once = self._once(found.trail)
        how = f"is open{once}" if once else "stays open"
        still_open = f"The path {drawn} is not {self._claim.effect_name} and {how}"
        if found.blocker is None:
            ends = names_in(self._kept, mask_of((found.trail.nodes[0], found.trail.nodes[-1])))
            rule, why = self._why_nothing_blocks(found)
            advice = _ADVICE[rule]
            yield Finding(rule, ends, f"{still_open}: {why}. {advice}", ("covariates",), path=found.path)
            return
        name = self._kept.graph.name(found.blocker)
        is_fork = (found.blocker, "fork") in found.trail.inner
        why = "is a common cause on it" if is_fork else "would block it"
        message = f"{still_open}: {listed([name])} {why} and the model does not adjust for it. Adjust for it."
        yield Finding("missing-covariate", (name,), message, ("covariates",), path=found.path)

    def _or_block(self, trail: Trail) -> str:
        """What else would block an opened path, as the end of a request."""
        unfit = self._claim.effect.forbidden | self._claim.ends
        fit = self._kept.graph.measured & ~unfit
        blockers = mask_of(node for node, role in trail.inner if role != "collider") & fit
        return f", or adjust for {listed(names_in(self._kept, blockers), 'or')}" if blockers else ""

    def _once(self, trail: Trail) -> str:
        """Which columns on a path block it as the config stands, but must not."""
        gone = mask_of(node for node, role in trail.inner if role != "collider") & self._let_go
        return f" once the config lets go of {listed(names_in(self._kept, gone))}" if gone else ""

    def _why_nothing_blocks(self, found: Missing) -> tuple[str, str]:
        """The rule for a path that no covariate on it can block, and why none can."""
        inner = mask_of(node for node, _role in found.trail.inner)
        barred = inner & self._kept.graph.measured
        named = f"{listed(names_in(self._kept, barred))} may not be adjusted for" if barred else ""
        below = ", being on a causal path or a consequence of one"
        if inner == barred and "both" not in found.trail.arrows:
            why = named + below if barred else "the outcome is a direct cause of the treatment"
            return "unblockable-path", why
        if not barred:
            return "unmeasured-cause", "nothing on it is measured, so no covariate on it can block it"
        return "unmeasured-cause", f"{named}{below}, and nothing else on it is measured"

    def _causes(self, node: int, descent: Trail, along: tuple[int, ...]) -> Iterator[_Cause]:
        """Who conditions on ``node``, the last one of ``descent``; ``along`` tells what a part joins."""
        distance = len(descent.nodes) - 1
        for adjusting in adjustments(self._claim, self._config, node):
            held = (self._kept.graph.name(node),)
            yield _Cause(
                "covariate",
                adjusting.doing,
                adjusting.undone,
                adjusting.columns,
                held,
                distance,
                adjusting.place,
            )
        rows = self._config.rows
        for kind, filter_parts in (("filter", rows.filter_parts), ("lost-rows", rows.silent_parts)):
            for filter_part in filter_parts:
                if self._stands_for(node, filter_part.part):
                    yield self._cause_in_rows(kind, filter_part, node, descent, along)

    def _cause_in_rows(
        self, kind: str, filter_part: FilterPart, node: int, descent: Trail, along: tuple[int, ...]
    ) -> _Cause:
        part = filter_part.part
        distance = len(descent.nodes) - (1 if part.fixed else 2)
        doing = (
            f"keeping rows by {part_text(part.written)}" if kind == "filter" else silent_text(part.written)
        )
        undone = (
            "drop this condition" if kind == "filter" else "start from rows that are not lost in this way"
        )
        if kind == "filter" and self._claim.row_filter_fixed:
            undone = "take rows that are not chosen by this condition, which the config may not drop"
        read = self._columns_read(node, part, descent, along)
        return _Cause(kind, doing, undone, read, read, distance, filter_part.place, part.written)

    def _stands_for(self, node: int, part: Part) -> bool:
        if part.fixed:
            return part.columns == 1 << node and bool(self._kept.conditioned >> node & 1)
        standing = self._kept.part_of.get(node)
        return standing is not None and not standing.fixed and standing.written is part.written

    def _columns_read(self, node: int, part: Part, descent: Trail, along: tuple[int, ...]) -> tuple[str, ...]:
        if part.fixed:
            return self._kept.graph.names_of(part.columns)
        if len(descent.nodes) > 1:
            return (self._kept.graph.name(descent.nodes[-2]),)
        # The part itself is where two arrowheads meet: its neighbours on the path are what it joins.
        place = along.index(node)
        return self._kept.graph.names_of(mask_of((along[place - 1], along[place + 1])))
