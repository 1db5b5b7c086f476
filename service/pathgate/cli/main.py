"""The command ``pathgate``: its words, and how each way of failing ends.

Whatever goes wrong is one clear line on standard error. Only what a command needs is imported, and only when
it runs, so that ``pathgate --help`` answers at once.
"""

from __future__ import annotations

import sys
from typing import Any

import click

from pathgate.cli.change_command import changes
from pathgate.cli.doctor_command import doctor
from pathgate.cli.review_command import review
from pathgate.cli.schemas import schema
from pathgate.cli.small_commands import check, explain, new
from pathgate.cli.terminal import say, settings_in_force

FAILED = 2
INTERRUPTED = 130


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
            say(f"{error.format_message()} (see {path} --help)")
            return error.exit_code
        case click.ClickException():
            say(error.format_message())
        case OSError():
            say(str(error))
        case _:
            say(f"failed by a fault of its own, not of the input: {type(error).__name__}: {error}")
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
    settings_in_force()
    run(bind, workers)


def _show_version(context: click.Context) -> None:
    from pathgate.version import VERSION  # noqa: PLC0415

    click.echo(f"pathgate {VERSION}")
    context.exit()


for command in (review, changes, check, doctor, explain, new, schema):
    main.add_command(command)
