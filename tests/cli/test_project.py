"""The project file: found from where one works, refused where it is wrong, and every value's origin shown."""

from __future__ import annotations

import json
from pathlib import Path

import pytest
from click.testing import CliRunner, Result

from pathgate.cli.main import main
from tests.cli.shelf import BIASED, GRAPH, SOUND, write

PROJECT = """\
graph = "model/graph.json"
configs = ["teams/*.json", "more"]
fail_on = "error"
baseline = "base.json"
dialect = "duckdb"

[outputs]
json = "build/run.json"
"""


def pathgate(*words: str) -> Result:
    result = CliRunner().invoke(main, ["review", *words], prog_name="pathgate")
    assert result.exception is None or isinstance(result.exception, SystemExit)
    assert "fault of its own" not in result.stderr
    return result


@pytest.fixture
def project(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    for name in ("model", "teams", "more", "below/deep"):
        (tmp_path / name).mkdir(parents=True)
    write(tmp_path / "model", "graph.json", GRAPH)
    write(tmp_path / "teams", "a.json", SOUND)
    write(tmp_path / "more", "b.json", BIASED)
    write(tmp_path, "base.json", {"pathgate_baseline": 1, "findings": []})
    write(tmp_path, "pathgate.toml", PROJECT)
    monkeypatch.chdir(tmp_path)
    return tmp_path


def test_plain_review_does_what_the_project_says(project):
    result = pathgate()
    assert result.exit_code == 1
    assert result.stdout.splitlines()[-1].startswith("2 configs found, 2 reviewed: 1 sound, 1 biased")
    assert json.loads((project / "build/run.json").read_text("utf-8"))["gate"]["counts"]["new"] == 1


def test_it_is_found_from_below_and_paths_count_from_it(project, monkeypatch):
    monkeypatch.chdir(project / "below/deep")
    result = pathgate()
    assert result.exit_code == 1
    assert "error covariate-on-collider at ../../more/b.json:1:" in result.stdout
    assert (project / "build/run.json").is_file()
    log = json.loads(pathgate("--format", "sarif").stdout)
    location = log["runs"][0]["results"][-1]["locations"][0]["physicalLocation"]["artifactLocation"]
    assert location == {"uri": "more/b.json", "uriBaseId": "ROOT"}


def test_the_table_in_pyproject_does_the_same(project):
    (project / "pathgate.toml").unlink()
    table = PROJECT.replace("[outputs]", "[tool.pathgate.outputs]")
    write(project, "pyproject.toml", f'[project]\nname = "ours"\n[tool.pathgate]\n{table}')
    assert pathgate().stdout.splitlines()[-1].startswith("2 configs found")
    assert "# pyproject.toml" in pathgate("--show").stdout


def test_a_pyproject_without_our_table_does_not_end_the_search(project, monkeypatch):
    write(project / "below", "pyproject.toml", "[tool.other]\n")
    monkeypatch.chdir(project / "below/deep")
    assert pathgate().stdout.splitlines()[-1].startswith("2 configs found")


def test_two_project_files_side_by_side_are_refused(project):
    write(project, "pyproject.toml", '[tool.pathgate]\nfail_on = "warning"\n')
    result = pathgate()
    assert (result.exit_code, result.stdout) == (2, "")
    assert "keep one of them" in result.stderr


def test_the_words_of_a_call_go_before_the_project(project):
    result = pathgate("model/graph.json", "teams/a.json", "--output", "json=other.json")
    assert result.exit_code == 0
    assert (project / "other.json").is_file()
    assert not (project / "build").exists()


def test_show_says_who_set_what_and_reviews_nothing(project):
    result = pathgate("--show", "--fail-on", "warning", "--output", "sarif=x.sarif")
    assert result.exit_code == 0
    assert result.stdout.splitlines() == [
        'graph = "model/graph.json"  # pathgate.toml',
        'configs = ["teams/*.json", "more"]  # pathgate.toml',
        'outputs.json = "build/run.json"  # pathgate.toml',
        'outputs.sarif = "x.sarif"  # --output',
        'dialect = "duckdb"  # pathgate.toml',
        'fail_on = "warning"  # --fail-on',
        'baseline = "base.json"  # pathgate.toml',
    ]
    assert not (project / "build").exists()


def test_show_without_a_project_names_the_defaults(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    assert pathgate("--show").stdout.startswith("graph = (none)  # default\n")
    shown = pathgate("g.json", "c.json", "--show").stdout.splitlines()
    assert shown[0] == 'graph = "g.json"  # GRAPH'
    assert shown[2:] == [
        "outputs = (none)  # default",
        "dialect = (none)  # default",
        'fail_on = "error"  # default',
        "baseline = (none)  # default",
    ]


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ('fail_onn = "error"', 'fail_onn: no such setting (did you mean "fail_on"?)'),
        ('wholly_else = "x"', "no such setting (there are graph, configs"),
        ('fail_on = "eror"', "'eror' is none of error, warning (did you mean \"error\"?)"),
        ('fail_on = "note"', "is none of error, warning"),
        ('dialect = "duckdbb"', 'did you mean "duckdb"'),
        ("graph = 3", "graph: a path is wanted"),
        ('graph = ""', "graph: a path is wanted"),
        ("configs = []", "configs: a path, a pattern or a list"),
        ("configs = [3]", "configs: a path is wanted"),
        ('outputs = "x"', "outputs: a table"),
        ('[outputs]\nsarrif = "x"', '(did you mean "sarif"?)'),
        ("graph = ", "no TOML"),
        ('graph = "a"\ngraph = "b"', "no TOML"),
        ('"\\u001b[31m" = 1', r"\u001b[31m: no such setting"),
        ("graph = 3\nconfigs = 4", "graph: a path is wanted, in quotes; configs: "),
    ],
)
def test_what_means_nothing_is_refused_in_one_line(project, text, words):
    write(project, "pathgate.toml", text)
    result = pathgate("model/graph.json", "teams/a.json")
    assert (result.exit_code, result.stdout) == (2, "")
    assert words in result.stderr
    assert len(result.stderr.splitlines()) == 1
    assert result.stderr[:-1].isprintable()


