"""The one place where everything is put together: settings, operations, pages, failures."""

from __future__ import annotations

import os
from collections.abc import Sequence

# What many requests need in the end is loaded at once: the first of them should not wait for it.
import scipy.sparse.csgraph  # noqa: F401 - loaded early
from flask import Flask, Response

import pathgate.review.sql_names  # noqa: F401 - loaded early
from pathgate.web.answering import view_of
from pathgate.web.endpoints import OPERATIONS
from pathgate.web.memory import give_back_after
from pathgate.web.operations import Operation
from pathgate.web.pages import install_pages
from pathgate.web.replies import add_headers, install_error_handlers
from pathgate.web.settings import Settings


class _App(Flask):
    def make_default_options_response(self) -> Response:
        """OPTIONS says in ``Allow`` what a path takes, and nothing in a body."""
        reply = super().make_default_options_response()
        reply.status_code = 204
        del reply.headers["Content-Type"]
        return reply


def create_app(settings: Settings | None = None, operations: Sequence[Operation] = OPERATIONS) -> Flask:
    """The service as a WSGI application.

    Args:
        settings: the limits; those that the environment asks for where none are given.
        operations: what it answers under ``/v1/``.

    Raises:
        InvalidSettings: the environment asks for settings that cannot be used.
    """
    if settings is None:
        settings = Settings.from_environment(os.environ)
    app = _App(__name__, static_folder=None)
    for operation in operations:
        app.add_url_rule(operation.path, operation.name, view_of(operation, settings), methods=["POST"])
    install_pages(app, operations, settings)
    install_error_handlers(app, settings)
    app.after_request(add_headers)
    app.after_request(give_back_after)
    return app
