"""Writes what a team begins with: a graph and a config to be changed, a project file, and schemas for editors."""

from __future__ import annotations

from importlib.resources import files
from pathlib import Path

from pathgate.cli.writing import json_bytes
from pathgate.graphs.schema import GRAPH_SCHEMA
from pathgate.review.schema import CONFIG_SCHEMA
from pathgate.web.schema_documents import schema_documents

_TEXTS = ("pathgate.toml", "graph.yaml", "configs/late-delivery-refunds.yaml")


class AlreadyThere(Exception):
    """Files that would be overwritten; the text names them."""


def write_starter(folder: Path) -> list[Path]:
    """Write the files into a folder, which is made where it is missing; those written, in order.

    Raises:
        AlreadyThere: one of them exists; nothing is written then.
        OSError: the folder cannot be written to.
    """
    contents = {folder / name: content for name, content in _contents().items()}
    there = [str(path) for path in contents if path.exists() or path.is_symlink()]
    if there:
        raise AlreadyThere(f"already there, and nothing was written: {', '.join(there)}")
    for path, content in contents.items():
        path.parent.mkdir(parents=True, exist_ok=True)
        with path.open("xb") as file:
            file.write(content)
    return list(contents)


def _contents() -> dict[str, bytes]:
    starter = files(__package__).joinpath("starter")
    texts = {name: starter.joinpath(name).read_bytes() for name in _TEXTS}
    schemas = schema_documents({"Graph": GRAPH_SCHEMA, "Config": CONFIG_SCHEMA})
    return texts | {f"schemas/{name}.json": json_bytes(schema) for name, schema in schemas.items()}
