"""The text for people: who is not a statistician understands it, and no name can steer the terminal."""

from __future__ import annotations

from pathlib import Path

import pytest

from pathgate.cli.reviewing import Question, review_files
from pathgate.cli.run import Fault, Item, Place, Run
from pathgate.cli.text import run_text
from pathgate.cli.wording import counts_text, fault_lines
from pathgate.web.settings import Settings
from tests.cli.shelf import BIASED, GRAPH, MISNAMED, SOUND, UNANSWERABLE, write
from tests.values import graph_of


def run_of(folder: Path, *configs: object, graph: object = GRAPH) -> Run:
    paths = [Path(write(folder, name, said)) for name, said in (("g.json", graph), ("c.json", list(configs)))]
    return review_files(Question(paths[0], (paths[1],)), Settings())


def test_each_config_has_a_headline_its_findings_and_what_to_change(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    blocks = run_text(run_of(Path(), SOUND, BIASED, UNANSWERABLE, MISNAMED)).split("\n\n")
    assert [block.splitlines()[0] for block in blocks[:4]] == [
        "SOUND  sound one",
        "BIASED  biased one",
        "UNANSWERABLE  lost one",
        "NOT JUDGED  misnamed one",
    ]
    assert '  error covariate-on-collider at c.json:1:185: Adjusting for "ticket" opens the path' in blocks[1]
    assert blocks[1].splitlines()[-1] == '  To mend it: stop adjusting for "ticket".'
    assert "no choice of the columns that the platform holds" in blocks[2]
    assert '#/config/covariates/0: no node is named "wether" (did you mean "weather"?)' in blocks[3]


def test_the_last_line_counts_and_the_caution_stands_once(tmp_path):
    text = run_text(run_of(tmp_path, SOUND, BIASED, BIASED, UNANSWERABLE, MISNAMED))
    last = (
        "5 configs found, 4 reviewed: 1 sound, 2 biased, 1 unanswerable; 1 not judged."
        " Errors: 3 new, 0 known, 0 accepted."
    )
    assert text.splitlines()[-1] == last
    assert text.count("it does not show that the graph is right") == 1
    assert text.count("In paths:") == 1


def test_paths_are_explained_only_where_one_is_shown(tmp_path):
    assert "In paths:" not in run_text(run_of(tmp_path, SOUND))


def test_several_ways_to_mend_it_are_listed(tmp_path):
    # late ← weather → volume → refund: either column blocks the path.
    graph = graph_of(("weather", "late"), ("weather", "volume"), ("volume", "refund"), ("late", "refund"))
    lines = run_text(run_of(tmp_path, {**SOUND, "covariates": []}, graph=graph)).splitlines()
    start = lines.index("  To mend it, do one of these:")
    assert set(lines[start + 1 : start + 3]) == {'  - adjust for "weather"', '  - adjust for "volume"'}


def test_what_a_sound_verdict_hinges_on_is_told_as_sentences_and_the_rest_counted(tmp_path):
    # depot_0 … depot_8 → late → refund: none of the nine may influence refund by another way.
    graph = graph_of(*((f"depot_{k}", "late") for k in range(9)), ("late", "refund"))
    config = {"name": "chain", "treatment": "late", "outcome": "refund", "covariates": []}
    paths = [Path(write(tmp_path, name, said)) for name, said in (("g.json", graph), ("c.json", config))]
    run = review_files(Question(paths[0], (paths[1],), hinges=True), Settings())
    lines = run_text(run).splitlines()
    start = lines.index("  The verdict hinges on every one of these being true:")
    absent = run.items[0].review["hinges_on"]["absent_edges"]
    assert lines[start + 1 : start + 9] == [f"  - {edge['question']}" for edge in absent[:8]]
    assert lines[start + 9] == f"  … {len(absent) - 8} more"
    assert "hinges on" not in run_text(run_of(tmp_path, BIASED))


def test_doubtful_edges_that_decide_are_told(tmp_path):
    graph = graph_of(("weather", "late"), ("late", "refund"), ("weather", "refund"))
    edges = [{**edge, "doubtful": edge["source"] == "weather"} for edge in graph["edges"]]
    config = {"treatment": "late", "outcome": "refund", "covariates": []}
    text = run_text(run_of(tmp_path, config, graph={**graph, "edges": edges}))
    line = "Whether it is sound depends on edges marked as doubtful: weather → late, weather → refund."
    assert f"  {line}" in text.splitlines()


HOSTILE = [
    "\x1b[31mred\x1b[0m",
    "\x1b]0;title\x07",
    "\x9b31m",
    "line\nbreak\rback\x08",
    "\u202eright to left",
    "a\u2028b",
    "\x7f\x00",
    "[bold red]markup[/]",
    "\ufeff\u200bhidden",
]


@pytest.mark.parametrize("name", HOSTILE)
@pytest.mark.parametrize("width", [None, 60])
def test_no_name_can_steer_the_terminal_or_hide(tmp_path, name, width):
    graph = graph_of((name, "late"), (name, "refund"), ("late", "refund"))
    configs = [
        {"name": name, "treatment": "late", "outcome": "refund", "covariates": []},
        {"name": name, "treatment": "late", "outcome": "refund", "covariates": [], name: 1},
        {"name": name, "treatment": name, "outcome": name, "covariates": ["x" + name]},
    ]
    run = run_of(tmp_path, *configs, graph=graph)
    assert [item.outcome for item in run.items] == ["biased", "not judged", "not judged"]
    text = run_text(run, width=width)
    assert all(character == "\n" or character.isprintable() for character in text)
    headlines = [line for line in text.splitlines() if line.startswith(("BIASED  ", "NOT JUDGED  "))]
    assert len(headlines) == 3
    if name.isprintable():
        assert headlines[0] == f"BIASED  {name}"


def test_lines_are_broken_at_the_width_of_a_terminal_and_nowhere_else(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    run = run_of(Path(), SOUND, BIASED, UNANSWERABLE)
    *lines, counts = run_text(run, width=60).splitlines()
    assert max(map(len, lines)) <= 60
    assert counts == counts_text(run)
    unbroken = [line for line in run_text(run).splitlines() if line.startswith("  error ")]
    assert len(unbroken) == 2
    assert all(line.endswith(".") for line in unbroken)


def test_colour_marks_words_and_never_stands_alone(tmp_path):
    run = run_of(tmp_path, SOUND, BIASED)
    assert "\x1b[31m\x1b[1mBIASED\x1b[0m  biased one" in run_text(run, colour=True)
    assert "\x1b" not in run_text(run)


def test_many_faults_are_counted_past_the_first_ten():
    faults = [Fault(f"#/config/covariates/{k}: unknown", Place(Path("c.json"))) for k in range(15)]
    lines = fault_lines(faults)
    assert lines[0] == "15 faults:"
    assert lines[-1] == "- and 5 more"
    assert len(lines) == 12


def test_nothing_found_is_counted_too():
    assert counts_text(Run()).startswith("0 configs found, 0 reviewed")
    assert Run().exit_status == 2
    assert counts_text(Run((Item("a", Place(Path("a")), problem={}),))).startswith(
        "1 config found, 0 reviewed"
    )
