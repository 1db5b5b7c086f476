"""``pathgate new``, ``check`` and ``explain``: from an empty folder to an intended fault that is found."""

from __future__ import annotations

import json
from dataclasses import fields
from pathlib import Path

import pytest
from click.testing import CliRunner, Result

from pathgate.cli.explaining import broken_at, rule_text
from pathgate.cli.main import main
from pathgate.review.rules import RULES
from pathgate.web.app import create_app
from pathgate.web.settings import Settings
from tests.cli.shelf import GRAPH, write


def pathgate(*words: str) -> Result:
    result = CliRunner().invoke(main, words, prog_name="pathgate")
    assert result.exception is None or isinstance(result.exception, SystemExit)
    assert "fault of its own" not in result.stderr
    return result


@pytest.fixture
def here(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    return tmp_path


def test_the_first_review_of_the_starter_works_and_an_intended_fault_is_found(here):
    written = pathgate("new", "refunds")
    assert written.exit_code == 0
    assert written.stdout.splitlines()[-1] == "Next: cd refunds && pathgate review"
    assert pathgate("check", "refunds/graph.yaml").exit_code == 0
    project = ["review", "--project", "refunds/pathgate.toml"]
    first = pathgate(*project)
    assert (first.exit_code, first.stdout.splitlines()[0]) == (0, "SOUND  late-delivery-refunds")
    config = here / "refunds/configs/late-delivery-refunds.yaml"
    text = config.read_text("utf-8")
    config.write_text(text.replace("'harbour')\n", "'harbour')\n  AND ticket_opened = TRUE\n"), "utf-8")
    line = 1 + config.read_text("utf-8").splitlines().index("  AND ticket_opened = TRUE")
    faulty = pathgate(*project)
    assert faulty.exit_code == 1
    assert f"error filter-on-collider at refunds/configs/{config.name}:{line}:7: " in faulty.stdout


def test_in_the_folder_of_the_starter_plain_review_does_it(here, monkeypatch):
    assert pathgate("new").stdout.splitlines()[-1] == "Next: pathgate review"
    assert pathgate("review").exit_code == 0
    monkeypatch.chdir(here / "configs")
    below = pathgate("review")
    assert below.exit_code == 0
    assert "1 config found, 1 reviewed: 1 sound" in below.stdout


def test_the_starter_overwrites_nothing_and_then_writes_nothing(here):
    (here / "graph.yaml").write_text("ours", "utf-8")
    refused = pathgate("new")
    assert (refused.exit_code, refused.stdout) == (2, "")
    assert refused.stderr == "pathgate: already there, and nothing was written: graph.yaml\n"
    assert [path.name for path in here.iterdir()] == ["graph.yaml"]
    assert (here / "graph.yaml").read_text("utf-8") == "ours"


def test_the_schemas_for_editors_are_those_of_the_service_and_found_by_the_comments(here):
    pathgate("new")
    client = create_app(Settings()).test_client()
    for name in ("graph", "config"):
        written = json.loads((here / f"schemas/{name}.json").read_text("utf-8"))
        assert written == json.loads(client.get(f"/schemas/{name}").data)
    for file in (here / "graph.yaml", *(here / "configs").iterdir()):
        comment, schema = file.read_text("utf-8").splitlines()[0].split("$schema=")
        assert comment == "# yaml-language-server: "
        assert (file.parent / schema).is_file()


FAULTY = """\
nodes: [late, refund]
edges:
  - {source: late, target: refund}
  - {source: refund, target: late}
  - {source: late, target: refnd}
"""


def test_a_graph_without_a_fault_passes(here):
    checked = pathgate("check", write(here, "g.json", GRAPH))
    assert (checked.exit_code, len(checked.stdout.splitlines())) == (0, 1)
    assert checked.stdout.endswith("5 nodes (4 measured), 6 edges (0 bidirected); 0 findings.\n")


def test_each_finding_of_a_graph_is_a_line_with_its_place(here):
    write(here, "g.yaml", "# ours\n" + FAULTY)
    checked = pathgate("check", "g.yaml")
    assert checked.exit_code == 1
    *findings, counts = checked.stdout.splitlines()
    assert [line.split(": ")[:2] for line in findings] == [
        ["g.yaml:6:28", "error undeclared-node"],
        ["g.yaml:4:3", "error cycle"],
    ]
    assert counts == "g.yaml: 2 nodes (2 measured), 3 edges (0 bidirected); 2 findings."


def test_the_json_of_a_check_is_the_answer_over_http(here):
    write(here, "g.yaml", FAULTY)
    edges = [("late", "refund"), ("refund", "late"), ("late", "refnd")]
    value = {"nodes": ["late", "refund"], "edges": [{"source": s, "target": t} for s, t in edges]}
    answer = create_app(Settings()).test_client().post("/v1/graph-check", json={"graph": value})
    checked = pathgate("check", "g.yaml", "--format", "json")
    assert (checked.exit_code, json.loads(checked.stdout)) == (1, answer.get_json())
    assert checked.stderr == "g.yaml: 2 nodes (2 measured), 3 edges (0 bidirected); 2 findings.\n"


@pytest.mark.parametrize(
    ("content", "words"), [("{", "no JSON"), ("[]", "#/graph"), ({"nodes": [3]}, "#/graph")]
)
@pytest.mark.parametrize("form", ["text", "json"])
def test_what_is_no_graph_is_no_pass(here, content, words, form):
    checked = pathgate("check", write(here, "g.json", content), "--format", form)
    assert checked.exit_code == 2
    assert words in checked.stderr
    assert checked.stdout == "" or json.loads(checked.stdout)["status"] in (400, 422)


@pytest.mark.parametrize("name", RULES)
def test_every_rule_is_explained_with_all_that_is_known_of_it(name):
    explained = pathgate("explain", name)
    assert explained.exit_code == 0
    rule = RULES[name]
    assert explained.stdout.startswith(f"{name} ({rule.severity})\n")
    for each in fields(rule):
        said = getattr(rule, each.name)
        for text in [said] if isinstance(said, str) else said if isinstance(said, tuple) else []:
            assert text.strip() in explained.stdout


@pytest.mark.parametrize("name", RULES)
def test_on_a_terminal_its_lines_are_broken_and_no_word_is_lost(name):
    text = rule_text(name)
    broken = broken_at(text, 60)
    assert max(map(len, broken.splitlines())) <= 60
    assert broken.split() == text.split()
    assert broken.count("\n\n") == text.count("\n\n")


def test_a_misspelt_rule_is_refused_with_the_nearest():
    refused = pathgate("explain", "filter-on-colider")
    assert (refused.exit_code, refused.stdout) == (2, "")
    assert '(did you mean "filter-on-collider"' in refused.stderr
    assert len(refused.stderr.splitlines()) == 1


def test_without_a_name_every_rule_is_listed():
    assert [line.split()[1] for line in pathgate("explain").stdout.splitlines()] == list(RULES)


def test_the_rule_of_what_could_not_be_judged_is_explained_too():
    assert "could not be judged" in pathgate("explain", "config-not-judged").stdout
