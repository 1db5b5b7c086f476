"""How is the service run: under which server, with how many workers and threads, and how does it stop?

gunicorn in this process, configured by the arguments alone (no file of its own, no environment variable), so
that a plain installation, the scripts and the image all run the same thing. Workers share nothing but the
port; each answers a few requests at a time in threads.
"""

from __future__ import annotations

import os
import socket
import struct
from pathlib import Path
from typing import TYPE_CHECKING, Any

from gunicorn.app.base import BaseApplication  # type: ignore[import-untyped]
from gunicorn.config import KNOWN_SETTINGS  # type: ignore[import-untyped]

from pathgate.web.settings import Settings

if TYPE_CHECKING:
    from flask import Flask

SHARED_MEMORY = Path("/dev/shm")  # noqa: S108 - gunicorn makes a file with a random name there

# How long a thread waits for the next bytes of a client, and for a client to take the next ones of an answer.
WAITING_SECONDS = 20


def gunicorn_options(
    bind: str, workers: int, *, threads: int = 4, access_log: bool = False
) -> dict[str, Any]:
    """The settings gunicorn is run with, by their names there.

    Args:
        bind: ``HOST:PORT``.
        workers: how many processes.
        threads: how many requests each process answers at a time.
        access_log: whether a line per request goes to standard output.

    >>> gunicorn_options("127.0.0.1:8080", 2)["graceful_timeout"]
    30
    """
    options: dict[str, Any] = {
        "bind": bind,
        "workers": workers,
        "worker_class": "gthread",
        "threads": threads,
        # Loaded once, before the workers are forked: they share its memory, and a service that cannot
        # start ends with an error instead of restarting its workers for ever.
        "preload_app": True,
        # Longer than the slowest request may take, so that a stop cuts off none.
        "graceful_timeout": 30,
        "keepalive": 5,
        "accesslog": "-" if access_log else None,
        # No header changes what a request is: the service makes no address and no scheme out of one.
        "forwarded_allow_ips": "",
        "forwarder_headers": "",
        "secure_scheme_headers": {},
        "proc_name": "pathgate",
        "when_ready": _limit_waiting,
    }
    if SHARED_MEMORY.is_dir() and os.access(SHARED_MEMORY, os.W_OK):
        # A worker's sign of life is a file; on a disk it could stall, on a read-only root it could not be.
        options["worker_tmp_dir"] = str(SHARED_MEMORY)
    if "control_socket_disable" in {setting.name for setting in KNOWN_SETTINGS}:
        # Newer releases open a socket in the home folder for their own command, which nothing here uses.
        options["control_socket_disable"] = True
    return options


def _limit_waiting(server: Any) -> None:
    """Have no thread wait for ever: a few clients that stall would stop the service.

    gunicorn has no setting for it. Connections inherit these options from the sockets they are accepted on.
    """
    waiting = struct.pack("@ll", WAITING_SECONDS, 0)
    for listener in server.LISTENERS:
        for option in (socket.SO_RCVTIMEO, socket.SO_SNDTIMEO):
            listener.sock.setsockopt(socket.SOL_SOCKET, option, waiting)


def serve(bind: str, workers: int) -> None:
    """Serve until a signal ends it: TERM finishes the requests under way, INT and QUIT do not.

    Ends the process (``SystemExit``): with status 0 after a signal, else with another one.

    Raises:
        InvalidSettings: the environment asks for settings that cannot be used; nothing was started.
    """
    settings = Settings.from_environment(os.environ)
    _Server(gunicorn_options(bind, workers), settings).run()


class _Server(BaseApplication):  # type: ignore[misc]
    def __init__(self, options: dict[str, Any], settings: Settings) -> None:
        self._options = options
        self._settings = settings
        super().__init__()

    def load_config(self) -> None:
        for name, value in self._options.items():
            self.cfg.set(name, value)

    def load(self) -> Flask:
        # Imported here, since whoever only asks for the options or for help needs no application.
        from pathgate.web.app import create_app  # noqa: PLC0415 - as said above
        from pathgate.web.memory import keep_heap_compact, set_apart_what_stays  # noqa: PLC0415 - as said above

        keep_heap_compact()
        app = create_app(self._settings)
        set_apart_what_stays()
        return app
