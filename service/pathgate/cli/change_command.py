"""``pathgate changes``: its words."""

from __future__ import annotations

import sys
from pathlib import Path

import click

from pathgate.cli.terminal import say, settings_in_force, takes_colour, write, write_text

# Only what a command needs is imported, and only when it runs, so that --help answers at once.
# ruff: noqa: PLC0415

_PATH = click.Path(path_type=Path)


@click.command()
@click.argument("old", metavar="OLD", type=_PATH)
@click.argument("new", metavar="NEW", type=_PATH)
@click.argument("configs", metavar="CONFIG...", nargs=-1, required=True, type=_PATH)
@click.option(
    "--format",
    "form",
    type=click.Choice(["text", "json", "markdown"]),
    default="text",
    show_default=True,
    help="What stands on standard output; json is the answer of /v1/changes, markdown a comment for a change.",
)
@click.option("--dialect", help="The SQL of configs that name none.")
def changes(old: Path, new: Path, configs: tuple[Path, ...], form: str, dialect: str | None) -> int:
    """Say what replacing the graph OLD by NEW does to model configs, and which of the changes did it.

    OLD and NEW are JSON or YAML files. Each CONFIG is such a file with one config or a list of them, a folder of such
    files (the graphs left out), or a pattern such as "teams/**/*.yaml".

    \b
    Exit status: 0 no config is broken: none that was sound is anything else now
                 1 some config is
                 2 something could not be judged against NEW (whatever else)
    """
    from pathgate.cli.change_formats import change_counts, change_json, change_markdown, change_text
    from pathgate.cli.changes import compare
    from pathgate.cli.wording import fault_lines

    run = compare(old, new, configs, settings_in_force(), dialect)
    for place, line in enumerate(fault_lines(run.faults)):
        say(line) if place == 0 else click.echo(f"  {line}", err=True)
    if form == "text":
        write_text(change_text(run, colour=takes_colour(sys.stdout)))
    else:
        write(change_json(run) if form == "json" else change_markdown(run))
        click.echo(change_counts(run), err=True)
    return run.exit_status
