"""What the README shows of the client is run as it stands, against a service elsewhere; so are its commands."""

from __future__ import annotations

import re
import shlex
from pathlib import Path

from click.testing import CliRunner

from pathgate.cli.main import main
from tests.client.loopback import nobody_at

README = (Path(__file__).parents[2] / "README.md").read_text("utf-8")
SECTION = README.partition("## A service as the gate\n")[2].partition("**Caution.**")[0]
SHOWN_URL = "http://127.0.0.1:8080"


def block(language: str) -> str:
    found = re.findall(rf"```{language}\n(.*?)```", SECTION, re.DOTALL)
    assert len(found) == 1
    assert SHOWN_URL in found[0]
    return str(found[0])


def test_the_program_prints_what_it_says(service_url, capsys):
    program = block("python")
    said = re.findall(r"# (stop: \w+)$", program, re.MULTILINE)
    exec(program.replace(SHOWN_URL, service_url), {})  # noqa: S102 - our own
    assert capsys.readouterr().out.splitlines() == said


def test_the_program_stops_where_nobody_answers(capsys):
    program = block("python").replace("timeout=30", "timeout=0.2")
    exec(program.replace(SHOWN_URL, nobody_at()), {})  # noqa: S102 - our own
    assert capsys.readouterr().out.startswith("stop, nothing is known: ")


def test_the_commands_end_well(service_url, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    assert CliRunner().invoke(main, ["new", "."]).exit_code == 0
    for line in block("sh").splitlines():
        program, *words = shlex.split(line.replace(SHOWN_URL, service_url), comments=True)
        assert program == "pathgate"
        result = CliRunner().invoke(main, words)
        assert (result.exit_code, result.stderr) == (0, "")
