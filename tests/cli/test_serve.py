"""``pathgate serve`` and the demo, as ``deploy/run`` uses them: a real server, asked over HTTP, ended by TERM."""

from __future__ import annotations

import signal
import socket
import subprocess
import sys
import time
import urllib.request

import pytest

from tests.cli.shelf import COMMAND, ENVIRONMENT

pytestmark = pytest.mark.system


def wait_until_ready(url: str, process: subprocess.Popen[bytes]) -> None:
    give_up = time.monotonic() + 30
    while True:
        assert process.poll() is None, "the service ended by itself"
        assert time.monotonic() < give_up, "the service did not become ready"
        try:
            with urllib.request.urlopen(f"{url}/readyz", timeout=5):  # noqa: S310 - our own
                return
        except OSError:
            time.sleep(0.1)


def test_a_served_demo_is_reviewed_and_the_service_ends_cleanly():
    with socket.create_server(("127.0.0.1", 0)) as server:
        bind = f"127.0.0.1:{server.getsockname()[1]}"
    words = [*COMMAND, "serve", "--bind", bind, "--workers", "1"]
    with subprocess.Popen(words, env=ENVIRONMENT, stderr=subprocess.DEVNULL) as process:
        try:
            wait_until_ready(f"http://{bind}", process)
            demo = [sys.executable, "-m", "pathgate.demo", "--url", f"http://{bind}"]
            done = subprocess.run(
                demo, env=ENVIRONMENT, capture_output=True, text=True, check=False, timeout=60
            )
        finally:
            process.send_signal(signal.SIGTERM)
        assert process.wait(timeout=60) == 0
    assert (done.returncode, done.stderr) == (0, "")
    verdicts = [line.split()[1] for line in done.stdout.splitlines() if len(line.split()) > 3]
    assert {"sound", "biased", "unanswerable"} <= set(verdicts)
