"""Can the service listen where it is told to? Asked before it starts, so that a no is one clear line."""

from __future__ import annotations

import socket

import click


def check_bind(bind: str) -> None:
    """Go on where ``bind`` is an address that is free to listen on.

    Raises:
        click.UsageError: it is no ``HOST:PORT``.
        click.ClickException: it is one, but nothing can listen there.
    """
    host, colon, port = bind.rpartition(":")
    if not colon or not host or not (port.isascii() and port.isdigit()) or int(port) > 65535:
        raise click.UsageError(f"--bind takes HOST:PORT, as in 127.0.0.1:8080, not {bind!r}")
    try:
        found = socket.getaddrinfo(host.strip("[]"), int(port), type=socket.SOCK_STREAM)
        family, kind, protocol, _name, address = found[0]
        with socket.socket(family, kind, protocol) as probe:
            # As the server does: connections of a server just stopped do not make a port busy.
            probe.setsockopt(socket.SOL_SOCKET, socket.SO_REUSEADDR, 1)
            probe.bind(address)
    except OSError as error:
        reason = (error.strerror or str(error)).lower()
        raise click.ClickException(f"cannot listen on {bind}: {reason}") from None
