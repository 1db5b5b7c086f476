"""Which files names stand for: nothing that was named drops out unseen, and nothing counts twice."""

from __future__ import annotations

import json
from pathlib import Path

import pytest
from click.testing import CliRunner, Result

from pathgate.cli.main import main
from pathgate.cli.naming import config_files
from tests.cli.shelf import GRAPH, SOUND, write


def pathgate(*words: str) -> Result:
    return CliRunner().invoke(main, ["review", "graph.json", *words], prog_name="pathgate")


def names(result: Result) -> list[str]:
    return [item["name"] for item in json.loads(result.stdout)["reviews"]]


@pytest.fixture
def here(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    write(tmp_path, "graph.json", GRAPH)
    for name in ("teams/a/one.json", "teams/a/two.yaml", "teams/b/three.json", "teams/b/notes.md"):
        (tmp_path / name).parent.mkdir(parents=True, exist_ok=True)
        write(tmp_path, name, {**SOUND, "name": Path(name).stem})
    return tmp_path


@pytest.mark.parametrize(
    ("words", "expected"),
    [
        (["teams/*/*.json"], ["one", "three"]),
        (["teams/**/*"], ["one", "two", "three"]),
        (["teams/a", "teams/*/one.json", "teams/a/two.yaml"], ["one", "two"]),
        (["teams/[b]/*"], ["three"]),
        (["teams/b/three.json", "teams/../teams/b/three.json"], ["three"]),
    ],
)
def test_a_pattern_stands_for_the_configs_that_match_and_no_file_counts_twice(here, words, expected):
    assert names(pathgate(*words, "--format", "json")) == expected


def test_a_pattern_leaves_the_graph_out(here):
    write(here, "c.json", SOUND)
    assert names(pathgate("*.json", "--format", "json")) == ["sound one"]


@pytest.mark.parametrize("pattern", ["teams/*.json", "nowhere/*.json", "teams/b/*.md"])
def test_a_pattern_that_matches_no_config_is_no_pass(here, pattern):
    result = pathgate(pattern, "teams/a")
    assert result.exit_code == 2
    assert f"{pattern}: no JSON or YAML file matches" in result.stdout


def test_a_file_whose_name_looks_like_a_pattern_is_that_file(here):
    write(here, "what[ever].json", SOUND)
    assert names(pathgate("what[ever].json", "--format", "json")) == ["sound one"]


@pytest.mark.parametrize("word", ["teams/a", "teams/a/*.json"])
def test_a_link_that_leads_nowhere_is_no_pass(here, word):
    (here / "teams/a/lost.json").symlink_to(here / "gone.json")
    result = pathgate(word)
    assert result.exit_code == 2
    assert "NOT JUDGED  teams/a/lost.json" in result.stdout


def test_a_folder_is_read_in_the_order_of_names(here):
    assert list(config_files([Path("teams/a")])) == [Path("teams/a/one.json"), Path("teams/a/two.yaml")]
