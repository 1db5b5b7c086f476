"""Reads a model config against a graph: which columns its names mean, and what makes it no config at all."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cache
from typing import Any, Literal, TypeGuard

from pathgate.criteria.selection import Part
from pathgate.graphs.errors import Fault, Place
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import mask_of
from pathgate.graphs.names import hint_within, quoted
from pathgate.review.errors import InvalidConfig
from pathgate.review.schema import CONFIG_SCHEMA, STANDARD_DIALECT
from pathgate.review.shape import Shape, are_cut_off
from pathgate.review.sql_names import Assumed, SqlFilter, read_sql_filter

NO_META = object()
"""Stands where a config has no ``meta``: null is something a config may say."""

Asks = Literal["total", "direct"]


@dataclass(frozen=True, slots=True)
class Named:
    """A column and where the config names it."""

    node: int
    place: Place


@dataclass(frozen=True, slots=True)
class FilterPart:
    """One condition of the row filter and where the config puts it."""

    part: Part
    place: Place


@dataclass(frozen=True, slots=True)
class Config:
    """A model config whose names are those of a graph; places are steps from the config itself.

    Attributes:
        name: what answers call it; empty where it has no name.
        treatments, outcomes, covariates: columns, each named once.
        filter_parts: the conditions on the rows kept.
        row_filter_fixed: may no part of the filter be dropped?
        asks: the total effect, or the direct one.
        meta: what the caller put there, which may be None; ``NO_META`` where nothing.
        may_read_unmeasured: may conditions on the rows read unmeasured nodes? Not in a team's config.
        assumed: what its row filter leaves unsaid.
    """

    name: str
    treatments: tuple[Named, ...]
    outcomes: tuple[Named, ...]
    covariates: tuple[Named, ...]
    filter_parts: tuple[FilterPart, ...] = ()
    row_filter_fixed: bool = False
    asks: Asks = "total"
    meta: object = NO_META
    may_read_unmeasured: bool = False
    assumed: tuple[Assumed, ...] = ()


def read_config(value: object, graph: CausalGraph) -> Config:
    """The config that a parsed JSON or YAML value describes.

    Raises:
        InvalidConfig: it describes none; ``faults`` holds every reason, places counted from the config.

    >>> graph = CausalGraph.of(("rain", "delay"), ("delay", "refund"))
    >>> config = read_config({"treatment": "delay", "outcome": "refund", "covariates": ["rain"]}, graph)
    >>> [graph.name(covariate.node) for covariate in config.covariates]
    ['rain']
    """
    faults = _config_shape().faults(value)
    if are_cut_off(faults):
        raise InvalidConfig(faults)
    config = understand_config(value, graph, faults)
    if config is None:
        raise InvalidConfig(faults)
    return config


@cache
def _config_shape() -> Shape:
    return Shape(CONFIG_SCHEMA)


def understand_config(value: object, graph: CausalGraph, faults: list[Fault]) -> Config | None:
    """The config that a value describes; what makes it meaningless is added to ``faults``.

    ``faults`` comes with what is wrong with the value's shape. Members that it names are not looked into, and
    where anything is wrong there is no config; so all faults, of shape and of meaning, come in one go.
    """
    faulty = {fault.place[0] for fault in faults if fault.place}
    said = (
        {member: held for member, held in value.items() if member not in faulty} if _is_object(value) else {}
    )
    names = NameReader(graph, faults)
    treatments, outcomes = understand_ends(said, names)
    covariates = names.read(said.get("covariates", []), ("covariates",))
    parts, assumed = _understand_rows(said, names, (*treatments, *outcomes, *covariates))
    if faults:
        return None
    return Config(
        name=said.get("name", ""),
        treatments=treatments,
        outcomes=outcomes,
        covariates=covariates,
        filter_parts=parts,
        row_filter_fixed=said.get("row_filter_fixed", False),
        asks=said.get("asks", "total"),
        meta=said.get("meta", NO_META),
        assumed=assumed,
    )


def _understand_rows(
    value: Mapping[str, Any], names: NameReader, modelled: Sequence[Named]
) -> tuple[tuple[FilterPart, ...], tuple[Assumed, ...]]:
    """The parts of the row filter, and what is assumed about it; the model's columns must be left something."""
    said, place = value.get("row_filter", []), ("row_filter",)
    if not isinstance(said, str):
        return read_parts(said, names, place), ()
    if any(fault.place == ("dialect",) for fault in names.faults):
        return (), ()
    dialect = value.get("dialect", STANDARD_DIALECT)
    found: SqlFilter = read_sql_filter(said, dialect, names.graph, names.faults, place)
    for named in modelled:
        if found.emptied >> named.node & 1:
            name = names.graph.name(named.node)
            detail = f"only rows where {quoted(name)} is null are kept, and the model needs its values"
            names.faults.append(Fault("invalid-request", place, detail, (name,)))
    return tuple(FilterPart(part, place) for part in found.parts), found.assumed


