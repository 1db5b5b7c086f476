"""``pathgate review --url``: a service judges as this process does, and one that fails is never a pass."""

from __future__ import annotations

import json
import random
from pathlib import Path
from typing import Any

import msgspec
import pytest
from click.testing import CliRunner, Result

from pathgate.cli.choices import FORMS
from pathgate.cli.main import main
from pathgate.cli.remote import MOST_BYTES, MOST_CONFIGS, batches, remote_judge
from pathgate.cli.reviewing import Question, review_files
from pathgate.client import Client
from pathgate.demo import demo_configs, demo_graph
from pathgate.graphs import read_graph
from pathgate.web.judging import judged
from pathgate.web.settings import Settings
from tests.cli.shelf import BIASED, GRAPH, MISNAMED, SOUND, UNANSWERABLE, write
from tests.client.fakes import Fakes
from tests.client.loopback import (
    Act,
    answering,
    body_of,
    dripping,
    faulty,
    hanging_up,
    in_chunks,
    nobody_at,
    problem,
    sending,
    serving,
    stalling_after,
)

LINES_HEAD = b"HTTP/1.1 200 OK\r\nContent-Type: application/x-ndjson\r\n"
HTML = b"<html><body>Welcome to the parcel lockers</body></html>"


@pytest.fixture(scope="module")
def service_url():
    with serving() as url:
        yield url


@pytest.fixture
def fakes() -> Fakes:
    return Fakes()


