"""Which covariate set has the least variance in each of hundreds of linear worlds of one graph?

The worlds are those of ``linear_worlds``, stacked, with strengths over several orders of magnitude and, in
every other world, some arrows of no strength at all: which of two sets wins then changes as often as it can.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence

import numpy as np
from numpy.typing import NDArray

from tests.linear_worlds import LinearWorld
from tests.values import Graph, arrows_of, bidirected_of, node_names

Stack = NDArray[np.float64]
ABSENT = 0.25


def draw_worlds(graph: Graph, rng: np.random.Generator, count: int) -> list[LinearWorld]:
    """Random worlds of this graph."""
    names = node_names(graph)
    place = {name: index for index, name in enumerate(names)}
    size = len(names) + len(bidirected_of(graph))
    weights = np.zeros((count, size, size))
    for source, target in arrows_of(graph):
        weights[:, place[target], place[source]] = _coefficients(rng, count)
    for cause, ends in enumerate(bidirected_of(graph), start=len(names)):
        for end in ends:
            weights[:, place[end], cause] = _coefficients(rng, count)
    noise = np.exp(rng.normal(0.0, 1.0, (count, size)))
    totals = np.linalg.inv(np.eye(size) - weights)
    covariance = (totals * noise[:, None, :]) @ totals.transpose(0, 2, 1)
    return [LinearWorld(place, weights[k], noise[k], covariance[k]) for k in range(count)]


def _coefficients(rng: np.random.Generator, count: int) -> Stack:
    drawn = rng.choice([-1.0, 1.0], count) * np.exp(rng.normal(0.0, 1.0, count))
    drawn[(rng.random(count) < ABSENT) & (np.arange(count) % 2 == 1)] = 0.0
    return drawn


def variances(
    worlds: Sequence[LinearWorld], treatments: Sequence[str], outcome: str, sets: Iterable[frozenset[str]]
) -> Stack:
    """Large-sample variance of the first treatment's coefficient in the regression of the outcome on all
    treatments and a set, times the number of rows: a row for each set, a column for each world."""
    place = worlds[0].place
    covariance = np.array([world.covariance for world in worlds])
    told = []
    for chosen in sets:
        regressors = [place[name] for name in (*treatments, *sorted(chosen))]
        # The first entry of the inverse is one over what is left of the first column's variance.
        precision = np.linalg.inv(covariance[:, regressors][:, :, regressors])[:, 0, 0]
        everything = [place[outcome], *regressors]
        told.append(precision / np.linalg.inv(covariance[:, everything][:, :, everything])[:, 0, 0])
    return np.array(told)
