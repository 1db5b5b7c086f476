"""Which single edge, added or turned round, would keep a set from recovering the effect in everybody?

One that makes it invalid among the rows kept (``hinges``), and one that joins the outcomes to what keeping rows
conditions on by a path that no weighting blocks: on which nothing weightable but colliders lies, each of them
above an outcome or above what is conditioned on (an inducing path: Verma & Pearl 1990). An arrow added opens as
colliders what lies above its source, whatever its target, so that the targets it must not have are one mask a
source: O(nodes + edges) each. A turned arrow is first held against these masks, and then tried.

An edge less never harms here either. The paths only get fewer, but for those along a treatment's arrow that stops
being causal; all that it leads to was forbidden, so nothing there is conditioned on or weighted by, colliders there
lie above nothing that counts, and no directed path goes on to an outcome but by another causal arrow.
"""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from functools import cached_property

from pathgate.criteria.adjustment import Effect, direct_effect, total_effect
from pathgate.criteria.hinges import Hinges, Reach
from pathgate.criteria.reachability import Conditions
from pathgate.criteria.whole import recovers
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.kinship import ancestors


@dataclass(frozen=True)
class WholeHinges:
    """What a set that recovers an effect in everybody hinges on; small graphs only (``CausalGraph.is_small``).

    Attributes:
        effect: the effect that it recovers.
        covariates: the set; it may hold unmeasured nodes.
        known: the columns whose joint distribution over everybody is known.
        is_direct: was the effect made by ``direct_effect``?

    >>> from pathgate.criteria import Part, keep_rows
    >>> graph = CausalGraph.of(("late", "refund"), ("age", "answer"))
    >>> kept = keep_rows(graph, [Part(graph.mask("answer"), fixed=False, written="answer")])
    >>> effect = total_effect(kept, graph.mask("late"), graph.mask("refund"))
    >>> graph.names_of(WholeHinges(effect, covariates=0, known=0).arrows_from(graph.index["age"], graph.everything))
    ('refund',)
    """

    effect: Effect
    covariates: int
    known: int
    is_direct: bool = False
    _without: dict[int, _Apart] = field(default_factory=dict, repr=False)

    def arrows_from(self, source: int, among: int) -> int:
        """The targets in ``among`` to which an arrow from ``source``, added alone, would undo the recovery.

        It is not looked at whether such an arrow would close a cycle or is there already.
        """
        harmful = self._among_kept.arrows_from(source, among)
        asked = among & ~harmful
        if not asked & self._apart.opening or not self.effect.kept.conditioned:
            return harmful
        return harmful | asked & self._joining(source, asked)

    def _joining(self, source: int, asked: int) -> int:
        """Targets to which an arrow would join outcomes and selection."""
        among_kept = self._among_kept
        if self.effect.treatments >> source & 1:
            # Onto a causal path such an arrow is itself causal, and no back-door path takes it.
            return self._apart.joined_from(source) & ~among_kept.causal_ends
        detours = among_kept.detours_from(source)
        joining = self._apart.joined_from(source) & ~detours
        if asked & detours:
            apart = self._apart_without(among_kept.steps_towards(source))
            joining |= apart.joined_from(source) & detours
        return joining

    def bidirected_with(self, node: int) -> int:
        """The nodes whose joining to ``node`` by a bidirected edge would undo the recovery."""
        harmful = self._among_kept.bidirected_with(node)
        return harmful | self._apart.joined_by_bidirected(node) if self.effect.kept.conditioned else harmful

    def may_turning_harm(self, source: int, target: int) -> bool:
        """Is it worth trying to turn the arrow from ``source`` to ``target`` round? Where not, no harm is sure.

        The turned graph's back-door paths are held to be those of the graph as it is with the arrow back added.
        A treatment's arrow that stops being causal adds to them only where the arrow back, into a treatment above
        the selection, makes what it leads to an ancestor of the selection; among the rows kept that is looked at.
        """
        if self._among_kept.may_turning_harm(source, target):
            return True
        causal, treatments = self._among_kept.causal_ends, self.effect.treatments
        if not self.effect.kept.conditioned or (treatments >> target & causal >> source & 1):
            return False
        return bool(self._apart.joined_from(target) >> source & 1)

    def does_turning_harm(self, source: int, target: int) -> bool:
        """Would the set not recover the effect if the arrow led the other way round? Tried; no cycle must come."""
        effect = self.effect
        kept = replace(effect.kept, graph=effect.kept.graph.with_arrow_turned(source, target))
        kind = direct_effect if self.is_direct else total_effect
        return not recovers(kind(kept, effect.treatments, effect.outcomes), self.covariates, self.known)

    @cached_property
    def _among_kept(self) -> Hinges:
        return Hinges(self.effect, self.covariates, self.is_direct)

    @cached_property
    def _apart(self) -> _Apart:
        return self._apart_in(self.effect.back_door_graph)

    def _apart_without(self, first_steps: int) -> _Apart:
        """The same without the arrows from treatments to these nodes."""
        if not first_steps:
            return self._apart
        if first_steps not in self._without:
            graph = self.effect.back_door_graph.without_arrows(self.effect.treatments, first_steps)
            self._without[first_steps] = self._apart_in(graph)
        return self._without[first_steps]

    def _apart_in(self, graph: CausalGraph) -> _Apart:
        selected = self.effect.kept.conditioned
        return _Apart(graph, self.effect.outcomes, selected, self.covariates & self.known & ~selected)


