"""Which single edge, added or turned round, would make a valid covariate set invalid?

For an added edge in closed form: the open walks from treatments and from outcomes are followed once, and then the
targets that an arrow from one node must not have are one mask. The walks are those of m-separation with colliders
in the set itself, so that a new walk splits where it first and last uses the new edge. An arrow between what lies
downstream of the treatments and what lies upstream of the outcomes changes which paths are causal; for the sources
of such arrows the walks are followed once more each. A turned arrow is first held against the same masks, which
only err on the side of suspicion, and then tried. An edge less never harms: paths and descendants only get fewer,
and a treatment's arrow that stops being causal leads to nothing conditioned on and never to an outcome.
"""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from functools import cached_property

from pathgate.criteria.adjustment import Effect, direct_effect, is_valid, total_effect
from pathgate.criteria.reachability import Conditions, entered
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.kinship import ancestors, descendants
from pathgate.graphs.masks import members


@dataclass(frozen=True, slots=True)
class Reach:
    """Where open walks from a set of nodes can go on: by an arrow out of a node, by an edge that points at it.

    Attributes:
        out, into: masks of these nodes.
        by_head: the nodes that the walks enter by an arrowhead.
    """

    out: int
    into: int
    by_head: int

    @classmethod
    def of(cls, graph: CausalGraph, starts: int, conditions: Conditions) -> Reach:
        """The walks that these conditions let through."""
        by_tail, by_head = entered(graph, starts, conditions)
        free = ~conditions.blocking
        # Entered by an arrowhead and left against one: a collider, open where it leads to the set.
        return cls((by_tail | by_head) & free, by_tail & free | by_head & conditions.opening, by_head)


