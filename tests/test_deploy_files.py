"""The image, the compose file and the server agree with each other, and the commands can be run."""

from __future__ import annotations

import os
import re
from pathlib import Path
from typing import Any

import pytest
from ruamel.yaml import YAML

from pathgate.web.serving import gunicorn_options

ROOT = Path(__file__).resolve().parents[1]
DOCKERFILE = (ROOT / "deploy" / "Dockerfile").read_text()


@pytest.fixture
def service() -> Any:
    return YAML(typ="safe").load(ROOT / "deploy" / "compose.yaml")["services"]["pathgate"]


def test_a_stop_waits_longer_than_the_server_needs_for_its_last_answers(service: Any):
    seconds = int(service["stop_grace_period"].removesuffix("s"))
    assert seconds > gunicorn_options("0.0.0.0:8080", 2)["graceful_timeout"]


def test_compose_publishes_the_image_s_port_on_this_machine_alone(service: Any):
    exposed = re.findall(r"^EXPOSE (\d+)$", DOCKERFILE, re.MULTILINE)
    assert [port.rsplit(":", 1)[1] for port in service["ports"]] == exposed
    assert all(port.startswith("127.0.0.1:") for port in service["ports"])


def test_compose_builds_from_the_dockerfile(service: Any):
    context = ROOT / "deploy" / service["build"]["context"]
    assert (context / service["build"]["dockerfile"]).resolve() == ROOT / "deploy" / "Dockerfile"


def test_what_the_image_copies_is_let_through_to_the_builder():
    allowed = {line[1:] for line in (ROOT / ".dockerignore").read_text().splitlines() if line.startswith("!")}
    copied = re.findall(r"^COPY (?!--from)(.+) \S+$", DOCKERFILE, re.MULTILINE)
    sources = {source for words in copied for source in words.split()}
    assert sources == allowed
    assert all((ROOT / source).exists() for source in sources)


@pytest.mark.parametrize("command", ["deploy/run", "deploy/test", "deploy/bench", "deploy/lock", ".ci/run"])
def test_the_commands_are_executable(command: str):
    assert os.access(ROOT / command, os.X_OK)
