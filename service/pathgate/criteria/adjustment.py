"""Which covariate sets carry an effect: validity, forbidden columns, and one valid set where any exists.

The adjustment criterion for sets of treatments and outcomes (Shpitser, VanderWeele & Robins 2010; Perković
et al. 2018) in its back-door form (van der Zander, Liśkiewicz & Textor 2019): a set is valid when it holds
no forbidden node and separates treatments from outcomes in the graph that lacks the first arrow of every
proper causal path. Rows kept count as conditioned on. O(nodes + edges) a question.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

from pathgate.criteria.reachability import Conditions
from pathgate.criteria.selection import Kept
from pathgate.criteria.separators import Separators
from pathgate.criteria.verdict import are_apart
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.kinship import ancestors, descendants


@dataclass(frozen=True)
class Effect:
    """An effect of some treatments on some outcomes among the rows kept, as a question about covariate sets.

    Attributes:
        kept: the graph with what keeping rows conditions on.
        treatments, outcomes: disjoint masks.
        on_causal_paths: the nodes other than treatments on proper causal paths, those that meet no treatment
            after their first node; the outcomes they lead to included.
        forbidden: these and their descendants, less the treatments: never to be conditioned on.
    """

    kept: Kept
    treatments: int
    outcomes: int
    on_causal_paths: int
    forbidden: int

    @cached_property
    def back_door_graph(self) -> CausalGraph:
        """The graph without the first arrow of every proper causal path (for a direct effect: without the arrow)."""
        return self.kept.graph.without_arrows(self.treatments, self.on_causal_paths)

    def conditioning(self, conditioned: int) -> Conditions:
        """Conditioning in the back-door graph on nodes none of which is forbidden.

        What leads to one of those does so without the arrows that the back-door graph lacks: they lead to what is
        forbidden. So the graph itself is asked, which many effects share.
        """
        opening = ancestors(self.kept.graph, conditioned)
        return Conditions(conditioned, opening, opening | self.above_ends)

    @cached_property
    def above_ends(self) -> int:
        """The ancestors of treatments and outcomes, these included."""
        return ancestors(self.kept.graph, self.treatments | self.outcomes)

    @cached_property
    def some_valid_set(self) -> int | None:
        """A minimal valid set of measured columns, or None where none is valid."""
        found = valid_sets(self)
        minimal = None if found is None else found.minimal()
        return None if minimal is None else covariates_in(self, minimal)

    @property
    def usable(self) -> int:
        """The measured columns that are neither treatment, outcome nor forbidden."""
        return self.kept.graph.measured & ~(self.treatments | self.outcomes | self.forbidden)


def total_effect(kept: Kept, treatments: int, outcomes: int) -> Effect:
    """The total effect as a question about covariate sets."""
    graph = kept.graph
    downstream = descendants(graph, treatments, avoiding=treatments) & ~treatments
    # A causal path keeps to what is downstream, so nothing else need be searched upstream.
    on_causal_paths = ancestors(graph, outcomes & downstream, avoiding=graph.everything & ~downstream)
    forbidden = descendants(graph, on_causal_paths) & ~treatments
    return Effect(kept, treatments, outcomes, on_causal_paths, forbidden)


def direct_effect(kept: Kept, treatment: int, outcome: int) -> Effect:
    """The coefficient of the arrow itself, in linear models, as a question about covariate sets.

    Where the arrow is there, nothing that descends from the outcome may be conditioned on and what is
    conditioned on must separate the two once the arrow is gone; where it is not, separation is all (Pearl
    1998; Spirtes et al. 1998). The arrow is then the one causal path. Treatment and outcome are one node each.
    """
    graph = kept.graph
    has_arrow = _has_arrow(graph, treatment.bit_length() - 1, outcome.bit_length() - 1)
    forbidden = descendants(graph, outcome) & ~treatment if has_arrow else 0
    return Effect(kept, treatment, outcome, outcome if has_arrow else 0, forbidden)


def _has_arrow(graph: CausalGraph, source: int, target: int) -> bool:
    if graph.is_small:
        return bool(graph.child_masks[source] >> target & 1)
    return target in graph.children(source)


def is_valid(effect: Effect, covariates: int) -> bool:
    """Do these covariates, on the rows kept, carry the effect?

    ``covariates`` is a mask without treatments and outcomes; it may hold unmeasured nodes, as a graph's
    theory may.
    """
    conditioned = covariates | effect.kept.conditioned
    if conditioned & effect.forbidden or conditioned & (effect.treatments | effect.outcomes):
        return False
    # What leads to a set with the treatments in it does so without an arrow out of a treatment as well.
    relevant = effect.above_ends | ancestors(effect.kept.graph, conditioned)
    # The back-door graph need not be made for one question.
    lacking = effect.treatments, effect.on_causal_paths
    ends = effect.treatments, effect.outcomes
    return are_apart(effect.kept.graph, *ends, conditioned, relevant, lacking=lacking)


def valid_set(effect: Effect, *, required: int = 0, allowed: int = -1) -> int | None:
    """A valid set that holds ``required``, keeps to ``allowed`` and is minimal so; None where none exists.

    Minimal among the valid sets that hold ``required``; see ``separators`` for the method and its cost.
    """
    if not required and allowed == -1:
        return effect.some_valid_set
    found = valid_sets(effect, required=required, allowed=allowed)
    minimal = None if found is None else found.minimal()
    return None if minimal is None else covariates_in(effect, minimal, required)


def valid_sets(effect: Effect, *, required: int = 0, allowed: int = -1) -> Separators | None:
    """All valid sets within bounds, as separating sets; None where ``required`` rules out every one.

    The separating sets hold what the kept rows condition on, too: ``covariates_in`` takes it out.
    """
    always = required | effect.kept.conditioned
    if always & (effect.forbidden | effect.treatments | effect.outcomes):
        return None
    return Separators(
        effect.back_door_graph,
        effect.treatments,
        effect.outcomes,
        required=always,
        allowed=effect.usable & allowed & ~effect.kept.conditioned,
    )


def covariates_in(effect: Effect, separating: int, required: int = 0) -> int:
    """The covariates of a separating set."""
    return (separating & ~effect.kept.conditioned) | required
