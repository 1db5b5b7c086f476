"""The commands under deploy/ do what the README says, and fail in one clear line that says what to do."""

from __future__ import annotations

import os
import shutil
import signal
import socket
import subprocess
import sys
import urllib.request
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import pytest

pytestmark = pytest.mark.system

ROOT = Path(__file__).resolve().parents[2]
COMMANDS = ("bash", "basename", "cat", "dirname", "grep", "mkdir", "mktemp", "rm", "tail", "tr")


def run(command: Path, *words: str, cwd: Path, **environment: str) -> subprocess.CompletedProcess[str]:
    """Run a command of deploy/ from some other folder, with changes to the environment."""
    return subprocess.run(
        [command, *words],
        cwd=cwd,
        env={**os.environ, **environment},
        capture_output=True,
        text=True,
        check=False,
        timeout=300,
    )


def the_one_line(done: subprocess.CompletedProcess[str]) -> str:
    """What it said went wrong, having made sure that it failed and said nothing more."""
    assert done.returncode != 0
    lines = done.stderr.splitlines()
    assert len(lines) == 1, done.stderr
    return lines[0]


def script(path: Path, text: str) -> Path:
    path.write_text(f"#!/bin/sh\n{text}\n")
    path.chmod(0o755)
    return path


@pytest.fixture
def bare_path(tmp_path: Path) -> Path:
    """A folder to use as PATH: the shell's everyday commands, and no Python."""
    folder = tmp_path / "bin"
    folder.mkdir()
    for name in COMMANDS:
        found = shutil.which(name)
        assert found, name
        (folder / name).symlink_to(found)
    return folder


@pytest.fixture
def fresh_copy(tmp_path: Path) -> Path:
    """The scripts in a project folder of their own, where nothing was ever installed."""
    copy = tmp_path / "a fresh copy"
    copy.mkdir()
    shutil.copytree(ROOT / "deploy", copy / "deploy")
    shutil.copy(ROOT / "pyproject.toml", copy)
    return copy


@contextmanager
def a_port_in_use() -> Iterator[int]:
    with socket.create_server(("127.0.0.1", 0)) as server:
        yield server.getsockname()[1]


def a_free_port() -> int:
    with a_port_in_use() as port:
        return port


def test_a_busy_port_is_found_before_anything_is_started(fresh_copy: Path, tmp_path: Path):
    with a_port_in_use() as port:
        line = the_one_line(run(fresh_copy / "deploy" / "run", cwd=tmp_path, PORT=str(port)))
    assert f"port {port} is busy" in line
    assert "PORT=" in line
    assert not (fresh_copy / ".venv").exists()


@pytest.mark.parametrize("port", ["0", "65536", "http", "80 80"])
def test_a_port_that_is_none_is_refused(tmp_path: Path, port: str):
    line = the_one_line(run(ROOT / "deploy" / "run", cwd=tmp_path, PORT=port))
    assert f"PORT is '{port}'" in line


@pytest.mark.parametrize("command", ["run", "test", "bench", "lock"])
def test_an_old_python_on_the_path_is_named(tmp_path: Path, bare_path: Path, command: str):
    script(bare_path / "python3", "echo 3.10")
    line = the_one_line(run(ROOT / "deploy" / command, cwd=tmp_path, PATH=str(bare_path), PYTHON=""))
    assert "Python 3.11 or later is needed" in line
    assert "python3 is 3.10" in line
    assert "python3-venv" in line


def test_an_old_python_asked_for_by_name_is_not_replaced_by_another(tmp_path: Path):
    old = script(tmp_path / "old-python", "echo 3.10")
    line = the_one_line(run(ROOT / "deploy" / "run", cwd=tmp_path, PYTHON=str(old), PORT=str(a_free_port())))
    assert f"{old} is 3.10" in line


def test_a_python_that_is_not_there_is_named(tmp_path: Path):
    line = the_one_line(run(ROOT / "deploy" / "run", cwd=tmp_path, PYTHON="python-of-nowhere"))
    assert "PYTHON is 'python-of-nowhere'" in line


def test_a_python_without_venv_names_the_package_to_install(tmp_path: Path, bare_path: Path):
    script(bare_path / "python3", "echo 3 12 no")
    line = the_one_line(run(ROOT / "deploy" / "run", cwd=tmp_path, PATH=str(bare_path), PYTHON=""))
    assert "apt-get install -y python3.12-venv" in line


def test_a_first_run_without_network_says_so(fresh_copy: Path, tmp_path: Path):
    unreachable = {
        "PIP_CONFIG_FILE": os.devnull,
        "PIP_INDEX_URL": f"http://127.0.0.1:{a_free_port()}/simple",
        "PIP_FIND_LINKS": "",
        "PIP_NO_CACHE_DIR": "1",
        "PIP_RETRIES": "0",
        "PYTHON": sys.executable,
        "PORT": str(a_free_port()),
    }
    line = the_one_line(run(fresh_copy / "deploy" / "run", cwd=tmp_path, **unreachable))
    assert "no network" in line


def test_a_full_run_that_would_need_root_for_a_system_package_says_which(tmp_path: Path, bare_path: Path):
    script(bare_path / "python3", f'exec "{sys.executable}" "$@"')
    script(bare_path / "id", "echo 1000")
    line = the_one_line(run(ROOT / "deploy" / "test", "--full", cwd=tmp_path, PATH=str(bare_path), PYTHON=""))
    assert "apt-get install -y --no-install-recommends shellcheck chromium" in line


@contextmanager
def serving(**environment: str) -> Iterator[tuple[subprocess.Popen[str], list[str]]]:
    """``deploy/run``, and the lines it printed until it said that it serves, or ended."""
    process = subprocess.Popen(
        [ROOT / "deploy" / "run"],
        cwd="/",
        env={**os.environ, **environment},
        stdout=subprocess.PIPE,
        stderr=subprocess.STDOUT,
        text=True,
        start_new_session=True,
    )
    try:
        assert process.stdout
        lines: list[str] = []
        for line in process.stdout:
            lines.append(line)
            if line.startswith("Serving on"):
                break
        yield process, lines
    finally:
        if process.poll() is None:
            process.terminate()
        process.communicate(timeout=60)


@pytest.mark.parametrize("ended_by", [signal.SIGINT, signal.SIGTERM])
def test_run_reviews_the_demo_serves_and_ends_on_a_signal(ended_by: signal.Signals):
    port = a_free_port()
    with serving(PORT=str(port)) as (process, lines):
        said = "".join(lines)
        assert {"sound", "biased", "unanswerable"} <= set(said.split()), said
        assert f"http://127.0.0.1:{port}/docs" in said
        with urllib.request.urlopen(f"http://127.0.0.1:{port}/readyz") as answer:
            assert answer.status == 200
        # To the whole process group, as a terminal does.
        os.killpg(process.pid, ended_by)
        assert process.wait(timeout=40) == 0
    with socket.socket() as probe:
        assert probe.connect_ex(("127.0.0.1", port)) != 0


def test_a_service_that_cannot_start_is_an_error_that_shows_why():
    with serving(PORT=str(a_free_port()), PATHGATE_MAX_NODES="many") as (process, lines):
        assert process.wait(timeout=40) != 0
    assert "PATHGATE_MAX_NODES" in "".join(lines)
    assert lines[-1].startswith("deploy/run: the service ended by itself")
