"""When the command colours what it writes, and how wide it is."""

from __future__ import annotations

import io

import pytest

from pathgate.cli.terminal import takes_colour


class Stream(io.StringIO):
    def __init__(self, *, is_terminal: bool) -> None:
        super().__init__()
        self.is_terminal = is_terminal

    def isatty(self) -> bool:
        return self.is_terminal


@pytest.mark.parametrize(
    ("is_terminal", "environment", "coloured"),
    [
        (True, {}, True),
        (True, {"NO_COLOR": ""}, True),
        (True, {"NO_COLOR": "1"}, False),
        (True, {"NO_COLOR": "0"}, False),
        (True, {"TERM": "dumb"}, False),
        (False, {}, False),
    ],
)
def test_only_a_terminal_is_coloured_and_only_where_nobody_objects(
    monkeypatch, is_terminal, environment, coloured
):
    for name in ("NO_COLOR", "TERM"):
        monkeypatch.delenv(name, raising=False)
    for name, said in environment.items():
        monkeypatch.setenv(name, said)
    assert takes_colour(Stream(is_terminal=is_terminal)) == coloured
