"""The paths that are read by GET, as the OpenAPI document describes them.

What they answer is not under ``/v1/``: pages for people, documents for tools, the state of the process.
"""

from __future__ import annotations

from dataclasses import fields
from typing import Any

from pathgate.review.rules import RULES, SEVERITIES
from pathgate.web.endpoints.shared_schemas import object_of
from pathgate.web.problem_schema import problem_response
from pathgate.web.problems import PROBLEM_TYPES
from pathgate.web.settings import Settings

Json = dict[str, Any]

_HTML = {"text/html; charset=utf-8": {"schema": {"type": "string"}}}


def _status(word: str) -> Json:
    return object_of(status={"const": word})


def _json(schema: Json) -> Json:
    return {"application/json": {"schema": schema}}


def _get(operation: str, summary: str, content: Json, **more: Any) -> Json:
    answer = {
        "description": "What was asked for.",
        "headers": {"X-Request-Id": {"$ref": "#/components/headers/RequestId"}},
        "content": content,
    }
    responses = {"200": answer, **more.pop("responses", {})}
    return {
        "get": {
            "operationId": operation,
            "tags": ["around"],
            "summary": summary,
            **more,
            "responses": {**responses, "500": {"$ref": "#/components/responses/Problem500"}},
        }
    }


def _limits() -> Json:
    return object_of(
        **{
            each.name: {
                "type": "integer" if isinstance(each.default, int) else "number",
                "description": each.metadata["text"],
            }
            for each in fields(Settings)
        }
    )


_PROBLEM_PAGE = object_of(
    type={"type": "string"},
    status={"type": "integer"},
    title={"type": "string"},
    text={"type": "string", "description": "What it means and what to do."},
    retryable={"type": "boolean"},
)

_RULE_PAGE = object_of(
    name={"type": "string"},
    severity={"enum": list(SEVERITIES)},
    meaning={"type": "string"},
    why_it_matters={"type": "string"},
    example={"type": "string", "description": "One case of it; names of columns stand in backticks."},
    what_to_do={"type": "string"},
    may_be_waived={"type": "boolean", "description": "Can a config accept it, under `accept`?"},
)


def _named(name: str, known: list[str]) -> list[Json]:
    return [{"name": name, "in": "path", "required": True, "schema": {"enum": known}}]


def get_paths(schema_names: list[str]) -> Json:
    """Each path that is read by GET, with what it answers."""
    missing = {"404": problem_response(404, ["not-found"])}
    return {
        "/openapi.json": _get("openapi", "This document.", _json({"type": "object"})),
        "/docs": _get("docs", "The reference, as a page that loads nothing from elsewhere.", _HTML),
        "/docs/rules": _get("rules", "All that a review can find, as a page.", _HTML),
        "/docs/rules/{name}": _get(
            "rule",
            "What a rule means, why it matters, an example, and what to do about a finding.",
            {**_HTML, **_json(_RULE_PAGE)},
            parameters=_named("name", list(RULES)),
            responses=missing,
        ),
        "/docs/roles": _get("roles", "What a column can be to the effect claimed, as a page.", _HTML),
        "/problems/{slug}": _get(
            "problem",
            "What a kind of problem means and what to do about it.",
            {**_HTML, **_json(_PROBLEM_PAGE)},
            parameters=_named("slug", list(PROBLEM_TYPES)),
            responses=missing,
        ),
        "/schemas/{name}": _get(
            "schema",
            "One schema of this interface by itself, as a JSON Schema document.",
            {"application/schema+json": {"schema": {"type": "object"}}},
            parameters=_named("name", schema_names),
            responses=missing,
        ),
        "/healthz": _get("healthz", "Is the process alive?", _json(_status("ok"))),
        "/readyz": _get("readyz", "Does it take requests?", _json(_status("ready"))),
        "/version": _get(
            "version",
            "Which version answers, and under which limits.",
            _json(object_of(version={"type": "string"}, limits=_limits())),
        ),
    }
