"""The image is built as its Dockerfile says and does its job with no rights: without a container daemon.

Debian's buildah and podman build and run it, both bases are made here from Debian's packages (no image
registry is asked), and everything lies in a temporary folder. The container has no network of its own but a
loopback, so requests are made inside it, with the Python that the image carries.
"""

from __future__ import annotations

import json
import os
import shutil
import subprocess
import time
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

pytestmark = [pytest.mark.full, pytest.mark.system, pytest.mark.xdist_group("container")]

ROOT = Path(__file__).resolve().parents[2]
TOOLS = ("buildah", "podman", "runc", "mmdebstrap")
IMAGE = "localhost/pathgate:test"
BASES = {"build": "python3,python3-venv,ca-certificates", "run": "python3"}
ASK = """
import http.client, sys
connection = http.client.HTTPConnection("127.0.0.1", 8080, timeout=5)
body = sys.stdin.buffer.read()
method, path = sys.argv[1:]
connection.request(method, path, body or None, {"Content-Type": "application/json"} if body else {})
answer = connection.getresponse()
print(answer.status)
print(answer.read().decode())
"""
GRAPH = {
    "nodes": ["weather", "late_pick_up", "refund"],
    "edges": [
        {"source": "weather", "target": "late_pick_up"},
        {"source": "weather", "target": "refund"},
        {"source": "late_pick_up", "target": "refund"},
    ],
}


class Engine:
    """buildah and podman with storage and settings of their own."""

    def __init__(self, folder: Path) -> None:
        self.folder = folder
        storage = folder / "storage.conf"
        storage.write_text(
            f'[storage]\ndriver = "overlay"\ngraphroot = "{folder}/graph"\nrunroot = "{folder}/run"\n'
        )
        containers = folder / "containers.conf"
        containers.write_text(
            '[containers]\ndefault_ulimits = ["nofile=1024:1024", "nproc=1024:1024"]\n'
            'log_driver = "k8s-file"\n[engine]\n'
            'cgroup_manager = "cgroupfs"\nruntime = "runc"\nevents_logger = "file"\n'
        )
        self.environment = {
            **os.environ,
            "CONTAINERS_STORAGE_CONF": str(storage),
            "CONTAINERS_CONF": str(containers),
        }

    def run(self, *words: str, stdin: str = "", check: bool = True) -> subprocess.CompletedProcess[str]:
        """Run a command to its end; a failing one is shown with all it said."""
        done = subprocess.run(
            words,
            env=self.environment,
            cwd=ROOT,
            input=stdin,
            capture_output=True,
            text=True,
            check=False,
            timeout=600,
        )
        assert done.returncode == 0 or not check, f"{' '.join(words)}\n{done.stdout}\n{done.stderr}"
        return done

    def make_base(self, name: str) -> None:
        """A Debian with this Python and nothing else, as an image ``localhost/base:<name>``."""
        archive = self.folder / f"{name}.tar"
        paths = [f"--dpkgopt=path-exclude=/usr/share/{each}/*" for each in ("doc", "man", "locale")]
        recommends = '--aptopt=APT::Install-Recommends "false"'
        include = f"--include={BASES[name]}"
        self.run(
            "mmdebstrap", "--quiet", "--variant=minbase", include, recommends, *paths, "trixie", str(archive)
        )
        self.run("podman", "import", str(archive), f"localhost/base:{name}")
        archive.unlink()

    def build(self) -> None:
        """The image, with the machine's certificates and pip settings as build secrets where it has some."""
        secrets = []
        for name, path in (("ca", "/etc/ssl/certs/ca-certificates.crt"), ("pip", "/etc/pip.conf")):
            if Path(path).exists():
                secrets += ["--secret", f"id={name},src={path}"]
        bases = [
            word for name in BASES for word in ("--build-arg", f"{name.upper()}_IMAGE=localhost/base:{name}")
        ]
        options = ["--isolation", "chroot", "--format", "docker", "--pull-never", "--tag", IMAGE]
        self.run("buildah", "bud", *options, *bases, *secrets, "--file", "deploy/Dockerfile", ".")

    def remove(self) -> None:
        """Every container, image and mount that was made, and the folder."""
        self.run("podman", "rm", "--all", "--force", "--time", "5", check=False)
        self.run("podman", "rmi", "--all", "--force", check=False)
        self.run("umount", f"{self.folder}/graph/overlay", check=False)
        shutil.rmtree(self.folder, ignore_errors=True)


