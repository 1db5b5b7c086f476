"""The commands that the README shows are run as they stand there, one after the other, from an empty folder."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

from tests.cli.shelf import ENVIRONMENT

README = Path(__file__).parents[2] / "README.md"

pytestmark = pytest.mark.slow


def test_the_commands_of_the_readme_do_what_they_say(tmp_path):
    text = README.read_text("utf-8")
    start = text.index("```sh\npathgate new") + len("```sh\n")
    block = text[start : text.index("```", start)]
    # The console command, whether or not its script is on the path.
    program = "from pathgate.cli.main import main; main(prog_name='pathgate')"
    script = f'set -e\npathgate() {{ "{sys.executable}" -c "{program}" "$@"; }}\n{block}'
    done = subprocess.run(
        ["bash", "-c", script], cwd=tmp_path, env=ENVIRONMENT, capture_output=True, text=True, check=False
    )
    assert (done.returncode, done.stderr) == (0, "")
    assert len(block.splitlines()) == 10
    made = {str(path.relative_to(tmp_path / "refunds")) for path in (tmp_path / "refunds").rglob("*")}
    assert {
        "build/pathgate.sarif",
        "build/pathgate.xml",
        "known.json",
        "configs/late-delivery-refunds.yaml",
    } <= made
    assert done.stdout.count("1 config found, 1 reviewed: 1 sound") == 5
