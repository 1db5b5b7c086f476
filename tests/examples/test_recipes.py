"""The recipes of deploy/examples, each run as its first lines say: none ever lets pass what is short or not judged."""

from __future__ import annotations

import os
import re
import runpy
import shutil
import socket
import sqlite3
import subprocess
import sys
from pathlib import Path
from xml.etree import ElementTree as ET

import msgspec
import pytest

from tests.examples.conftest import EXAMPLES

pytestmark = [pytest.mark.system, pytest.mark.xdist_group("recipes")]

SOUND = "configs/late-pick-up-refunds.yaml"
BIASED = "drafts/refunds-among-tickets.yaml"
UNKNOWN_COLUMN = "name: lost\ntreatment: late_pick_up\noutcome: refund\ncovariates: [tide]\n"


@pytest.fixture
def parcels(tmp_path):
    """A copy of the example's folder."""
    return Path(shutil.copytree(EXAMPLES / "parcels", tmp_path / "parcels"))


def run(*words, cwd, environment):
    return subprocess.run(
        [str(word) for word in words],
        cwd=cwd,
        env=environment,
        capture_output=True,
        text=True,
        check=False,
        timeout=120,
    )


def test_the_readme_lists_every_recipe_and_the_shell_s_can_be_run():
    readme = (EXAMPLES.parents[1] / "README.md").read_text("utf-8")
    section = readme[readme.index("## In a pipeline") :].split("\n## ")[0]
    listed = re.findall(r"^\| `([^`]+)` \|", section, re.MULTILINE)
    assert sorted(listed) == sorted(path.name for path in EXAMPLES.iterdir() if path.is_file())
    assert all(os.access(EXAMPLES / name, os.X_OK) for name in ("ci.sh", "pre-commit"))


# --- the step of a load


@pytest.fixture
def step(parcels, environment):
    """Runs the step; its exit status, what it said, and the rows that are in the warehouse then."""
    numbers, warehouse = parcels / "numbers.csv", parcels / "warehouse.db"
    numbers.write_text("metric,day,value\nrefund_uplift,2026-03-01,0.21\nrefund_uplift,2026-03-02,0.2\n")

    def run_step(url, config):
        words = ["load_step.py", url, parcels / "graph.yaml", parcels / config, numbers, warehouse]
        done = run(sys.executable, *words, cwd=EXAMPLES, environment=environment)
        if not warehouse.exists():
            return done.returncode, done.stderr, []
        with sqlite3.connect(warehouse) as connection:
            return done.returncode, done.stderr, connection.execute("SELECT * FROM published").fetchall()

    return run_step


def test_a_sound_config_s_numbers_are_loaded(step, service_url):
    rows = [("refund_uplift", "2026-03-01", 0.21), ("refund_uplift", "2026-03-02", 0.2)]
    assert step(service_url, SOUND) == (0, "", rows)


def test_a_biased_config_stops_the_load(step, service_url):
    status, said, rows = step(service_url, BIASED)
    assert (status, rows) == (1, [])
    assert "filter-on-collider" in said


def test_what_cannot_be_judged_stops_the_load(step, service_url, parcels):
    (parcels / "lost.yaml").write_text(UNKNOWN_COLUMN)
    status, said, rows = step(service_url, "lost.yaml")
    assert (status, rows) == (2, [])
    assert "not loaded" in said


@pytest.mark.slow
def test_a_service_that_is_away_stops_the_load(step):
    with socket.create_server(("127.0.0.1", 0)) as server:
        url = f"http://127.0.0.1:{server.getsockname()[1]}"
    status, _said, rows = step(url, SOUND)
    assert (status, rows) == (2, [])


def test_rows_that_are_no_numbers_load_none_of_them(step, service_url, parcels):
    (parcels / "configs" / "ours.yaml").write_bytes((parcels / SOUND).read_bytes())
    (parcels / "numbers.csv").write_text(
        "metric,day,value\nrefund_uplift,2026-03-01,0.21\nrefund_uplift,,x\n"
    )
    status, _said, rows = step(service_url, "configs/ours.yaml")
    assert (status, rows) == (2, [])


# --- the job of a CI


def job(parcels, environment):
    return run("sh", EXAMPLES / "ci.sh", parcels, "out/reports", cwd="/", environment=environment)


