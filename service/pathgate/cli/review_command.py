"""``pathgate review``: its words, and where what it finds is put."""

from __future__ import annotations

import os
import sys
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any, cast

import click

from pathgate.cli.choices import FAIL_ON, FORMS, IF_UNREACHABLE, Form
from pathgate.cli.terminal import say, settings_in_force, takes_colour, text_width, write, write_text

if TYPE_CHECKING:
    from pathgate.cli.plan import Plan
    from pathgate.cli.reviewing import Judging, Question
    from pathgate.cli.run import Run

# For all configs together, where a service judges.
PATIENCE_SECONDS = 300.0

_PATH = click.Path(path_type=Path)


class _Output(click.ParamType):  # type: ignore[type-arg]
    """``FORM=FILE``."""

    name = "FORM=FILE"

    def convert(
        self, value: Any, param: click.Parameter | None, ctx: click.Context | None
    ) -> tuple[str, Path]:
        """The form and the file."""
        form, equals, file = str(value).partition("=")
        if form not in FORMS or not equals or not file:
            self.fail(f"{value!r} is no FORM=FILE, where FORM is one of {', '.join(FORMS)}", param, ctx)
        return form, Path(file)


@click.command()
@click.argument("graph", metavar="[GRAPH", required=False, type=_PATH)
@click.argument("configs", metavar="[CONFIG...]]", nargs=-1, type=_PATH)
@click.option(
    "--format",
    "form",
    type=click.Choice(FORMS),
    default="text",
    show_default=True,
    help="What stands on standard output; all but text are one document, with the counts on standard error.",
)
@click.option(
    "--output", "outputs", multiple=True, type=_Output(), help="Also write a form to a file; repeatable."
)
@click.option(
    "--fail-on", type=click.Choice(FAIL_ON), help="From which severity on a finding counts.  [default: error]"
)
@click.option("--dialect", help="The SQL of configs that name none.")
@click.option("--baseline", type=_PATH, metavar="FILE", help="Known findings, which do not make it fail.")
@click.option(
    "--write-baseline", type=_PATH, metavar="FILE", help="Note down as known all that is found now."
)
@click.option("--prune-baseline", is_flag=True, help="Take out of the baseline what no longer occurs.")
@click.option("--hinges", is_flag=True, help="In JSON too, say what sound verdicts hinge on.")
@click.option("--url", metavar="URL", help="Have the service at this address judge, instead of this process.")
@click.option(
    "--timeout",
    type=click.FloatRange(min=0, min_open=True, max=86_400),
    metavar="SECONDS",
    help="How long the service may take for everything, retries included.  [default: 300]",
)
@click.option(
    "--if-unreachable",
    type=click.Choice(IF_UNREACHABLE),
    help="What becomes of configs for which the service is out of reach; pass is told in every form.  [default: fail]",
)
@click.option("--project", type=_PATH, metavar="FILE", help="The project file, instead of the nearest one.")
@click.option("--show", is_flag=True, help="Show each setting and who set it, and review nothing.")
def review(graph: Path | None, configs: tuple[Path, ...], **options: Any) -> int:
    """Review model configs against a causal graph, in this process or by a running service.

    GRAPH is a JSON or YAML file. Each CONFIG is such a file with one config or a list of them, a folder of such files
    (GRAPH itself left out), or a pattern such as "teams/**/*.yaml". What is left out here is taken from pathgate.toml
    (or the table tool.pathgate of pyproject.toml) in this folder or above: graph, configs, outputs, dialect, fail_on,
    baseline. A service that asks for a token is given the one in PATHGATE_TOKEN.

    \b
    Exit status: 0 no config falls short: sound, or every error accepted or known
                 1 some config falls short
                 2 something could not be judged (whatever else)
    """
    plan = _plan(graph, configs, options)
    if options["show"]:
        write_text(plan.shown())
        return 0
    _check(plan)
    asked = _question(plan, options)
    run = _run(asked, _judging(options))
    _print(run, options["form"], plan.root)
    _write_outputs(run, plan)
    return run.exit_status


def _plan(graph: Path | None, configs: Sequence[Path], options: Mapping[str, Any]) -> Plan:
    from pathgate.cli.plan import make_plan  # noqa: PLC0415 - not for --help
    from pathgate.cli.project import InvalidProject, Project, find_project, read_project  # noqa: PLC0415

    words = {
        "graph": (graph, "GRAPH"),
        "configs": (tuple(configs), "CONFIG"),
        "outputs": (_by_form(options["outputs"]), "--output"),
        "fail_on": (options["fail_on"], "--fail-on"),
        "dialect": (options["dialect"], "--dialect"),
        "baseline": (options["baseline"], "--baseline"),
    }
    try:
        file = options["project"] or find_project(Path.cwd())
        project = read_project(file) if file else Project()
        return make_plan({name: said for name, said in words.items() if said[0]}, project, Path.cwd())
    except InvalidProject as error:
        raise click.ClickException(str(error)) from None


