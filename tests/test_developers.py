"""What DEVELOPERS.md says of the rooms of the package is so: every module has its place there, and no other word."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[1]
PACKAGE = ROOT / "service" / "pathgate"


@pytest.fixture
def developers() -> str:
    return (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")


def test_the_rooms_of_a_review_are_the_modules_that_there_are(developers):
    block = re.search(r"## Rooms of `review/`\n\n```\n(.*?)```", developers, re.DOTALL)
    assert block is not None
    modules = {path.stem for path in (PACKAGE / "review").glob("*.py")} - {"__init__"}
    # The first ten letters of a line name the room; a star stands for what goes on like that.
    told = set(re.findall(r"[a-z_]+\*?", "\n".join(line[10:] for line in block[1].splitlines())))
    patterns = {word for word in told if word.endswith("*")}
    assert patterns == {"formula_*"}
    assert modules - told == {name for name in modules if name.startswith("formula_")}
    assert {word for word in told if "_" in word} - patterns <= modules


def test_every_file_that_is_named_is_there(developers):
    named = set(re.findall(r"`((?:[a-z_]+/)+[a-z_]*(?:\.[a-z]+)?)`", developers))
    assert len(named) > 15
    for name in named:
        assert any((base / name).exists() for base in (ROOT, PACKAGE)), name