def reports(parcels):
    folder = parcels / "out" / "reports"
    log_run = msgspec.json.decode((folder / "pathgate.sarif").read_bytes())["runs"][0]
    cases = list(ET.parse(folder / "pathgate.xml").getroot().iter("testcase"))  # noqa: S314 - our own
    return log_run, cases, (folder / "pathgate.md").read_text("utf-8")


def test_a_job_over_sound_configs_passes_and_leaves_its_reports(parcels, environment):
    done = job(parcels, environment)
    assert (done.returncode, done.stderr) == (0, "")
    log_run, cases, markdown = reports(parcels)
    assert [each for each in log_run["results"] if each["level"] == "error"] == []
    assert [case.get("name") for case in cases] == ["late-pick-up-refunds"]
    assert "late-pick-up-refunds" in markdown


def test_a_job_fails_over_a_biased_config_and_its_reports_say_where(parcels, environment):
    shutil.copy(parcels / BIASED, parcels / "configs")
    assert job(parcels, environment).returncode == 1
    log_run, cases, _markdown = reports(parcels)
    (error,) = (each for each in log_run["results"] if each["level"] == "error")
    place = error["locations"][0]["physicalLocation"]
    assert error["ruleId"] == "filter-on-collider"
    assert place["artifactLocation"]["uri"] == "configs/refunds-among-tickets.yaml"
    assert place["region"]["startLine"] == 9
    assert [case.get("name") for case in cases if case.find("failure") is not None] == [
        "refunds-among-tickets"
    ]


@pytest.mark.parametrize("spoil", ["unknown column", "no config", "no graph"])
def test_a_job_that_could_not_judge_ends_with_2(parcels, environment, spoil):
    match spoil:
        case "unknown column":
            (parcels / "configs" / "lost.yaml").write_text(UNKNOWN_COLUMN)
        case "no config":
            (parcels / SOUND).unlink()
        case "no graph":
            (parcels / "graph.yaml").unlink()
    assert job(parcels, environment).returncode == 2


def test_a_job_in_a_folder_that_is_not_there_ends_with_2(parcels, environment):
    assert job(parcels / "elsewhere", environment).returncode == 2


# --- the hook


@pytest.fixture
def repository(parcels, environment):
    """A git repository with the example's folder committed, and the hook installed."""

    def git(*words):
        named = ["-c", "user.name=Refunds", "-c", "user.email=refunds@parcels.invalid"]
        return run("git", *named, *words, cwd=parcels, environment=environment)

    assert git("init", "--quiet").returncode == 0
    hooks = parcels / ".git" / "hooks"
    hooks.mkdir(exist_ok=True)
    shutil.copy(EXAMPLES / "pre-commit", hooks)
    git("add", ".")
    committed = git("commit", "--quiet", "--message", "begin")
    assert committed.returncode == 0, committed.stderr
    return git


def test_a_commit_with_a_biased_config_is_refused(repository, parcels):
    shutil.copy(parcels / BIASED, parcels / "configs")
    repository("add", "configs")
    refused = repository("commit", "--message", "more")
    assert refused.returncode != 0
    assert "filter-on-collider" in refused.stdout + refused.stderr
    assert "ended with 1" in refused.stderr
    assert repository("rev-list", "--count", "HEAD").stdout.strip() == "1"


def test_a_commit_is_judged_by_what_is_staged(repository, parcels):
    (parcels / "configs" / "mended.yaml").write_bytes((parcels / BIASED).read_bytes())
    repository("add", "configs")
    # Mended in the folder alone: what would be committed is still biased …
    (parcels / "configs" / "mended.yaml").write_bytes((parcels / SOUND).read_bytes())
    assert repository("commit", "--message", "more").returncode != 0
    repository("add", "configs")
    # … and spoilt in the folder alone, it is sound.
    (parcels / "configs" / "mended.yaml").write_bytes((parcels / BIASED).read_bytes())
    assert repository("commit", "--message", "more").returncode == 0


def test_a_commit_that_cannot_be_judged_is_refused(repository, parcels):
    (parcels / "configs" / "lost.yaml").write_text(UNKNOWN_COLUMN)
    repository("add", "configs")
    refused = repository("commit", "--message", "more")
    assert refused.returncode != 0
    assert "ended with 2" in refused.stderr


# --- the task of an orchestrator


