"""``pathgate review``: what it reads, what it says, how it ends."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest
from click.testing import CliRunner, Result

from pathgate.cli.main import main
from pathgate.criteria.deadline import Deadline
from pathgate.demo import demo_configs, demo_graph
from pathgate.graphs import read_graph
from pathgate.review import read_config
from pathgate.review import review as review_one
from pathgate.review.hinge_document import whole_document
from pathgate.web.app import create_app
from pathgate.web.settings import Settings
from tests.cli.shelf import BIASED, GRAPH, MISNAMED, SOUND, UNANSWERABLE, WAIVER, write


def pathgate(*words: str, **environment: str) -> Result:
    result = CliRunner().invoke(main, ["review", *words], env=environment, prog_name="pathgate")
    assert result.exception is None or isinstance(result.exception, SystemExit)
    assert "Traceback" not in result.output
    return result


def documents(result: Result) -> list[dict[str, Any]]:
    return json.loads(result.stdout)["reviews"]


@pytest.fixture
def graph(tmp_path: Path) -> str:
    return write(tmp_path, "graph.json", GRAPH)


@pytest.mark.parametrize(
    ("configs", "status"),
    [
        ([SOUND], 0),
        ([SOUND, SOUND], 0),
        ([BIASED], 1),
        ([UNANSWERABLE], 1),
        ([SOUND, BIASED], 1),
        ([MISNAMED], 2),
        ([SOUND, MISNAMED], 2),
        ([BIASED, MISNAMED, UNANSWERABLE], 2),
    ],
)
@pytest.mark.parametrize("form", ["text", "json"])
def test_the_exit_status_tells_the_worst(tmp_path, graph, configs, status, form):
    together = write(tmp_path, "all.json", configs)
    apart = [write(tmp_path, f"{place}.json", config) for place, config in enumerate(configs)]
    assert pathgate(graph, together, "--format", form).exit_code == status
    assert pathgate("--format", form, graph, *apart).exit_code == status


def test_json_is_one_document_with_the_reviews_of_the_package(tmp_path):
    graph = write(tmp_path, "graph.json", demo_graph())
    result = pathgate(graph, write(tmp_path, "configs.json", demo_configs()), "--format", "json")
    judged = read_graph(demo_graph())
    for index, (item, config) in enumerate(zip(documents(result), demo_configs(), strict=True)):
        answer = review_one(judged, read_config(config, judged))
        expected = whole_document(answer, Deadline.never(), hinges=False)
        assert item == {"index": index, "count": 8, "name": config["name"], "review": expected}
    assert result.stdout.endswith("}\n")
    assert result.stderr == (
        "8 configs found, 8 reviewed: 1 sound, 6 biased, 1 unanswerable; 0 not judged."
        " Errors: 7 new, 0 known, 0 accepted.\n"
    )


def test_json_has_the_same_reviews_as_the_service(tmp_path):
    graph = write(tmp_path, "graph.json", demo_graph())
    request = {"graph": demo_graph(), "configs": demo_configs()}
    answer = create_app(Settings()).test_client().post("/v1/reviews", json=request).get_json()
    assert (
        documents(pathgate(graph, write(tmp_path, "c.json", demo_configs()), "--format", "json"))
        == answer["reviews"]
    )


def test_json_has_what_verdicts_hinge_on_where_that_is_asked_for(tmp_path):
    graph = write(tmp_path, "graph.json", demo_graph())
    configs = write(tmp_path, "configs.json", demo_configs())
    asked = documents(pathgate(graph, configs, "--format", "json", "--hinges"))
    others = documents(pathgate(graph, configs, "--format", "json"))
    hinges = [item["review"].pop("hinges_on") for item in asked]
    assert asked == others
    assert [bool(each["absent_edges"]) for each in hinges] == [
        item["review"]["verdict"] == "sound" for item in others
    ]


def test_a_config_that_means_nothing_carries_its_problem_as_over_http(tmp_path, graph):
    result = pathgate(graph, write(tmp_path, "c.json", [SOUND, MISNAMED]), "--format", "json")
    item = documents(result)[1]
    assert (item["index"], item["count"], item["name"]) == (1, 2, "misnamed one")
    assert "review" not in item
    detail = 'no node is named "wether" (did you mean "weather"?)'
    assert item["problem"] == {
        "type": "/problems/unknown-node",
        "title": "A name is not in the graph",
        "status": 422,
        "detail": detail,
        "retryable": False,
        "errors": [{"pointer": "#/config/covariates/0", "detail": detail}],
    }


@pytest.mark.parametrize(
    ("name", "content", "words"),
    [
        ("syntax.json", "{", "no JSON: broken syntax"),
        ("twice.json", '{"name": 1, "name": 2}', 'no JSON: the key "name" stands twice'),
        ("nan.json", '{"cost": NaN}', "NaN is not a number"),
        ("twice.yaml", "name: 1\nname: 2\n", 'no YAML: the key "name" stands twice'),
        ("tab.yml", "a:\n\t- b\n", "no YAML: broken syntax"),
        ("latin.yaml", "name: Stra\xdfe".encode("latin-1"), "no UTF-8 (line 1, column 11)"),
        ("latin.json", '"Stra\xdfe"'.encode("latin-1"), "no JSON"),
        ("empty.json", "", "no JSON"),
        ("empty.yaml", "", "no YAML: the file holds no value"),
        ("none.json", "[]", "an empty list holds no config"),
        ("none.yaml", "[]", "an empty list holds no config"),
        ("deep.json", "[" * 300 + "]" * 300, "nested more than 100 levels"),
        ("deep.yaml", "[" * 300 + "]" * 300, "nested more than 100 levels"),
    ],
)
def test_a_file_that_holds_no_config_is_one_problem_and_the_others_are_reviewed(
    tmp_path, graph, name, content, words
):
    faulty = write(tmp_path, name, content)
    result = pathgate(graph, faulty, write(tmp_path, "good.json", SOUND), "--format", "json")
    first, second = documents(result)
    assert result.exit_code == 2
    assert first["name"] == faulty
    assert first["problem"]["detail"].startswith(f"{faulty}: ")
    assert words in first["problem"]["detail"]
    assert second["review"]["verdict"] == "sound"
    assert "1 not judged" in result.stderr
    text = pathgate(graph, faulty)
    assert text.stdout.startswith(f"NOT JUDGED  {faulty}\n  {faulty}: ")


def test_the_place_of_broken_syntax_is_in_the_problem(tmp_path, graph):
    for name, content in (("a.json", '{\n  "a": ]}'), ("a.yaml", "\na: *b")):
        result = pathgate(graph, write(tmp_path, name, content), "--format", "json")
        problem = documents(result)[0]["problem"]
        assert problem["type"] == "/problems/not-json"
        assert problem["line"] == 2
        assert problem["column"] > 1


def test_a_missing_file_is_one_problem(tmp_path, graph):
    missing = str(tmp_path / "nowhere.json")
    result = pathgate(graph, missing, write(tmp_path, "c.json", BIASED))
    assert result.exit_code == 2
    assert f"NOT JUDGED  {missing}\n  {missing}: no such file or directory\n" in result.stdout
    assert "BIASED  biased one" in result.stdout


def test_a_file_larger_than_the_limit_is_not_read(tmp_path, graph):
    large = write(tmp_path, "large.json", json.dumps({**SOUND, "meta": "x" * 3000}))
    result = pathgate(graph, large, PATHGATE_MAX_BODY_BYTES="2000")
    assert result.exit_code == 2
    assert "larger than 2,000 bytes" in result.stdout
    assert pathgate(graph, large, PATHGATE_MAX_BODY_BYTES="4000").exit_code == 0


def test_a_folder_stands_for_its_configs_in_order_without_the_graph(tmp_path, graph):
    write(tmp_path, "b.yaml", "name: from yaml\ntreatment: late\noutcome: refund\ncovariates: [weather]\n")
    write(tmp_path, "a.json", BIASED)
    write(tmp_path, "C.YML", "[]")
    write(tmp_path, "notes.txt", "no config")
    (tmp_path / "older.json").mkdir()
    result = pathgate(graph, str(tmp_path), "--format", "json")
    assert [item["name"] for item in documents(result)] == [
        str(tmp_path / "C.YML"),
        "biased one",
        "from yaml",
    ]


def test_a_folder_without_configs_is_a_problem(tmp_path, graph):
    folder = tmp_path / "empty"
    folder.mkdir()
    result = pathgate(graph, str(folder))
    assert result.exit_code == 2
    assert "a folder without a config" in result.stdout


def test_a_config_without_a_name_is_called_by_its_place(tmp_path, graph):
    nameless = {key: said for key, said in SOUND.items() if key != "name"}
    one = write(tmp_path, "one.json", nameless)
    many = write(tmp_path, "many.json", [nameless, "no config"])
    items = documents(pathgate(graph, one, many, "--format", "json"))
    assert [item["name"] for item in items] == [one, f"{many}#/0", f"{many}#/1"]
    assert items[2]["problem"]["errors"] == [
        {"pointer": "#/config", "detail": "a config is an object, not a string"}
    ]


def test_yaml_and_json_are_judged_alike(tmp_path):
    yaml_graph = "$schema: graph.schema.json\nnodes:\n- late\n- {id: no, measured: false}\n- refund\nedges:\n"
    yaml_graph += "".join(
        f"- {{source: {source}, target: {target}}}\n"
        for source, target in (("late", "refund"), ("no", "late"), ("no", "refund"))
    )
    yaml_config = (
        "&c\n$schema: x\nname: on\ntreatment: late\noutcome: refund\ncovariates: []\nmeta: 2026-01-01\n"
    )
    graph = {
        "nodes": ["late", {"id": "no", "measured": False}, "refund"],
        "edges": [
            {"source": "late", "target": "refund"},
            {"source": "no", "target": "late"},
            {"source": "no", "target": "refund"},
        ],
    }
    config = {"name": "on", "treatment": "late", "outcome": "refund", "covariates": [], "meta": "2026-01-01"}
    by_yaml = pathgate(
        write(tmp_path, "g.yaml", yaml_graph), write(tmp_path, "c.yaml", yaml_config), "--format", "json"
    )
    by_json = pathgate(
        write(tmp_path, "g.json", graph), write(tmp_path, "c.json", config), "--format", "json"
    )
    assert documents(by_yaml) == documents(by_json)
    assert documents(by_yaml)[0]["review"]["verdict"] == "unanswerable"
    assert documents(by_yaml)[0]["review"]["meta"] == "2026-01-01"


def test_an_alias_bomb_is_a_problem_at_once(tmp_path, graph):
    lines = ["a0: &a0 [x, x, x, x, x, x, x, x, x, x]"]
    lines += [f"a{k}: &a{k} [{', '.join([f'*a{k - 1}'] * 10)}]" for k in range(1, 12)]
    result = pathgate(graph, write(tmp_path, "bomb.yaml", "\n".join(lines)))
    assert result.exit_code == 2
    assert "aliases stand for more than" in result.stdout


@pytest.mark.parametrize(
    ("content", "words"),
    [
        ("{", "no JSON"),
        ("[]", "#/graph: a graph is an object"),
        ({"nodes": ["a"], "edges": [{"source": "a", "target": "b"}]}, "#/graph/edges/0/target"),
    ],
)
def test_a_graph_that_cannot_be_used_is_said_in_one_line_and_nothing_is_judged(tmp_path, content, words):
    graph = write(tmp_path, "graph.json", content)
    config = write(tmp_path, "c.json", SOUND)
    result = pathgate(graph, config)
    counts = (
        "1 config found, 0 reviewed: 0 sound, 0 biased, 0 unanswerable; 1 not judged (1 skipped)."
        " Errors: 0 new, 0 known, 0 accepted.\n"
    )
    assert (result.exit_code, result.stdout) == (2, counts)
    assert result.stderr.startswith("pathgate: nothing was judged: ")
    assert words in result.stderr
    assert len(result.stderr.splitlines()) == 1
    as_json = pathgate(graph, config, "--format", "json")
    assert (as_json.exit_code, as_json.stderr) == (2, result.stderr + counts)
    document = json.loads(as_json.stdout)
    assert [item["problem"]["title"] for item in document["reviews"]] == ["Skipped"]
    assert document["problem"]["status"] in (400, 422)


def test_several_faults_of_a_graph_are_all_named(tmp_path):
    graph = write(
        tmp_path, "graph.json", {"nodes": ["a", "a", ""], "edges": [{"source": "a", "target": "b"}]}
    )
    lines = pathgate(graph, write(tmp_path, "c.json", SOUND)).stderr.splitlines()
    assert lines[0] == "pathgate: nothing was judged: 3 faults:"
    assert [line.split(":")[0] for line in lines[1:]] == [
        "  - #/graph/nodes/2",
        "  - #/graph/nodes/1",
        "  - #/graph/edges/0/target",
    ]


def test_a_folder_or_nothing_as_graph_is_said_in_one_line(tmp_path):
    config = write(tmp_path, "c.json", SOUND)
    for graph in (str(tmp_path), str(tmp_path / "nowhere.json")):
        result = pathgate(graph, config)
        assert result.exit_code == 2
        assert result.stdout.startswith("1 config found, 0 reviewed")
        assert len(result.stderr.splitlines()) == 1


def test_a_config_that_takes_too_long_is_a_problem_of_its_own(tmp_path):
    # A chain of many back doors: far more than a twentieth of a second.
    size = 3000
    nodes = ["late", "refund", *(f"n{k}" for k in range(size))]
    edges = [{"source": f"n{k}", "target": end} for k in range(size) for end in ("late", "refund")]
    graph = write(tmp_path, "graph.json", {"nodes": nodes, "edges": edges})
    slow = {"name": "slow", "treatment": "late", "outcome": "refund", "covariates": []}
    result = pathgate(
        graph, write(tmp_path, "c.json", slow), "--format", "json", PATHGATE_TIME_BUDGET_SECONDS="0.05"
    )
    assert result.exit_code == 2
    assert documents(result)[0]["problem"]["type"] == "/problems/too-costly"


def test_settings_that_cannot_be_used_are_said_in_one_line(tmp_path, graph):
    result = pathgate(graph, write(tmp_path, "c.json", SOUND), PATHGATE_MAX_DEPTH="many")
    assert (result.exit_code, result.stdout) == (2, "")
    assert result.stderr == "pathgate: PATHGATE_MAX_DEPTH: 'many' is not a whole number\n"


@pytest.mark.parametrize("words", [[], ["g.json"], ["g.json", "c.json", "--format", "xml"], ["--frmat", "x"]])
def test_a_call_that_means_nothing_is_said_in_one_line(words):
    result = pathgate(*words)
    assert (result.exit_code, result.stdout) == (2, "")
    assert len(result.stderr.splitlines()) == 1
    assert result.stderr.endswith("(see pathgate review --help)\n")


def test_a_waiver_counts_for_the_status_and_never_for_the_verdict(tmp_path, graph):
    waiver = {"rule": "covariate-on-collider", **WAIVER}
    accepted = write(tmp_path, "a.json", {**BIASED, "accept": [waiver]})
    result = pathgate(graph, accepted)
    assert result.exit_code == 0
    assert result.stdout.startswith("BIASED  biased one\n")
    assert f"  accepted error covariate-on-collider at {accepted}:1:" in result.stdout
    why = "- Accepted by refunds team until 2999-01-31: the ticket desk was closed"
    assert f"  {why}\n" in result.stdout
    assert result.stdout.splitlines()[-1].endswith("Errors: 0 new, 0 known, 1 accepted.")


@pytest.mark.parametrize(
    ("change", "rule"),
    [
        ({"until": "2020-01-31"}, "waiver-expired"),
        ({"why": ""}, "waiver-without-reason"),
        ({"columns": "weather"}, "waiver-unused"),
        ({"rule": "treatment-fixed"}, "waiver-not-allowed"),
    ],
)
def test_a_waiver_that_does_not_hold_accepts_nothing_and_is_told(tmp_path, graph, change, rule):
    waiver = {"rule": "covariate-on-collider", **WAIVER, **change}
    config = write(tmp_path, "a.json", json.dumps({**BIASED, "accept": [waiver]}, indent=1))
    result = pathgate(graph, config)
    assert result.exit_code == 1
    line = 1 + Path(config).read_text("utf-8").splitlines().index("  {")
    assert f"warning {rule} at {config}:{line}:3: " in result.stdout
    assert pathgate(graph, config, "--fail-on", "warning").stdout.splitlines()[-1].endswith("0 accepted.")
