"""The bar of a long run: where a person watches, on standard error, and gone at the end."""

from __future__ import annotations

import os
import pty
import subprocess
import sys

import pytest

from tests.cli.shelf import ENVIRONMENT

pytestmark = pytest.mark.slow

PROGRAM = """
import sys
from pathgate.cli.progress import progress_bar
with progress_bar(patience=float(sys.argv[1])) as tell:
    for done in range(3):
        tell(done, 3)
print("rich" in sys.modules)
"""


def run(patience: float, ours: int, theirs: int) -> tuple[str, str]:
    """What stood on standard output, and what on standard error, whose other end is ``ours``."""
    done = subprocess.run(
        [sys.executable, "-c", PROGRAM, str(patience)],
        env={**ENVIRONMENT, "TERM": "xterm"},
        stdout=subprocess.PIPE,
        stderr=theirs,
        text=True,
        check=True,
    )
    os.set_blocking(ours, False)
    try:
        said = os.read(ours, 100_000).decode()
    except BlockingIOError:
        said = ""
    os.close(ours)
    os.close(theirs)
    return done.stdout, said


def test_a_long_run_before_a_person_has_one_and_takes_it_away():
    said, drawn = run(0, *pty.openpty())
    assert said == "True\n"
    assert "/3" in drawn
    # Its line is wiped, and the cursor shown again.
    assert drawn.rstrip().endswith("\x1b[2K")
    assert "\x1b[?25h" in drawn


def test_a_short_run_has_none_and_does_without_the_library():
    assert run(3600, *pty.openpty()) == ("False\n", "")


def test_a_pipe_has_none():
    assert run(0, *os.pipe()) == ("False\n", "")
