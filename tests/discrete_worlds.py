"""What would happen to the very units whose rows were kept, in a small discrete world?

Each node is a function of its parents, of the unmeasured causes behind its bidirected edges and of a finite
noise of its own; a unit is one combination of all noises (Pearl 2009, section 7.1). Listing the units gives
every probability and every counterfactual exactly: no sampling, up to about seven nodes.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from itertools import product
from typing import Any

import numpy as np
from numpy.typing import NDArray

from tests.values import (
    Graph,
    Names,
    arrows_of,
    as_set,
    node_names,
    topological_names,
    with_explicit_causes,
)

Values = NDArray[np.int64]
Shares = NDArray[np.float64]
Rows = dict[str, Values]
Mask = NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class Mechanism:
    """How one node gets its value: ``table[noise, parent values…]``, the noise drawn by ``shares``."""

    node: str
    parents: tuple[str, ...]
    table: Values
    shares: Shares


@dataclass(frozen=True, slots=True)
class DiscreteWorld:
    """Mechanisms, parents first; a unit is a combination of noises, and ``probability`` that of each."""

    mechanisms: tuple[Mechanism, ...]
    values: int
    noises: tuple[Values, ...]
    probability: Shares

    def rows(self, do: Mapping[str, int] | None = None) -> Rows:
        """The value of every node in every unit, as things are or with some nodes set."""
        setting, rows = dict(do or {}), Rows()
        for mechanism, noise in zip(self.mechanisms, self.noises, strict=True):
            if mechanism.node in setting:
                rows[mechanism.node] = np.full_like(noise, setting[mechanism.node])
            else:
                index = (noise, *(rows[parent] for parent in mechanism.parents))
                rows[mechanism.node] = mechanism.table[index]
        return rows

    def share(self, mask: Mask) -> float:
        """Probability of the units marked."""
        return float(self.probability[mask].sum())

    def mean(self, amounts: NDArray[Any], mask: Mask) -> float:
        """Mean over the units marked, which must have positive probability."""
        return float(self.probability[mask] @ amounts[mask]) / self.share(mask)


def draw_discrete_world(
    graph: Graph, rng: np.random.Generator, *, values: int = 3, responses: int = 3, mixing: float = 0.2
) -> DiscreteWorld:
    """A random world of this graph; every value of a node has positive probability whatever its parents.

    A node with parents follows one of ``responses`` random tables, or with probability ``mixing`` takes a
    value at random. A seed gives the same world in whatever order the graph is written down.
    """
    explicit = with_explicit_causes(graph)
    arrows = arrows_of(explicit)
    order = topological_names(explicit)
    if order is None:
        raise ValueError("the graph has a directed cycle")
    parents = {name: tuple(sorted(s for s, target in arrows if target == name)) for name in order}
    mechanisms = tuple(
        _follower(name, parents[name], rng, (values, responses), mixing=mixing)
        if parents[name]
        else Mechanism(name, (), np.arange(values), _shares(rng, values))
        for name in order
    )
    return _world_of(mechanisms, values)


def without_chance(world: DiscreteWorld, nodes: Names) -> DiscreteWorld:
    """The same world but for some nodes that follow the first of their tables always: functions of their parents."""
    certain = as_set(nodes)
    return _world_of(
        tuple(
            replace(each, table=each.table[:1], shares=np.ones(1)) if each.node in certain else each
            for each in world.mechanisms
        ),
        world.values,
    )


def _world_of(mechanisms: tuple[Mechanism, ...], values: int) -> DiscreteWorld:
    grid = np.indices([len(mechanism.shares) for mechanism in mechanisms]).reshape(len(mechanisms), -1)
    weights = [mechanism.shares[noise] for mechanism, noise in zip(mechanisms, grid, strict=True)]
    return DiscreteWorld(mechanisms, values, tuple(grid), np.prod(weights, axis=0))


def _follower(
    node: str, parents: tuple[str, ...], rng: np.random.Generator, sizes: tuple[int, int], *, mixing: float
) -> Mechanism:
    values, responses = sizes
    shape = (values,) * len(parents)
    tables = rng.integers(values, size=(responses, *shape))
    constants = np.arange(values).reshape(values, *(1 for _ in parents))
    shares = np.concatenate([(1 - mixing) * _shares(rng, responses), np.full(values, mixing / values)])
    table = np.concatenate([tables, np.broadcast_to(constants, (values, *shape))])
    return Mechanism(node, parents, table, shares)


def _shares(rng: np.random.Generator, count: int) -> Shares:
    # Bounded away from zero, so that no stratum is too thin for double precision.
    return 0.8 * rng.dirichlet(np.ones(count)) + 0.2 / count


@dataclass(frozen=True, slots=True)
class FilterPart:
    """One part of a row filter: the combinations of its columns' values whose rows are kept."""

    columns: tuple[str, ...]
    kept: frozenset[tuple[int, ...]]


