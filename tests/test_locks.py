"""The lock files hold what pyproject.toml asks for, with hashes, for every Python served, and no address."""

from __future__ import annotations

import re
import tomllib
from functools import cache
from pathlib import Path

import pytest
from packaging.requirements import Requirement
from packaging.utils import canonicalize_name

ROOT = Path(__file__).resolve().parents[1]
RUNTIME, BUILD, TEST = "requirements.txt", "requirements-build.txt", "requirements-test.txt"
SPARK = "requirements-spark.txt"
PYTHONS = ("3.11", "3.12", "3.13", "3.14")


@cache
def entries(lock: str) -> tuple[str, ...]:
    """The lines of a lock file, those continued by a backslash joined."""
    written = (ROOT / "deploy" / lock).read_text().replace("\\\n", " ")
    return tuple(line.strip() for line in written.splitlines() if line.strip())


def pins(lock: str, python: str) -> dict[str, str]:
    """Package → version that the file installs under a Python on Linux."""
    environment = {"python_version": python, "python_full_version": f"{python}.0", "sys_platform": "linux"}
    found = {}
    for entry in entries(lock):
        requirement = Requirement(entry.split(" --hash=")[0])
        if requirement.marker is None or requirement.marker.evaluate(environment):
            found[canonicalize_name(requirement.name)] = str(requirement.specifier).removeprefix("==")
    return found


def asked_for() -> dict[str, list[str]]:
    """Lock file → the requirements that pyproject.toml states for it."""
    project = tomllib.loads((ROOT / "pyproject.toml").read_text())
    runtime, build = project["project"]["dependencies"], project["build-system"]["requires"]
    groups = project["dependency-groups"]
    return {RUNTIME: runtime, BUILD: build, TEST: runtime + build + groups["test"], SPARK: groups["spark"]}


@pytest.mark.parametrize("lock", [RUNTIME, BUILD, TEST, SPARK])
def test_every_entry_is_one_version_with_hashes_and_nothing_else(lock: str):
    assert entries(lock)
    for entry in entries(lock):
        assert re.fullmatch(r"[a-z0-9-]+==[^\s;]+( ; [^:/@]+?)?(\s+--hash=sha256:[0-9a-f]{64})+", entry), (
            entry
        )


@pytest.mark.parametrize("lock", [RUNTIME, BUILD, TEST, SPARK])
@pytest.mark.parametrize("python", PYTHONS)
def test_what_the_project_asks_for_is_locked_within_its_bounds(lock: str, python: str):
    locked = pins(lock, python)
    for requirement in map(Requirement, asked_for()[lock]):
        version = locked.get(canonicalize_name(requirement.name))
        assert version, f"{requirement.name} is not locked: run deploy/lock"
        assert requirement.specifier.contains(version, prereleases=True), requirement.name


@pytest.mark.parametrize("python", PYTHONS)
def test_the_tests_run_on_the_very_versions_that_are_served(python: str):
    tested = pins(TEST, python).items()
    assert pins(RUNTIME, python).items() <= tested
    assert pins(BUILD, python).items() <= tested


@pytest.mark.parametrize("python", PYTHONS)
def test_spark_s_packages_are_beside_those_of_the_tests_and_change_none(python: str):
    assert not pins(SPARK, python).keys() & pins(TEST, python).keys()
