"""Random covariate sets that carry an effect, on random graphs and filters, and every single change to them.

Sets may hold unmeasured nodes, as what a fixed effect absorbs may be unmeasured. A change is judged by the criterion
anew, on the changed graph.
"""

from __future__ import annotations

import random
from collections.abc import Iterator
from dataclasses import dataclass, replace
from itertools import combinations
from typing import Any

from pathgate.criteria import Effect, Kept, Part, direct_effect, is_valid, keep_rows, recovers, total_effect
from pathgate.graphs import InvalidGraph, read_graph
from tests.brute import descendants
from tests.review.brute_hinges import edges_of, with_edge, with_turned, without_edges
from tests.strategies import random_graph, random_parts, random_question
from tests.values import Graph, arrows_of, node_names

Edge = tuple[str, str, str]


@dataclass(frozen=True)
class Case:
    """A covariate set on a graph; ``known`` is None where the effect is that among the rows kept."""

    graph: Graph
    treatments: tuple[str, ...]
    outcomes: tuple[str, ...]
    covariates: tuple[str, ...]
    parts: tuple[dict[str, Any], ...]
    known: tuple[str, ...] | None
    is_direct: bool = False

    def on(self, graph: Graph) -> Case:
        """The same set on another graph of the same nodes."""
        return replace(self, graph=graph)

    @property
    def effect(self) -> Effect:
        """What is asked, of the production code."""
        kept = self.kept
        kind = direct_effect if self.is_direct else total_effect
        return kind(kept, kept.graph.mask(self.treatments), kept.graph.mask(self.outcomes))

    @property
    def kept(self) -> Kept:
        """The graph with its selection nodes."""
        graph = read_graph(self.graph)
        return keep_rows(
            graph, [Part(graph.mask(part["columns"]), part["fixed"], part) for part in self.parts]
        )

    @property
    def is_sound(self) -> bool:
        """Does the set carry the effect, or recover it? False on a faulty graph as well."""
        effect = self.effect
        mask = effect.kept.graph.mask
        if self.known is None:
            return is_valid(effect, mask(self.covariates))
        return recovers(effect, mask(self.covariates), mask(self.known))


def random_case(rng: random.Random, *, population: str) -> Case:
    """One case, sound or not; half of them look only at what does not descend from the treatments."""
    chances = {"arrow": rng.choice([0.2, 0.3, 0.45]), "bidirected": rng.choice([0.0, 0.05, 0.15])}
    graph = random_graph(rng, rng.choice([2, 3, 4, 5, 5, 6, 6, 7]), unmeasured=0.2, **chances)
    is_direct = rng.random() < 0.15
    asked = random_question(rng, graph, single=is_direct or rng.random() < 0.5)
    parts = random_parts(rng, graph, 3, fixed=0.3)
    if rng.random() < 0.1:
        parts.append({"columns": [rng.choice(node_names(graph))], "fixed": rng.random() < 0.4})
    ends = {*asked.x, *asked.y}
    parts = [part for part in parts if not (part["fixed"] and ends & set(part["columns"]))]
    covariates = asked.given
    if rng.random() < 0.5:
        below = descendants(graph, asked.x)
        parts = [part for part in parts if not below & set(part["columns"])]
        covariates = tuple(name for name in covariates if name not in below)
    chance = rng.choice([0.3, 0.7, 1.0])
    known = tuple(name for name in node_names(graph) if rng.random() < chance)
    told = known if population == "whole" else None
    return Case(graph, asked.x, asked.y, covariates, tuple(parts), told, is_direct)


def sound_cases(seeds: range, *, population: str) -> Iterator[tuple[int, Case]]:
    """For each seed the first sound one among some random cases; mostly rows are left out, often that matters."""
    for seed in seeds:
        rng = random.Random(seed)
        is_filtered, is_weighted = rng.random() < 0.8, population == "whole" and rng.random() < 0.5
        drawn = (random_case(rng, population=population) for _ in range(25))
        sound = (case for case in drawn if bool(case.parts) >= is_filtered and case.is_sound)
        found = next((case for case in sound if not is_weighted or needs_weighting(case)), None)
        if found is not None:
            yield seed, found


def needs_weighting(case: Case) -> bool:
    """Is it about everybody, and do the kept rows alone not recover the effect?"""
    return case.known is not None and not replace(case, known=()).is_sound


def lost_by(case: Case, graph: Graph) -> bool | None:
    """Is the case no longer sound on the changed graph? None where that is no graph."""
    try:
        return not case.on(graph).is_sound
    except InvalidGraph:
        return None


def absent_arrows(case: Case) -> Iterator[tuple[str, str, bool]]:
    """Every arrow that could be added, and whether the case is lost by it."""
    present, names = set(arrows_of(case.graph)), node_names(case.graph)
    for source in names:
        for target in names:
            if source != target and (source, target) not in present:
                lost = lost_by(case, with_edge(case.graph, ("directed", source, target)))
                if lost is not None:
                    yield source, target, lost


def absent_bidirected(case: Case) -> Iterator[tuple[str, str, bool]]:
    """Every bidirected edge that could be added, and whether the case is lost by it."""
    present = edges_of(case.graph)
    for first, second in combinations(node_names(case.graph), 2):
        edge = ("bidirected", first, second)
        if edge not in present:
            lost = lost_by(case, with_edge(case.graph, edge))
            assert lost is not None
            yield first, second, lost


def turned_arrows(case: Case) -> Iterator[tuple[str, str, bool]]:
    """Every arrow that could be turned, and whether the case is lost by it."""
    for source, target in arrows_of(case.graph):
        lost = lost_by(case, with_turned(case.graph, ("directed", source, target)))
        if lost is not None:
            yield source, target, lost


def removals(case: Case) -> Iterator[tuple[Edge, bool]]:
    """Every edge, and whether the case is lost without it."""
    for edge in edges_of(case.graph):
        lost = lost_by(case, without_edges(case.graph, {edge}))
        assert lost is not None
        yield edge, lost