@dataclass(frozen=True)
class Hinges:
    """What a valid covariate set hinges on; small graphs only (``CausalGraph.is_small``).

    Attributes:
        effect: the effect that it carries.
        covariates: the valid set.
        is_direct: was the effect made by ``direct_effect``?
    """

    effect: Effect
    covariates: int
    is_direct: bool = False
    _without: dict[int, Reach] = field(default_factory=dict, repr=False)

    def arrows_from(self, source: int, among: int) -> int:
        """The targets in ``among`` to which an arrow from ``source``, added alone, would make the set invalid.

        It is not looked at whether such an arrow would close a cycle or is there already.
        """
        return among and among & self._arrows_from(source, among)

    def _arrows_from(self, source: int, among: int) -> int:
        harmful = self._harmful_arrows(source)
        at = 1 << source
        if at & self.effect.treatments:
            # The new arrow is itself the first one of a proper causal path, and harms where it leads to what
            # is conditioned on.
            return harmful & ~self.causal_ends | self.causal_ends & self._opening
        detours = self.detours_from(source)
        if not among & detours:
            return harmful
        return harmful & ~detours | detours & self._harmful_detours(source, among)

    def bidirected_with(self, node: int) -> int:
        """The nodes whose joining to ``node`` by a bidirected edge would make the set invalid."""
        harmful = 0
        if self._from_treatments.into >> node & 1:
            harmful |= self._from_outcomes.into
        if self._from_outcomes.into >> node & 1:
            harmful |= self._from_treatments.into
        return harmful

    def may_turning_harm(self, source: int, target: int) -> bool:
        """Is it worth trying to turn the arrow from ``source`` to ``target`` round? Where not, no harm is sure.

        Without the arrow, walks and ancestors are fewer, but for walks from a treatment down what was a causal
        path; so what the masks say of the arrow back, added to the graph as it is, can only be too much.
        """
        treatments, outcomes = self._from_treatments, self._from_outcomes
        at, to = 1 << target, 1 << source
        out = treatments.out | self._below_causal
        if (out & at and outcomes.into & to) or (outcomes.out & at and treatments.into & to):
            return True
        if to & self._opening:
            changes_causes = (self._downstream | self.effect.treatments) & at and to & self.causal_ends
            return bool(out & outcomes.out & at or self._below_causal & at or changes_causes)
        return bool(at & self._below_conditioned and to & self._upstream)

    def does_turning_harm(self, source: int, target: int) -> bool:
        """Would the set be invalid if the arrow led the other way round? Tried; no cycle must come of it."""
        effect = self.effect
        kept = replace(effect.kept, graph=effect.kept.graph.with_arrow_turned(source, target))
        kind = direct_effect if self.is_direct else total_effect
        return not is_valid(kind(kept, effect.treatments, effect.outcomes), self.covariates)

    def _harmful_arrows(self, source: int) -> int:
        """Harmful targets as far as the new arrow leaves the causal paths what they are."""
        treatments, outcomes = self._from_treatments, self._from_outcomes
        at = 1 << source
        harmful = outcomes.into if treatments.out & at else 0
        if outcomes.out & at:
            harmful |= treatments.into
        if at & (treatments.out & outcomes.out | self._below_causal):
            # Both sides meet at the source, which so becomes an ancestor of what is conditioned on; or what is
            # conditioned on comes to descend from a causal path.
            harmful |= self._opening
        return harmful

    def _harmful_detours(self, source: int, among: int) -> int:
        """Harmful targets upstream of the outcomes, for a source downstream of the treatments: a new causal path."""
        at = 1 << source
        if at & self._below_conditioned:
            return self._upstream
        outcomes = self._from_outcomes
        if not (self._upstream & outcomes.into & among or outcomes.out & at):
            return self._opening
        treatments = self._from_treatments_without(self.steps_towards(source))
        harmful = self._opening
        if treatments.out & at:
            harmful |= outcomes.into
        if outcomes.out & at:
            harmful |= treatments.into
        return harmful

    def detours_from(self, source: int) -> int:
        """The targets of an arrow from ``source`` that would be part of a new causal path, but not its first step."""
        return self._upstream if self._downstream >> source & 1 and not self.is_direct else 0

    def steps_towards(self, source: int) -> int:
        """Where arrows from treatments lead that would become first steps of causal paths by such an arrow."""
        return ancestors(self._graph, 1 << source, avoiding=self.effect.treatments) & self._first_steps

    @cached_property
    def causal_ends(self) -> int:
        """Where an arrow from a treatment begins a causal path."""
        return self.effect.outcomes if self.is_direct else self._upstream

    @property
    def _graph(self) -> CausalGraph:
        return self.effect.kept.graph

    @cached_property
    def _conditioned(self) -> int:
        return self.covariates | self.effect.kept.conditioned

    @cached_property
    def _opening(self) -> int:
        """What is conditioned on and all its ancestors; the same with and without the first causal arrows."""
        return ancestors(self._graph, self._conditioned)

    @cached_property
    def _from_treatments(self) -> Reach:
        return self._reach(self.effect.back_door_graph, self.effect.treatments)

    def _from_treatments_without(self, first_steps: int) -> Reach:
        """The same without the arrows from treatments to these nodes."""
        if not first_steps:
            return self._from_treatments
        if first_steps not in self._without:
            treatments = self.effect.treatments
            without = self.effect.back_door_graph.without_arrows(treatments, first_steps)
            self._without[first_steps] = self._reach(without, treatments)
        return self._without[first_steps]

    @cached_property
    def _first_steps(self) -> int:
        """Where arrows from the treatments lead that begin no causal path."""
        children = self.effect.back_door_graph.child_masks
        steps = 0
        for treatment in members(self.effect.treatments):
            steps |= children[treatment]
        return steps & ~self.effect.treatments

    @cached_property
    def _from_outcomes(self) -> Reach:
        return self._reach(self.effect.back_door_graph, self.effect.outcomes)

    def _reach(self, graph: CausalGraph, starts: int) -> Reach:
        return Reach.of(graph, starts, Conditions(self._conditioned, self._opening))

    @cached_property
    def _below_causal(self) -> int:
        return descendants(self._graph, self.effect.on_causal_paths)

    @cached_property
    def _downstream(self) -> int:
        """What directed paths from the treatments reach without meeting another one."""
        treatments = self.effect.treatments
        return descendants(self._graph, treatments, avoiding=treatments) & ~treatments

    @cached_property
    def _upstream(self) -> int:
        """What reaches the outcomes by directed paths without meeting a treatment, the outcomes included."""
        return ancestors(self._graph, self.effect.outcomes, avoiding=self.effect.treatments)

    @cached_property
    def _below_conditioned(self) -> int:
        """What descends from something downstream that leads to the set: no causal path may come through it."""
        if self.is_direct:
            return 0
        return descendants(self._graph, self._downstream & self._opening, avoiding=self.effect.treatments)
