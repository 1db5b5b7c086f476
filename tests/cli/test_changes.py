"""``pathgate changes``: what it says of a folder of configs where the graph changes, and how it ends."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest
from click.testing import CliRunner, Result

from pathgate.cli.main import main
from pathgate.web.app import create_app
from pathgate.web.endpoints.changes import OPERATION
from pathgate.web.settings import Settings
from tests.cli.shelf import BIASED, GRAPH, MISNAMED, SOUND, UNANSWERABLE, write
from tests.values import Graph

FORMS = ("text", "json", "markdown")
STORMS: Graph = {
    "nodes": [*GRAPH["nodes"], {"id": "storms", "measured": False}],
    "edges": [*GRAPH["edges"], *({"source": "storms", "target": end} for end in ("late", "refund"))],
}
WITHOUT_WEATHER: Graph = {
    "nodes": [node for node in GRAPH["nodes"] if node["id"] != "weather"],
    "edges": [edge for edge in GRAPH["edges"] if edge["source"] != "weather"],
}


def pathgate(*words: str, **environment: str) -> Result:
    result = CliRunner().invoke(main, ["changes", *words], env=environment, prog_name="pathgate")
    assert result.exception is None or isinstance(result.exception, SystemExit)
    assert "fault of its own" not in result.stderr
    return result


@pytest.fixture
def here(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    write(tmp_path, "old.json", GRAPH)
    write(tmp_path, "new.json", STORMS)
    return tmp_path


@pytest.mark.parametrize("form", FORMS)
@pytest.mark.parametrize(
    ("new", "configs", "status"),
    [
        (GRAPH, [SOUND, BIASED, UNANSWERABLE], 0),
        (STORMS, [BIASED, UNANSWERABLE], 0),
        (STORMS, [BIASED, SOUND], 1),
        (STORMS, [SOUND, MISNAMED], 2),
        (GRAPH, [MISNAMED], 2),
        (WITHOUT_WEATHER, [SOUND], 2),
        (WITHOUT_WEATHER, [UNANSWERABLE | {"covariates": ["late"]}], 0),
    ],
)
def test_the_exit_status_tells_the_worst(here, form, new, configs, status):
    write(here, "other.json", new)
    result = pathgate("old.json", "other.json", write(here, "c.json", configs), "--format", form)
    assert result.exit_code == status, result.output


def test_the_json_is_the_answer_over_http(here):
    request = OPERATION.examples[0].request
    names = [write(here, f"{member}.json", request[member]) for member in ("graph", "other", "configs")]
    result = pathgate(*names, "--format", "json")
    answer = create_app(Settings()).test_client().post("/v1/changes", json={**request, "limit": 1000})
    document = json.loads(result.stdout)
    gate = document.pop("gate")
    assert document == answer.get_json()
    changes = [entry["change"] for entry in document["configs"]]
    counts = gate["counts"]
    assert (gate["exit_status"], counts["found"], counts["not_judged"]) == (1, len(changes), 0)
    for outcome in ("broken", "mended", "other-reason", "same"):
        assert counts[outcome.replace("-", "_")] == changes.count(outcome)
    assert [each["file"] for each in gate["configs"]] == [names[2]] * len(changes)


def test_all_forms_tell_the_same_sentences_and_counts(here):
    write(here, "c.json", [SOUND, BIASED, MISNAMED])
    told = {form: pathgate("old.json", "new.json", "c.json", "--format", form) for form in FORMS}
    sentence = "sound one: sound before, unanswerable after: the new unmeasured node storms (storms → late, "
    assert f"BROKEN  {sentence}" in told["text"].stdout
    assert f"- {sentence}" in told["markdown"].stdout
    assert json.loads(told["json"].stdout)["configs"][0]["summary"].startswith(sentence)
    counts = told["text"].stdout.splitlines()[-1]
    assert counts.startswith("3 configs found: 1 broken, 0 mended, 1 other-reason, 1 same; 1 not judged. ")
    assert told["json"].stderr == told["markdown"].stderr == counts + "\n"
    assert told["text"].stderr == ""


def test_markdown_is_a_table_and_a_list(here):
    write(here, "c.json", [SOUND | {"name": "a | b <i>"}, BIASED | {"covariates": ["ticket"]}])
    lines = pathgate("old.json", "new.json", "c.json", "--format", "markdown").stdout.splitlines()
    assert lines[0] == "## Pathgate: this change of graph breaks some config"
    rows = [line for line in lines if line.startswith("|")]
    assert rows[:2] == ["| Config | Before | After | Change | Where |", "|---|---|---|---|---|"]
    assert rows[2] == r"| a \| b \<i\> | sound | unanswerable | broken | c.json:1:2 |"
    assert len(rows) == 4
    assert "### New nodes" in lines
    assert "- storms → late" in lines


def test_promises_lost_and_gained_are_named(here):
    chain = {"nodes": ["weather", "late", "refund"], "edges": [{"source": "weather", "target": "late"}]}
    fork = {**chain, "edges": [{"source": "weather", "target": "refund"}]}
    names = [write(here, "chain.json", chain), write(here, "fork.json", fork)]
    config = write(here, "c.json", {**SOUND, "covariates": []})
    text = pathgate(*names, config).stdout
    assert "Independencies no longer promised:\n  weather and refund\n" in text
    assert "Independencies now promised:\n  weather and late\n" in text
    assert text.endswith("Independencies: 1 lost, 1 gained.\n")


def test_a_problem_is_shown_with_its_place_in_the_file(here):
    write(here, "c.yaml", "name: ours\ntreatment: late\noutcome: refund\ncovariates: [wether]\n")
    result = pathgate("old.json", "new.json", "c.yaml")
    assert result.exit_code == 2
    assert result.stdout.startswith("NOT JUDGED  ours: not judged before and after")
    assert "(at c.yaml:4:14)" in result.stdout


def test_a_file_that_cannot_be_read_is_one_entry(here):
    write(here, "bad.json", "{")
    write(here, "good.json", SOUND)
    result = pathgate("old.json", "new.json", "bad.json", "good.json", "missing.json", "--format", "json")
    bad, good, missing = json.loads(result.stdout)["configs"]
    assert result.exit_code == 2
    assert good["change"] == "broken"
    assert bad["problem"]["type"] == "/problems/not-json"
    assert "no such file" in missing["problem"]["detail"]


@pytest.mark.parametrize("form", FORMS)
@pytest.mark.parametrize("place", [0, 1])
@pytest.mark.parametrize(
    ("content", "words"),
    [
        ("{", "no JSON"),
        ({"nodes": ["a"], "edges": [{"source": "a", "target": "a"}]}, "joins"),
        ([1], "a graph is an object"),
    ],
)
def test_a_graph_of_no_use_is_never_a_pass(here, form, place, content, words):
    names = ["old.json", "new.json"]
    names[place] = write(here, "faulty.json", content)
    result = pathgate(*names, write(here, "c.json", SOUND), "--format", form)
    assert result.exit_code == 2
    assert words in result.stderr
    assert "faulty.json" in result.stderr
    if form == "json":
        assert words in json.loads(result.stdout)["detail"]


def test_a_cycle_in_the_new_graph_is_named_as_over_http(here):
    turned: Any = [{"source": s, "target": t} for s, t in (("late", "refund"), ("refund", "late"))]
    cyclic = write(here, "cyclic.json", {"nodes": ["late", "refund"], "edges": turned})
    result = pathgate("old.json", cyclic, write(here, "c.json", SOUND), "--format", "json")
    problem = json.loads(result.stdout)
    assert problem["type"] == "/problems/cycle"
    assert [each["pointer"] for each in problem["errors"]] == ["#/other/edges"]


def test_the_graphs_are_left_out_of_folders_and_no_config_is_no_pass(here):
    write(here, "c.json", SOUND)
    result = pathgate("old.json", "new.json", ".", "--format", "json")
    assert [entry["name"] for entry in json.loads(result.stdout)["configs"]] == ["sound one"]
    (here / "c.json").unlink()
    empty = pathgate("old.json", "new.json", ".")
    assert (empty.exit_code, empty.stdout.splitlines()[-1][:16]) == (2, "0 configs found:")


def test_a_dialect_is_taken_by_configs_that_name_none(here):
    filtered = {**SOUND, "row_filter": "`weather` > 3"}
    write(here, "c.json", filtered)
    plain = pathgate("old.json", "new.json", "c.json")
    spoken = pathgate("old.json", "new.json", "c.json", "--dialect", "mysql")
    assert (plain.exit_code, spoken.exit_code) == (2, 1)


def test_what_the_call_leaves_open_the_project_file_says(here):
    (here / "configs").mkdir()
    write(here / "configs", "c.json", {**SOUND, "row_filter": "`weather` > 3"})
    assert pathgate("old.json", "new.json").exit_code == 2
    assert pathgate("old.json", "new.json").stderr.startswith("pathgate: no CONFIG: ")
    write(here, "pathgate.toml", 'configs = "configs"\ndialect = "mysql"\n')
    assert pathgate("old.json", "new.json").exit_code == 1
    assert pathgate("old.json", "new.json", "configs").exit_code == 1
    assert pathgate("old.json", "new.json", "--dialect", "duckdb").exit_code == 2
    write(here, "pathgate.toml", "dialects = 3\n")
    refused = pathgate("old.json", "new.json", "configs")
    assert (refused.exit_code, refused.stdout) == (2, "")
    assert "no such setting" in refused.stderr


def test_names_cannot_steer_the_terminal(here):
    write(here, "c.json", SOUND | {"name": "up\x1b[31m\nlift"})
    result = pathgate("old.json", "new.json", "c.json")
    assert "up\\u001b[31m\\u000alift" in result.stdout
    assert "\x1b" not in result.stdout


def test_time_that_runs_out_is_said_and_never_ends_the_rest(here):
    names = [f"n{number}" for number in range(900)]
    edges = [{"source": a, "target": b} for a, b in zip(names, names[3:], strict=False)]
    write(here, "long.json", {"nodes": names, "edges": edges})
    write(here, "longer.json", {"nodes": names, "edges": [*edges, {"source": "n0", "target": "n1"}]})
    config = {"treatment": "n0", "outcome": "n3", "covariates": []}
    result = pathgate(
        "long.json",
        "longer.json",
        write(here, "c.json", config),
        "--format",
        "json",
        PATHGATE_TIME_BUDGET_SECONDS="0.05",
    )
    document = json.loads(result.stdout)
    assert document["complete"] is False
    assert document["configs"][0]["change"] == "same"
