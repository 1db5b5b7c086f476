"""``pathgate changes``: its words."""

from __future__ import annotations

import sys
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import click

from pathgate.cli.terminal import say, settings_in_force, takes_colour, write, write_text

# Only what a command needs is imported, and only when it runs, so that --help answers at once.
# ruff: noqa: PLC0415

_PATH = click.Path(path_type=Path)


@click.command()
@click.argument("old", metavar="OLD", type=_PATH)
@click.argument("new", metavar="NEW", type=_PATH)
@click.argument("configs", metavar="[CONFIG...]", nargs=-1, type=_PATH)
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
    files (the graphs left out), or a pattern such as "teams/**/*.yaml". Configs and dialect that are left out here are
    taken from pathgate.toml (or the table tool.pathgate of pyproject.toml) in this folder or above.

    \b
    Exit status: 0 no config is broken: none that was sound is anything else now
                 1 some config is
                 2 something could not be judged against NEW (whatever else)
    """
    from pathgate.cli.change_formats import change_counts, change_json, change_markdown, change_text
    from pathgate.cli.changes import compare
    from pathgate.cli.wording import fault_lines

    said = {} if configs and dialect is not None else _project_values()
    named, spoken = configs or said.get("configs", ()), dialect or said.get("dialect")
    if not named:
        message = "no CONFIG: name it, or set configs in pathgate.toml (pathgate new writes one)"
        raise click.ClickException(message)
    run = compare(old, new, named, settings_in_force(), spoken)
    for place, line in enumerate(fault_lines(run.faults)):
        say(line) if place == 0 else click.echo(f"  {line}", err=True)
    if form == "text":
        write_text(change_text(run, colour=takes_colour(sys.stdout)))
    else:
        write(change_json(run) if form == "json" else change_markdown(run))
        click.echo(change_counts(run), err=True)
    return run.exit_status


def _project_values() -> Mapping[str, Any]:
    """What the project file sets, where there is one."""
    from pathgate.cli.project import InvalidProject, find_project, read_project

    try:
        file = find_project(Path.cwd())
        return read_project(file).values if file else {}
    except InvalidProject as error:
        raise click.ClickException(str(error)) from None