@pytest.fixture
def here(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    write(tmp_path, "graph.json", {"$schema": "schemas/graph.json", **GRAPH})
    write(tmp_path, "one.json", {**SOUND, "$schema": "schemas/config.json"})
    write(tmp_path, "two.json", [{**SOUND, "$schema": "schemas/config.json"}] * 2)
    write(
        tmp_path,
        "all.json",
        [SOUND, BIASED, UNANSWERABLE, MISNAMED, 7, {**SOUND, "covariates": ["a", "b", 3]}],
    )
    return tmp_path


def pathgate(*words: str) -> Result:
    return CliRunner().invoke(main, ["review", "graph.json", *words], prog_name="pathgate")


def random_demo_configs(seed: int, count: int) -> list[dict[str, Any]]:
    """Configs on the demo's graph, some of which name what is not measured or not there."""
    rng = random.Random(seed)
    names = [node if isinstance(node, str) else node["id"] for node in demo_graph()["nodes"]]
    found = []
    for number in range(count):
        treatment, outcome, *others = rng.sample([*names, "lockr_full"], 6)
        config: dict[str, Any] = {"name": f"ünlike {number}", "treatment": treatment, "outcome": outcome}
        config["covariates"] = others[: rng.randint(0, 4)]
        if rng.random() < 0.4:
            config["row_filter"] = rng.choice([f"{rng.choice(names)} > 3", [rng.choice(names)], "not SQL ("])
        config["meta"] = {"at": rng.choice([1.0, 1e22, -0.0, 2**70, "→ \u2028", None, [True, {}]])}
        found.append(config)
    return found


@pytest.mark.parametrize("form", FORMS)
def test_every_form_has_the_bytes_that_it_has_in_process(here, service_url, form):
    alone = pathgate("all.json", "one.json", "--format", form)
    asked = pathgate("all.json", "one.json", "--format", form, "--url", service_url)
    assert asked.stdout_bytes == alone.stdout_bytes
    assert (asked.exit_code, asked.stderr) == (alone.exit_code, alone.stderr)
    assert alone.exit_code == 2
    assert "sound one" in alone.stdout


@pytest.mark.parametrize("more", [[], ["--hinges"], ["--dialect", "duckdb"], ["--fail-on", "warning"]])
def test_the_demo_and_random_configs_are_judged_alike(here, service_url, more):
    write(here, "graph.json", demo_graph())
    write(here, "all.json", [*demo_configs(), *random_demo_configs(7, 2 * MOST_CONFIGS)])
    words = ["all.json", "--format", "json", *more]
    alone, asked = pathgate(*words), pathgate(*words, "--url", service_url)
    assert asked.stdout_bytes == alone.stdout_bytes
    outcomes = [each["outcome"] for each in json.loads(alone.stdout)["gate"]["configs"]]
    assert {"sound", "biased", "unanswerable", "not judged"} == set(outcomes)


def test_a_config_that_takes_another_number_in_its_request_keeps_its_places(here, service_url):
    """``#/configs/1`` must not be taken for the beginning of ``#/configs/10``."""
    write(here, "all.json", [{**MISNAMED, "name": f"number {place}"} for place in range(12)])
    found = json.loads(pathgate("all.json", "--format", "json", "--url", service_url).stdout)["reviews"]
    assert {each["problem"]["errors"][0]["pointer"] for each in found} == {"#/config/covariates/0"}


def test_exit_statuses_are_those_of_judging_in_process(here, service_url):
    assert pathgate("one.json", "--url", service_url).exit_code == 0
    write(here, "short.json", BIASED)
    assert pathgate("one.json", "short.json", "--url", service_url).exit_code == 1


def test_a_faulty_graph_is_refused_with_its_place_in_the_file(here, service_url):
    write(
        here, "graph.json", json.dumps({"nodes": ["a"], "edges": [{"source": "a", "target": "b"}]}, indent=1)
    )
    for form in FORMS:
        alone = pathgate("all.json", "--format", form)
        asked = pathgate("all.json", "--format", form, "--url", service_url)
        assert (asked.exit_code, asked.stdout, asked.stderr) == (2, alone.stdout, alone.stderr)
        assert "no node is declared" in asked.stderr


def test_requests_hold_a_bounded_number_of_configs_and_of_bytes():
    small = [{"name": str(number)} for number in range(2 * MOST_CONFIGS + 1)]
    assert [len(batch) for batch in batches(small)] == [MOST_CONFIGS, MOST_CONFIGS, 1]
    large = {"meta": "x" * (MOST_BYTES // 2)}
    assert [len(batch) for batch in batches([large, large, *small[:3]])] == [1, 4]
    huge = {"meta": "x" * 2 * MOST_BYTES}
    assert list(batches([small[0], huge, small[1]])) == [[small[0]], [huge], [small[1]]]
    assert list(batches([])) == []


def test_a_service_that_takes_less_at_a_time_is_asked_in_smaller_pieces(here):
    configs = [{**SOUND, "name": f"number {number}", "meta": "x" * 300} for number in range(20)]
    configs.insert(3, {**SOUND, "name": "large", "meta": "x" * 9_000})
    write(here, "all.json", configs)
    with serving(Settings(max_body_bytes=5_000)) as url:
        result = pathgate("all.json", "--url", url)
    assert result.exit_code == 2
    assert result.stdout.count("SOUND  number") == 20
    assert "NOT JUDGED  large\n  the body is larger than 5,000 bytes" in result.stdout


def review_line(index: int, count: int, config: dict[str, Any] = SOUND, **more: Any) -> bytes:
    answer = judged(config, read_graph(GRAPH), Settings(), hinges=False)
    return (
        msgspec.json.encode({"index": index, "count": count, "name": config["name"], **answer, **more})
        + b"\n"
    )


LYING: dict[str, Act] = {
    "an HTML page": answering(HTML, media="text/html"),
    "an HTML page as lines": in_chunks(HTML),
    "a document": answering({"reviews": []}),
    "no line": in_chunks(),
    "another count": in_chunks(review_line(0, 1)),
    "one line too few": in_chunks(review_line(0, 2)),
    "a cut line": in_chunks(review_line(0, 2), review_line(1, 2)[:-40]),
    "one line too many": in_chunks(review_line(0, 2), review_line(1, 2), review_line(2, 2)),
    "a cut stream": in_chunks(review_line(0, 2), is_ended=False),
    "a stream that is cut after its last line": in_chunks(
        review_line(0, 2), review_line(1, 2), is_ended=False
    ),
    "a problem with status 200": in_chunks(b'{"type":"/problems/overloaded","status":503}\n'),
    "a verdict against its findings": in_chunks(
        review_line(0, 2), review_line(1, 2).replace(b'"sound"', b'"biased"')
    ),
    "no HTTP": sending(b"hello\n"),
    "a redirect": answering(b"", 302, Location="/"),
    "a refusal": problem(401, retryable=False, slug="unauthorized"),
    "a service that fails": problem(500, retryable=False, slug="internal-error"),
    "a service that is not there": problem(404, retryable=False, slug="not-found"),
}
SLOW: dict[str, Act] = {
    "no answer": stalling_after(b""),
    "a head that drips": dripping(b"HTTP/1.1 200 OK\r\nX: "),
    "a line that drips": dripping(LINES_HEAD + b"\r\n" + review_line(0, 2)),
    "a stream that stalls": stalling_after(LINES_HEAD + b"\r\n" + review_line(0, 2)),
    "a gateway": answering(HTML, 502, "text/html"),
    "a service that stays busy": problem(503, retryable=True, Retry_After="600"),
}


@pytest.mark.parametrize("choice", ["fail", "pass"])
@pytest.mark.parametrize("act", LYING.values(), ids=LYING.keys())
def test_a_service_that_lies_or_refuses_is_exit_2_whatever_the_call_chose(here, act, choice):
    with faulty(act) as server:
        result = pathgate("two.json", "--url", server.url, "--if-unreachable", choice)
    assert result.exit_code == 2
    assert "2 configs found" in result.output
    assert len(server.requests) == 1


@pytest.mark.parametrize("act", SLOW.values(), ids=SLOW.keys())
def test_a_service_out_of_reach_is_exit_2_unless_the_call_lets_it_pass(here, act):
    words = ["two.json", "--timeout", "0.3"]
    with faulty(act) as server:
        assert pathgate(*words, "--url", server.url).exit_code == 2
        assert pathgate(*words, "--url", server.url, "--if-unreachable", "fail").exit_code == 2
        result = pathgate(*words, "--url", server.url, "--if-unreachable", "pass")
    assert result.exit_code == 0
    assert "(--if-unreachable pass)" in result.stdout
    assert "let pass)" in result.stdout.splitlines()[-1]


def test_an_answer_that_is_whole_passes(here):
    """What the lying ones are made from, so that they fail for what they say."""
    with faulty(in_chunks(review_line(0, 2), review_line(1, 2))) as server:
        assert pathgate("two.json", "--url", server.url).exit_code == 0
    assert body_of(server.requests[0]) == {
        "graph": GRAPH,
        "configs": [json.loads((here / "one.json").read_text())] * 2,
        "hinges": True,
    }


@pytest.mark.parametrize("form", FORMS)
def test_that_nobody_judged_is_told_in_every_form(here, form):
    words = ["one.json", "all.json", "--format", form, "--timeout", "0.3", "--if-unreachable", "pass"]
    with faulty(stalling_after(b"")) as server:
        result = pathgate(*words, "--url", server.url)
    assert result.exit_code == 0
    told = result.stdout.replace("\\", "")
    assert "the service is out of reach" in told
    assert "(--if-unreachable pass)" in told
    assert "the call says so: 7." in told
    counted = "7 configs found, 0 reviewed: 0 sound, 0 biased, 0 unanswerable; 7 not judged (7 let pass)."
    assert counted in (result.stderr if form == "json" else told)


def test_machines_are_told_that_nobody_judged(here):
    words = ["one.json", "--timeout", "0.3", "--if-unreachable", "pass"]
    outputs = [word for form in FORMS for word in ("--output", f"{form}=out.{form}")]
    with faulty(stalling_after(b"")) as server:
        pathgate(*words, *outputs, "--url", server.url)
    document = json.loads((here / "out.json").read_text())
    assert document["reviews"][0]["problem"]["title"] == "The service is out of reach"
    assert (document["gate"]["counts"]["let_pass"], document["gate"]["configs"][0]["let_pass"]) == (1, True)
    assert document["gate"]["counts"]["reviewed"] == 0
    log = json.loads((here / "out.sarif").read_text())["runs"][0]
    assert [(each["ruleId"], each["level"]) for each in log["results"]] == [("config-not-judged", "warning")]
    assert log["invocations"][0]["executionSuccessful"] is False
    junit = (here / "out.junit").read_text()
    assert 'errors="0" skipped="1"' in junit
    assert "<skipped" in junit
    page = (here / "out.markdown").read_text()
    assert page.startswith(
        "## Pathgate: no config that was judged falls short, and 1 let pass were not judged\n"
    )


def test_what_was_judged_before_the_service_went_away_stays_judged(here):
    """Two requests are needed; the second never gets an answer."""
    configs = [{**SOUND, "name": f"number {number}"} for number in range(MOST_CONFIGS + 2)]
    configs[0] = {**BIASED, "name": "number 0"}
    write(here, "all.json", configs)
    first = in_chunks(
        *(review_line(place, MOST_CONFIGS, config) for place, config in enumerate(configs[:MOST_CONFIGS]))
    )
    counts = {"fail": (2, "2 not judged."), "pass": (1, "2 not judged (2 let pass).")}
    for choice, (status, said) in counts.items():
        with faulty(first, stalling_after(b"")) as server:
            words = ["--url", server.url, "--timeout", "2", "--if-unreachable", choice]
            result = pathgate("all.json", *words)
        assert result.exit_code == status
        assert result.stdout.splitlines()[-1].startswith(
            f"102 configs found, 100 reviewed: 99 sound, 1 biased, 0 unanswerable; {said}"
        )


@pytest.mark.parametrize("choice", ["fail", "pass"])
def test_what_was_judged_before_the_service_refused_stays_judged(here, choice):
    configs = [{**SOUND, "name": f"number {number}"} for number in range(MOST_CONFIGS + 2)]
    write(here, "all.json", configs)
    lines = (review_line(place, MOST_CONFIGS, config) for place, config in enumerate(configs[:MOST_CONFIGS]))
    with faulty(in_chunks(*lines), problem(401, retryable=False, slug="unauthorized")) as server:
        result = pathgate("all.json", "--url", server.url, "--if-unreachable", choice)
    assert result.exit_code == 2
    assert result.stdout.count("NOT JUDGED  number 10") == 2
    assert result.stdout.count("  said unauthorized") == 2


@pytest.mark.parametrize(
    "pointer", ["", "#", "nowhere", "#/configs/0/~9/x", "#/graph/nodes/99", "#/configs/\x1b[31m"]
)
def test_a_problem_that_points_nowhere_is_one_config_that_is_not_judged(here, pointer):
    errors = [{"pointer": pointer, "detail": "said so"}]
    document = {
        "type": "/problems/x",
        "title": "T",
        "status": 422,
        "detail": "d",
        "retryable": False,
        "errors": errors,
    }
    line = {"index": 0, "count": 1, "name": SOUND["name"], "problem": document}
    for form in FORMS:
        with faulty(in_chunks(msgspec.json.encode(line) + b"\n")) as server:
            result = pathgate("one.json", "--url", server.url, "--format", form)
        assert result.exit_code == 2
        assert "said so" in result.output
        assert "1 config found, 0 reviewed" in result.output
        assert "\x1b" not in result.output


def test_an_unreadable_file_does_not_pass_because_the_service_is_out_of_reach(here):
    write(here, "broken.json", "{")
    words = ["one.json", "broken.json", "--timeout", "0.3", "--if-unreachable", "pass"]
    with faulty(stalling_after(b"")) as server:
        assert pathgate(*words, "--url", server.url).exit_code == 2


def test_no_baseline_is_written_of_what_nobody_judged(here):
    words = ["one.json", "--timeout", "0.3", "--if-unreachable", "pass", "--write-baseline", "known.json"]
    with faulty(stalling_after(b"")) as server:
        result = pathgate(*words, "--url", server.url)
    assert not (here / "known.json").exists()
    assert "The baseline was not written" in result.stdout


def test_a_flapping_service_is_asked_again_until_it_answers(here, fakes):
    acts = [hanging_up, problem(503, retryable=True, Retry_After="4"), in_chunks(review_line(0, 1))]
    with faulty(*acts) as server:
        judge = remote_judge(fakes.client(server.url), lets_pass=False)
        run = review_files(Question(Path("graph.json"), (Path("one.json"),)), Settings(), judging=judge)
    assert (run.exit_status, run.counts.verdicts["sound"]) == (0, 1)
    assert fakes.slept == [0.125, 4.25]


def test_nobody_there_is_nothing_judged(here, fakes):
    asked = Question(Path("graph.json"), (Path("one.json"), Path("all.json")))
    run = review_files(asked, Settings(), judging=remote_judge(fakes.client(nobody_at()), lets_pass=False))
    assert (run.exit_status, run.counts.skipped) == (2, 7)
    assert run.problem["title"] == "The service is out of reach"
    run = review_files(asked, Settings(), judging=remote_judge(fakes.client(nobody_at()), lets_pass=True))
    assert (run.exit_status, run.counts.let_pass, run.counts.reviewed) == (0, 7, 0)


def test_no_config_is_no_pass_either(here, fakes):
    (here / "empty").mkdir()
    run = review_files(
        Question(Path("graph.json"), (Path("empty"),)),
        Settings(),
        judging=remote_judge(Client(nobody_at()), lets_pass=True),
    )
    assert run.exit_status == 2


@pytest.mark.parametrize(
    ("words", "says"),
    [
        (["--timeout", "3"], "--timeout needs a --url"),
        (["--if-unreachable", "pass"], "--if-unreachable needs a --url"),
        (["--url", "gate.parcels.invalid"], "no address of a service"),
        (["--url", "http://gate", "--timeout", "0"], "timeout"),
        (["--url", "http://gate", "--if-unreachable", "ignore"], "ignore"),
    ],
)
def test_a_call_that_means_nothing_is_refused(here, words, says):
    result = pathgate("one.json", *words)
    assert result.exit_code == 2
    assert says in result.stderr
    assert result.stdout == ""


def test_a_token_comes_from_the_environment_and_is_not_shown(here, monkeypatch):
    monkeypatch.setenv("PATHGATE_TOKEN", "hush-hush")
    with faulty(problem(403, retryable=False, slug="forbidden")) as server:
        result = pathgate("one.json", "--url", server.url)
    assert b"Authorization: Bearer hush-hush" in server.requests[0]
    assert "hush" not in result.output
    monkeypatch.setenv("PATHGATE_TOKEN", "hush\nhush")
    result = pathgate("one.json", "--url", server.url)
    assert result.exit_code == 2
    assert "hush" not in result.output
