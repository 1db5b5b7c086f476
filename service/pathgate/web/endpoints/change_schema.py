"""The schema of an answer about a change of graph.

What the two graphs make of each config, all that differs between them, and a page of promises lost and gained.
"""

from __future__ import annotations

from typing import Any, get_args

from pathgate.review.changes import MOST_CULPRITS, Outcome
from pathgate.review.findings import Verdict
from pathgate.review.graph_difference import SAID_OF_NODES
from pathgate.web.endpoints.reviews import LINE
from pathgate.web.endpoints.shared_schemas import NAME_LIST, NEXT_PAGE, object_of

Schema = dict[str, Any]

_ENDS: Schema = {
    "source": {"type": "string"},
    "target": {"type": "string"},
    "kind": {"enum": ["directed", "bidirected"]},
}
_VERDICT: Schema = {"enum": [*get_args(Verdict), None]}
_MEMBERS: Schema = {
    "type": "array",
    "items": {"enum": list(SAID_OF_NODES)},
    "description": "of what is said of the node, what is not what it was",
}
_PROBLEM: Schema = LINE["properties"]["problem"]


def _list(items: Schema, description: str) -> Schema:
    return {"type": "array", "items": items, "description": description}


_EDGE = object_of(**_ENDS)
_STATEMENT = object_of(x={"type": "string"}, y={"type": "string"}, given=NAME_LIST)

_CULPRIT_EDGE = object_of(
    **_ENDS,
    change={
        "enum": ["added", "removed", "turned", "kind-changed"],
        "description": "what happened to the edge, which stands here as it is now, or as it was where it is gone",
    },
)
_CULPRIT_NODE: Schema = {
    "type": "object",
    "properties": {
        "node": {"type": "string"},
        "change": {
            "enum": ["added", "removed", "changed"],
            "description": "a node comes and goes with its edges",
        },
        "members": _MEMBERS,
    },
    "required": ["node", "change"],
    "additionalProperties": False,
}

CONFIG_CHANGE: Schema = {
    "type": "object",
    "description": "what replacing the graph does to one config",
    "properties": {
        "name": {"type": "string"},
        "before": {**_VERDICT, "description": "against `graph`; null where it could not be judged"},
        "after": {**_VERDICT, "description": "against `other`; null where it could not be judged"},
        "change": {
            "enum": list(get_args(Outcome)),
            "description": (
                "`broken`: sound before and not after; `mended`: the reverse; `other-reason`: sound neither time, by"
                " another verdict, other errors (rule and columns) or another problem"
            ),
        },
        "edges": _list(
            _CULPRIT_EDGE,
            "the edges among the changes that did it: a set of changes, together with `nodes`, with which `graph` gives"
            " what `other` gives, and of which no proper subset does",
        ),
        "nodes": _list(_CULPRIT_NODE, "the nodes among those changes"),
        "complete": {
            "type": "boolean",
            "description": (
                "false where time or trials ran out before it was known that no proper subset does it; more than"
                f" {MOST_CULPRITS} changes are not listed then"
            ),
        },
        "summary": {"type": "string", "description": "the whole in one sentence"},
        "problem_before": {
            **_PROBLEM,
            "description": "a problem document without instance: why it could not be judged before",
        },
        "problem": {
            **_PROBLEM,
            "description": "a problem document without instance: why it cannot be judged after",
        },
    },
    "required": ["name", "before", "after", "change", "edges", "nodes", "complete", "summary"],
    "additionalProperties": False,
}

CHANGES: Schema = {
    "type": "object",
    "properties": {
        "configs": {"type": "array", "items": {"$ref": "#/components/schemas/ConfigChange"}},
        "nodes": object_of(
            added={**NAME_LIST, "description": "only `other` has them"},
            removed={**NAME_LIST, "description": "only `graph` has them"},
            changed=_list(
                object_of(node={"type": "string"}, members=_MEMBERS),
                "of these something else is said; costs apart",
            ),
        ),
        "edges": object_of(
            added=_list(_EDGE, "all that only `other` has; one turned round or of another kind is here too"),
            removed=_list(_EDGE, "all that only `graph` has, likewise"),
            turned=_list(_EDGE, "the arrows that lead the other way round now, as they are in `other`"),
        ),
        "independencies": {
            **object_of(
                lost=_list(_STATEMENT, "statements of the basis of `graph` that are not true in `other`"),
                gained=_list(_STATEMENT, "statements of the basis of `other` that are not true in `graph`"),
            ),
            "description": "a page of them, all lost ones before the first one gained",
        },
        **NEXT_PAGE,
    },
    "required": ["configs", "nodes", "edges", "independencies", "complete"],
    "additionalProperties": False,
}