@dataclass(frozen=True)
class _Apart:
    """Outcomes and selection, apart in a back-door graph: what would join them, whatever weighting is chosen?

    Attributes:
        graph: the back-door graph.
        outcomes, selected: what some weighting separates.
        weightable: the nodes that a weighting may hold.
    """

    graph: CausalGraph
    outcomes: int
    selected: int
    weightable: int
    _found: dict[int, int] = field(default_factory=dict, repr=False)

    def joined_from(self, source: int) -> int:
        """The targets of an arrow from ``source`` that would join the two."""
        if source not in self._found:
            self._found[source] = self._joined_from(source)
        return self._found[source]

    def _joined_from(self, source: int) -> int:
        at = 1 << source
        outcomes, selected = self._from_outcomes, self._from_selected
        # An arrow to what lies above neither leads to no collider that is open, and opens none.
        if not self.opening & at:
            opened = ancestors(self.graph, at) & ~self.opening
            outcomes = self._reach_again(outcomes, self.outcomes, opened)
            selected = self._reach_again(selected, self.selected, opened)
            if outcomes.by_head & selected.by_head & opened:
                return self.opening
        harmful = selected.into if outcomes.out & at else 0
        if selected.out & at:
            harmful |= outcomes.into
        return harmful & self.opening

    def joined_by_bidirected(self, node: int) -> int:
        """The other ends of a bidirected edge at ``node`` that would join the two."""
        joined = self._from_selected.into if self._from_outcomes.into >> node & 1 else 0
        if self._from_selected.into >> node & 1:
            joined |= self._from_outcomes.into
        return joined

    @cached_property
    def opening(self) -> int:
        """What lies above the two: there a collider is open for some weighting, or goes round another way."""
        return ancestors(self.graph, self.outcomes | self.selected)

    @cached_property
    def _from_outcomes(self) -> Reach:
        return self._reach(self.outcomes, self.opening)

    @cached_property
    def _from_selected(self) -> Reach:
        return self._reach(self.selected, self.opening)

    def _reach_again(self, known: Reach, starts: int, opened: int) -> Reach:
        """The walks from the same starts once more colliders are open."""
        return self._reach(starts, self.opening | opened) if known.by_head & opened else known

    def _reach(self, starts: int, opening: int) -> Reach:
        return Reach.of(self.graph, starts, Conditions(self.weightable, opening))
