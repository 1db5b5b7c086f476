"""A real service on a port of its own, for the tests that ask one over HTTP."""

from __future__ import annotations

import signal
import socket
import subprocess
import time
import urllib.request
from collections.abc import Iterator
from contextlib import contextmanager

from tests.cli.shelf import COMMAND, ENVIRONMENT

READY_WITHIN_SECONDS = 60


@contextmanager
def served() -> Iterator[str]:
    """The address of a service that is ready; it is ended by TERM, and must end cleanly."""
    with socket.create_server(("127.0.0.1", 0)) as server:
        bind = f"127.0.0.1:{server.getsockname()[1]}"
    words = [*COMMAND, "serve", "--bind", bind, "--workers", "1"]
    with subprocess.Popen(words, env=ENVIRONMENT, stderr=subprocess.DEVNULL) as process:
        try:
            _wait_until_ready(f"http://{bind}", process)
            yield f"http://{bind}"
        finally:
            process.send_signal(signal.SIGTERM)
            status = process.wait(timeout=60)
        assert status == 0


def _wait_until_ready(url: str, process: subprocess.Popen[bytes]) -> None:
    give_up = time.monotonic() + READY_WITHIN_SECONDS
    while True:
        assert process.poll() is None, "the service ended by itself"
        assert time.monotonic() < give_up, "the service did not become ready"
        try:
            with urllib.request.urlopen(f"{url}/readyz", timeout=5):  # noqa: S310 - our own
                return
        except OSError:
            # Nothing to wait on but the port itself.
            time.sleep(0.1)
