"""The OpenAPI 3.1 document, assembled from the operations themselves, so that it can promise nothing else.

``python -m pathgate.web.openapi`` prints it; with ``--write PATH`` it is written there. The answers of the
examples are what the operations answer to them under default settings.
"""

from __future__ import annotations

import argparse
import json
import sys
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from pathgate.criteria.deadline import Deadline
from pathgate.graphs.schema import GRAPH_SCHEMA
from pathgate.version import VERSION
from pathgate.web.endpoints import OPERATIONS
from pathgate.web.media import LINES
from pathgate.web.openapi_gets import get_paths
from pathgate.web.operations import Example, Operation, envelope_shape, open_call
from pathgate.web.problem_schema import PROBLEM_SCHEMA, problem_response
from pathgate.web.schema_documents import document_name
from pathgate.web.settings import Settings

Json = dict[str, Any]

# What any POST can end in; the statuses that the web server itself might send are not the service's promise.
_FAILURES: Mapping[int, tuple[str, ...]] = {
    400: ("not-json",),
    406: ("not-acceptable",),
    408: ("request-timeout",),
    413: ("body-too-large",),
    415: ("unsupported-media-type",),
    422: (
        "invalid-request",
        "not-supported",
        "invalid-graph",
        "cycle",
        "unknown-node",
        "over-limit",
        "bad-cursor",
        "too-costly",
    ),
    500: ("internal-error",),
}

_DESCRIPTION = (
    "Pathgate reads a team's causal graph and says whether the number that a model config reports is the effect it"
    " is read as: which column or row filter breaks it, along which path, and what to change.\n\n"
    "It keeps no state: everything needed is in the request, and any request can safely be sent again. A failure is"
    " a problem document (RFC 9457) whose `type` is a page of this service. Unknown members are refused, so that a"
    " misspelt one cannot pass unnoticed. A set of columns is written as a name or a list of names.\n\n"
    "A verdict is about the graph it was given: it does not show that the graph is right. Where a number decides"
    " about people's health, credit, work or safety, a qualified statistician and the local rules come first."
)


def document(operations: Sequence[Operation]) -> Json:
    """The OpenAPI document for these operations and the GET paths that are always there.

    Raises:
        ValueError: two operations give different schemas the same name.
    """
    schemas = _schemas_of(operations)
    paths = get_paths(sorted(map(document_name, schemas)))
    return {
        "openapi": "3.1.0",
        "info": {
            "title": "Pathgate",
            "version": VERSION,
            "summary": "Does the number a model config reports mean what it claims?",
            "description": _DESCRIPTION,
        },
        "servers": [{"url": "/"}],
        "tags": [
            {"name": "questions", "description": "Questions about a graph, each asked by POST."},
            {"name": "around", "description": "The reference, the schemas, and the state of the service."},
        ],
        "paths": {**{each.path: {"post": _post(each)} for each in operations}, **paths},
        "components": {
            "schemas": schemas,
            "responses": {
                _response_name(status): problem_response(status, slugs) for status, slugs in _FAILURES.items()
            },
            "headers": {
                "RequestId": {
                    "description": "The id of the request: that of its own X-Request-Id, where it is a UUID.",
                    "schema": {"type": "string", "format": "uuid"},
                }
            },
        },
    }


def _rendered(operations: Sequence[Operation]) -> str:
    """The document as text, ending in a newline."""
    return json.dumps(document(operations), indent=2, ensure_ascii=False) + "\n"


def _post(operation: Operation) -> Json:
    failures = {
        str(status): {"$ref": f"#/components/responses/{_response_name(status)}"} for status in _FAILURES
    }
    failures |= {str(status): problem_response(status, slugs) for status, slugs in operation.failures.items()}
    in_lines: Json = {LINES: {"schema": operation.line_schema}} if operation.line_schema else {}
    answers = [_answer_to(operation, example) for example in operation.examples]
    return {
        "operationId": operation.name,
        "tags": ["questions"],
        "summary": operation.summary,
        "description": operation.description,
        "requestBody": {
            "required": True,
            "content": {
                "application/json": {
                    "schema": _reference(operation, "Request"),
                    "examples": _examples(operation, [each.request for each in operation.examples]),
                }
            },
        },
        "responses": {
            "200": {
                "description": "The answer.",
                "headers": {"X-Request-Id": {"$ref": "#/components/headers/RequestId"}},
                "content": {
                    "application/json": {
                        "schema": _reference(operation, "Answer"),
                        "examples": _examples(operation, answers),
                    },
                    **in_lines,
                },
            },
            **dict(sorted(failures.items())),
        },
    }


def _examples(operation: Operation, values: Sequence[Json]) -> Json:
    return {
        example.name: {"summary": example.summary, "value": value}
        for example, value in zip(operation.examples, values, strict=True)
    }


def _answer_to(operation: Operation, example: Example) -> Json:
    # Decoded from text, so that the operation cannot change the example it is asked about.
    request = json.loads(json.dumps(example.request))
    call = open_call(operation, envelope_shape(operation), request, Settings(), Deadline.never())
    answer = operation.answer(call)
    call.refuse_faults()
    return answer


def _reference(operation: Operation, kind: str) -> Json:
    return {"$ref": f"#/components/schemas/{_schema_name(operation, kind)}"}


def _schema_name(operation: Operation, kind: str) -> str:
    return "".join(word.capitalize() for word in operation.name.split("-")) + kind


def _response_name(status: int) -> str:
    return f"Problem{status}"


def _schemas_of(operations: Sequence[Operation]) -> Json:
    """Every named schema of the document."""
    schemas: Json = {"Graph": GRAPH_SCHEMA, "Problem": PROBLEM_SCHEMA}
    for operation in operations:
        own = {
            _schema_name(operation, "Request"): operation.request_schema,
            _schema_name(operation, "Answer"): operation.response_schema,
        }
        for name, schema in {**own, **operation.components}.items():
            if schemas.setdefault(name, schema) != schema:
                raise ValueError(f"two different schemas are named {name}")
    return schemas


def main(arguments: Sequence[str] | None = None) -> None:
    """Print the document of all operations, or write it to a file."""
    parser = argparse.ArgumentParser(description="Print the OpenAPI document of this service, or write it.")
    parser.add_argument("--write", metavar="PATH", type=Path, help="the file to write it to")
    path = parser.parse_args(arguments).write
    text = _rendered(OPERATIONS)
    if path is None:
        sys.stdout.write(text)
    else:
        path.write_text(text, encoding="utf-8")


if __name__ == "__main__":
    main()
