"""Puts a document into a file whole or not at all: a reader finds the old one or the new one, never half of one."""

from __future__ import annotations

import os
import secrets
import stat
from pathlib import Path
from typing import Any


def json_bytes(document: Any) -> bytes:
    """A JSON document as people read it, with a line break at its end; what could steer a terminal is escaped.

    >>> json_bytes(["→ \\x9b"])
    b'[\\n  "\\xe2\\x86\\x92 \\\\u009b"\\n]\\n'
    """
    from msgspec import json  # noqa: PLC0415 - slow to import, and only what writes needs it

    text = json.format(json.encode(document), indent=2).decode()
    # Outside strings nothing but line breaks is unprintable, so whatever else is stands inside one.
    lines = (line if line.isprintable() else "".join(map(_escaped, line)) for line in text.split("\n"))
    return ("\n".join(lines) + "\n").encode()


def _escaped(character: str) -> str:
    if character.isprintable():
        return character
    units = character.encode("utf-16-be")
    return "".join(f"\\u{units[k]:02x}{units[k + 1]:02x}" for k in range(0, len(units), 2))


def write_whole(path: Path, content: bytes) -> None:
    """Write a file, and the folders above it where they are missing.

    Raises:
        OSError: it cannot be written; what was there before is still there.
    """
    target = Path(os.path.realpath(path))
    if target.exists() and not stat.S_ISREG(target.stat().st_mode):
        # A pipe or a device is written into: to put a file in its place would take it away.
        target.write_bytes(content)
        return
    target.parent.mkdir(parents=True, exist_ok=True)
    beside = target.with_name(f".{target.name[:100]}.{secrets.token_hex(6)}")
    try:
        with beside.open("xb") as file:
            file.write(content)
            file.flush()
            os.fsync(file.fileno())
        beside.replace(target)
    finally:
        beside.unlink(missing_ok=True)