class Container:
    """A running container, asked from inside."""

    def __init__(self, engine: Engine, name: str) -> None:
        self.engine = engine
        self.name = name

    def python(self, code: str, *words: str, stdin: str = "", check: bool = True) -> Any:
        """Run code with the image's Python inside the container."""
        command = ("podman", "exec", "--interactive", self.name, "python", "-c", code, *words)
        return self.engine.run(*command, stdin=stdin, check=check)

    def ask(self, method: str, path: str, body: object = None) -> tuple[int, Any]:
        """One request: the status and the JSON of the answer."""
        written = "" if body is None else json.dumps(body)
        status, answer = self.python(ASK, method, path, stdin=written).stdout.split("\n", 1)
        return int(status), json.loads(answer)

    def inspect(self, template: str) -> str:
        return self.engine.run("podman", "inspect", self.name, "--format", template).stdout.strip()

    def process_status(self) -> dict[str, str]:
        """What the kernel says of the container's first process."""
        lines = Path("/proc", self.inspect("{{.State.Pid}}"), "status").read_text().splitlines()
        return {name: " ".join(rest.split()) for name, _, rest in (line.partition(":") for line in lines)}

    def wait_until_ready(self) -> None:
        give_up = time.monotonic() + 30
        while self.python(ASK, "GET", "/readyz", check=False).stdout[:3] != "200":
            assert self.inspect("{{.State.Running}}") == "true", self.logs()
            assert time.monotonic() < give_up, self.logs()

    def logs(self) -> str:
        said = self.engine.run("podman", "logs", self.name, check=False)
        return said.stdout + said.stderr


def install_tools() -> None:
    if all(shutil.which(tool) for tool in TOOLS):
        return
    assert os.geteuid() == 0, (
        f"{', '.join(TOOLS)} are needed: install Debian's packages of these names as root"
    )
    for command in (["update"], ["install", "-y", "--no-install-recommends", *TOOLS]):
        subprocess.run(["apt-get", *command], check=True, capture_output=True, timeout=300)


@pytest.fixture(scope="module")
def engine(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Engine]:
    install_tools()
    made = Engine(tmp_path_factory.mktemp("containers"))
    try:
        for name in BASES:
            made.make_base(name)
        made.build()
        yield made
    finally:
        made.remove()


@pytest.fixture
def container(engine: Engine) -> Iterator[Container]:
    rights = ["--read-only", "--read-only-tmpfs=false", "--cap-drop=ALL", "--security-opt=no-new-privileges"]
    bounds = ["--memory=256m", "--pids-limit=64", "--tmpfs=/tmp:rw,size=16m,mode=1777,noexec"]
    running = Container(engine, "pathgate-test")
    options = ["--detach", "--name", running.name, "--network=none", "--no-healthcheck"]
    engine.run("podman", "run", *options, *rights, *bounds, IMAGE)
    try:
        running.wait_until_ready()
        yield running
    finally:
        engine.run("podman", "rm", "--force", running.name)


def test_it_reviews_a_config_with_a_read_only_root_and_no_rights(container: Container):
    config = {"treatment": ["late_pick_up"], "outcome": ["refund"], "covariates": []}
    status, answer = container.ask("POST", "/v1/review", {"graph": GRAPH, "config": config})
    assert (status, answer["verdict"]) == (200, "biased")
    config["covariates"] = ["weather"]
    status, answer = container.ask("POST", "/v1/review", {"graph": GRAPH, "config": config})
    assert (status, answer["verdict"]) == (200, "sound")

    process = container.process_status()
    assert process["Uid"] == "10001 10001 10001 10001"
    assert process["Gid"] == "10001 10001 10001 10001"
    assert int(process["CapEff"], 16) == 0
    assert process["NoNewPrivs"] == "1"
    refused = container.python("open('/opt/pathgate/probe', 'w')", check=False)
    assert "Read-only file system" in refused.stderr


def test_the_image_says_how_its_health_is_asked_for(container: Container):
    health = json.loads(
        container.engine.run("podman", "inspect", IMAGE, "--format", "{{json .HealthCheck.Test}}").stdout
    )
    assert health[0] == "CMD"
    container.engine.run("podman", "exec", container.name, *health[1:])


def test_a_stop_ends_it_with_status_zero(container: Container):
    container.engine.run("podman", "stop", "--time", "25", container.name)
    assert container.inspect("{{.State.ExitCode}}") == "0", container.logs()
