"""What a formula says of a model: its outcome, what it adjusts for, and its terms.

A factor that reads one column stands for it (a log, a category, a spline); one that computes a value from several is
a computed column. A product of what stands alone as well adds nothing that is adjusted for: it lets one effect
differ by the other. Linear in the formula once that is expanded.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Any

from pathgate.criteria.determined import made_of
from pathgate.graphs.errors import Fault, Place
from pathgate.graphs.masks import mask_of, members
from pathgate.review.derived import Columns
from pathgate.review.names import Named, NameReader
from pathgate.review.terms import ModelTerm
from pathgate.review.wording import listed

if TYPE_CHECKING:
    from pathgate.review.formula import Factor, Formula, Term

_PLACE: Place = ("formula",)
_Read = tuple["Term", list[Named]]


@dataclass(frozen=True, slots=True)
class ModelFormula:
    """A formula whose names are those of a graph.

    Attributes:
        columns: the config's columns and those that the formula computes.
        outcomes, covariates: what stands left of the tilde, and right of it beside the treatments.
        terms: its terms but for the intercept, in its order.
        treated: mask of the treatments, as the config names them.
        computed: the terms that are computed columns of the formula's own.
        passed_over: its names that are declared as outside the graph.
    """

    columns: Columns
    outcomes: tuple[Named, ...]
    covariates: tuple[Named, ...]
    terms: tuple[ModelTerm, ...]
    treated: int
    computed: frozenset[str]
    passed_over: tuple[tuple[str, Place], ...] = ()


def understand_formula(said: Mapping[str, Any], columns: Columns, faults: list[Fault]) -> ModelFormula | None:
    """What the ``formula`` of a config says; what is wrong with it is added to ``faults``."""
    # The parser of formulas takes long to load, and most configs have none.
    from pathgate.review.formula import FormulaRefused, read_formula  # noqa: PLC0415 - slow to import

    try:
        formula = read_formula(said["formula"])
    except FormulaRefused as refused:
        faults.append(Fault(refused.slug, _PLACE, refused.detail))
        return None
    return _Understanding(said, columns, faults).formula(formula)


class _Understanding:
    def __init__(self, said: Mapping[str, Any], columns: Columns, faults: list[Fault]) -> None:
        self._said = said
        self._columns = columns
        self._faults = faults
        self._passed_over: list[tuple[str, Place]] = []
        # What is computed by the formula itself stands after everything else.
        self._first = columns.graph.size
        self._sums = 0

    def formula(self, formula: Formula) -> ModelFormula | None:
        before = len(self._faults)
        outcomes = [named for factor in formula.outcomes if (named := self._factor(factor)) is not None]
        read = [(term, self._nodes(term)) for term in formula.terms]
        if len(self._faults) > before:
            return None
        treated = self._treated()
        single = mask_of(nodes[0].node for _term, nodes in read if len(nodes) == 1)
        plain = treated | mask_of(node for node in members(single) if node < self._first)
        self._refuse_without(treated, read, plain)
        adjusted = self._adjusted(read, plain)
        terms = tuple(self._term(term, nodes, read, plain) for term, nodes in read)
        covariates = tuple(named for named in adjusted.values() if not treated >> named.node & 1)
        computed = frozenset(self._columns.graph.names[self._first :])
        return ModelFormula(
            self._columns, tuple(outcomes), covariates, terms, treated, computed, tuple(self._passed_over)
        )

    def _nodes(self, term: Term) -> list[Named]:
        """What each factor of a term is; a factor outside the graph is left out."""
        return [named for factor in term.factors if (named := self._factor(factor)) is not None]

    def _factor(self, factor: Factor) -> Named | None:
        """The column that a factor is: the one that it reads, or a computed one of its own name."""
        graph = self._columns.graph
        known = graph.node_called(factor.written)
        if known is not None:
            return Named(known, _PLACE, factor.written)
        found = self._read(factor.names)
        nodes = mask_of(named.node for named in found)
        if not nodes:
            return None
        if factor.keeps == "computed" and len(found) > 1:
            self._columns = self._columns.grown([(factor.written, nodes)], {})
            self._sums |= factor.is_sum << graph.size
            return Named(graph.size, _PLACE, factor.written)
        node = found[0].node
        if factor.keeps != "column":
            is_coarse = factor.keeps == "coarse" or bool(self._columns.recodes.get(found[0].written))
            self._columns = self._columns.grown([], {factor.written: (node, is_coarse)})
        return Named(node, _PLACE, factor.written)

    def _read(self, names: Sequence[str]) -> tuple[Named, ...]:
        columns = self._columns
        reader = NameReader(
            columns.graph,
            self._faults,
            recodes=columns.recodes,
            outside=columns.outside,
            refuse_repeats=False,
        )
        found = reader.read_each([(name, _PLACE) for name in names])
        self._passed_over += reader.passed_over
        return found

    def _treated(self) -> int:
        """The treatments as far as they can be read; what is wrong with them is told elsewhere."""
        names = self._said.get("treatment", ())
        reader = NameReader(self._columns.graph, [], recodes=self._columns.recodes)
        return reader.mask(names, ("treatment",))

    def _refuse_without(self, treated: int, read: Sequence[_Read], plain: int) -> None:
        """A fault for each treatment that is no term, nor multiplied with what is one."""
        seen, part_of = 0, dict[int, str]()
        for term, nodes in read:
            if len(nodes) == 1:
                seen |= 1 << nodes[0].node
            if self._is_product(nodes, plain):
                seen |= self._columns_of(nodes)
            of_term = made_of(mask_of(named.node for named in nodes), self._columns.inputs)
            for node in members(of_term & treated):
                part_of.setdefault(node, term.written)
        for node in members(treated & ~seen):
            name = self._columns.graph.name(node)
            detail = f"the formula has no term of the treatment {listed([name])}"
            if node in part_of:
                shown = listed([part_of[node]])
                detail += f" by itself, only {shown}: add a term for it, or make {shown} the treatment"
            self._faults.append(Fault("invalid-request", ("treatment",), detail, (name,)))

    def _adjusted(self, read: Sequence[_Read], plain: int) -> dict[int, Named]:
        """What the terms adjust for, by node: of several functions of one column the one that keeps most."""
        adjusted: dict[int, Named] = {}
        for term, nodes in read:
            if not nodes or self._is_product(nodes, plain):
                continue
            named = nodes[0] if len(nodes) == 1 else Named(self._product(term, nodes), _PLACE, term.written)
            held = adjusted.get(named.node)
            if held is None or self._coarseness(named) < self._coarseness(held):
                adjusted[named.node] = named
        return adjusted

    def _is_product(self, nodes: Sequence[Named], plain: int) -> bool:
        """Is it made of columns each of which stands alone in the model as well? A sum of them multiplies none."""
        if len(nodes) == 1 and (nodes[0].node < self._first or (plain | self._sums) >> nodes[0].node & 1):
            return False
        return not self._columns_of(nodes) & ~plain

    def _columns_of(self, nodes: Sequence[Named]) -> int:
        """The columns that factors read; those that the formula computes count as what they are made of."""
        read = 0
        for named in nodes:
            inputs = self._columns.inputs.get(named.node, 0) if named.node >= self._first else 0
            read |= inputs or 1 << named.node
        return read

    def _product(self, term: Term, nodes: Sequence[Named]) -> int:
        graph = self._columns.graph
        known = graph.index.get(term.written)
        if known is None:
            self._columns = self._columns.grown([(term.written, mask_of(n.node for n in nodes))], {})
            return graph.size
        return known

    def _coarseness(self, named: Named) -> int:
        kept = self._columns.recodes.get(named.written)
        return 0 if kept is None else 2 if kept else 1

    def _term(self, term: Term, nodes: list[Named], read: Sequence[_Read], plain: int) -> ModelTerm:
        if not nodes or self._is_product(nodes, plain):
            return ModelTerm(term.written, _PLACE, None, self._columns_of(nodes))
        if len(nodes) > 1:
            return ModelTerm(term.written, _PLACE, self._product(term, nodes))
        node, crossed, bends = nodes[0].node, 0, 0
        for other, others in read:
            if other is term:
                continue
            if len(others) == 1 and others[0].node == node:
                bends += 1
            elif others and self._is_product(others, plain) and self._columns_of(others) >> node & 1:
                crossed |= self._columns_of(others)
        return ModelTerm(term.written, _PLACE, node, crossed & ~(1 << node), is_bent=bends > 0)


def agreed_outcomes(
    formula: ModelFormula, given: Sequence[Named], said: Mapping[str, Any], faults: list[Fault]
) -> tuple[Named, ...]:
    """The outcomes of a config with a formula; a fault where it names others beside it."""
    if "outcome" not in said:
        return formula.outcomes
    if {named.node for named in given} != {named.node for named in formula.outcomes} and given:
        graph = formula.columns.graph
        of_formula = listed(graph.names_of(mask_of(named.node for named in formula.outcomes)))
        detail = f"the outcome of the formula is {of_formula}"
        faults.append(Fault("invalid-request", ("outcome",), detail))
    return tuple(given)


def agreed_covariates(
    formula: ModelFormula, given: Sequence[Named], said: Mapping[str, Any], faults: list[Fault]
) -> tuple[Named, ...]:
    """The covariates of a config with a formula; a fault where it names others beside it."""
    if "covariates" not in said:
        return formula.covariates
    places = {named.node: named.place for named in given}
    mine, theirs = _spelled_out(formula, formula.covariates), _spelled_out(formula, given)
    graph = formula.columns.graph
    for nodes, where in (
        (mine & ~theirs, "the formula adjusts for {} and the covariates do not name it"),
        (theirs & ~mine, "the covariates name {} and the formula has no term of it"),
    ):
        if nodes:
            columns = graph.names_of(nodes)
            faults.append(Fault("invalid-request", ("covariates",), where.format(listed(columns)), columns))
    return tuple(replace(named, place=places.get(named.node, named.place)) for named in formula.covariates)


def _spelled_out(formula: ModelFormula, covariates: Sequence[Named]) -> int:
    """The columns, those that the formula computes by what they are made of; treatments among these left out."""
    nodes = 0
    for named in covariates:
        if named.written in formula.computed:
            nodes |= formula.columns.inputs[named.node] & ~formula.treated
        else:
            nodes |= 1 << named.node
    return nodes
