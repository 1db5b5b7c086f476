"""What a sound config should still know: directions and populations that its number is easily misread for."""

from __future__ import annotations

from collections.abc import Iterator

from pathgate.criteria.deadline import Deadline
from pathgate.criteria.determined import determined_by
from pathgate.graphs.kinship import ancestors, descendants
from pathgate.review.claims import Claim
from pathgate.review.config import Config
from pathgate.review.findings import Finding
from pathgate.review.wording import capital, listed, part_text, silent_text


def warning_findings(claim: Claim, config: Config, deadline: Deadline) -> Iterator[Finding]:
    """Warnings on treatments, outcomes and filter; none of them changes the verdict.

    Raises:
        OutOfTime: the deadline came first.
    """
    yield from _directions(claim, config, deadline)
    yield from _treatments(claim, config, deadline)
    yield from _rows(claim, config)


def _directions(claim: Claim, config: Config, deadline: Deadline) -> Iterator[Finding]:
    graph = claim.graph
    outcomes = listed(graph.names_of(claim.outcomes), "or")
    for treatment in config.treatments:
        deadline.poll()
        name = graph.name(treatment.node)
        if not descendants(graph, 1 << treatment.node) & claim.outcomes:
            message = (
                f"No directed path leads from {listed([name])} to {outcomes}: by this graph the effect is zero,"
                " and any other number is bias or chance. Check whether the graph lacks an arrow."
            )
            yield Finding("no-causal-path", (name,), message, treatment.place)
        elif claim.asks == "direct" and not claim.effect.on_causal_paths:
            message = (
                f"No arrow leads from {listed([name])} to {outcomes}: by this graph the direct effect is zero, and"
                " any other number is bias or chance. Ask for the total effect, or check whether the graph lacks an"
                " arrow."
            )
            yield Finding("no-arrow", (name,), message, treatment.place)
        earlier = ancestors(graph, 1 << treatment.node) & claim.outcomes
        for outcome in config.outcomes if earlier else ():
            if earlier >> outcome.node & 1:
                deadline.poll()
                names = graph.names_of(1 << treatment.node | 1 << outcome.node)
                message = (
                    f"The outcome {listed([graph.name(outcome.node)])} is a cause of the treatment"
                    f" {listed([name])} in this graph: check whether the two were swapped."
                )
                yield Finding("outcome-precedes-treatment", names, message, outcome.place)


def _treatments(claim: Claim, config: Config, deadline: Deadline) -> Iterator[Finding]:
    graph = claim.graph
    for treatment in config.treatments:
        deadline.poll()
        later = descendants(graph, 1 << treatment.node) & claim.treatments & ~(1 << treatment.node)
        if later:
            earlier, names = graph.name(treatment.node), graph.names_of(later)
            message = (
                f"{listed([earlier])} is a cause of {listed(names)}, a treatment too: its coefficient is its"
                " effect with the other treatments held fixed, not its total effect."
            )
            columns = graph.names_of(later | 1 << treatment.node)
            yield Finding("treatment-precedes-treatment", columns, message, treatment.place)


def _rows(claim: Claim, config: Config) -> Iterator[Finding]:
    graph = claim.graph
    below = descendants(graph, claim.treatments)
    alone = determined_by(claim.treatments, claim.inputs)
    for filter_part in (*config.rows.filter_parts, *config.rows.silent_parts):
        part = filter_part.part
        # A filter on treatments, or what is computed from them alone, narrows their range and says nothing else.
        if part.columns & below and part.columns & ~alone:
            columns = graph.names_of(part.columns & below)
            is_silent = any(filter_part is silent for silent in config.rows.silent_parts)
            who = f"Who is kept by {part_text(part.written)} depends on the treatment"
            if is_silent:
                who = f"{capital(silent_text(part.written))} makes who is kept depend on the treatment"
            message = (
                f"{who} (through {listed(columns)}): the number speaks of the rows that were in fact kept, and of"
                " nobody else. Say so wherever it is reported."
            )
            rule = "lost-rows-depend-on-treatment" if is_silent else "filter-depends-on-treatment"
            yield Finding(rule, columns, message, filter_part.place, part.written)
