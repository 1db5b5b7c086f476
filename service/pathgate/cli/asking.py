"""Which service is asked, and as whom? The address from the call, the token from the environment."""

from __future__ import annotations

import os

import click

from pathgate.client import Client
from pathgate.client.service import DEFAULT_RETRIES

TOKEN_VARIABLE = "PATHGATE_TOKEN"  # noqa: S105 - its name


def make_client(url: str, timeout: float, retries: int = DEFAULT_RETRIES) -> Client:
    """A client for the service at ``url``.

    Raises:
        click.UsageError: there can be no such service, or the token cannot be sent.
    """
    try:
        token = os.environ.get(TOKEN_VARIABLE) or None
        return Client(url, timeout=timeout, retries=retries, token=token)
    except ValueError as error:
        raise click.UsageError(str(error), click.get_current_context(silent=True)) from None
