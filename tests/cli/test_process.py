"""The command as a process: what it imports, and how it ends when something outside gets in its way."""

from __future__ import annotations

import json
import os
import signal
import socket
import subprocess
import sys
import tomllib
from pathlib import Path

import pytest
from click.testing import CliRunner

from pathgate.cli.main import main
from pathgate.version import VERSION
from tests.cli.shelf import BIASED, COMMAND, ENVIRONMENT, GRAPH, SOUND, write

# Every test starts processes: not for a quick look.
pytestmark = pytest.mark.slow

ROOT = Path(__file__).resolve().parents[2]
HEAVY = [
    "numpy",
    "scipy",
    "flask",
    "werkzeug",
    "gunicorn",
    "msgspec",
    "networkx",
    "rich",
    "ruamel",
    "jsonschema_rs",
    "sqlglot",
    "rapidfuzz",
    "pandas",
    "xml",
]
COMMANDS = ["review", "changes", "check", "doctor", "explain", "new", "schema", "serve"]


def run(*words: str, **environment: str) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [*COMMAND, *words],
        env={**ENVIRONMENT, **environment},
        capture_output=True,
        text=True,
        check=False,
        timeout=60,
    )


@pytest.mark.parametrize("words", [["--help"], ["--version"], *([name, "--help"] for name in COMMANDS)])
def test_help_is_answered_without_the_weight_of_the_checks(words):
    program = (
        "import sys\nfrom pathgate.cli.main import main\n"
        f"main({words!r}, standalone_mode=False)\n"
        f"print([name for name in {HEAVY!r} if name in sys.modules], file=sys.stderr)"
    )
    done = subprocess.run([sys.executable, "-c", program], capture_output=True, text=True, check=True)
    assert done.stdout
    assert done.stderr == "[]\n"


def test_a_small_review_loads_nothing_that_only_others_need(tmp_path):
    needless = [
        "flask",
        "werkzeug",
        "gunicorn",
        "networkx",
        "pandas",
        "formulaic",
        "scipy",
        "sqlglot",
        "rich",
        "xml",
    ]
    words = ["review", write(tmp_path, "g.json", GRAPH), write(tmp_path, "c.json", SOUND)]
    program = (
        "import sys\nfrom pathgate.cli.main import main\n"
        f"main({words!r}, standalone_mode=False)\n"
        f"print([name for name in {needless!r} if name in sys.modules], file=sys.stderr)"
    )
    done = subprocess.run([sys.executable, "-c", program], capture_output=True, text=True, check=True)
    assert done.stdout.startswith("SOUND")
    assert done.stderr == "[]\n"


def test_every_command_is_in_the_help():
    listed = CliRunner().invoke(main, ["--help"]).output.split("Commands:")[1]
    assert sorted(line.split()[0] for line in listed.strip().splitlines()) == sorted(COMMANDS)


def test_the_version_is_that_of_the_package():
    result = CliRunner().invoke(main, ["--version"])
    assert (result.exit_code, result.output) == (0, f"pathgate {VERSION}\n")


def test_the_console_command_is_this_one():
    declared = tomllib.loads((ROOT / "pyproject.toml").read_text("utf-8"))["project"]["scripts"]
    assert declared == {"pathgate": "pathgate.cli.main:main"}


def test_without_words_the_help_is_shown_and_the_status_says_that_nothing_was_done():
    done = run()
    assert done.returncode == 2
    assert "Commands:" in done.stdout + done.stderr


def test_an_unknown_command_is_one_line():
    done = run("revew")
    assert (done.returncode, done.stdout) == (2, "")
    assert len(done.stderr.splitlines()) == 1
    assert "'review'" in done.stderr


def test_a_pipe_gets_plain_text_in_utf_8_and_the_status(tmp_path):
    done = run("review", write(tmp_path, "g.json", GRAPH), write(tmp_path, "c.json", BIASED))
    assert done.returncode == 1
    assert "\x1b" not in done.stdout
    assert "late → [ticket] ← (habit) → refund" in done.stdout
    assert done.stderr == ""


