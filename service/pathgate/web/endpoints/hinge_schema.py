"""The schemas of what a verdict rests on: hinges, and the edges that the team marked as doubtful."""

from __future__ import annotations

from typing import Any

from pathgate.review.doubtful import MOST_TRIED
from pathgate.review.hinges import MOST_NAMES, MOST_NODES
from pathgate.web.endpoints.shared_schemas import NAME_LIST

_ENDS: dict[str, Any] = {
    "source": {"type": "string"},
    "target": {"type": "string"},
    "kind": {"enum": ["directed", "bidirected"]},
}
_QUESTION = {"type": "string", "description": "what must be true, as a sentence to be answered yes or no"}

_STATEMENT: dict[str, Any] = {
    "type": "object",
    "properties": {"x": {"type": "string"}, "y": {"type": "string"}, "given": NAME_LIST},
    "required": ["x", "y", "given"],
    "additionalProperties": False,
}

_ABSENT: dict[str, Any] = {
    "type": "object",
    "properties": {
        **_ENDS,
        "question": _QUESTION,
        "exposed_by": {
            "description": (
                "the independency of the two ends that the graph promises for all rows, and that the edge would"
                " break; null where an end is unmeasured or no set of columns separates the two"
            ),
            "anyOf": [_STATEMENT, {"type": "null"}],
        },
    },
    "required": ["source", "target", "kind", "question", "exposed_by"],
    "additionalProperties": False,
}

_PRESENT: dict[str, Any] = {
    "type": "object",
    "properties": {**_ENDS, "question": _QUESTION},
    "required": ["source", "target", "kind", "question"],
    "additionalProperties": False,
}

HINGES_ON: dict[str, Any] = {
    "type": "object",
    "description": (
        "what a sound verdict hinges on; the lists are empty where the verdict is another one. Edges that would make"
        " the graph faulty (a cycle, an arrow back in time) are left out."
    ),
    "properties": {
        "absent_edges": {
            "type": "array",
            "description": "any one of these, if it existed, would make the verdict anything but sound",
            "items": _ABSENT,
        },
        "reversed": {
            "type": "array",
            "description": "any one of these arrows, turned round, would",
            "items": _PRESENT,
        },
        "removed": {
            "type": "array",
            "description": "any one of these edges, taken away, would: always empty, since with an edge less a sound"
            " config stays sound",
            "items": _PRESENT,
        },
        "complete": {
            "type": "boolean",
            "description": (
                f"false where the time came to an end, the lists would hold more than {MOST_NAMES:,} names, or the"
                f" graph has more than {MOST_NODES:,} nodes (then they are empty)"
            ),
        },
    },
    "required": ["absent_edges", "reversed", "removed", "complete"],
    "additionalProperties": False,
}

DOUBTFUL: dict[str, Any] = {
    "type": "object",
    "description": "where the graph has doubtful edges: is the config sound with and without them?",
    "properties": {
        "verdict": {
            "enum": ["always", "never", "depends"],
            "description": "sound whichever of the doubtful edges exist, whichever do not, or it depends",
        },
        "depends_on": {
            "type": "array",
            "description": "the doubtful edges whose existence decides it, given some choice of the others",
            "items": {
                "type": "object",
                "properties": _ENDS,
                "required": list(_ENDS),
                "additionalProperties": False,
            },
        },
        "complete": {
            "type": "boolean",
            "description": (
                f"false where `depends_on` may lack some: there are more than {MOST_TRIED} doubtful edges, or the"
                " time came to an end; the verdict holds in any case"
            ),
        },
    },
    "required": ["verdict", "depends_on", "complete"],
    "additionalProperties": False,
}

HINGE_COMPONENTS = {"HingesOn": HINGES_ON, "Doubtful": DOUBTFUL}