def _check(plan: Plan) -> None:
    from pathgate.cli.plan import NotPlanned  # noqa: PLC0415 - not for --help

    try:
        plan.check()
    except NotPlanned as error:
        raise click.UsageError(str(error), click.get_current_context()) from None


def _by_form(outputs: Sequence[tuple[str, Path]]) -> dict[str, Path]:
    by_form = dict(outputs)
    if len(by_form) < len(outputs):
        raise click.UsageError("--output names a form twice", click.get_current_context())
    return by_form


def _question(plan: Plan, options: Mapping[str, Any]) -> Question:
    from pathgate.cli.reviewing import Question  # noqa: PLC0415 - not for --help
    from pathgate.review.schema import DIALECTS  # noqa: PLC0415

    context = click.get_current_context()
    dialect = plan.value("dialect")
    if dialect is not None and dialect not in DIALECTS:
        raise click.UsageError(f"--dialect {dialect!r} is none of {', '.join(DIALECTS)}", context)
    if options["prune_baseline"] and (options["write_baseline"] or plan.value("baseline") is None):
        raise click.UsageError("--prune-baseline needs a --baseline to take something out of", context)
    return Question(
        graph=plan.value("graph"),
        configs=plan.value("configs"),
        dialect=dialect,
        fail_on=plan.value("fail_on"),
        baseline=plan.value("baseline"),
        prune=options["prune_baseline"],
        write_baseline=options["write_baseline"],
        hinges=options["hinges"] or options["form"] == "text",
        shows_hinges=options["hinges"],
    )


def _judging(options: Mapping[str, Any]) -> Judging:
    from pathgate.cli.reviewing import local_judge  # noqa: PLC0415 - not for --help

    if options["url"] is None:
        for name in ("timeout", "if_unreachable"):
            if options[name] is not None:
                word = f"--{name.replace('_', '-')}"
                raise click.UsageError(f"{word} needs a --url", click.get_current_context())
        return local_judge
    from pathgate.cli.asking import make_client  # noqa: PLC0415
    from pathgate.cli.remote import remote_judge  # noqa: PLC0415

    client = make_client(options["url"], options["timeout"] or PATIENCE_SECONDS)
    return remote_judge(client, lets_pass=options["if_unreachable"] == "pass")


def _run(asked: Question, judging: Judging) -> Run:
    from pathgate.cli.progress import progress_bar  # noqa: PLC0415 - not for --help
    from pathgate.cli.reviewing import review_files  # noqa: PLC0415

    settings = settings_in_force()
    with progress_bar() as tell:
        return review_files(asked, settings, tell, judging)


def _print(run: Run, form: Form, root: Path) -> None:
    from pathgate.cli.rendering import rendered  # noqa: PLC0415 - not for --help
    from pathgate.cli.text import run_text  # noqa: PLC0415
    from pathgate.cli.wording import counts_text  # noqa: PLC0415

    _say_why_nothing_was_judged(run)
    if form == "text":
        write_text(run_text(run, width=text_width(), colour=takes_colour(sys.stdout)))
        return
    write(rendered(run, form, root))
    for note in run.notes:
        click.echo(note, err=True)
    click.echo(counts_text(run), err=True)


def _say_why_nothing_was_judged(run: Run) -> None:
    from pathgate.cli.wording import fault_lines  # noqa: PLC0415 - not for --help

    if run.problem is not None:
        first, *others = fault_lines(run.faults)
        say(f"nothing was judged: {first}")
        for line in others:
            click.echo(f"  {line}", err=True)


def _write_outputs(run: Run, plan: Plan) -> None:
    from pathgate.cli.rendering import rendered  # noqa: PLC0415 - not for --help
    from pathgate.cli.writing import write_whole  # noqa: PLC0415

    read = {os.path.realpath(item.place.file) for item in run.items}
    for form, output in plan.value("outputs").items():
        if os.path.realpath(output.value) in read:
            raise click.ClickException(f"the output {form} would be written over a config: {output.value}")
        write_whole(output.value, rendered(run, cast("Form", form), plan.root))
