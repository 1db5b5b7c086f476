"""Do the covariates carry the effect over to everybody, from the rows kept?

That they do not is an error where the effect in everybody is claimed, and a note where it is not.
"""

from __future__ import annotations

from collections.abc import Iterator

from pathgate.criteria.adjustment import is_valid
from pathgate.criteria.paths import OpenPath, explain_path, find_open_path
from pathgate.criteria.reachability import Conditions
from pathgate.criteria.whole import recovers
from pathgate.graphs.graph import CausalGraph
from pathgate.graphs.masks import mask_of, members
from pathgate.review.claims import Claim
from pathgate.review.config import Config
from pathgate.review.findings import Finding
from pathgate.review.wording import listed


def population_findings(claim: Claim, config: Config) -> Iterator[Finding]:
    """What keeps the number from speaking of everybody, where rows are kept by something."""
    kept = claim.effect.kept
    if not kept.parts or claim.asks == "direct":
        return
    held = claim.usable_covariates
    # Where they do not even carry it among the rows kept, the errors say why.
    if not is_valid(claim.effect, held):
        return
    if not recovers(claim.effect, held, claim.known):
        yield _not_recovered(claim, config)
    elif claim.population == "whole":
        yield from _filtered_weights(claim, config)


def _not_recovered(claim: Claim, config: Config) -> Finding:
    graph = claim.graph
    columns = _read_by(claim)
    rows = config.rows
    place = rows.filter_parts[0].place if rows.filter_parts else rows.silent_parts[0].place
    known = graph.names_of(claim.known & claim.usable_covariates)
    with_known = f", weighted by what is known of {listed(known)} in everybody," if known else ""
    if claim.population == "whole":
        message = (
            f"The effect in everybody is not recovered by adjusting: who is kept, by {listed(columns)}, tells of the"
            f" outcome, and the covariates{with_known} do not undo that. Claim `population: kept`, or name under"
            " `measured_everywhere` what you know the distribution of in everybody."
        )
        return Finding("not-recovered", columns, message, place, path=_path_to_selection(claim))
    message = (
        "The number speaks of the rows kept alone. The effect in everybody is not recovered from them by adjusting"
        f" for these covariates{with_known.rstrip(',')}."
    )
    return Finding("kept-rows-only", columns, message, place)


def _read_by(claim: Claim) -> tuple[str, ...]:
    nodes = 0
    for part in claim.effect.kept.parts:
        nodes |= part.columns
    return claim.graph.names_of(nodes)


def _path_to_selection(claim: Claim) -> OpenPath | None:
    """A path by which who is kept tells of the outcome, given all that can be weighted by."""
    effect = claim.effect
    graph: CausalGraph = effect.back_door_graph
    weights = claim.known & claim.usable_covariates & effect.usable & ~effect.kept.conditioned
    trail = find_open_path(graph, effect.kept.conditioned, effect.outcomes, Conditions.on(graph, weights))
    return explain_path(effect.kept, trail, weights) if trail else None


def _filtered_weights(claim: Claim, config: Config) -> Iterator[Finding]:
    held, known = claim.usable_covariates, claim.known
    needed = mask_of(
        node for node in members(known & held) if not recovers(claim.effect, held, known & ~(1 << node))
    )
    for filter_part in config.rows.filter_parts:
        for node in members(filter_part.part.columns & needed):
            name = claim.graph.name(node)
            message = (
                f"The row filter reads {listed([name])}, which has to be weighted by how it is distributed in"
                " everybody: that is possible only where some rows of each of its values are kept."
            )
            part = filter_part.part
            yield Finding("weighting-column-filtered", (name,), message, filter_part.place, part.written)
