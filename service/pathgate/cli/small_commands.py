"""``pathgate check``, ``pathgate explain`` and ``pathgate new``: their words."""

from __future__ import annotations

from pathlib import Path
from shlex import quote

import click

from pathgate.cli.terminal import say, settings_in_force, text_width, write, write_text

# Only what a command needs is imported, and only when it runs, so that --help answers at once.
# ruff: noqa: PLC0415


@click.command()
@click.argument("graph", metavar="GRAPH", type=click.Path(path_type=Path))
@click.option(
    "--format",
    "form",
    type=click.Choice(["text", "json"]),
    default="text",
    show_default=True,
    help="A line for each finding, or the answer of /v1/graph-check with the counts on standard error.",
)
def check(graph: Path, form: str) -> int:
    """Check a causal graph by itself.

    \b
    Exit status: 0 nothing is wrong with it
                 1 something is
                 2 it is no graph, or cannot be read
    """
    from pathgate.cli.checking import check_file, checked_text
    from pathgate.cli.wording import fault_lines
    from pathgate.cli.writing import json_bytes

    checked = check_file(graph, settings_in_force())
    for place, line in enumerate(fault_lines(checked.faults)):
        say(line) if place == 0 else click.echo(f"  {line}", err=True)
    if form == "text":
        write_text(checked_text(graph, checked))
    else:
        write(json_bytes(checked.answer or checked.problem))
        if checked.answer is not None:
            click.echo(checked_text(graph, checked).splitlines()[-1], err=True)
    return checked.exit_status


@click.command()
@click.argument("rule", metavar="[RULE]", required=False)
def explain(rule: str | None) -> None:
    """Say what a rule means and what to do where it is broken; without RULE, list them all."""
    from pathgate.cli.explaining import NoSuchRule, broken_at, rule_text, rules_text

    try:
        write_text(rules_text() if rule is None else broken_at(rule_text(rule), text_width()))
    except NoSuchRule as error:
        raise click.ClickException(str(error)) from None


@click.command()
@click.argument("folder", metavar="[FOLDER]", default=".", type=click.Path(path_type=Path))
def new(folder: Path) -> None:
    """Write a starter into FOLDER (here where it is left out): a graph, a config, a project file.

    Nothing is overwritten.
    """
    from pathgate.cli.starting import AlreadyThere, write_starter
    from pathgate.review.visible import visible

    try:
        written = write_starter(folder)
    except AlreadyThere as error:
        raise click.ClickException(str(error)) from None
    step = (
        "pathgate review" if folder.resolve() == Path.cwd() else f"cd {quote(str(folder))} && pathgate review"
    )
    lines = [*(f"wrote {path}" for path in written), f"Next: {step}"]
    write_text("".join(f"{visible(line)}\n" for line in lines))
