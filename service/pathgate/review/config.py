"""Reads a model config against a graph: which columns its names mean, and what makes it no config at all.

The graph grows by the columns that the config computes, in ``derived`` and in its formula, before any other name is
looked up. Faults of shape and of meaning come in one go. Linear in the config.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from functools import cache
from typing import Any, Literal, TypeGuard

from pathgate.graphs.errors import Fault, Place
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import mask_of, members
from pathgate.graphs.names import quoted
from pathgate.review.derived import Columns, understand_columns
from pathgate.review.errors import InvalidConfig
from pathgate.review.model_formula import ModelFormula, agreed_covariates, agreed_outcomes, understand_formula
from pathgate.review.names import Named, NameReader
from pathgate.review.rows_kept import ALL_ROWS, RowsKept, understand_rows
from pathgate.review.schema import CONFIG_SCHEMA
from pathgate.review.shape import Shape, are_cut_off
from pathgate.review.terms import ModelTerm
from pathgate.review.waivers import Acceptance, understand_waivers

NO_META = object()
"""Stands where a config has no ``meta``: null is something a config may say."""

Asks = Literal["total", "direct"]
Claimed = Literal["kept", "whole"]


@dataclass(frozen=True, slots=True)
class Config:
    """A model config whose names are those of a graph; places are steps from the config itself.

    Attributes:
        name: what answers call it; empty where it has no name.
        columns: what its names can mean: the team's graph, grown by the columns that it computes.
        treatments, outcomes: columns, each named once; a computed treatment stands for what it is made of.
        covariates, fixed_effects, weighted_by, matched_on: what the model adjusts for, and how.
        treated: the treatments as the config names them.
        terms: what the model has coefficients for.
        rows: which rows the model sees.
        row_filter_fixed: may no part of the filter be dropped?
        asks: the total effect, or the direct one.
        population: whose effect is claimed.
        known: mask of the columns whose distribution over everybody is known.
        meta: what the caller put there, which may be None; ``NO_META`` where nothing.
        may_read_unmeasured: may conditions on the rows read unmeasured nodes? Not in a team's config.
        repeated: the columns that the model adjusts for twice, once by a recode.
        passed_over: the names that the config declares as outside the graph, where it uses them.
        accepted: its waivers.
        written: the config as it was written, for its digest; None where it never was.
    """

    name: str
    columns: Columns
    treatments: tuple[Named, ...]
    outcomes: tuple[Named, ...]
    covariates: tuple[Named, ...]
    fixed_effects: tuple[Named, ...] = ()
    weighted_by: tuple[Named, ...] = ()
    matched_on: tuple[Named, ...] = ()
    treated: tuple[Named, ...] = ()
    terms: tuple[ModelTerm, ...] = ()
    rows: RowsKept = ALL_ROWS
    row_filter_fixed: bool = False
    asks: Asks = "total"
    population: Claimed = "kept"
    known: int = 0
    meta: object = NO_META
    may_read_unmeasured: bool = False
    repeated: tuple[Named, ...] = ()
    passed_over: tuple[tuple[str, Place], ...] = ()
    accepted: tuple[Acceptance, ...] = ()
    written: Mapping[str, Any] | None = None

    @property
    def adjusted_for(self) -> tuple[Named, ...]:
        """All columns that the model adjusts for, in whichever way."""
        return (*self.covariates, *self.weighted_by, *self.matched_on, *self.fixed_effects)


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
    if not _is_object(value):
        return None
    faulty = {fault.place[0] for fault in faults if fault.place}
    said = {member: held for member, held in value.items() if member not in faulty}
    columns = understand_columns(said, graph, faults)
    formula = understand_formula(said, columns, faults) if "formula" in said else None
    config = _named(said, formula.columns if formula else columns, formula, faults)
    _refuse_meaningless(value, said, faults)
    return None if faults else replace(config, written=value)


def _named(
    said: Mapping[str, Any], columns: Columns, formula: ModelFormula | None, faults: list[Fault]
) -> Config:
    """The members of a config, their names looked up; of no use where that adds to the faults."""
    names = NameReader(columns.graph, faults, recodes=columns.recodes, outside=columns.outside)
    names.passed_over.extend(formula.passed_over if formula else ())
    ends = _Ends(columns, said, NameReader(columns.graph, faults, recodes=columns.recodes), formula)
    adjusted = {member: names.read(said.get(member, []), (member,)) for member in _ADJUSTING}
    repeated = tuple(names.repeated)
    if formula:
        adjusted["covariates"] = agreed_covariates(formula, adjusted["covariates"], said, faults)
    treatments, outcomes = ends.read()
    modelled = (*treatments, *outcomes, *(named for read in adjusted.values() for named in read))
    rows = understand_rows(said, names, modelled)
    known = _known(said, names)
    waivers = understand_waivers(said, names)
    plain = _plain_terms(ends.treated, adjusted["covariates"], names.passed_over)
    return Config(
        name=said.get("name", ""),
        columns=columns,
        treatments=treatments,
        outcomes=outcomes,
        covariates=adjusted["covariates"],
        fixed_effects=adjusted["fixed_effects"],
        weighted_by=adjusted["weighted_by"],
        matched_on=adjusted["matched_on"],
        treated=ends.treated,
        terms=formula.terms if formula else plain,
        rows=rows,
        row_filter_fixed=said.get("row_filter_fixed", False),
        asks=said.get("asks", "total"),
        population=said.get("population", "kept"),
        known=known,
        meta=said.get("meta", NO_META),
        repeated=repeated,
        passed_over=tuple(names.passed_over),
        accepted=waivers,
    )


def _plain_terms(
    treated: Sequence[Named], covariates: Sequence[Named], passed_over: Sequence[tuple[str, Place]]
) -> tuple[ModelTerm, ...]:
    """The terms of a model without a formula: its treatments, then its covariates, outside ones last."""
    inside = (ModelTerm(named.written, named.place, named.node) for named in (*treated, *covariates))
    outside = (ModelTerm(name, place, None) for name, place in passed_over if place[0] == "covariates")
    return (*inside, *outside)


_ADJUSTING = ("covariates", "fixed_effects", "weighted_by", "matched_on")


def _refuse_meaningless(value: Mapping[str, Any], said: Mapping[str, Any], faults: list[Fault]) -> None:
    # A schema that let a formula stand in for them would say nothing clear of what is missing.
    missing = [
        member for member in ("outcome", "covariates") if member not in value and "formula" not in value
    ]
    faults += [Fault("invalid-request", (), f"the member {quoted(member)} is missing") for member in missing]
    if said.get("population") == "whole" and said.get("asks") == "direct":
        detail = "a direct effect is judged among the rows kept only"
        faults.append(Fault("invalid-request", ("population",), detail))


def _known(said: Mapping[str, Any], names: NameReader) -> int:
    member = "measured_everywhere"
    found = names.read(said.get(member, []), (member,))
    for named in found:
        if not names.graph.measured >> named.node & 1:
            name = names.graph.name(named.node)
            detail = f"{quoted(name)} is marked as unmeasured in the graph: nobody holds it everywhere"
            names.faults.append(Fault("invalid-request", named.place, detail, (name,)))
    return mask_of(named.node for named in found)


@dataclass(slots=True)
class _Ends:
    """Treatments and outcomes of a config, which must be in the graph; a computed treatment stands for its inputs."""

    columns: Columns
    said: Mapping[str, Any]
    names: NameReader
    formula: ModelFormula | None = None
    treated: tuple[Named, ...] = ()

    def read(self) -> tuple[tuple[Named, ...], tuple[Named, ...]]:
        treatments = self.names.read(self.said.get("treatment", []), ("treatment",))
        outcomes = self.names.read(self.said.get("outcome", []), ("outcome",))
        if self.formula:
            outcomes = agreed_outcomes(self.formula, outcomes, self.said, self.names.faults)
        refuse_ends(self.said, self.names, treatments, outcomes)
        self.treated = treatments
        bases: dict[int, Named] = {}
        for named in treatments:
            for base in members(self.columns.bases(named.node)):
                bases.setdefault(base, replace(named, node=base))
        own = {named.node for named in treatments}
        refuse_shared(self.names, [named for base, named in bases.items() if base not in own], outcomes)
        if self.said.get("asks") == "direct" and len(bases) > len(treatments) == 1:
            detail = "a direct effect is that of one column, and this treatment is computed from several"
            self.names.faults.append(Fault("invalid-request", ("treatment",), detail))
        return tuple(bases.values()), outcomes


def understand_ends(
    value: Mapping[str, Any], names: NameReader
) -> tuple[tuple[Named, ...], tuple[Named, ...]]:
    """The treatments and the outcomes that the members of those names mean; they must not share a column."""
    treatments = names.read(value.get("treatment", []), ("treatment",))
    outcomes = names.read(value.get("outcome", []), ("outcome",))
    refuse_ends(value, names, treatments, outcomes)
    return treatments, outcomes


def refuse_ends(
    value: Mapping[str, Any], names: NameReader, treatments: Sequence[Named], outcomes: Sequence[Named]
) -> None:
    """A fault for what treatments and outcomes cannot be together."""
    refuse_shared(names, treatments, outcomes)
    if value.get("asks") == "direct":
        for several in (treatments, outcomes):
            if len(several) > 1:
                detail = "a direct effect is that of one column on one other"
                names.faults.append(Fault("invalid-request", several[1].place, detail))


def refuse_shared(names: NameReader, treatments: Sequence[Named], outcomes: Sequence[Named]) -> None:
    """A fault for each column that is both treatment and outcome."""
    treated = {treatment.node for treatment in treatments}
    for outcome in outcomes:
        if outcome.node in treated:
            name = names.graph.name(outcome.node)
            detail = f"{quoted(name)} cannot be both treatment and outcome"
            names.faults.append(Fault("invalid-request", outcome.place, detail, (name,)))


def _is_object(value: object) -> TypeGuard[Mapping[str, Any]]:
    return isinstance(value, Mapping)
