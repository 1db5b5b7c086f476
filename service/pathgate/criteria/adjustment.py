"""Which covariate sets carry an effect: validity, forbidden columns, and one valid set where any exists.

The adjustment criterion for sets of treatments and outcomes (Shpitser, VanderWeele & Robins 2010; Perković
et al. 2018) in its back-door form (van der Zander, Liśkiewicz & Textor 2019): a set is valid when it holds
no forbidden node and separates treatments from outcomes in the graph that lacks the first arrow of every
proper causal path. Rows kept count as conditioned on. O(nodes + edges) a question.
"""

from __future__ import annotations

from dataclasses import dataclass

from pathgate.criteria.selection import Kept
from pathgate.criteria.separators import Separators
from pathgate.criteria.verdict import are_separated
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.kinship import ancestors, descendants


@dataclass(frozen=True)
class Effect:
    """The total effect of some treatments on some outcomes among the rows kept.

    Attributes:
        kept: the graph with what keeping rows conditions on.
        treatments, outcomes: disjoint masks.
        on_causal_paths: the nodes other than treatments on proper causal paths, those that meet no treatment
            after their first node; the outcomes they lead to included.
        forbidden: these and their descendants, less the treatments: never to be conditioned on.
        back_door_graph: the graph without the first arrow of every proper causal path.
    """

    kept: Kept
    treatments: int
    outcomes: int
    on_causal_paths: int
    forbidden: int
    back_door_graph: CausalGraph

    @property
    def usable(self) -> int:
        """The measured columns that are neither treatment, outcome nor forbidden."""
        return self.kept.graph.measured & ~(self.treatments | self.outcomes | self.forbidden)


def total_effect(kept: Kept, treatments: int, outcomes: int) -> Effect:
    """The total effect as a question about covariate sets."""
    graph = kept.graph
    downstream = descendants(graph, treatments, avoiding=treatments) & ~treatments
    upstream = ancestors(graph, outcomes, avoiding=treatments) & ~treatments
    on_causal_paths = downstream & upstream
    forbidden = descendants(graph, on_causal_paths) & ~treatments
    back_door_graph = graph.without_arrows(treatments, on_causal_paths)
    return Effect(kept, treatments, outcomes, on_causal_paths, forbidden, back_door_graph)


def is_valid(effect: Effect, covariates: int) -> bool:
    """Do these covariates, on the rows kept, carry the effect?

    ``covariates`` is a mask without treatments and outcomes; it may hold unmeasured nodes, as a graph's
    theory may.
    """
    conditioned = covariates | effect.kept.conditioned
    if conditioned & effect.forbidden or conditioned & (effect.treatments | effect.outcomes):
        return False
    return are_separated(effect.back_door_graph, effect.treatments, effect.outcomes, conditioned)


def valid_set(effect: Effect, *, required: int = 0, allowed: int = -1) -> int | None:
    """A valid set that holds ``required``, keeps to ``allowed`` and is minimal so; None where none exists.

    Minimal among the valid sets that hold ``required``; see ``separators`` for the method and its cost.
    """
    always = required | effect.kept.conditioned
    if always & (effect.forbidden | effect.treatments | effect.outcomes):
        return None
    found = Separators(
        effect.back_door_graph,
        effect.treatments,
        effect.outcomes,
        required=always,
        allowed=effect.usable & allowed & ~effect.kept.conditioned,
    ).minimal()
    return None if found is None else (found & ~effect.kept.conditioned) | required
