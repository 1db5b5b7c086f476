"""Schemas that several operations publish: paths, names, conditions on rows, pages."""

from __future__ import annotations

from typing import Any

from pathgate.review.schema import BARE_NAME, NAMES, PART
from pathgate.web.operations import GRAPH_REFERENCE
from pathgate.web.paging import DEFAULT_LIMIT

Schema = dict[str, Any]

GRAPH: Schema = dict(GRAPH_REFERENCE)

NAME_LIST: Schema = {"type": "array", "items": {"type": "string"}}

LABEL: Schema = {
    "title": "a node's name, or the condition on the rows that a selection node stands for",
    "anyOf": [
        {"type": "string"},
        {"type": "object", "properties": {"part": {}}, "required": ["part"], "additionalProperties": False},
    ],
}

PATH: Schema = {
    "type": "object",
    "description": "A path, no node twice.",
    "properties": {
        "nodes": {"type": "array", "minItems": 2, "items": {"$ref": "#/components/schemas/Label"}},
        "arrows": {
            "type": "array",
            "description": "how the edge from each node to the next points, read from first to last",
            "items": {"enum": ["forward", "backward", "both"]},
        },
        "steps": {
            "type": "array",
            "description": "for each node between the ends, why it lets the path through",
            "items": {
                "type": "object",
                "properties": {
                    "node": {"$ref": "#/components/schemas/Label"},
                    "role": {"enum": ["chain", "fork", "collider"]},
                    "open": {"type": "boolean"},
                    "because": {"enum": ["not-conditioned", "conditioned", "descendant-conditioned"]},
                    "through": {
                        "type": "array",
                        "description": "for a collider: the directed path from it to the conditioned node",
                        "items": {"$ref": "#/components/schemas/Label"},
                    },
                },
                "required": ["node", "role", "open", "because"],
                "additionalProperties": False,
            },
        },
    },
    "required": ["nodes", "arrows", "steps"],
    "additionalProperties": False,
}

PATH_COMPONENTS: dict[str, Schema] = {"Label": LABEL, "Path": PATH}

SELECTED_ON: Schema = {
    "title": "a node's name, or a list of names (together one condition) and conditions {columns, fixed}",
    "description": "what decides which rows are kept",
    "anyOf": [
        BARE_NAME,
        {
            "type": "array",
            "items": {
                "title": "a name or a condition {columns, fixed}",
                "anyOf": [BARE_NAME, PART],
            },
        },
    ],
}

GIVEN: Schema = {**NAMES, "description": "the nodes conditioned on, measured or not", "default": []}

LIMIT: Schema = {
    "type": "integer",
    "minimum": 1,
    "default": DEFAULT_LIMIT,
    "description": "most items on this page; lowered to the operator's maximum",
}
CURSOR: Schema = {
    "type": "string",
    "description": "from the page before: send it back with the same request for the next page",
}
NEXT_PAGE: dict[str, Schema] = {
    "complete": {"type": "boolean", "description": "is this the last page?"},
    "cursor": {"type": "string", "description": "present where complete is false"},
}

MEASURE_NEXT: Schema = {
    "type": "object",
    "properties": {
        "measure": {**NAME_LIST, "description": "unmeasured nodes"},
        "causes_of": {
            "type": "array",
            "description": "the common cause behind each of these bidirected edges",
            "items": {**NAME_LIST, "minItems": 2, "maxItems": 2},
        },
    },
    "required": ["measure", "causes_of"],
    "additionalProperties": False,
}


def object_of(**properties: Schema) -> Schema:
    """The schema of an object that has all of these members and no others."""
    return {
        "type": "object",
        "properties": properties,
        "required": list(properties),
        "additionalProperties": False,
    }
