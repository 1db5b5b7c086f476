"""A gate against a real service: the same bytes as in process, and no pass once the service is gone."""

from __future__ import annotations

import json
import subprocess
from pathlib import Path

import pytest

from tests.cli.shelf import BIASED, COMMAND, ENVIRONMENT, GRAPH, MISNAMED, SOUND, UNANSWERABLE, write
from tests.served import served

pytestmark = pytest.mark.system

FORMS = ("text", "json", "sarif", "junit", "markdown")


def pathgate(folder: Path, *words: str) -> subprocess.CompletedProcess[bytes]:
    return subprocess.run(
        [*COMMAND, *words], cwd=folder, env=ENVIRONMENT, capture_output=True, check=False, timeout=120
    )


def test_a_gate_over_http_is_the_gate_in_process_until_the_service_is_gone(tmp_path):
    write(tmp_path, "graph.json", GRAPH)
    many = [{**SOUND, "name": f"number {number}", "meta": number / 3} for number in range(120)]
    write(tmp_path, "all.json", [SOUND, BIASED, UNANSWERABLE, MISNAMED, *many])
    words = ["review", "graph.json", "all.json"]
    with served() as url:
        for form in FORMS:
            alone = pathgate(tmp_path, *words, "--format", form)
            asked = pathgate(tmp_path, *words, "--format", form, "--url", url)
            assert (asked.returncode, asked.stdout, asked.stderr) == (2, alone.stdout, alone.stderr)
        doctor = pathgate(tmp_path, "doctor", url, "--format", "json")
        assert doctor.returncode == 0, doctor.stdout
        assert {step["outcome"] for step in json.loads(doctor.stdout)["steps"]} == {"ok"}
    gone = pathgate(tmp_path, *words, "--url", url, "--timeout", "5")
    assert gone.returncode == 2
    assert b"124 not judged (124 skipped)" in gone.stderr + gone.stdout
    let_pass = pathgate(tmp_path, *words, "--url", url, "--timeout", "5", "--if-unreachable", "pass")
    assert let_pass.returncode == 0
    assert b"124 not judged (124 let pass)" in let_pass.stdout
    assert pathgate(tmp_path, "doctor", url).returncode == 2
