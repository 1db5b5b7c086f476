"""The baseline: what was known does not fail, what is new does, and nothing gets into it unasked."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest
from click.testing import CliRunner, Result

from pathgate.cli.main import main
from tests.cli.shelf import BIASED, GRAPH, MISNAMED, SOUND, UNANSWERABLE, write

TICKET = {
    "rule": "covariate-on-collider",
    "file": "configs/a.json",
    "config": "biased one",
    "columns": ["ticket"],
}


def pathgate(*words: str) -> Result:
    result = CliRunner().invoke(main, ["review", "graph.json", "configs", *words], prog_name="pathgate")
    assert result.exception is None or isinstance(result.exception, SystemExit)
    assert "fault of its own" not in result.stderr
    return result


def last(result: Result) -> str:
    return result.stdout.splitlines()[-1].split(". ")[1]


@pytest.fixture
def here(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    (tmp_path / "configs").mkdir()
    write(tmp_path, "graph.json", GRAPH)
    write(tmp_path, "configs/a.json", [SOUND, BIASED])
    return tmp_path


def baseline(folder: Path, *findings: Any) -> None:
    write(folder, "base.json", {"pathgate_baseline": 1, "findings": list(findings)})


def held(folder: Path, name: str = "base.json") -> list[dict[str, Any]]:
    return json.loads((folder / name).read_text("utf-8"))["findings"]


def test_written_once_it_lets_known_faults_pass_and_no_others(here):
    written = pathgate("--write-baseline", "base.json")
    assert written.exit_code == 0
    assert "The baseline was written. Findings known from now on: 1." in written.stdout
    assert held(here) == [TICKET]
    again = pathgate("--baseline", "base.json")
    assert (again.exit_code, last(again)) == (0, "Errors: 0 new, 1 known, 0 accepted.")
    assert "  known error covariate-on-collider at configs/a.json:" in again.stdout
    assert "BIASED  biased one\n" in again.stdout
    write(here, "configs/b.json", UNANSWERABLE)
    more = pathgate("--baseline", "base.json")
    assert (more.exit_code, last(more)) == (1, "Errors: 1 new, 1 known, 0 accepted.")
    assert held(here) == [TICKET]


def test_lines_and_other_configs_may_move(here):
    baseline(here, TICKET)
    text = "\n\n" + json.dumps([UNANSWERABLE, {**BIASED, "covariates": ["ticket", "weather"]}], indent=8)
    write(here, "configs/a.json", text)
    assert last(pathgate("--baseline", "base.json")) == "Errors: 1 new, 1 known, 0 accepted."


@pytest.mark.parametrize("member", ["rule", "file", "config", "columns"])
def test_an_entry_for_anything_else_does_not_count(here, member):
    other = ["weather"] if member == "columns" else "other"
    baseline(here, {**TICKET, member: other})
    assert pathgate("--baseline", "base.json").exit_code == 1


def test_two_configs_of_one_name_do_not_hide_behind_one_entry(here):
    baseline(here, TICKET)
    write(here, "configs/a.json", [BIASED, BIASED])
    result = pathgate("--baseline", "base.json")
    assert (result.exit_code, last(result)) == (1, "Errors: 1 new, 1 known, 0 accepted.")
    assert pathgate("--write-baseline", "base.json").exit_code == 0
    assert held(here) == [{**TICKET, "times": 2}]
    assert pathgate("--baseline", "base.json").exit_code == 0


def test_files_are_told_apart_from_the_folder_of_the_baseline(here, monkeypatch):
    (here / "gate").mkdir()
    assert pathgate("--write-baseline", "gate/base.json").exit_code == 0
    assert [entry["file"] for entry in held(here, "gate/base.json")] == ["../configs/a.json"]
    monkeypatch.chdir(here / "gate")
    words = ["review", "../graph.json", str(here / "configs"), "--baseline", "base.json"]
    assert CliRunner().invoke(main, words).exit_code == 0


def test_entries_that_no_longer_occur_are_told_and_stay_until_pruned(here):
    gone = {**TICKET, "config": "sound one"}
    baseline(here, TICKET, gone)
    told = pathgate("--baseline", "base.json")
    assert told.exit_code == 0
    line = "No longer found, and still in the baseline: covariate-on-collider (ticket) in configs/a.json"
    assert f"{line} of sound one.\n" in told.stdout
    assert held(here) == [TICKET, gone]
    pruned = pathgate("--baseline", "base.json", "--prune-baseline")
    assert "Entries that no longer occur were taken out of the baseline: 1." in pruned.stdout
    assert held(here) == [TICKET]
    assert "No longer found" not in pathgate("--baseline", "base.json").stdout


def test_an_entry_that_answers_for_fewer_than_it_says_is_lowered(here):
    baseline(here, {**TICKET, "times": 3})
    pathgate("--baseline", "base.json", "--prune-baseline")
    assert held(here) == [TICKET]


def test_what_was_not_looked_at_or_could_not_be_judged_is_not_gone(here):
    write(here, "configs/b.json", [MISNAMED])
    write(here, "configs/c.json", "{")
    write(here, "elsewhere.json", BIASED)
    kept = [
        {**TICKET, "file": "configs/b.json", "config": "misnamed one"},
        {**TICKET, "file": "configs/c.json"},
        {**TICKET, "file": "elsewhere.json"},
    ]
    gone = [{**TICKET, "file": "removed.json"}, {**TICKET, "file": "configs/b.json", "config": "renamed"}]
    baseline(here, TICKET, *kept, *gone)
    assert pathgate("--baseline", "base.json", "--prune-baseline").exit_code == 2
    assert sorted(held(here), key=str) == sorted([TICKET, *kept], key=str)


def test_it_is_not_written_where_something_could_not_be_judged(here):
    write(here, "configs/b.json", MISNAMED)
    baseline(here)
    before = (here / "base.json").read_bytes()
    result = pathgate("--write-baseline", "base.json")
    assert result.exit_code == 2
    assert "The baseline was not written, since 1 could not be judged." in result.stdout
    assert (here / "base.json").read_bytes() == before


@pytest.mark.parametrize(
    "content",
    [
        "{",
        [],
        {},
        {"pathgate_baseline": 2, "findings": []},
        {"pathgate_baseline": 1},
        {"pathgate_baseline": 1, "findings": {}},
        {"pathgate_baseline": 1, "findings": [], "more": 1},
        {"pathgate_baseline": 1, "findings": [3]},
        {"pathgate_baseline": 1, "findings": [{**TICKET, "line": 3}]},
        {"pathgate_baseline": 1, "findings": [{**TICKET, "rule": 3}]},
        {"pathgate_baseline": 1, "findings": [{**TICKET, "columns": "ticket"}]},
        {"pathgate_baseline": 1, "findings": [{**TICKET, "columns": [3]}]},
        {"pathgate_baseline": 1, "findings": [{**TICKET, "times": 0}]},
        {"pathgate_baseline": 1, "findings": [{**TICKET, "times": True}]},
        {"pathgate_baseline": 1, "findings": [TICKET, TICKET]},
        {"pathgate_baseline": 1, "findings": [{key: TICKET[key] for key in ("rule", "file", "config")}]},
    ],
)
def test_a_damaged_one_is_no_pass(here, content):
    write(here, "configs/a.json", SOUND)
    write(here, "base.json", content)
    result = pathgate("--baseline", "base.json")
    assert result.exit_code == 2
    assert result.stderr.startswith("pathgate: nothing was judged: base.json: ")
    assert result.stdout.startswith("1 config found, 0 reviewed")


def test_a_missing_one_is_no_pass(here):
    write(here, "configs/a.json", SOUND)
    assert pathgate("--baseline", "base.json").exit_code == 2


@pytest.mark.parametrize("words", [["--prune-baseline"], ["--prune-baseline", "--write-baseline", "x.json"]])
def test_there_must_be_something_to_prune(here, words):
    assert pathgate(*words).exit_code == 2
    assert not (here / "x.json").exists()
