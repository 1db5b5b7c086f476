"""Is the effect in everybody recovered from the rows kept? By definition, in worlds and by paths.

In a discrete world both sides are exact: the adjustment formula over the kept rows, weighted by what is known
of everybody, and the truncated factorisation. By paths, the criterion is read off its wording.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from itertools import product

import numpy as np
from numpy.typing import NDArray

from tests.brute import is_valid_adjustment, proper_paths, separated, subsets
from tests.discrete_worlds import DiscreteWorld, draw_discrete_world, joint_distribution
from tests.strategies import Question
from tests.values import Graph, Names, as_set, node_names, without_arrow

Table = NDArray[np.float64]


@dataclass(frozen=True)
class KeptWorld:
    """A binary world as it is seen through the rows kept, those in which every conditioned node is one.

    Attributes:
        names: the nodes, in the order of the axes.
        everybody: their joint distribution.
        kept: their joint distribution among the rows kept.
        truth: P(outcomes | do(treatments)): a row for each setting of the treatments.
    """

    names: list[str]
    everybody: Table
    kept: Table
    truth: Table

    def formula(self, asked: Question, covariates: Names, weights: Names) -> Table:
        """Σ P(y | x, z, kept) · P(z less w | w, kept) · P(w), shaped like ``truth``."""
        weighting = sorted(as_set(weights))
        others = sorted(as_set(covariates) - set(weighting))
        columns = [*asked.x, *asked.y, *weighting, *others]
        sizes = [2 ** len(part) for part in (asked.x, asked.y, weighting, others)]
        joint = self._among(self.kept, columns).reshape(sizes)
        # A stratum that holds no kept row (another value of a column held at one) has the weight zero.
        outcome = _shares(joint, joint.sum(axis=1, keepdims=True))
        strata = joint.sum(axis=(0, 1))
        other = _shares(strata, strata.sum(axis=1, keepdims=True))
        return np.einsum("xywo,wo,w->xy", outcome, other, self._among(self.everybody, weighting).reshape(-1))

    def _among(self, table: Table, columns: Sequence[str]) -> Table:
        left = [name for name in self.names if name in columns]
        gone = tuple(place for place, name in enumerate(self.names) if name not in columns)
        return np.transpose(table.sum(axis=gone), [left.index(name) for name in columns])


def _shares(part: Table, whole: Table) -> Table:
    return np.divide(part, whole, out=np.zeros_like(part), where=whole > 0)


def draw_kept_world(
    selected: Graph, conditioned: Iterable[str], asked: Question, rng: np.random.Generator
) -> KeptWorld:
    """A random binary world of a graph with selection nodes."""
    world = draw_discrete_world(selected, rng, values=2, responses=4)
    names = node_names(selected)
    everybody = joint_distribution(world, names)
    held = set(conditioned)
    inside = np.zeros_like(everybody)
    place = tuple(1 if name in held else slice(None) for name in names)
    inside[place] = everybody[place]
    return KeptWorld(names, everybody, inside / inside.sum(), _truth(world, asked))


def _truth(world: DiscreteWorld, asked: Question) -> Table:
    settings = product((0, 1), repeat=len(asked.x))
    effects = (joint_distribution(world, asked.y, dict(zip(asked.x, one, strict=True))) for one in settings)
    return np.array([effect.reshape(-1) for effect in effects])


def is_right(worlds: Iterable[KeptWorld], asked: Question, covariates: Names, weights: Names) -> bool:
    """Does the formula give the truth in every one of the worlds?"""
    return all(
        np.allclose(world.formula(asked, covariates, weights), world.truth, atol=1e-9) for world in worlds
    )


def recovery_by_paths(
    selected: Graph, conditioned: Names, asked: Question
) -> Callable[[frozenset[str], frozenset[str]], bool]:
    """The criterion for (covariates, known), by listing paths and every weighting."""
    held = as_set(conditioned)
    back_door = selected
    for path in proper_paths(selected, asked.x, asked.y):
        if path.is_causal:
            back_door = without_arrow(back_door, path.nodes[0], path.nodes[1])
    usable: dict[frozenset[str], bool] = {}

    def undoes(weights: frozenset[str]) -> bool:
        if weights not in usable:
            usable[weights] = not held or separated(back_door, asked.y, held, weights)
        return usable[weights]

    def recovers(covariates: frozenset[str], known: frozenset[str]) -> bool:
        if not is_valid_adjustment(selected, asked.x, asked.y, covariates, held):
            return False
        return any(undoes(weights) for weights in subsets((covariates & known) - held))

    return recovers