def understand_ends(
    value: Mapping[str, Any], names: NameReader
) -> tuple[tuple[Named, ...], tuple[Named, ...]]:
    """The treatments and the outcomes that the members of those names mean; they must not share a column."""
    treatments = names.read(value.get("treatment", []), ("treatment",))
    outcomes = names.read(value.get("outcome", []), ("outcome",))
    treated = {treatment.node for treatment in treatments}
    for outcome in outcomes:
        if outcome.node in treated:
            name = names.graph.name(outcome.node)
            detail = f"{quoted(name)} cannot be both treatment and outcome"
            names.faults.append(Fault("invalid-request", outcome.place, detail, (name,)))
    if value.get("asks") == "direct":
        for several in (treatments, outcomes):
            if len(several) > 1:
                detail = "a direct effect is that of one column on one other"
                names.faults.append(Fault("invalid-request", several[1].place, detail))
    return treatments, outcomes


def _is_object(value: object) -> TypeGuard[Mapping[str, Any]]:
    return isinstance(value, Mapping)


@dataclass(frozen=True, slots=True)
class NameReader:
    """Finds the columns that names mean, by id or by another name of the column.

    Attributes:
        graph: where the columns are.
        faults: what is wrong is added here.
        by_alias: do other names of a column count? They do in configs.
        refuse_repeats: is a column named twice a fault? It is in configs.
    """

    graph: CausalGraph
    faults: list[Fault]
    by_alias: bool = True
    refuse_repeats: bool = True

    def read(self, value: str | Sequence[str], place: Place) -> tuple[Named, ...]:
        """The columns that a name or a list of names means; unknown and repeated names are faults."""
        if isinstance(value, str):
            return self.read_each([(value, place)])
        return self.read_each([(name, (*place, k)) for k, name in enumerate(value)])

    def read_each(self, listed: Sequence[tuple[str, Place]]) -> tuple[Named, ...]:
        """The same for names that are not next to each other in the input."""
        found: dict[int, Named] = {}
        for name, at in listed:
            node = self.find(name)
            if node is None:
                aliases = self.graph.aliases if self.by_alias else ()
                hint = hint_within(self.faults, name, self.graph.names, aliases)
                detail = f"no node is named {quoted(name)}{hint}"
                self.faults.append(Fault("unknown-node", at, detail, (name,)))
            elif node not in found:
                found[node] = Named(node, at)
            elif self.refuse_repeats:
                detail = f"the column {quoted(self.graph.name(node))} is named twice"
                self.faults.append(Fault("invalid-request", at, detail, (self.graph.name(node),)))
        return tuple(found.values())

    def mask(self, value: str | Sequence[str], place: Place) -> int:
        """The same as a mask, for sets that are only computed with."""
        names = (value,) if isinstance(value, str) else value
        index = self.graph.index
        mask = 0
        for name in names:
            if name not in index:
                return mask_of(named.node for named in self.read(value, place))
            mask |= 1 << index[name]
        return mask

    def find(self, name: str) -> int | None:
        """The node that bears this name."""
        node = self.graph.index.get(name)
        return self.graph.aliases.get(name) if node is None and self.by_alias else node


def read_parts(value: str | Sequence[Any], names: NameReader, place: Place) -> tuple[FilterPart, ...]:
    """The conditions on the rows that a value of the right shape describes, bare names making up one."""
    items = [value] if isinstance(value, str) else list(value)
    bare = [(k, item) for k, item in enumerate(items) if isinstance(item, str)]
    parts: list[FilterPart] = []
    for k, item in enumerate(items):
        if isinstance(item, str):
            if k == bare[0][0]:
                found = names.read_each([(name, (*place, at)) for at, name in bare])
                columns = mask_of(one.node for one in found)
                parts.append(
                    FilterPart(Part(columns, fixed=False, written=[name for _, name in bare]), place)
                )
        else:
            parts.append(_object_part(item, names, (*place, k)))
    return tuple(parts)


def _object_part(item: Mapping[str, Any], names: NameReader, place: Place) -> FilterPart:
    found = names.read(item["columns"], (*place, "columns"))
    fixed = item.get("fixed", False)
    if fixed and not isinstance(item["columns"], str) and len(item["columns"]) != 1:
        detail = "a condition that is fixed holds exactly one column at one value"
        names.faults.append(Fault("invalid-request", (*place, "fixed"), detail))
    return FilterPart(Part(mask_of(one.node for one in found), fixed=fixed, written=dict(item)), place)
