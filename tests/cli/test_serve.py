"""``pathgate serve`` and the demo, as ``deploy/run`` uses them: a real server, asked over HTTP, ended by TERM."""

from __future__ import annotations

import subprocess
import sys

import pytest

from tests.cli.shelf import ENVIRONMENT
from tests.served import served

pytestmark = pytest.mark.system


def test_a_served_demo_is_reviewed_and_the_service_ends_cleanly():
    with served() as url:
        demo = [sys.executable, "-m", "pathgate.demo", "--url", url]
        done = subprocess.run(demo, env=ENVIRONMENT, capture_output=True, text=True, check=False, timeout=60)
    assert (done.returncode, done.stderr) == (0, "")
    verdicts = [line.split()[1] for line in done.stdout.splitlines() if len(line.split()) > 3]
    assert {"sound", "biased", "unanswerable"} <= set(verdicts)
