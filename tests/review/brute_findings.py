"""Which degenerate members, warnings and notes does a config deserve, and where? Read off semantics rule by rule."""

from __future__ import annotations

from collections.abc import Iterable, Iterator

from tests.brute import ancestors, descendants, is_valid_adjustment
from tests.criteria.recovering import recovery_by_paths
from tests.review.brute_review import Part, Question, meant_by, selected_graph
from tests.strategies import Question as Asked
from tests.values import arrows_of

Told = tuple[str, tuple[str | int, ...], frozenset[str]]
"""Rule, place and columns of a finding."""

ADJUSTING = ("covariates", "weighted_by", "matched_on", "fixed_effects")


def treated_at(question: Question) -> dict[str, tuple[str | int, ...]]:
    """The treatments that the effect is about, each with the place of the first name that stands for it."""
    places: dict[str, tuple[str | int, ...]] = {}
    for k, name in enumerate(question.treatments):
        for base in question.columns.bases(question.columns.node(name)):
            places.setdefault(base, ("treatment", k))
    return places


def adjusted_at(question: Question) -> Iterator[tuple[str, str, tuple[str, int], list[tuple[str, int]]]]:
    """For each column adjusted for: node, name, place, and the places where the same list repeats it.

    A column counts by its fullest name, the first of them.
    """
    columns = question.columns
    for member in ADJUSTING:
        named: dict[str, list[tuple[str, int]]] = {}
        for k, name in enumerate(getattr(question, member)):
            named.setdefault(columns.node(name), []).append((name, k))
        for node, spelled in named.items():
            name, k = min(spelled, key=lambda each: (each[0] in columns.coarse, each[1]))
            yield node, name, (member, k), [(member, other) for _, other in spelled if other != k]


def usable(question: Question) -> tuple[frozenset[str], frozenset[str], list[Part]]:
    """Covariates, fixed effects and filter as far as they can be judged: measured, and no ends held fixed."""
    may_have = question.measured - question.ends
    parts = []
    for part in question.parts:
        (meant,) = meant_by(question, [part])
        columns = [name for name in part["columns"] if question.columns.node(name) in question.measured]
        if columns and not (meant["fixed"] and meant["columns"] & question.ends):
            parts.append({**part, "columns": columns, "written": part})
    return question.adjusted_for & may_have, question.absorbing & may_have, parts


def held_fixed(question: Question) -> frozenset[str]:
    """All that the model holds fixed, as far as it can be judged."""
    covariates, fixed_effects, _ = usable(question)
    return (covariates | question.columns.absorbed(fixed_effects)) - question.ends


def degenerate(question: Question) -> Iterator[Told]:
    """The faults of single members."""
    yield from _ends(question)
    yield from _adjusted(question)
    yield from _filter(question)
    yield from _without_variation(question)


def _sides(question: Question) -> dict[str, frozenset[str]]:
    return {"treatment": question.treated, "outcome": question.results}


def _ends(question: Question) -> Iterator[Told]:
    columns = question.columns
    ends = [("treatment", node, place) for node, place in treated_at(question).items()]
    ends += [("outcome", columns.node(name), ("outcome", k)) for k, name in enumerate(question.outcomes)]
    for role, node, place in ends:
        if node not in question.measured:
            yield f"unmeasured-{role}", place, frozenset({node})


def _adjusted(question: Question) -> Iterator[Told]:
    sides = _sides(question)
    for node, _, place, _ in adjusted_at(question):
        for role in (role for role in sides if node in sides[role]):
            yield f"{role}-among-covariates", place, frozenset({node})
        if node not in question.measured | question.ends:
            yield "unmeasured-covariate", place, frozenset({node})


def _filter(question: Question) -> Iterator[Told]:
    sides = _sides(question)
    for k, part in enumerate(meant_by(question, question.parts)):
        if part["columns"] - question.measured:
            yield "unmeasured-filter-column", ("row_filter", k), part["columns"] - question.measured
        for role in sides if part["fixed"] else ():
            for node in part["columns"] & sides[role]:
                yield f"{role}-fixed", ("row_filter", k), frozenset({node})


def _without_variation(question: Question) -> Iterator[Told]:
    columns = question.columns
    covariates, fixed_effects, parts = usable(question)
    read = meant_by(question, parts)
    pinned = {node for part in read if part["fixed"] for node in part["columns"]}
    held = covariates | columns.absorbed(fixed_effects)
    stuck = columns.without_variation(held | pinned, question.treated)
    for node, _, place, _ in adjusted_at(question):
        if place[0] == "fixed_effects":
            for end in (columns.absorbed({node}) - {node}) & question.ends:
                yield "no-variation-left", place, frozenset({node, end})
        if node in stuck:
            yield "no-variation-left", place, frozenset({node})
    for k, part in enumerate(meant_by(question, question.parts)):
        for node in part["columns"] & stuck if part["fixed"] else ():
            yield "no-variation-left", ("row_filter", k), frozenset({node})


