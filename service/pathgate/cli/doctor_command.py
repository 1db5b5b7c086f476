"""``pathgate doctor``: its words."""

from __future__ import annotations

import click

from pathgate.cli.terminal import write, write_text


@click.command()
@click.argument("url", metavar="URL")
@click.option(
    "--timeout",
    type=click.FloatRange(min=0, min_open=True, max=86_400),
    default=30.0,
    show_default=True,
    metavar="SECONDS",
    help="How long all of it may take.",
)
@click.option("--format", "form", type=click.Choice(["text", "json"]), default="text", show_default=True)
def doctor(url: str, timeout: float, form: str) -> int:
    """Try whether the service at URL can be relied on from here, without a second try of anything.

    Is it reached and ready, which version is it, which limits are in force, does it review the demo as this
    installation does, and does a gate stop what falls short? Each step says how long it took. A service that asks
    for a token is given the one in PATHGATE_TOKEN.

    \b
    Exit status: 0 all of it ended well
                 2 something did not
    """
    # Only what a command needs is imported, and only when it runs, so that --help answers at once.
    from pathgate.cli.asking import make_client  # noqa: PLC0415
    from pathgate.cli.doctoring import diagnose, diagnosis_document, diagnosis_text  # noqa: PLC0415
    from pathgate.cli.writing import json_bytes  # noqa: PLC0415

    diagnosis = diagnose(make_client(url, timeout, retries=0))
    if form == "json":
        write(json_bytes(diagnosis_document(diagnosis)))
    else:
        write_text(diagnosis_text(diagnosis))
    return diagnosis.exit_status
