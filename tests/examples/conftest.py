"""A real service on a port of its own, and the command on the path, as the recipes expect them."""

from __future__ import annotations

import os
import shlex
import signal
import socket
import subprocess
import sys
import time
import urllib.request
from collections.abc import Iterator
from pathlib import Path

import pytest

from tests.cli.shelf import COMMAND, ENVIRONMENT

EXAMPLES = Path(__file__).resolve().parents[2] / "deploy" / "examples"


@pytest.fixture(scope="session")
def service_url() -> Iterator[str]:
    """A service that is ready."""
    with socket.create_server(("127.0.0.1", 0)) as server:
        bind = f"127.0.0.1:{server.getsockname()[1]}"
    words = [*COMMAND, "serve", "--bind", bind, "--workers", "1"]
    with subprocess.Popen(words, env=ENVIRONMENT, stderr=subprocess.DEVNULL) as process:
        try:
            _wait_until_ready(f"http://{bind}", process)
            yield f"http://{bind}"
        finally:
            process.send_signal(signal.SIGTERM)
        assert process.wait(timeout=60) == 0


def _wait_until_ready(url: str, process: subprocess.Popen[bytes]) -> None:
    give_up = time.monotonic() + 60
    while True:
        assert process.poll() is None, "the service ended by itself"
        assert time.monotonic() < give_up, "the service did not become ready"
        try:
            with urllib.request.urlopen(f"{url}/readyz", timeout=5):  # noqa: S310 - our own
                return
        except OSError:
            time.sleep(0.1)


@pytest.fixture(scope="session")
def environment(tmp_path_factory: pytest.TempPathFactory) -> dict[str, str]:
    """An environment in whose path ``pathgate`` is this source tree's, and git asks nobody for settings."""
    folder = tmp_path_factory.mktemp("bin")
    # The console command, whether or not its script is on the path.
    command = folder / "pathgate"
    command.write_text(f'#!/bin/sh\nexec {shlex.join(COMMAND)} "$@"\n')
    command.chmod(0o755)
    path = os.pathsep.join([str(folder), str(Path(sys.executable).parent), os.environ["PATH"]])
    return {**ENVIRONMENT, "PATH": path, "GIT_CONFIG_GLOBAL": os.devnull, "GIT_CONFIG_SYSTEM": os.devnull}
