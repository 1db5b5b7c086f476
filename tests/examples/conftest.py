"""A real service on a port of its own, and the command on the path, as the recipes expect them."""

from __future__ import annotations

import os
import shlex
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

from tests.cli.shelf import COMMAND, ENVIRONMENT
from tests.served import served

EXAMPLES = Path(__file__).resolve().parents[2] / "deploy" / "examples"


@pytest.fixture(scope="session")
def service_url() -> Iterator[str]:
    """A service that is ready."""
    with served() as url:
        yield url


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