@pytest.fixture(scope="module")
def task():
    """What the recipe defines."""
    return runpy.run_path(str(EXAMPLES / "gate_task.py"))


@pytest.fixture
def ending(tmp_path):
    """A command that ends with each of some statuses in turn, and a way to tell how often it was run."""
    count = tmp_path / "count"

    def command(*statuses):
        count.write_text("0")
        program = (
            "import pathlib, sys\n"
            f"path, statuses = pathlib.Path({str(count)!r}), {statuses!r}\n"
            "turn = int(path.read_text())\n"
            "path.write_text(str(turn + 1))\n"
            "print('turn', turn)\n"
            "sys.exit(statuses[turn])\n"
        )
        return [sys.executable, "-c", program]

    command.runs = lambda: int(count.read_text())
    return command


def test_a_task_passes_where_the_command_does_after_pauses_that_grow(task, ending):
    pauses = []
    task["gate"](ending(2, 2, 0), pause=pauses.append)
    assert (pauses, ending.runs()) == ([5, 10], 3)


def test_a_task_never_tries_again_what_falls_short(task, ending):
    pauses = []
    with pytest.raises(task["FallsShort"], match="turn 1"):
        task["gate"](ending(2, 1, 0), pause=pauses.append)
    assert (pauses, ending.runs()) == ([5], 2)


def test_a_task_gives_up_on_what_is_never_judged(task, ending):
    with pytest.raises(task["NotJudged"], match="turn 2"):
        task["gate"](ending(2, 2, 2, 0), pause=lambda _seconds: None)
    assert ending.runs() == 3


@pytest.mark.parametrize("status", [3, 126, 130])
def test_a_status_that_the_command_does_not_have_is_no_pass(task, ending, status):
    with pytest.raises(task["NotJudged"], match=str(status)):
        task["gate"](ending(status, 0), pause=lambda _seconds: None)
    assert ending.runs() == 1


def test_a_command_that_does_not_end_judged_nothing(task, tmp_path):
    # It waits for a writer that never comes.
    waiting = f"import os; os.mkfifo({str(tmp_path / 'pipe')!r}); open({str(tmp_path / 'pipe')!r})"
    with pytest.raises(task["NotJudged"], match="no end within"):
        task["gate"]([sys.executable, "-c", waiting], tries=1, seconds_per_try=0.5)


def test_a_task_waits_for_a_graph_that_is_not_there_yet(task, parcels, environment):
    graph = parcels / "graph.yaml"
    later = graph.rename(parcels / "later.yaml")
    command = [shutil.which("pathgate", path=environment["PATH"]), "review", graph, parcels / SOUND]
    task["gate"]([str(word) for word in command], pause=lambda _seconds: later.rename(graph))
    assert graph.exists()


@pytest.mark.parametrize(("config", "falls_short"), [(SOUND, False), (BIASED, True)])
def test_a_task_waits_for_a_service_that_is_not_there_yet(
    task, parcels, environment, service_url, config, falls_short
):
    pathgate = shutil.which("pathgate", path=environment["PATH"])
    with socket.create_server(("127.0.0.1", 0)) as server:
        nowhere = f"http://127.0.0.1:{server.getsockname()[1]}"
    # The address is read from a file, as where a service is found by its name.
    address = parcels / "address"
    address.write_text(nowhere)
    script = f'exec {pathgate} review --timeout 20 --url "$(cat {address})" {parcels / "graph.yaml"} {parcels / config}'
    pauses = []

    def pause(seconds):
        pauses.append(seconds)
        address.write_text(service_url)

    if falls_short:
        with pytest.raises(task["FallsShort"], match="filter-on-collider"):
            task["gate"](["sh", "-c", script], pause=pause)
    else:
        task["gate"](["sh", "-c", script], pause=pause)
    assert pauses == [5]


@pytest.mark.parametrize(("config", "status"), [(SOUND, 0), (BIASED, 1)])
def test_the_task_as_a_program_ends_as_the_command_does(parcels, environment, config, status):
    words = ["gate_task.py", "pathgate", "review", parcels / "graph.yaml", parcels / config]
    assert run(sys.executable, *words, cwd=EXAMPLES, environment=environment).returncode == status


def test_the_task_without_its_command_is_not_judged(environment):
    words = ["gate_task.py", "no-such-command"]
    assert run(sys.executable, *words, cwd=EXAMPLES, environment=environment).returncode == 2
