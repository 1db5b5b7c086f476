"""What is read by GET: the reference, the pages of problems, rules and roles, the schemas, the state of the service.

Everything but the state is made once, when the app is; a request only picks it up.
"""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import asdict
from typing import Any

import msgspec
from flask import Flask, Response, redirect, request
from werkzeug.exceptions import NotFound
from werkzeug.wrappers import Response as AnyResponse

from pathgate.review.rules import RULES
from pathgate.version import VERSION
from pathgate.web.openapi import document
from pathgate.web.operations import Operation
from pathgate.web.problems import PROBLEM_TYPES, ProblemType
from pathgate.web.reference import ANY_SERVER, Pages
from pathgate.web.replies import json_reply
from pathgate.web.schema_documents import schema_documents
from pathgate.web.settings import Settings

_SERVER = re.compile(r"https?://[A-Za-z0-9.:\[\]_-]+/")
_SCHEMA_JSON = "application/schema+json"


def install_pages(app: Flask, operations: Sequence[Operation], settings: Settings) -> None:
    """Add every path that is read by GET."""
    described = document(operations)
    _install_state(app, settings)
    _install_documents(app, described)
    pages = Pages(app.jinja_env, described)
    _install_reference(app, pages)
    _install_problems(app, pages)
    _install_rules(app, pages)
    _install_roles(app, pages)


def _install_state(app: Flask, settings: Settings) -> None:
    version = {"version": VERSION, "limits": settings.as_dict()}
    for path, told in (
        ("/healthz", {"status": "ok"}),
        ("/readyz", {"status": "ready"}),
        ("/version", version),
    ):
        app.add_url_rule(path, path, lambda told=told: json_reply(told))


def _install_documents(app: Flask, described: Mapping[str, Any]) -> None:
    openapi = msgspec.json.encode(described)
    schemas = {
        name: msgspec.json.encode(schema)
        for name, schema in schema_documents(described["components"]["schemas"]).items()
    }

    @app.get("/openapi.json")
    def openapi_document() -> Response:
        return Response(openapi, content_type="application/json")

    @app.get("/schemas/<name>")
    def schema_document(name: str) -> Response:
        if name not in schemas:
            raise NotFound
        return Response(schemas[name], content_type=_SCHEMA_JSON)


def _install_reference(app: Flask, pages: Pages) -> None:
    reference = pages.reference()

    @app.get("/")
    def home() -> AnyResponse:
        return redirect("/docs")

    @app.get("/docs")
    def docs() -> Response:
        # The commands to copy name the server that the page came from, where its name is a plain one.
        root = request.url_root
        text = reference.replace(ANY_SERVER, root) if _SERVER.fullmatch(root) else reference
        return _page(text, pages)


def _install_problems(app: Flask, pages: Pages) -> None:
    problem_pages = {slug: pages.problem(each) for slug, each in PROBLEM_TYPES.items()}

    @app.get("/problems/<slug>")
    def problem(slug: str) -> Response:
        if slug not in PROBLEM_TYPES:
            raise NotFound
        if _is_json_wanted():
            return json_reply(_problem_document(PROBLEM_TYPES[slug]))
        return _page(problem_pages[slug], pages)


def _install_rules(app: Flask, pages: Pages) -> None:
    rule_pages = {name: pages.rule(each) for name, each in RULES.items()}
    index = pages.rules()

    @app.get("/docs/rules")
    def rules() -> Response:
        return _page(index, pages)

    @app.get("/docs/rules/<name>")
    def rule(name: str) -> Response:
        if name not in RULES:
            raise NotFound
        return json_reply(asdict(RULES[name])) if _is_json_wanted() else _page(rule_pages[name], pages)


def _install_roles(app: Flask, pages: Pages) -> None:
    listed = pages.roles()

    @app.get("/docs/roles")
    def roles() -> Response:
        return _page(listed, pages)


def _page(text: str, pages: Pages) -> Response:
    reply = Response(text, content_type="text/html; charset=utf-8")
    reply.headers["Content-Security-Policy"] = pages.content_policy
    reply.headers["Referrer-Policy"] = "no-referrer"
    return reply


def _is_json_wanted() -> bool:
    best = request.accept_mimetypes.best_match(["text/html", "application/json"], "text/html")
    return best == "application/json"


def _problem_document(each: ProblemType) -> dict[str, Any]:
    return {
        "type": each.reference,
        "status": each.status,
        "title": each.title,
        "text": each.text,
        "retryable": each.retryable,
    }