def draw_filter(
    parts: Sequence[Mapping[str, Any]], rng: np.random.Generator, *, values: int = 3
) -> list[FilterPart]:
    """A random filter for the parts of a request.

    A part that is not fixed drops something and is not itself an AND of conditions on single columns (that
    would have been split). The filter as a whole keeps two values or more of every column not fixed.

    Raises:
        ValueError: no such filter turned up (one binary column alone cannot be narrowed without fixing it).
    """
    fixed = {column for part in parts if part.get("fixed", False) for column in as_set(part["columns"])}
    for _ in range(1000):
        drawn = [_draw_part(part, rng, values) for part in parts]
        kept = _values_kept(drawn, values)
        if all(len(seen) >= (1 if column in fixed else 2) for column, seen in kept.items()):
            return drawn
    raise ValueError("every filter tried holds some column at one value or keeps nothing")


def _draw_part(part: Mapping[str, Any], rng: np.random.Generator, values: int) -> FilterPart:
    columns = tuple(sorted(as_set(part["columns"])))
    if part.get("fixed", False):
        return FilterPart(columns, frozenset({(int(rng.integers(values)),)}))
    cells = list(product(range(values), repeat=len(columns)))
    kept = [cell for cell in cells if rng.random() < 0.6]
    box = np.prod([len({cell[place] for cell in kept}) for place in range(len(columns))])
    is_and = len(kept) == (box if len(columns) > 1 else len(cells))
    return _draw_part(part, rng, values) if is_and or not kept else FilterPart(columns, frozenset(kept))


def _values_kept(parts: Sequence[FilterPart], values: int) -> dict[str, set[int]]:
    """For each column that some part reads: its values in the rows that pass every part."""
    columns = sorted({column for part in parts for column in part.columns})
    if not columns:
        return {}
    grid = np.indices((values,) * len(columns)).reshape(len(columns), -1)
    rows = dict(zip(columns, grid, strict=True))
    mask = kept_rows(rows, parts)
    return {column: set(rows[column][mask].tolist()) for column in columns}


def kept_rows(rows: Rows, parts: Sequence[FilterPart]) -> Mask:
    """Which units pass every part of the filter."""
    size = len(next(iter(rows.values())))
    mask = np.ones(size, dtype=np.bool_)
    for part in parts:
        cells = zip(*(rows[column].tolist() for column in part.columns), strict=True)
        mask &= np.fromiter((cell in part.kept for cell in cells), dtype=np.bool_, count=size)
    return mask


def effect_among_kept(
    world: DiscreteWorld,
    parts: Sequence[FilterPart],
    outcome: str,
    *,
    setting: Mapping[str, int],
    other: Mapping[str, int],
) -> float:
    """E[Y(setting) − Y(other)] over the units whose rows were in fact kept."""
    kept = kept_rows(world.rows(), parts)
    return world.mean(world.rows(setting)[outcome] - world.rows(other)[outcome], kept)


def adjusted_difference(
    world: DiscreteWorld,
    parts: Sequence[FilterPart],
    outcome: str,
    *,
    setting: Mapping[str, int],
    other: Mapping[str, int],
    covariates: Names = (),
) -> float | None:
    """Σ over z of P(z | kept) · (E[Y | setting, z, kept] − E[Y | other, z, kept]).

    None where some stratum of the kept rows holds no row with one of the two settings.
    """
    rows = world.rows()
    kept = kept_rows(rows, parts)
    strata = _strata(rows, sorted(as_set(covariates)), world.values)
    total = 0.0
    for stratum in np.unique(strata[kept]):
        within = kept & (strata == stratum)
        first, second = (within & _matches(rows, wanted) for wanted in (setting, other))
        if not first.any() or not second.any():
            return None
        difference = world.mean(rows[outcome], first) - world.mean(rows[outcome], second)
        total += world.share(within) * difference
    return total / world.share(kept)


def _strata(rows: Rows, columns: Sequence[str], values: int) -> Values:
    codes = np.zeros_like(next(iter(rows.values())))
    for column in columns:
        codes = codes * values + rows[column]
    return codes


def _matches(rows: Rows, wanted: Mapping[str, int]) -> Mask:
    size = len(next(iter(rows.values())))
    mask = np.ones(size, dtype=np.bool_)
    for column, value in wanted.items():
        mask &= rows[column] == value
    return mask


def joint_distribution(
    world: DiscreteWorld, columns: Sequence[str], do: Mapping[str, int] | None = None
) -> Shares:
    """P(columns), or P(columns | do(…)): an array with one axis for each column, in the order given."""
    codes = _strata(world.rows(do), columns, world.values)
    counted = np.bincount(codes, weights=world.probability, minlength=world.values ** len(columns))
    return counted.astype(np.float64).reshape((world.values,) * len(columns))


def is_within_reach(graph: Graph, most_units: int = 200_000, *, values: int = 3, responses: int = 3) -> bool:
    """Does a world of this graph have few enough units to list?"""
    explicit = with_explicit_causes(graph)
    targets = {target for _, target in arrows_of(explicit)}
    noises = [values + responses if name in targets else values for name in node_names(explicit)]
    return int(np.prod(noises)) <= most_units
