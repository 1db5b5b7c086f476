"""What a change of graph does, as the documents that HTTP callers and the command show: the same members.

One entry is one config between two graphs; an error of its own is a problem in it, and never the end of the others.
"""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

from pathgate.criteria.deadline import Deadline
from pathgate.graphs.errors import Place
from pathgate.review.change_words import change_sentence
from pathgate.review.changed_promises import Promise
from pathgate.review.changes import ConfigChange, Judgement, change_of
from pathgate.review.graph_difference import Difference, EdgeChange, NamedEdge, NodeChange
from pathgate.web.judging import problem_members
from pathgate.web.settings import Settings

Json = dict[str, Any]


def config_entry(
    value: Any, called: str, difference: Difference, settings: Settings, search: Deadline, place: Place
) -> Json:
    """What replacing one graph by another does to a config; it has the whole time budget for its reviews.

    Args:
        value: the config as it came.
        called: what to call it where it has no name of its own.
        difference: between the two graphs.
        settings: the limits.
        search: how long it may be looked for what did it.
        place: where the config stands in the input, for the pointers of a problem.
    """
    found = change_of(value, difference, Deadline(settings.time_budget_seconds), search)
    said = value.get("name") if isinstance(value, dict) else None
    name = said if isinstance(said, str) else ""
    entry: Json = {
        "name": name,
        "before": found.before.verdict,
        "after": found.after.verdict,
        "change": found.outcome,
        "edges": [_edge_change(each) for each in found.culprits if isinstance(each, EdgeChange)],
        "nodes": [_node_change(each) for each in found.culprits if isinstance(each, NodeChange)],
        "complete": found.is_complete,
        "summary": change_sentence(name or called, found, difference),
    }
    return entry | _problems(found, settings, place)


def difference_document(difference: Difference) -> Json:
    """All that differs between the two graphs, whatever it does."""
    return {
        "nodes": {
            "added": list(difference.added_nodes),
            "removed": list(difference.removed_nodes),
            "changed": [
                {"node": each.node, "members": list(each.members)} for each in difference.changed_nodes
            ],
        },
        "edges": {
            "added": _edges(difference.added_edges),
            "removed": _edges(difference.removed_edges),
            "turned": _edges(each.edge for each in difference.turned),
        },
    }


def promise_document(promise: Promise) -> Json:
    """A promised independency."""
    return {"x": promise.x, "y": promise.y, "given": list(promise.given)}


def _problems(found: ConfigChange, settings: Settings, place: Place) -> Json:
    sides: tuple[tuple[str, Judgement], ...] = (("problem_before", found.before), ("problem", found.after))
    return {
        member: problem_members(side.problem, settings, place)
        for member, side in sides
        if side.problem is not None
    }


def _edge_change(change: EdgeChange) -> Json:
    return {**_edge(change.edge), "change": change.change}


def _node_change(change: NodeChange) -> Json:
    members = {"members": list(change.members)} if change.members else {}
    return {"node": change.node, "change": change.change, **members}


def _edges(edges: Iterable[NamedEdge]) -> list[Json]:
    return [_edge(edge) for edge in edges]


def _edge(edge: NamedEdge) -> Json:
    kind, source, target = edge
    return {"source": source, "target": target, "kind": kind}
