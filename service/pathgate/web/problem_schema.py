"""The shape of a problem document, and the answers that hold one, as the OpenAPI document states them."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from pathgate.web.problems import PROBLEM_TYPES

Schema = dict[str, Any]

PROBLEM_SCHEMA: Schema = {
    "title": "a problem",
    "description": "Why a request failed (RFC 9457). Further members may be added by later versions.",
    "type": "object",
    "properties": {
        "type": {
            "type": "string",
            "description": "The kind of problem: a page of this service that says what it means and what to do.",
            "enum": [each.reference for each in PROBLEM_TYPES.values()],
        },
        "title": {"type": "string", "description": "The kind of problem in a few words."},
        "status": {"type": "integer", "description": "The HTTP status, once more."},
        "detail": {
            "type": "string",
            "description": "A sentence about this one; the first fault, where several.",
        },
        "instance": {
            "type": "string",
            "pattern": "^urn:uuid:[0-9a-f]{8}(-[0-9a-f]{4}){3}-[0-9a-f]{12}$",
            "description": "The id of the request, also in the X-Request-Id header and in the service's log.",
        },
        "retryable": {
            "type": "boolean",
            "description": "May the same request succeed later, unchanged?",
        },
        "errors": {
            "type": "array",
            "minItems": 1,
            "description": "Every fault found in the input, up to the number that the operator allows.",
            "items": {
                "type": "object",
                "properties": {
                    "pointer": {
                        "type": "string",
                        "pattern": "^#(/[^/]*)*$",
                        "description": "Where: a JSON pointer as a URI fragment (RFC 6901); `#` is the whole body.",
                    },
                    "detail": {"type": "string", "description": "What is wrong there, in one sentence."},
                },
                "required": ["pointer", "detail"],
                "additionalProperties": False,
            },
        },
        "errors_omitted": {
            "type": "integer",
            "minimum": 1,
            "description": "How many more faults were found than are listed; reading stops at some number.",
        },
        "line": {"type": "integer", "minimum": 1, "description": "The line where the body stops being JSON."},
        "column": {
            "type": "integer",
            "minimum": 1,
            "description": "The column in that line, in characters.",
        },
        "cycle": {
            "type": "array",
            "items": {"type": "string"},
            "description": "A directed cycle of the graph, its first node repeated at the end.",
        },
        "seconds": {"type": "number", "description": "The time budget that was used up."},
    },
    "required": ["type", "title", "status", "detail", "instance", "retryable"],
}


def problem_response(status: int, slugs: Sequence[str]) -> Schema:
    """The answer with this status, whose problem is of one of these kinds."""
    types = [PROBLEM_TYPES[slug] for slug in slugs]
    own: Schema = {
        "properties": {
            "type": {"enum": [each.reference for each in types]},
            "title": {"enum": [each.title for each in types]},
            "status": {"const": status},
            "retryable": {"const": types[0].retryable},
        }
    }
    if status == 409:
        own["properties"]["review"] = {"$ref": "#/components/schemas/Review"}
    own["required"] = {400: ["line", "column"], 409: ["review"]}.get(status, [])
    return {
        "description": "; ".join(each.title for each in types) + ".",
        "headers": {"X-Request-Id": {"$ref": "#/components/headers/RequestId"}},
        "content": {
            "application/problem+json": {
                "schema": {"allOf": [{"$ref": "#/components/schemas/Problem"}, own]},
            }
        },
    }
