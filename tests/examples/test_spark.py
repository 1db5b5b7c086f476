"""One verdict whoever gives it: a table of configs in Spark, /v1/reviews, this process, the command at the shell."""

from __future__ import annotations

import json
import re
import shutil
import subprocess
import sys
import urllib.request
from importlib.util import find_spec
from typing import Any

import msgspec
import pytest

from pathgate.cli.yaml_text import read_yaml
from pathgate.client import Client
from pathgate.graphs import read_graph
from pathgate.web.judging import judged
from pathgate.web.settings import Settings
from tests.examples.conftest import EXAMPLES

pytestmark = [pytest.mark.system, pytest.mark.xdist_group("recipes")]

GRAPH_FILE = EXAMPLES / "parcels" / "graph.yaml"
GRAPH = read_yaml(GRAPH_FILE.read_text("utf-8"), max_depth=20)
BASE = {"treatment": "late_pick_up", "outcome": "refund"}
COLUMNS = ["rain", "promotion", "locker_full", "ticket_opened"]
FILTERS = ["ticket_opened = TRUE", "promotion IN ('none', 'spring') AND locker_full > 2", "rain = 'none'"]


def configs() -> list[Any]:
    """Every choice of covariates under every filter, and what can be wrong with a config."""
    choices = [[c for k, c in enumerate(COLUMNS) if mask >> k & 1] for mask in range(2 ** len(COLUMNS))]
    plain = [{**BASE, "covariates": chosen} for chosen in choices]
    filtered = [{**each, "row_filter": sql} for each in plain for sql in FILTERS]
    named = [
        {**each, "name": f"№ {number} “refunds” \\ →"} for number, each in enumerate([*plain, *filtered])
    ]
    other = [
        {
            "formula": "refund ~ late_pick_up * rain + locker_full",
            "treatment": "late_pick_up",
            "name": "as formula",
        },
        {
            **BASE,
            "covariates": ["rain", "locker_full"],
            "name": "with meta",
            "meta": {"é": [1, 2.5, None, 1e300]},
        },
        {**BASE, "covariates": ["complaint_habit"], "name": "unmeasured"},
        {**BASE, "covariates": ["rane"], "name": "misspelt"},
        {**BASE, "covariates": [], "row_filter": "rain = = 1", "name": "broken SQL"},
        {**BASE, "covariats": []},
        ["a", "list"],
    ]
    return [*named, *other]


def http_answers(url: str, asked: list[Any]) -> list[bytes]:
    """The review or problem in each line of /v1/reviews, as the bytes that came."""
    body = json.dumps({"graph": GRAPH, "configs": asked}).encode()
    headers = {"Content-Type": "application/json", "Accept": "application/x-ndjson"}
    request = urllib.request.Request(f"{url}/v1/reviews", body, headers)  # noqa: S310 - our own
    with urllib.request.urlopen(request, timeout=60) as reply:  # noqa: S310
        lines = reply.read().splitlines()
    answers = []
    for index, (line, config) in enumerate(zip(lines, asked, strict=True)):
        name = config.get("name", "") if isinstance(config, dict) else ""
        head = msgspec.json.encode({"index": index, "count": len(asked), "name": name})
        assert line.startswith(head[:-1] + b",")
        answers.append(b"{" + line[len(head) :])
    return answers


def without_place(answer: bytes) -> bytes:
    """An answer whose pointers do not tell where in the request a config stood, which only a request can say."""
    value = msgspec.json.decode(answer)
    for error in value.get("problem", {}).get("errors", []):
        error["pointer"] = re.sub(r"^#/(config|configs/\d+)(?=/|$)", "#", error["pointer"])
    return msgspec.json.encode(value)


def in_process(asked: list[Any]) -> list[bytes]:
    graph = read_graph(GRAPH)
    return [msgspec.json.encode(judged(config, graph, Settings(), hinges=False)) for config in asked]


def test_over_http_and_in_process_the_verdicts_are_the_same_bytes(service_url):
    asked = configs()
    over_http, here = http_answers(service_url, asked), in_process(asked)
    for config, theirs, ours in zip(asked, over_http, here, strict=True):
        if b'"review"' in ours[:10]:
            assert theirs == ours, config
        else:
            assert without_place(theirs) == without_place(ours), config
    verdicts = {msgspec.json.decode(each).get("review", {}).get("verdict") for each in here}
    assert verdicts == {"sound", "biased", None}


@pytest.mark.parametrize("is_asked", [False, True], ids=["in process", "from the service"])
def test_at_the_shell_the_verdicts_are_those_bytes_too(environment, tmp_path, service_url, is_asked):
    asked = [config for config in configs() if isinstance(config, dict) and "name" in config]
    (tmp_path / "configs.json").write_text(json.dumps(asked))
    words = ["pathgate", "review", GRAPH_FILE, tmp_path / "configs.json", "--format", "json"]
    done = subprocess.run(
        [*words, *(["--url", service_url] if is_asked else [])],
        env=environment,
        cwd=tmp_path,
        capture_output=True,
        check=False,
        timeout=120,
    )
    lines = msgspec.json.decode(done.stdout)["reviews"]
    answers = [{key: line[key] for key in ("review", "problem") if key in line} for line in lines]
    check_same_reviews(answers, in_process(asked))


