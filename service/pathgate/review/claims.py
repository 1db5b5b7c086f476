"""What a config claims, in terms of the graph, and whether a choice of covariates and filter parts carries it.

The verdict, the remedies and "can anything carry it" all ask this module, so that they cannot disagree.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from functools import cached_property

from pathgate.criteria.adjustment import Effect, direct_effect, is_valid, total_effect, valid_set
from pathgate.criteria.selection import Part, keep_rows
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import mask_of
from pathgate.review.config import Asks, Config

# Effects on different choices of rows that one review may hold at a time.
MOST_EFFECTS = 64


@dataclass(frozen=True)
class Claim:
    """An effect claimed on a graph.

    Attributes:
        graph: the team's graph.
        treatments, outcomes: masks.
        covariates: what the config adjusts for.
        parts: its row filter.
        row_filter_fixed: may no part be dropped?
        asks: the total effect, or the direct one (then treatment and outcome are one column each).
        may_read_unmeasured: may a condition on the rows read what the platform does not hold?
    """

    graph: CausalGraph
    treatments: int
    outcomes: int
    covariates: int
    parts: tuple[Part, ...]
    row_filter_fixed: bool = False
    asks: Asks = "total"
    may_read_unmeasured: bool = False
    _effects: dict[tuple[int, ...], tuple[Effect, tuple[Part, ...]]] = field(default_factory=dict, repr=False)

    @classmethod
    def of(cls, graph: CausalGraph, config: Config) -> Claim:
        """The claim that a config makes."""
        return cls(
            graph=graph,
            treatments=mask_of(named.node for named in config.treatments),
            outcomes=mask_of(named.node for named in config.outcomes),
            covariates=mask_of(named.node for named in config.covariates),
            parts=tuple(filter_part.part for filter_part in config.filter_parts),
            row_filter_fixed=config.row_filter_fixed,
            asks=config.asks,
            may_read_unmeasured=config.may_read_unmeasured,
        )

    @property
    def ends(self) -> int:
        """Treatments and outcomes."""
        return self.treatments | self.outcomes

    @property
    def readable(self) -> int:
        """The nodes that a condition on the rows may read."""
        return self.graph.everything if self.may_read_unmeasured else self.graph.measured

    @property
    def effect_name(self) -> str:
        """What the claim is about, in a sentence."""
        return "the direct effect" if self.asks == "direct" else "the effect"

    @cached_property
    def usable_covariates(self) -> int:
        """The covariates that the model can have: measured, and neither treatment nor outcome."""
        return self.covariates & self.graph.measured & ~self.ends

    @cached_property
    def judged_parts(self) -> tuple[Part, ...]:
        """The filter as far as it can be judged: without unmeasured columns, without parts that leave
        nothing to compare."""
        judged = []
        for part in self.parts:
            columns = part.columns & self.readable
            if columns and not (part.fixed and columns & self.ends):
                judged.append(part if columns == part.columns else Part(columns, part.fixed, part.written))
        return tuple(judged)

    @cached_property
    def effect(self) -> Effect:
        """The effect claimed, on the rows that the judged parts keep."""
        return self.effect_among(self.judged_parts)

    def effect_among(self, parts: Sequence[Part]) -> Effect:
        """The effect on the rows that some parts keep; the last ``MOST_EFFECTS`` are remembered."""
        key = tuple(map(id, parts))
        remembered = self._effects.get(key)
        if remembered is not None:
            return remembered[0]
        kind = direct_effect if self.asks == "direct" else total_effect
        effect = kind(keep_rows(self.graph, parts), self.treatments, self.outcomes)
        if len(self._effects) >= MOST_EFFECTS:
            self._effects.clear()
        # The parts are held beside the effect: their identities are the key.
        self._effects[key] = (effect, tuple(parts))
        return effect

    def can_filter_by(self, part: Part) -> bool:
        """Can a dataset be filtered by this part and still hold something to compare?"""
        return not part.columns & ~self.readable and not (part.fixed and part.columns & self.ends)

    def is_carried_by(self, covariates: int, parts: Sequence[Part]) -> bool:
        """Does this choice review as sound?"""
        if self.ends & ~self.graph.measured or covariates & (self.ends | ~self.graph.measured):
            return False
        return all(map(self.can_filter_by, parts)) and is_valid(self.effect_among(parts), covariates)

    @cached_property
    def can_be_carried(self) -> bool:
        """Would any choice of measured covariates, with whichever filter parts may be dropped, do?

        Dropping a part never hurts: a selection node has no children and so blocks nothing, and where a
        part fixes a column, the column can be adjusted for instead.
        """
        parts = self.parts if self.row_filter_fixed else ()
        if self.ends & ~self.graph.measured or not all(map(self.can_filter_by, parts)):
            return False
        return valid_set(self.effect_among(parts)) is not None
