"""What a config claims, in terms of the graph, and whether a choice of what to adjust for and filter by carries it.

The verdict, the remedies and "can anything carry it" all ask this module, so that they cannot disagree.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace
from functools import cached_property
from itertools import combinations

from pathgate.criteria.adjustment import Effect, direct_effect, total_effect
from pathgate.criteria.determined import determined_by, made_of
from pathgate.criteria.populations import AmongKept, InEverybody, Population
from pathgate.criteria.selection import Part, fixed_by, keep_rows
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import mask_of, members
from pathgate.review.config import Asks, Claimed, Config

# Effects on different choices of rows that one review may hold at a time.
MOST_EFFECTS = 64
# Of so many fixed effects every set to keep is looked at; of more, those that lack one, or hold one or none.
MOST_FIXED_EFFECTS = 6
# Sets of columns left out, one after the other, in search of a choice that leaves the treatments some variation.
MOST_EXCLUSIONS = 100


@dataclass(frozen=True, slots=True)
class Choice:
    """What a model adjusts for, and the conditions that it keeps rows by.

    Attributes:
        covariates: mask of the columns adjusted for otherwise than by fixed effects.
        fixed_effects: mask of the columns whose fixed effects are absorbed.
        parts: the parts of the row filter that stay.
    """

    covariates: int
    fixed_effects: int
    parts: tuple[Part, ...]


@dataclass(frozen=True)
class Claim:
    """An effect claimed on a graph.

    Attributes:
        graph: the team's graph, grown by the columns that the config computes.
        treatments, outcomes: masks.
        covariates: what the config adjusts for otherwise than by fixed effects.
        parts: its row filter.
        silent: what keeps rows beside it; never to be dropped.
        fixed_effects: the columns whose fixed effects it absorbs.
        beside: those of the covariates that only its weights or its matching adjust for.
        inputs: for each computed column what it is computed from.
        row_filter_fixed: may no part be dropped?
        asks: the total effect, or the direct one (then treatment and outcome are one column each).
        population: whose effect.
        known: the columns whose distribution over everybody is known.
        may_read_unmeasured: may a condition on the rows read what the platform does not hold?
    """

    graph: CausalGraph
    treatments: int
    outcomes: int
    covariates: int
    parts: tuple[Part, ...]
    silent: tuple[Part, ...] = ()
    fixed_effects: int = 0
    beside: int = 0
    inputs: Mapping[int, int] = field(default_factory=dict)
    row_filter_fixed: bool = False
    asks: Asks = "total"
    population: Claimed = "kept"
    known: int = 0
    may_read_unmeasured: bool = False
    _effects: dict[tuple[int, ...], tuple[Effect, tuple[Part, ...]]] = field(default_factory=dict, repr=False)

    @classmethod
    def of(cls, config: Config) -> Claim:
        """The claim that a config makes."""
        covariates = mask_of(named.node for named in config.covariates)
        beside = mask_of(named.node for named in (*config.weighted_by, *config.matched_on))
        return cls(
            graph=config.columns.graph,
            treatments=mask_of(named.node for named in config.treatments),
            outcomes=mask_of(named.node for named in config.outcomes),
            covariates=covariates | beside,
            parts=tuple(each.part for each in config.rows.filter_parts),
            silent=tuple(each.part for each in config.rows.silent_parts),
            fixed_effects=mask_of(named.node for named in config.fixed_effects),
            beside=beside & ~covariates,
            inputs=config.columns.inputs,
            row_filter_fixed=config.row_filter_fixed,
            asks=config.asks,
            population=config.population,
            known=config.known,
            may_read_unmeasured=config.may_read_unmeasured,
        )

    def on(self, graph: CausalGraph) -> Claim:
        """The same claim on another graph of the same nodes."""
        # Effects are remembered for one graph.
        return replace(self, graph=graph, _effects={})

    @property
    def ends(self) -> int:
        """Treatments and outcomes."""
        return self.treatments | self.outcomes

    @property
    def adjusted_for(self) -> int:
        """All columns that the config adjusts for, in whichever way."""
        return self.covariates | self.fixed_effects

    @property
    def readable(self) -> int:
        """The nodes that a condition on the rows may read."""
        return self.graph.everything if self.may_read_unmeasured else self.graph.measured

    @property
    def effect_name(self) -> str:
        """What the claim is about, in a sentence."""
        if self.population == "whole":
            return "the effect in everybody"
        return "the direct effect" if self.asks == "direct" else "the effect"

    @property
    def usable(self) -> Choice:
        """The config's own choice as far as the model can have it: measured, and neither treatment nor outcome."""
        may_have = self.graph.measured & ~self.ends
        return Choice(self.covariates & may_have, self.fixed_effects & may_have, self.judged_parts)

    @cached_property
    def usable_covariates(self) -> int:
        """What the model can hold fixed of what it adjusts for, what its fixed effects absorb included."""
        return self.held_fixed(self.usable) & ~self.ends

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
        """The effect on the rows that some parts of the filter keep; the last ``MOST_EFFECTS`` are remembered."""
        return self.effect_on_rows((*parts, *self.silent))

    def effect_on_rows(self, parts: Sequence[Part]) -> Effect:
        """The same on the rows that exactly these parts keep, silent ones included or not."""
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

    def population_of(self, effect: Effect) -> Population:
        """The population that the claim is about, with an effect in it."""
        return AmongKept(effect) if self.population == "kept" else InEverybody(effect, self.known)

    def can_filter_by(self, part: Part) -> bool:
        """Can a dataset be filtered by this part and still hold something to compare?"""
        return not part.columns & ~self.readable and not (part.fixed and part.columns & self.ends)

    def absorbed(self, fixed_effects: int) -> int:
        """What has one value within each value of one of these columns of the config, measured or not."""
        constant = 0
        for node in members(fixed_effects):
            constant |= self._constant_within[node]
        return constant & ~fixed_effects

    @cached_property
    def _constant_within(self) -> dict[int, int]:
        """For each column of the fixed effects, what is constant within it, step by step, or computed from that."""
        below: dict[int, int] = {}
        for node, columns in self.graph.constant_within.items():
            for column in columns:
                below[column] = below.get(column, 0) | 1 << node
        found = {}
        for fixed in members(self.fixed_effects):
            constant = reached = 1 << fixed
            while reached:
                further = 0
                for node in members(reached):
                    further |= below.get(node, 0)
                reached = further & ~constant
                constant |= reached
            found[fixed] = determined_by(constant, self.inputs)
        return found

    def held_fixed(self, choice: Choice) -> int:
        """All that a choice holds fixed in the comparison, rows aside."""
        return choice.covariates | choice.fixed_effects | self.absorbed(choice.fixed_effects)

    def leaves_no_variation(self, choice: Choice) -> int:
        """The columns adjusted for that only the treatments can make vary, once the others are held fixed."""
        if not self.inputs:
            return 0
        return self.only_varied_by(self.treatments, self.held_fixed(choice) | fixed_by(choice.parts))

    def only_varied_by(self, columns: int, held: int) -> int:
        """The computed columns held fixed that only these columns can make vary, once the others are held."""
        found, known = 0, held
        known_with = held | columns
        # Inputs stand before what uses them, so that what a column is determined by is settled when it comes.
        for node, needed in self.inputs.items():
            is_determined, is_with = not needed & ~known, not needed & ~known_with
            if held >> node & 1:
                found |= (is_with and not is_determined) << node
            known |= is_determined << node
            known_with |= is_with << node
        return found

    def is_carried_by(self, choice: Choice) -> bool:
        """Does this choice review as sound?"""
        named = choice.covariates | choice.fixed_effects
        if self.ends & ~self.graph.measured or named & (self.ends | ~self.graph.measured):
            return False
        held = self.held_fixed(choice)
        if held & self.ends or self.leaves_no_variation(choice):
            return False
        if not all(map(self.can_filter_by, choice.parts)):
            return False
        return self.population_of(self.effect_among(choice.parts)).carries(held)

    @property
    def own_choice(self) -> Choice:
        """What the config itself chooses."""
        return Choice(self.covariates, self.fixed_effects, self.parts)

    @cached_property
    def undroppable(self) -> tuple[Part, ...]:
        """The parts of the filter that have to stay."""
        return self.parts if self.row_filter_fixed else ()

    @cached_property
    def can_be_carried(self) -> bool:
        """Would any choice of measured columns, with whichever filter parts may be dropped, do?

        Dropping a part never hurts: a selection node has no children and so blocks nothing, and where a part
        fixes a column, the column can be adjusted for instead. In everybody, what undoes a selection undoes a
        lesser one.
        """
        if self.ends & ~self.graph.measured or not all(map(self.can_filter_by, self.undroppable)):
            return False
        return next(self.choices(self.undroppable), None) is not None

    def choices(self, parts: tuple[Part, ...], required: int = 0) -> Iterator[Choice]:
        """Choices on some rows that carry the effect: for each set of fixed effects to keep one, if any does."""
        population = self.population_of(self.effect_among(parts))
        for kept in self._fixed_effects_to_keep():
            held = kept | self.absorbed(kept)
            choice = None if held & self.ends else self._varying(population, kept, parts, required)
            if choice is not None and self.is_carried_by(choice):
                yield choice

    def _varying(
        self, population: Population, kept: int, parts: tuple[Part, ...], required: int
    ) -> Choice | None:
        """A choice with these fixed effects that carries the effect and leaves the treatments some variation.

        Where one leaves them none, whichever does must lack that computed column or something it is made of.
        """
        held = kept | self.absorbed(kept)
        waiting, met = [0], set[int]()
        while waiting and len(met) < MOST_EXCLUSIONS:
            excluded = waiting.pop()
            met.add(excluded)
            found = population.one(required=held | required, allowed=~excluded)
            if found is None:
                continue
            choice = Choice((found | required) & ~held, kept, parts)
            stuck = self.leaves_no_variation(choice)
            if not stuck:
                return choice
            behind = made_of(1 << stuck.bit_length() - 1, self.inputs) & choice.covariates & ~required
            waiting += [both for node in members(behind) if (both := excluded | 1 << node) not in met]
        return None

    def _fixed_effects_to_keep(self) -> Iterator[int]:
        """Sets of fixed effects, larger ones first."""
        columns = [1 << node for node in members(self.usable.fixed_effects)]
        few = len(columns) <= MOST_FIXED_EFFECTS
        for count in range(len(columns), -1, -1):
            if few or count in (len(columns), len(columns) - 1, 1, 0):
                yield from map(sum, combinations(columns, count))