def test_a_terminal_without_arrows_gets_their_numbers(tmp_path):
    words = ["review", write(tmp_path, "g.json", GRAPH), write(tmp_path, "c.json", BIASED)]
    done = run(*words, PYTHONIOENCODING="ascii")
    assert done.returncode == 1
    assert "late \\u2192 [ticket] \\u2190 (habit) \\u2192 refund" in done.stdout
    as_json = run(*words, "--format", "json", PYTHONIOENCODING="ascii")
    assert "→" in json.loads(as_json.stdout)["reviews"][0]["review"]["findings"][0]["message"]


@pytest.mark.parametrize(("config", "status"), [(SOUND, 0), (BIASED, 1)])
@pytest.mark.parametrize("form", ["text", "json"])
def test_a_reader_that_goes_away_changes_nothing_about_the_status(tmp_path, config, status, form):
    # More than a pipe holds, so that writing must fail.
    many = write(tmp_path, "c.json", [config] * 1000)
    words = ["review", write(tmp_path, "g.json", GRAPH), many, "--format", form]
    with subprocess.Popen(
        [*COMMAND, *words], env=ENVIRONMENT, stdout=subprocess.PIPE, stderr=subprocess.PIPE
    ) as process:
        process.stdout.close()
        said = process.stderr.read().decode()
        assert process.wait(timeout=60) == status
    assert "pathgate:" not in said
    assert len(said.splitlines()) == (1 if form == "json" else 0)


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="no /dev/full here")
def test_a_full_disk_is_one_line_and_no_verdict(tmp_path):
    words = ["review", write(tmp_path, "g.json", GRAPH), write(tmp_path, "c.json", SOUND)]
    with Path("/dev/full").open("wb") as full:
        done = subprocess.run(
            [*COMMAND, *words], env=ENVIRONMENT, stdout=full, stderr=subprocess.PIPE, text=True, check=False
        )
    assert done.returncode == 2
    assert done.stderr == "pathgate: [Errno 28] No space left on device\n"


def test_ctrl_c_ends_with_130_and_no_traceback(tmp_path):
    fifo = tmp_path / "graph.json"
    os.mkfifo(fifo)
    words = ["review", str(fifo), write(tmp_path, "c.json", SOUND)]
    with subprocess.Popen([*COMMAND, *words], env=ENVIRONMENT, stderr=subprocess.PIPE) as process:
        # Opens only when the command has begun to read its graph, which then never comes.
        with fifo.open("wb"):
            process.send_signal(signal.SIGINT)
            assert process.wait(timeout=60) == 130
        assert process.stderr.read().strip() == b""


@pytest.mark.parametrize(
    ("bind", "words"),
    [
        ("8080", "HOST:PORT"),
        ("127.0.0.1:", "HOST:PORT"),
        (":8080", "HOST:PORT"),
        ("127.0.0.1:99999", "HOST:PORT"),
        ("127.0.0.1:http", "HOST:PORT"),
        ("nowhere.invalid:8080", "cannot listen on nowhere.invalid:8080"),
    ],
)
def test_an_address_that_cannot_be_listened_on_is_one_line(bind, words):
    result = CliRunner().invoke(main, ["serve", "--bind", bind])
    assert result.exit_code == 2
    assert words in result.stderr
    assert len(result.stderr.splitlines()) == 1


def test_a_busy_port_is_one_line():
    with socket.create_server(("127.0.0.1", 0)) as server:
        bind = f"127.0.0.1:{server.getsockname()[1]}"
        result = CliRunner().invoke(main, ["serve", "--bind", bind])
    assert result.exit_code == 2
    assert result.stderr == f"pathgate: cannot listen on {bind}: address already in use\n"


@pytest.mark.parametrize("workers", ["0", "-1", "two"])
def test_a_number_of_workers_that_is_none_is_one_line(workers):
    result = CliRunner().invoke(main, ["serve", "--workers", workers])
    assert result.exit_code == 2
    assert len(result.stderr.splitlines()) == 1


def test_settings_that_cannot_be_used_keep_the_service_from_starting():
    result = CliRunner().invoke(main, ["serve", "--bind", "127.0.0.1:0"], env={"PATHGATE_MAX_NODES": "0"})
    assert result.exit_code == 2
    assert "PATHGATE_MAX_NODES" in result.stderr
    assert len(result.stderr.splitlines()) == 1