def test_a_faulty_pyproject_that_means_us_is_refused_and_another_one_is_not_ours(project):
    (project / "pathgate.toml").unlink()
    words = ("model/graph.json", "teams/a.json")
    write(project, "pyproject.toml", "[tool.other\n")
    assert pathgate(*words).exit_code == 0
    write(project, "pyproject.toml", "[tool.pathgate\n")
    assert pathgate(*words).exit_code == 2


@pytest.mark.parametrize("words", [(), ("model/graph.json",)])
def test_a_call_that_leaves_open_what_to_review_is_refused(project, words):
    write(project, "pathgate.toml", "")
    result = pathgate(*words)
    assert (result.exit_code, result.stdout) == (2, "")
    assert len(result.stderr.splitlines()) == 1


def test_a_project_file_can_be_named(project):
    other = write(project / "below", "other.toml", 'graph = "../model/graph.json"\nconfigs = "../teams"\n')
    assert pathgate("--project", other).exit_code == 0
    assert pathgate("--project", "nowhere.toml").exit_code == 2


def test_the_dialect_of_the_project_holds_for_configs_that_name_none(project):
    # In double quotes stands a column, but in MySQL a text, and a condition that reads no column is refused.
    config = {**SOUND, "row_filter": '"weather" > 3'}
    write(project / "teams", "a.json", [config, {**config, "name": "own", "dialect": "mysql"}])
    reviews = json.loads(pathgate("--format", "json").stdout)["reviews"]
    assert ["review" in each for each in reviews] == [True, False, True]
    plain = pathgate("model/graph.json", "teams/a.json", "--dialect", "mysql", "--format", "json")
    assert ["review" in each for each in json.loads(plain.stdout)["reviews"]] == [False, False]
    assert pathgate("--dialect", "duckdbb").exit_code == 2


def test_warnings_count_where_the_project_says_so(project):
    # ticket descends from weather: two warnings, and a sound verdict.
    config = {"name": "no effect", "treatment": "ticket", "outcome": "weather", "covariates": ["late"]}
    write(project / "more", "b.json", config)
    assert pathgate().exit_code == 0
    write(project, "pathgate.toml", PROJECT.replace('"error"', '"warning"'))
    failing = pathgate()
    assert failing.exit_code == 1
    assert "Errors and warnings: 2 new" in failing.stdout.splitlines()[-1]
