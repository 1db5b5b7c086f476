"""The named schemas of the interface, each as a JSON Schema document that stands by itself.

An editor given ``/schemas/graph`` completes and checks a graph as it is written, with nothing else at hand.
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from typing import Any

Json = dict[str, Any]

_PREFIX = "#/components/schemas/"
_WORD = re.compile(r"(?<=[a-z0-9])(?=[A-Z])")


def document_name(schema: str) -> str:
    """The name in the path of a schema.

    >>> document_name("GraphCheckAnswer")
    'graph-check-answer'
    """
    return _WORD.sub("-", schema).lower()


def schema_documents(schemas: Mapping[str, Any]) -> dict[str, Json]:
    """Name in the path → document, for every named schema."""
    return {document_name(name): _document(name, schemas) for name in schemas}


def _document(name: str, schemas: Mapping[str, Any]) -> Json:
    needed: dict[str, Any] = {}
    _collect(schemas[name], schemas, needed)
    definitions = {"$defs": {each: _relative(schema) for each, schema in needed.items()}} if needed else {}
    return {
        "$schema": "https://json-schema.org/draft/2020-12/schema",
        "$id": f"/schemas/{document_name(name)}",
        **_relative(schemas[name]),
        **definitions,
    }


def _collect(schema: Any, schemas: Mapping[str, Any], needed: dict[str, Any]) -> None:
    for name in _references(schema):
        if name not in needed:
            needed[name] = schemas[name]
            _collect(schemas[name], schemas, needed)


def _references(schema: Any) -> Iterator[str]:
    if isinstance(schema, Mapping):
        reference = schema.get("$ref")
        if isinstance(reference, str) and reference.startswith(_PREFIX):
            yield reference.removeprefix(_PREFIX)
    for part in schema.values() if isinstance(schema, Mapping) else schema:
        if isinstance(part, Mapping | list | tuple):
            yield from _references(part)


def _relative(schema: Any) -> Any:
    """The schema with its references turned to the definitions of its own document."""
    if isinstance(schema, Mapping):
        return {
            key: f"#/$defs/{said.removeprefix(_PREFIX)}" if key == "$ref" else _relative(said)
            for key, said in schema.items()
        }
    return [_relative(part) for part in schema] if isinstance(schema, list | tuple) else schema
