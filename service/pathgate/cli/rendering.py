"""In which forms can a run be had? Each is made from the same run, and only the ones asked for are loaded."""

from __future__ import annotations

from pathlib import Path

from pathgate.cli.choices import Form
from pathgate.cli.run import Run


def rendered(run: Run, form: Form, root: Path | None = None) -> bytes:
    """The document of a run in one form; ``root`` is the folder that files are seen from, where the form asks."""
    # Each form has libraries of its own, and most calls need one of them.
    match form:
        case "text":
            from pathgate.cli.text import run_text  # noqa: PLC0415

            return run_text(run).encode()
        case "json":
            from pathgate.cli.json_format import run_json  # noqa: PLC0415

            return run_json(run)
        case "sarif":
            from pathgate.cli.sarif_format import run_sarif  # noqa: PLC0415

            return run_sarif(run, root)
        case "junit":
            from pathgate.cli.junit_format import run_junit  # noqa: PLC0415

            return run_junit(run)
        case "markdown":
            from pathgate.cli.markdown_format import run_markdown  # noqa: PLC0415

            return run_markdown(run)
