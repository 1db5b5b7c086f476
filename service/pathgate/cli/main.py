"""The command ``pathgate``: its words, and how each way of failing ends.

Whatever goes wrong is one clear line on standard error. Only what a command needs is imported, and only when
it runs, so that ``pathgate --help`` answers at once.
"""

from __future__ import annotations

import os
import shutil
import sys
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

if TYPE_CHECKING:
    from pathgate.cli.reviewing import Outcome
    from pathgate.web.settings import Settings

FAILED = 2
INTERRUPTED = 130

_NARROWEST, _WIDEST = 40, 110


class _Command(click.Group):
    """A group whose every end is a status and at most one line, never a traceback."""

    def main(self, *args: Any, **extra: Any) -> Any:
        run: Any = super().main
        if not extra.pop("standalone_mode", True):
            return run(*args, standalone_mode=False, **extra)
        try:
            status = run(*args, standalone_mode=False, **extra)
        except click.Abort:
            status = INTERRUPTED
        except Exception as error:
            status = _say_error(error)
        sys.exit(status if isinstance(status, int) else 0)


def _say_error(error: Exception) -> int:
    """Say what went wrong; the exit status that goes with it."""
    match error:
        case click.exceptions.NoArgsIsHelpError():
            error.show()
            return error.exit_code
        case click.UsageError():
            path = error.ctx.command_path if error.ctx else "pathgate"
            _say(f"{error.format_message()} (see {path} --help)")
            return error.exit_code
        case click.ClickException():
            _say(error.format_message())
        case OSError():
            _say(str(error))
        case _:
            _say(f"failed by a fault of its own, not of the input: {type(error).__name__}: {error}")
    return FAILED


@click.group(cls=_Command, context_settings={"help_option_names": ["-h", "--help"]})
@click.option(
    "--version",
    is_flag=True,
    is_eager=True,
    expose_value=False,
    callback=lambda context, _option, asked: _show_version(context) if asked else None,
    help="Show the version and exit.",
)
def main() -> None:
    """Says whether the number a model config reports is the effect it is read as, from your causal graph."""


@main.command()
@click.option(
    "--bind", default="127.0.0.1:8080", show_default=True, metavar="HOST:PORT", help="Where to listen."
)
@click.option(
    "--workers", default=2, show_default=True, type=click.IntRange(1, 1000), help="How many processes."
)
def serve(bind: str, workers: int) -> None:
    """Run the service until a signal ends it. Limits come from PATHGATE_... variables; /version shows them."""
    from pathgate.cli.listening import check_bind  # noqa: PLC0415
    from pathgate.web.serving import serve as run  # noqa: PLC0415

    check_bind(bind)
    _settings()
    run(bind, workers)


@main.command()
@click.argument("graph", metavar="GRAPH", type=click.Path(path_type=Path))
@click.argument("configs", metavar="CONFIG...", nargs=-1, required=True, type=click.Path(path_type=Path))
@click.option(
    "--format",
    "form",
    type=click.Choice(["text", "json"]),
    default="text",
    show_default=True,
    help="Text for people, or one JSON document with the counts on standard error.",
)
@click.option(
    "--hinges",
    is_flag=True,
    help="In JSON too, say what sound verdicts hinge on; text always shows some of it.",
)
def review(graph: Path, configs: Sequence[Path], form: str, hinges: bool) -> int:  # noqa: FBT001 - click's call
    """Review model configs against a causal graph, in this process.

    GRAPH is a JSON or YAML file (.yaml, .yml). Each CONFIG is such a file with one config or a list of them,
    or a folder of such files (GRAPH itself left out).

    \b
    Exit status: 0 every config is sound
                 1 some config falls short
                 2 something could not be judged (whatever else)
    """
    from pathgate.cli.reviewing import review_files  # noqa: PLC0415

    outcome = review_files(graph, configs, _settings(), hinges=hinges or form == "text")
    if form == "json":
        _print_json(outcome)
    else:
        _print_text(outcome)
    return outcome.exit_status


def _print_json(outcome: Outcome) -> None:
    from msgspec import json  # noqa: PLC0415

    from pathgate.cli.text import counts_text  # noqa: PLC0415

    _write(json.format(json.encode(outcome.document()), indent=2) + b"\n")
    if not _say_problem(outcome):
        click.echo(counts_text(outcome), err=True)


def _print_text(outcome: Outcome) -> None:
    from pathgate.cli.text import outcome_text  # noqa: PLC0415

    if _say_problem(outcome):
        return
    width = None
    if sys.stdout.isatty():
        width = max(_NARROWEST, min(_WIDEST, shutil.get_terminal_size().columns))
    is_colourful = width is not None and "NO_COLOR" not in os.environ and os.environ.get("TERM") != "dumb"
    text = outcome_text(outcome, width=width, colour=is_colourful)
    # A terminal that has no arrows gets their numbers, not an error.
    _write(text.encode(sys.stdout.encoding or "utf-8", "backslashreplace"))


def _say_problem(outcome: Outcome) -> bool:
    """Say on standard error why the graph cannot be used; false where it can."""
    from pathgate.cli.text import problem_lines  # noqa: PLC0415

    if outcome.problem is None:
        return False
    first, *others = problem_lines(outcome.problem)
    _say(f"nothing was judged: {first}")
    for line in others:
        click.echo(f"  {line}", err=True)
    return True


def _write(content: bytes) -> None:
    """Write to standard output. A reader that has gone away changes nothing about the verdicts."""
    try:
        sys.stdout.buffer.write(content)
        sys.stdout.buffer.flush()
    except BrokenPipeError:
        # What is left in the buffer must not fail once more when the process ends.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())


def _settings() -> Settings:
    from pathgate.web.settings import InvalidSettings, Settings  # noqa: PLC0415

    try:
        return Settings.from_environment(os.environ)
    except InvalidSettings as error:
        raise click.ClickException("; ".join(error.faults)) from None


def _show_version(context: click.Context) -> None:
    from pathgate.version import VERSION  # noqa: PLC0415

    click.echo(f"pathgate {VERSION}")
    context.exit()


def _say(text: str) -> None:
    click.echo(f"pathgate: {' '.join(text.split())}", err=True)
