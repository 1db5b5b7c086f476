"""How the command speaks: documents on standard output, everything else as single lines on standard error."""

from __future__ import annotations

import os
import shutil
import sys
from typing import TYPE_CHECKING, TextIO

import click

if TYPE_CHECKING:
    from pathgate.web.settings import Settings

_NARROWEST, _WIDEST = 40, 110


def say(text: str) -> None:
    """One line on standard error, under the command's name; nothing in it can steer a terminal."""
    line = " ".join(text.split())
    if not line.isprintable():
        from pathgate.review.visible import visible  # noqa: PLC0415 - its package is heavy, and this is rare

        line = visible(line)
    click.echo(f"pathgate: {line}", err=True)


def write(content: bytes) -> None:
    """Write to standard output. A reader that has gone away changes nothing about the verdicts."""
    try:
        sys.stdout.buffer.write(content)
        sys.stdout.buffer.flush()
    except BrokenPipeError:
        # What is left in the buffer must not fail once more when the process ends.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())


def write_text(text: str) -> None:
    """Write a text to standard output. A terminal that has no arrows gets their numbers, not an error."""
    write(text.encode(sys.stdout.encoding or "utf-8", "backslashreplace"))


def text_width() -> int | None:
    """Where lines for people break; None where no terminal shows them."""
    if not sys.stdout.isatty():
        return None
    return max(_NARROWEST, min(_WIDEST, shutil.get_terminal_size().columns))


def takes_colour(stream: TextIO) -> bool:
    """Does it go to a terminal that colours, and to somebody who wants that?"""
    return stream.isatty() and not os.environ.get("NO_COLOR") and os.environ.get("TERM") != "dumb"


def settings_in_force() -> Settings:
    """The limits that the environment sets.

    Raises:
        click.ClickException: they cannot be used.
    """
    from pathgate.web.settings import InvalidSettings, Settings  # noqa: PLC0415 - not for --help

    try:
        return Settings.from_environment(os.environ)
    except InvalidSettings as error:
        raise click.ClickException("; ".join(error.faults)) from None
