"""All formats of one run say the same, and each is what its readers take it for."""

from __future__ import annotations

import json
import re
from collections import Counter
from pathlib import Path
from typing import Any
from xml.etree import ElementTree as Xml

import jsonschema_rs
import junitparser
import pytest
from click.testing import CliRunner
from markdown_it import MarkdownIt

from pathgate.cli.choices import FORMS
from pathgate.cli.main import main
from pathgate.cli.rendering import rendered
from pathgate.cli.reviewing import Question, review_files
from pathgate.cli.run import Run
from pathgate.demo import demo_configs, demo_graph
from pathgate.review.rules import RULES
from pathgate.web.settings import Settings
from tests.cli.shelf import BIASED, FILTERED_YAML, GRAPH, MISNAMED, SOUND, UNANSWERABLE, WAIVER, write

SARIF_SCHEMA = Path(__file__).parent / "published" / "sarif-2.1.0.json"
CONFIGS = [
    SOUND,
    BIASED,
    UNANSWERABLE,
    {**BIASED, "name": "known one"},
    {**BIASED, "name": "waived one", "accept": [{"rule": "covariate-on-collider", **WAIVER}]},
    MISNAMED,
]


@pytest.fixture
def here(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    write(tmp_path, "graph.json", GRAPH)
    write(tmp_path, "all.json", json.dumps(CONFIGS, indent=1))
    write(tmp_path, "filtered.yaml", FILTERED_YAML)
    write(tmp_path, "broken.json", "{")
    return tmp_path


def asking(*configs: str, **others: Any) -> Question:
    return Question(Path("graph.json"), tuple(map(Path, configs)), **others)


@pytest.fixture
def run(here: Path) -> Run:
    """New, known and accepted faults, sound ones, and two configs that cannot be judged."""
    entries = [
        {"rule": "covariate-on-collider", "file": "all.json", "config": "known one", "columns": ["ticket"]}
    ]
    gone = {"rule": "no-arrow", "file": "all.json", "config": "sound one", "columns": []}
    write(here, "base.json", {"pathgate_baseline": 1, "findings": [*entries, gone]})
    asked = asking("all.json", "filtered.yaml", "broken.json", baseline=Path("base.json"))
    return review_files(asked, Settings())


def sarif(run: Run) -> dict[str, Any]:
    return json.loads(rendered(run, "sarif"))["runs"][0]


def junit(run: Run) -> junitparser.JUnitXml:
    return junitparser.JUnitXml.fromstring(rendered(run, "junit"))


def cases(report: junitparser.JUnitXml) -> list[junitparser.TestCase]:
    return [case for suite in report for case in suite]


def tables(text: str) -> list[list[str]]:
    """The cells of the rows of all tables, as a reader of Markdown shows them."""
    html = MarkdownIt("commonmark").enable("table").render(text)
    page = Xml.fromstring(f"<page>{html}</page>")  # noqa: S314 - our own
    return [["".join(cell.itertext()) for cell in row] for row in page.iter("tr")]


def test_the_run_holds_everything_there_is_to_show(run):
    assert Counter(item.outcome for item in run.items) == {
        "sound": 1,
        "biased": 4,
        "unanswerable": 1,
        "not judged": 2,
    }
    counts = run.counts
    assert (counts.new, counts.known, counts.accepted) == (3, 1, 1)
    assert [item.falls_short for item in run.items] == [False, True, True, False, False, False, True, False]
    assert run.exit_status == 2


def test_all_formats_agree_on_rules_and_places(run):
    expected = sorted((each.rule, str(each.place)) for item in run.items for each in item.findings)
    assert len(expected) >= 6
    gate = json.loads(rendered(run, "json"))["gate"]
    as_json = [each for config in gate["configs"] for each in config["findings"]]
    assert (
        sorted((each["rule"], f"{each['file']}:{each['line']}:{each['column']}") for each in as_json)
        == expected
    )
    as_sarif = [each for each in sarif(run)["results"] if each["ruleId"] in RULES]
    assert sorted((each["ruleId"], sarif_place(each)) for each in as_sarif) == expected
    lines = re.compile(r"\b(?:error|warning|note) ([a-z-]+) at ([^ :]+:[0-9]+:[0-9]+): ")
    assert sorted(lines.findall(rendered(run, "text").decode())) == expected
    plain = re.sub(r"\\(?=[!-/:-@\[-`{-~])", "", rendered(run, "markdown").decode())
    assert sorted(lines.findall(plain)) == expected
    told = [
        part for case in cases(junit(run)) for part in [*(each.text for each in case.result), case.system_out]
    ]
    assert sorted(lines.findall("\n".join(filter(None, told)))) == expected


def sarif_place(result: dict[str, Any]) -> str:
    physical = result["locations"][0]["physicalLocation"]
    region = physical["region"]
    return f"{physical['artifactLocation']['uri']}:{region['startLine']}:{region['startColumn']}"


def test_all_formats_agree_on_what_counts(run):
    counts = run.counts
    gate = json.loads(rendered(run, "json"))["gate"]
    assert gate["counts"]["found"] == len(run.items) == 8
    assert [gate["counts"][key] for key in ("new", "known", "accepted", "not_judged")] == [3, 1, 1, 2]
    results = sarif(run)["results"]
    errors = [each for each in results if each["level"] == "error" and each["ruleId"] in RULES]
    assert sum(not each["suppressions"] for each in errors) == counts.new
    suppressed = Counter(each["suppressions"][0]["kind"] for each in errors if each["suppressions"])
    assert suppressed == {"external": counts.known, "inSource": counts.accepted}
    assert sum(each["ruleId"] == "config-not-judged" for each in results) == counts.not_judged
    report = junit(run)
    assert (report.tests, report.failures, report.errors, report.skipped) == (8, 3, 2, 0)
    rows = tables(rendered(run, "markdown").decode())[1:]
    assert len(rows) == 8
    assert [sum(int(row[column]) for row in rows) for column in (3, 4, 5)] == [3, 1, 1]
    last = "8 configs found, 6 reviewed: 1 sound, 4 biased, 1 unanswerable; 2 not judged."
    last += " Errors: 3 new, 1 known, 1 accepted."
    assert rendered(run, "text").decode().splitlines()[-1] == last
    for form in ("sarif", "junit", "markdown"):
        assert last in rendered(run, form).decode()


def test_what_no_longer_occurs_is_told_in_every_format(run):
    assert [entry.rule for entry in run.gone] == ["no-arrow"]
    for form in FORMS:
        assert "no-arrow" in rendered(run, form).decode()


def test_why_something_is_accepted_is_told_in_every_format(run):
    for form in FORMS:
        text = rendered(run, form).decode()
        assert all(WAIVER[member] in text for member in ("why", "owner", "until"))


def test_sarif_is_valid_by_the_published_schema(run):
    validator = jsonschema_rs.validator_for(json.loads(SARIF_SCHEMA.read_text("utf-8")))
    log = json.loads(rendered(run, "sarif"))
    assert [error.message for error in validator.iter_errors(log)] == []
    # The schema does refuse something.
    assert not validator.is_valid({**log, "version": "2.0.0"})


def test_sarif_always_writes_its_level_and_says_whether_it_is_suppressed(run):
    results = sarif(run)["results"]
    assert all(each["level"] in ("error", "warning", "note") for each in results)
    assert all("suppressions" in each for each in results)
    driver = sarif(run)["tool"]["driver"]
    assert all(driver["rules"][each["ruleIndex"]]["id"] == each["ruleId"] for each in results)
    assert {rule["id"] for rule in driver["rules"]} == {*RULES, "config-not-judged"}


def test_sarif_points_at_the_condition_inside_the_sql_text(here):
    run = review_files(asking("filtered.yaml"), Settings())
    result = next(each for each in sarif(run)["results"] if each["level"] == "error")
    region = result["locations"][0]["physicalLocation"]["region"]
    line = (here / "filtered.yaml").read_text("utf-8").splitlines()[region["startLine"] - 1]
    assert region["startLine"] == region["endLine"]
    assert line[region["startColumn"] - 1 : region["endColumn"] - 1] == "ticket = 1"


def test_a_fingerprint_of_sarif_outlasts_a_move_of_lines(here):
    before = sarif(review_files(asking("filtered.yaml"), Settings()))["results"]
    write(here, "filtered.yaml", "# a line more\n\n" + FILTERED_YAML)
    after = sarif(review_files(asking("filtered.yaml"), Settings()))["results"]
    prints = [[each["partialFingerprints"] for each in results] for results in (before, after)]
    assert prints[0] == prints[1]
    assert len({each["pathgate/v1"] for each in prints[0]}) == len(prints[0])
    assert [sarif_place(each) for each in before] != [sarif_place(each) for each in after]


def test_files_are_named_in_sarif_as_seen_from_the_project(here, tmp_path_factory):
    odd = here / "team a%" / "c#1.json"
    odd.parent.mkdir()
    write(odd.parent, odd.name, SOUND | {"covariates": []})
    elsewhere = write(tmp_path_factory.mktemp("elsewhere"), "c.json", BIASED)
    run = review_files(asking(str(odd), elsewhere), Settings())
    places = [each["locations"][0]["physicalLocation"]["artifactLocation"] for each in sarif(run)["results"]]
    assert {"uri": "team%20a%25/c%231.json", "uriBaseId": "ROOT"} in places
    assert {"uri": f"file://{elsewhere}"} in places


def test_junit_has_a_case_for_each_config(run):
    kinds = {case.name: [type(each).__name__ for each in case.result] for case in cases(junit(run))}
    assert kinds == {
        "sound one": [],
        "biased one": ["Failure"],
        "lost one": ["Failure"],
        "known one": [],
        "waived one": [],
        "misnamed one": ["Error"],
        "filtered one": ["Failure"],
        "broken.json": ["Error"],
    }


def test_a_run_that_could_judge_nothing_is_no_pass_in_any_format(here):
    write(here, "graph.json", {"nodes": ["a"], "edges": [{"source": "a", "target": "b"}]})
    run = review_files(asking("all.json", "broken.json"), Settings())
    assert run.exit_status == 2
    assert (run.counts.found, run.counts.reviewed, run.counts.skipped) == (7, 0, 6)
    report = junit(run)
    assert (report.tests, report.errors, report.skipped) == (8, 2, 6)
    invocation = sarif(run)["invocations"][0]
    assert (invocation["executionSuccessful"], invocation["exitCode"]) == (False, 2)
    assert "no node is declared" in invocation["toolExecutionNotifications"][0]["message"]["text"]
    assert len(sarif(run)["results"]) == 7
    document = json.loads(rendered(run, "json"))
    assert document["problem"]["type"] == "/problems/unknown-node"
    assert [set(each) for each in document["reviews"]] == [{"index", "count", "name", "problem"}] * 7
    page = rendered(run, "markdown").decode()
    assert page.startswith("## Pathgate: something could not be judged\n")
    assert "no node is declared" in page


HOSTILE = [
    "\x1b[31mred\x1b[0m",
    "a | b",
    "line\nbreak",
    "]]> & <b attribute='x\">",
    "`code` *bold* _low_ [link](http://x.invalid)",
    "\ufffe\uffff\x00\x9b\u202e",
    "1. - # + www.x.invalid",
    "back\\slash \\| pipe",
]


@pytest.mark.parametrize("name", HOSTILE)
def test_no_name_breaks_a_format_or_steers_a_terminal(here, name):
    edges = [{"source": name, "target": "late"}, {"source": name, "target": "refund"}]
    edges.append({"source": "late", "target": "refund"})
    write(here, "graph.json", {"nodes": [name, "late", "refund"], "edges": edges})
    config = {"name": name, "treatment": "late", "outcome": "refund", "covariates": []}
    write(here, "all.json", [config, {**config, "covariates": ["x" + name]}])
    run = review_files(asking("all.json"), Settings())
    assert [item.outcome for item in run.items] == ["biased", "not judged"]
    for form in FORMS:
        text = rendered(run, form).decode()
        assert all(character == "\n" or character.isprintable() for character in text), form
    shown = run.items[0].name if name.isprintable() else None
    validator = jsonschema_rs.validator_for(json.loads(SARIF_SCHEMA.read_text("utf-8")))
    assert validator.is_valid(json.loads(rendered(run, "sarif")))
    names = [case.name for case in cases(junit(run))]
    rows = tables(rendered(run, "markdown").decode())
    assert len(names) == 2
    assert [len(row) for row in rows] == [7, 7, 7]
    if shown:
        assert names == [name, name]
        assert [row[0] for row in rows[1:]] == [name, name]
    html = MarkdownIt("commonmark").enable("table").render(rendered(run, "markdown").decode())
    assert set(re.findall(r"<([a-z0-9]+)", html)) <= {*("h2", "h3", "p", "ul", "li"), *TABLE_TAGS}


TABLE_TAGS = ("table", "thead", "tbody", "tr", "th", "td")


def test_several_outputs_are_written_in_one_run_beside_the_text(here):
    words = [f"{form}=build/out.{form}" for form in FORMS]
    options = [word for each in words for word in ("--output", each)]
    result = CliRunner().invoke(main, ["review", "graph.json", "filtered.yaml", *options])
    assert result.exit_code == 1
    assert result.stdout.startswith("BIASED  filtered one\n")
    run = review_files(asking("filtered.yaml", hinges=True), Settings())
    for form in FORMS:
        assert (here / f"build/out.{form}").read_bytes() == rendered(run, form)
    assert sorted(path.name for path in (here / "build").iterdir()) == sorted(f"out.{form}" for form in FORMS)


@pytest.mark.parametrize("form", [form for form in FORMS if form != "text"])
def test_a_machine_format_has_standard_output_to_itself(here, form):
    result = CliRunner().invoke(main, ["review", "graph.json", "filtered.yaml", "--format", form])
    assert result.stdout_bytes == rendered(review_files(asking("filtered.yaml"), Settings()), form)
    assert result.stderr.splitlines()[-1].startswith("1 config found, 1 reviewed: 0 sound, 1 biased")


@pytest.mark.parametrize(
    "words",
    [
        ["--output", "sarif=graph.json"],
        ["--output", "sarif=filtered.yaml"],
        ["--output", "sarif=x", "--output", "junit=./x"],
        ["--output", "sarif=x", "--output", "sarif=y"],
        ["--output", "xml=x"],
        ["--output", "sarif"],
        ["--output", "sarif="],
    ],
)
def test_no_output_takes_the_place_of_another_file(here, words):
    before = {path.name: path.read_bytes() for path in here.iterdir()}
    result = CliRunner().invoke(main, ["review", "graph.json", "filtered.yaml", *words])
    assert result.exit_code == 2
    assert len(result.stderr.splitlines()) == 1
    assert {path.name: path.read_bytes() for path in here.iterdir()} == before


def test_an_output_that_cannot_be_written_is_no_pass(here):
    write(here, "sound.json", SOUND)
    (here / "taken").mkdir()
    result = CliRunner().invoke(main, ["review", "graph.json", "sound.json", "--output", "json=taken"])
    assert result.exit_code == 2
    assert result.stdout.startswith("SOUND")
    assert len(result.stderr.splitlines()) == 1


@pytest.mark.parametrize("name", ["demo.json", "demo.yaml"])
def test_every_place_points_at_a_value_that_the_finding_is_about(here, name):
    write(here, "graph.json", demo_graph())
    # What JSON with line breaks says, YAML says too.
    text = json.dumps(demo_configs(), indent=1)
    write(here, name, text)
    lines = text.splitlines()
    run = review_files(asking(name), Settings())
    pointed = 0
    for each in (finding for item in run.items for finding in item.findings):
        region = each.place.region
        if region.end_line is not None:
            value = json.loads(lines[region.line - 1][region.column - 1 : region.end_column - 1])
            assert value in (*each.columns, *each.document.get("open_path", {}).get("nodes", []))
            pointed += 1
    assert pointed >= 5
