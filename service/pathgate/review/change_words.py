"""What a change of graph does to a config, in one sentence that can stand in a pull request.

It names what did it, up to a few changes; the rest is counted.
"""

from __future__ import annotations

from pathgate.review.changes import ConfigChange, Judgement
from pathgate.review.graph_difference import Change, Difference, EdgeChange, NamedEdge, NodeChange
from pathgate.review.hinges import plain_name
from pathgate.review.visible import visible
from pathgate.review.wording import listed

# Changes, errors and edges of one node that a sentence names; more are counted.
_MOST = 3


def change_sentence(name: str, found: ConfigChange, difference: Difference) -> str:
    """The sentence.

    Args:
        name: what the config is called.
        found: what became of it.
        difference: between the two graphs.
    """
    before, after = (each.verdict or "not judged" for each in (found.before, found.after))
    if before != after:
        verdicts = f"{before} before, {after} after"
    elif found.outcome == "same":
        verdicts = f"{before} before and after" + ("" if before == "sound" else ", for the same reason")
    else:
        verdicts = f"{before} before and after, for another reason"
    culprits = [change_phrase(each, difference) for each in found.culprits]
    because = f": {_enumerated(culprits, 'change')}" if culprits else ""
    return f"{visible(name)}: {verdicts}{because}{_reason(found.after)}."


def change_phrase(change: Change, difference: Difference) -> str:
    """One change as a phrase."""
    return _edge_phrase(change) if isinstance(change, EdgeChange) else _node_phrase(change, difference)


def edge_text(edge: NamedEdge) -> str:
    """An edge as it is drawn.

    >>> edge_text(("directed", "rain", "late delivery"))
    'rain → "late delivery"'
    """
    kind, source, target = edge
    return f"{plain_name(source)} {'→' if kind == 'directed' else '↔'} {plain_name(target)}"


def _edge_phrase(change: EdgeChange) -> str:
    shown = edge_text(change.edge)
    what = "arrow" if change.edge[0] == "directed" else "edge"
    if change.was is not None:
        return f"{shown} instead of {edge_text(change.was)}"
    return f"the {'new' if change.change == 'added' else 'removed'} {what} {shown}"


def _node_phrase(change: NodeChange, difference: Difference) -> str:
    name, new = plain_name(change.node), difference.new
    if change.change == "removed":
        return f"the removed node {name}"
    is_measured = bool(new.measured >> new.index[change.node] & 1)
    if change.change == "added":
        edges = [edge_text(edge) for edge in difference.edges_at(change.node)]
        drawn = f" ({_enumerated(edges, 'edge', joined=', ')})" if edges else ""
        return f"the new {'' if is_measured else 'unmeasured '}node {name}{drawn}"
    said = [
        {
            "measured": "now measured" if is_measured else "no longer measured",
            "recorded": "recorded at another time",
            "constant_within": "constant within other columns",
            "columns": "known by other names",
        }[member]
        for member in change.members
    ]
    return f"{name} {_enumerated(said, 'change')}"


def _reason(after: Judgement) -> str:
    """Why it is not sound on the new graph, in parentheses; nothing where it is."""
    if after.problem is not None:
        return f" ({visible(str(after.problem))})"
    errors = dict.fromkeys(f"{each.rule}: {listed(each.columns)}" for each in after.errors)
    return f" ({_enumerated(list(errors), 'error', joined='; ')})" if errors else ""


def _enumerated(items: list[str], what: str, joined: str = " and ") -> str:
    shown = items[:_MOST]
    if len(items) > _MOST:
        more = len(items) - _MOST
        shown.append(f"{more:,} more {what}" + ("" if more == 1 else "s"))
    if joined == " and " and len(shown) > 2:
        shown = [", ".join(shown[:-1]), shown[-1]]
    return joined.join(shown)
