"""What do regressions and correlations come to in a linear world that the graph describes?

Each node is a weighted sum of its parents, of the unmeasured causes behind its bidirected edges and of noise
of its own (Wright 1921). Covariances are those of the population, solved for and not sampled, so that a
coefficient equals an effect exactly or not at all. Coefficients are drawn in sorted order of the edges: a
seed gives the same world however the graph is written down.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tests.values import Graph, Names, arrows_of, as_set, bidirected_of, node_names

Matrix = NDArray[np.float64]
TOLERANCE = 1e-10


@dataclass(frozen=True, slots=True)
class LinearWorld:
    """One linear structural model.

    Attributes:
        place: where each node stands in the matrices; the causes behind bidirected edges stand after them.
        weights: ``weights[i, j]`` is the coefficient of the arrow from j to i.
        noise: variance of each node's own noise.
        covariance: of everything, in the population.
    """

    place: dict[str, int]
    weights: Matrix
    noise: Matrix
    covariance: Matrix

    def among(self, rows: list[str], columns: list[str]) -> Matrix:
        """Covariances of the rows with the columns."""
        return self.covariance[np.ix_([self.place[n] for n in rows], [self.place[n] for n in columns])]

    def arrow(self, source: str, target: str) -> float:
        """The coefficient of one arrow; zero where there is none."""
        return float(self.weights[self.place[target], self.place[source]])


def draw_world(graph: Graph, rng: np.random.Generator) -> LinearWorld:
    """A random world of this graph: coefficients of magnitude 0.3 to 1.2, noise variances of 0.5 to 1.5."""
    names = sorted(node_names(graph))
    place = {name: index for index, name in enumerate(names)}
    shared = sorted(tuple(sorted(ends)) for ends in bidirected_of(graph))
    size = len(names) + len(shared)
    weights = np.zeros((size, size))
    for source, target in sorted(arrows_of(graph)):
        weights[place[target], place[source]] = _coefficient(rng)
    for cause, ends in enumerate(shared, start=len(names)):
        for end in ends:
            weights[place[end], cause] = _coefficient(rng)
    noise = rng.uniform(0.5, 1.5, size)
    totals = np.linalg.inv(np.eye(size) - weights)
    return LinearWorld(place, weights, noise, totals @ np.diag(noise) @ totals.T)


def _coefficient(rng: np.random.Generator) -> float:
    return float(rng.uniform(0.3, 1.2) * rng.choice([-1.0, 1.0]))


def partial_correlation(world: LinearWorld, x: str, y: str, given: Names = ()) -> float:
    """Correlation of x and y with the linear part of ``given`` taken out of both."""
    fixed = sorted(as_set(given))
    pair = [x, y]
    within = world.among(pair, pair)
    if fixed:
        explained = np.linalg.solve(world.among(fixed, fixed), world.among(fixed, pair))
        within = within - world.among(pair, fixed) @ explained
    return float(within[0, 1] / np.sqrt(within[0, 0] * within[1, 1]))


def is_uncorrelated(world: LinearWorld, x: str, y: str, given: Names = ()) -> bool:
    """Is the partial correlation zero but for rounding?"""
    return abs(partial_correlation(world, x, y, given)) < TOLERANCE


def regression_coefficients(
    world: LinearWorld, outcome: str, treatments: Names, covariates: Names = ()
) -> dict[str, float]:
    """Coefficient of each treatment in the population regression of the outcome on all of them together."""
    terms = sorted(as_set(treatments))
    regressors = [*terms, *sorted(as_set(covariates) - set(terms))]
    solved = np.linalg.solve(world.among(regressors, regressors), world.among(regressors, [outcome]))
    return {name: float(solved[index, 0]) for index, name in enumerate(terms)}


def joint_effect(world: LinearWorld, treatments: Names, outcome: str) -> dict[str, float]:
    """Effect of setting each treatment by one more while the others are held fixed."""
    terms = sorted(as_set(treatments))
    weights = world.weights.copy()
    weights[[world.place[name] for name in terms], :] = 0.0
    totals = np.linalg.inv(np.eye(len(weights)) - weights)
    return {name: float(totals[world.place[outcome], world.place[name]]) for name in terms}


def residual_variance(world: LinearWorld, target: str, regressors: Names) -> float:
    """What is left of the target's variance after the population regression on the regressors."""
    others = sorted(as_set(regressors))
    own = float(world.among([target], [target])[0, 0])
    if not others:
        return own
    solved = np.linalg.solve(world.among(others, others), world.among(others, [target]))
    return own - float((world.among([target], others) @ solved)[0, 0])


def estimate_variance(world: LinearWorld, treatment: str, outcome: str, covariates: Names = ()) -> float:
    """Large-sample variance of the treatment's coefficient, times the number of rows."""
    others = as_set(covariates)
    left = residual_variance(world, outcome, others | {treatment})
    return left / residual_variance(world, treatment, others)


def adjustment_holds(
    graph: Graph,
    treatments: Names,
    outcomes: Names,
    covariates: Names = (),
    conditioned: Names = (),
    *,
    draws: int = 3,
    seed: int = 0,
) -> bool:
    """Do coefficients equal effects, for every treatment and outcome, in every one of the worlds drawn?

    ``graph`` and ``conditioned`` are those of :func:`tests.brute.with_selection` where rows are filtered:
    the selection nodes are linear nodes like any other, adjusted for.
    """
    given = as_set(covariates) | as_set(conditioned)
    if given & (as_set(treatments) | as_set(outcomes)):
        return False
    rng = np.random.default_rng(seed)
    worlds = (draw_world(graph, rng) for _ in range(draws))
    return all(
        _are_equal(regression_coefficients(world, outcome, treatments, given), effect)
        for world in worlds
        for outcome in sorted(as_set(outcomes))
        for effect in [joint_effect(world, treatments, outcome)]
    )


def direct_effect_holds(
    graph: Graph,
    treatment: str,
    outcome: str,
    covariates: Names = (),
    conditioned: Names = (),
    *,
    draws: int = 3,
    seed: int = 0,
) -> bool:
    """Does the coefficient equal that of the arrow (zero where there is none) in every world drawn?"""
    given = as_set(covariates) | as_set(conditioned)
    if given & {treatment, outcome}:
        return False
    rng = np.random.default_rng(seed)
    worlds = (draw_world(graph, rng) for _ in range(draws))
    return all(
        _are_equal(
            regression_coefficients(world, outcome, treatment, given),
            {treatment: world.arrow(treatment, outcome)},
        )
        for world in worlds
    )


def _are_equal(found: dict[str, float], wanted: dict[str, float]) -> bool:
    return all(abs(found[name] - value) <= TOLERANCE * (1 + abs(value)) for name, value in wanted.items())
