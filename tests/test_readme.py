"""What the README promises is run: its request, its code, its tables."""

import json
import re
from pathlib import Path

import pytest

from pathgate.demo import demo_configs, demo_graph
from pathgate.web.app import create_app
from pathgate.web.endpoints import OPERATIONS
from pathgate.web.settings import Settings, settings_table

ROOT = Path(__file__).parents[1]


@pytest.fixture(scope="module")
def readme():
    return (ROOT / "README.md").read_text(encoding="utf-8")


def blocks(readme, language):
    found = re.findall(r"^```(\w*)\n(.*?)^```$", readme, flags=re.MULTILINE | re.DOTALL)
    return [text for named, text in found if named == language]


def test_the_curl_call_answers_as_shown(readme):
    call = next(block for block in blocks(readme, "sh") if block.startswith("curl"))
    body = re.search(r"-d '(.*)'", call, flags=re.DOTALL)[1]
    path = re.search(r"http://127\.0\.0\.1:8080(\S+)", call)[1]
    answer = create_app(Settings()).test_client().post(path, data=body, content_type="application/json")
    shown = json.loads(blocks(readme, "json")[0])
    assert answer.status_code == 200
    assert {member: answer.get_json()[member] for member in shown} == shown


def test_the_python_code_prints_what_it_says(readme, capsys):
    code = blocks(readme, "python")[0]
    exec(compile(code, "README.md", "exec"), {})  # noqa: S102 - our own page
    assert capsys.readouterr().out.strip() == code.rsplit("# ", 1)[1].strip()


def test_the_settings_are_those_in_the_code(readme):
    assert settings_table().strip() in readme


def test_every_operation_is_in_the_table(readme):
    for operation in OPERATIONS:
        assert f"| `{operation.path}` |" in readme


def test_the_verdicts_shown_are_those_of_the_demo(readme):
    table = blocks(readme, "")[0]
    client = create_app(Settings()).test_client()
    for config in demo_configs():
        answer = client.post("/v1/review", json={"graph": demo_graph(), "config": config}).get_json()
        line = next(line for line in table.splitlines() if line.split()[:1] == [config["name"]])
        assert line.split()[1] == answer["verdict"]
        errors = [finding["rule"] for finding in answer["findings"] if finding["severity"] == "error"]
        assert line.split()[2] == (errors[0] if errors else "nothing")


def test_the_caution_is_shown(readme):
    assert "it does not show that the graph is right" in readme


def test_developers_fits_two_pages():
    words = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8").split()
    assert len(words) < 1000
