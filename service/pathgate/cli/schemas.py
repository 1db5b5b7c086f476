"""``pathgate schema``: the JSON Schemas of the interface, for editors and checks that reach no service.

Each is the very document that the service gives at ``/schemas/NAME``, made from the same declarations.
"""

from __future__ import annotations

import click

from pathgate.cli.terminal import write, write_text

# Only what the command needs is imported, and only when it runs, so that --help answers at once.
# ruff: noqa: PLC0415


@click.command()
@click.argument("name", metavar="[NAME]", required=False)
def schema(name: str | None) -> None:
    """Print the JSON Schema called NAME, such as graph, config or review (a verdict); without NAME, list them all.

    It is what the service gives at /schemas/NAME. An editor finds it by the comment at the top of a YAML file:

    \b
    # yaml-language-server: $schema=schemas/graph.json
    """
    from pathgate.cli.writing import json_bytes
    from pathgate.graphs.names import did_you_mean
    from pathgate.web.endpoints import OPERATIONS
    from pathgate.web.openapi import document
    from pathgate.web.schema_documents import schema_documents

    schemas = schema_documents(document(OPERATIONS)["components"]["schemas"])
    if name is None:
        write_text("".join(f"{each}\n" for each in sorted(schemas)))
        return
    if name not in schemas:
        near = did_you_mean(name, list(schemas))
        raise click.ClickException(f"no schema is called {name!r}{near}; pathgate schema lists them")
    write(json_bytes(schemas[name]))