def test_the_client_s_verdicts_are_those_bytes_too(service_url):
    asked = configs()
    lines = Client(service_url).reviews(GRAPH, asked)
    answers = [{key: line[key] for key in ("review", "problem") if key in line} for line in lines]
    check_same_reviews(answers, in_process(asked))


def check_same_reviews(answers: list[Any], ours: list[bytes]) -> None:
    """What was decoded, encoded again, is the same bytes wherever it is a review."""
    reviewed = 0
    for theirs, here in zip(answers, ours, strict=True):
        assert ("review" in theirs) == here.startswith(b'{"review"')
        if "review" in theirs:
            assert msgspec.json.encode(theirs) == here
            reviewed += 1
    assert reviewed > 60


# --- Spark itself: deploy/test --full installs it, and Java


@pytest.fixture
def spark(environment, tmp_path):
    """Runs the recipe in local mode over lines; its exit status, what it said, and the rows it wrote by config."""
    assert find_spec("pyspark"), "deploy/test --full installs what deploy/requirements-spark.txt names"
    assert shutil.which("java"), "deploy/test --full installs Java"
    options = (
        "--master local[2] --driver-memory 1g --conf spark.ui.enabled=false"
        f" --conf spark.sql.files.maxPartitionBytes=4k --conf spark.local.dir={tmp_path} pyspark-shell"
    )
    local = {
        **environment,
        "PYSPARK_PYTHON": sys.executable,
        "PYSPARK_SUBMIT_ARGS": options,
        "SPARK_LOCAL_IP": "127.0.0.1",
    }

    def run(lines: list[str], graph=GRAPH_FILE):
        (tmp_path / "configs.jsonl").write_text("".join(f"{line}\n" for line in lines), "utf-8")
        words = [EXAMPLES / "spark_reviews.py", graph, tmp_path / "configs.jsonl", tmp_path / "reviewed"]
        done = subprocess.run(
            [sys.executable, *words],
            env=local,
            cwd=tmp_path,
            capture_output=True,
            text=True,
            check=False,
            timeout=300,
        )
        parts = sorted((tmp_path / "reviewed").glob("part-*.json"))
        rows = [json.loads(row) for part in parts for row in part.read_text("utf-8").splitlines()]
        return done, rows, len(parts)

    return run


@pytest.mark.slow
@pytest.mark.full
def test_in_spark_the_verdicts_are_the_same_bytes(spark, service_url):
    asked = configs()
    lines = [json.dumps(config, ensure_ascii=False) for config in asked]
    twice = '{"name": "twice", "name": "said", "treatment": "rain"}'
    done, rows, parts = spark([*lines, twice, "{no json"])
    assert done.returncode == 2, done.stderr
    assert parts > 1
    by_config = {row["config"]: row for row in rows}
    assert len(rows) == len(by_config) == len(asked) + 2
    over_http, here = http_answers(service_url, asked), in_process(asked)
    for line, theirs, ours in zip(lines, over_http, here, strict=True):
        row = by_config[line]
        assert row["answer"].encode() == ours
        review = msgspec.json.decode(ours).get("review")
        assert row.get("verdict") == (review and review["verdict"])
        assert review is None or theirs == ours
    for broken in (twice, "{no json"):
        assert by_config[broken].get("verdict") is None
        assert json.loads(by_config[broken]["answer"])["problem"]["type"] == "/problems/not-json"
    not_judged = sum("verdict" not in row for row in rows)
    short = sum(row.get("verdict") in ("biased", "unanswerable") for row in rows)
    assert done.stdout == f"{len(rows)} found, {short} short, {not_judged} not judged\n"


@pytest.mark.slow
@pytest.mark.full
@pytest.mark.parametrize(
    ("covariates", "status", "counts"),
    [
        ([["rain", "locker_full"]], 0, "1 found, 0 short, 0 not judged\n"),
        ([["rain", "locker_full"], ["rain"]], 1, "2 found, 1 short, 0 not judged\n"),
        ([], 2, "0 found, 0 short, 0 not judged\n"),
    ],
)
def test_the_spark_job_ends_as_the_command_does(spark, covariates, status, counts):
    done, _rows, _parts = spark([json.dumps({**BASE, "covariates": each}) for each in covariates])
    assert (done.returncode, done.stdout) == (status, counts), done.stderr


@pytest.mark.slow
@pytest.mark.full
def test_a_spark_job_without_a_graph_judges_nothing(spark, tmp_path):
    done, rows, _parts = spark([json.dumps({**BASE, "covariates": []})], tmp_path / "nowhere.yaml")
    assert (done.returncode, rows) == (2, [])
    assert "not judged" in done.stderr