def warnings(question: Question) -> Iterator[Told]:
    """What a config should be warned of."""
    yield from _directions(question)
    yield from _rows(question)
    yield from _timing(question)
    yield from _computed(question)
    yield from _filtered_weights(question)


def _directions(question: Question) -> Iterator[Told]:
    graph, columns = question.columns.graph, question.columns
    for treatment, place in treated_at(question).items():
        below = descendants(graph, treatment)
        if not below & question.results:
            yield "no-causal-path", place, frozenset({treatment})
        elif question.asks == "direct" and (treatment, *question.results) not in arrows_of(graph):
            yield "no-arrow", place, frozenset({treatment})
        later = below & question.treated - {treatment}
        if later:
            yield "treatment-precedes-treatment", place, later | {treatment}
        for k, name in enumerate(question.outcomes):
            if columns.node(name) in ancestors(graph, treatment):
                yield "outcome-precedes-treatment", ("outcome", k), frozenset({columns.node(name), treatment})


def _rows(question: Question) -> Iterator[Told]:
    columns = question.columns
    below = descendants(columns.graph, question.treated)
    conditions: list[tuple[str, tuple[str | int, ...], Iterable[str]]] = [
        ("filter-depends-on-treatment", ("row_filter", k), part["columns"])
        for k, part in enumerate(question.parts)
    ]
    silent = "lost-rows-depend-on-treatment"
    conditions.append((silent, ("rows_exist_because",), question.rows_exist_because))
    conditions += [(silent, ("missing_because", name), why) for name, why in question.missing_because.items()]
    for rule, place, names in conditions:
        # What is kept by the treatment alone only narrows its range.
        if columns.nodes(names) & below and columns.nodes(names) - columns.determined(question.treated):
            yield rule, place, columns.nodes(names) & below


def _timing(question: Question) -> Iterator[Told]:
    moments = question.columns.recorded()
    for node, _, place, _ in adjusted_at(question):
        for role, ends in (("treatment", question.treated), ("outcome", question.results)):
            is_late = any(moments.get(end, 9**9) < moments.get(node, 0) for end in ends)
            if is_late and node not in question.ends:
                yield f"covariate-recorded-after-{role}", place, frozenset({node})


def _computed(question: Question) -> Iterator[Told]:
    columns = question.columns
    for k, name in enumerate(question.treatments):
        bases = columns.bases(columns.node(name))
        if len(bases) > 1:
            yield "treatment-of-several-columns", ("treatment", k), bases
    adjusted = list(adjusted_at(question))
    whole = {node for node, name, *_ in adjusted if name not in columns.coarse}
    everything = question.adjusted_for | question.absorbing
    for node, _, place, repeats in adjusted:
        if node in columns.inputs and node in columns.determined(everything - {node}):
            yield "redundant-covariate", place, frozenset({node})
        for at in repeats if node in whole else ():
            yield "redundant-covariate", at, frozenset({node})
        for at in [place, *repeats] if node not in whole else ():
            yield "coarse-covariate", at, frozenset({node})


def _filtered_weights(question: Question) -> Iterator[Told]:
    """Filter columns without whose distribution over everybody the effect in everybody is not recovered."""
    if question.population == "kept" or not is_selected(question) or not recovered(question):
        return
    for k, part in enumerate(meant_by(question, question.parts)):
        for node in part["columns"]:
            if not recovered(question, frozenset({node})):
                yield "weighting-column-filtered", ("row_filter", k), frozenset({node})


def is_selected(question: Question) -> bool:
    """Are rows kept by anything that can be judged?"""
    return bool(selected_graph(question, usable(question)[2])[1])


def carries_among_kept(question: Question) -> bool:
    """Does what is held fixed carry the total effect among the rows kept?"""
    selected, conditioned = selected_graph(question, usable(question)[2])
    ends = (question.treated, question.results)
    is_total = question.asks == "total"
    return is_total and is_valid_adjustment(selected, *ends, held_fixed(question), conditioned)


def recovered(question: Question, unknown: frozenset[str] = frozenset()) -> bool:
    """Does it recover the effect in everybody, with the distribution of these columns unknown?"""
    selected, conditioned = selected_graph(question, usable(question)[2])
    asked = Asked(tuple(sorted(question.treated)), tuple(sorted(question.results)), ())
    known = question.columns.nodes(question.measured_everywhere) - unknown
    return recovery_by_paths(selected, conditioned, asked)(held_fixed(question), known)
