"""Puts a document into a file whole or not at all: a reader finds the old one or the new one, never half of one."""

from __future__ import annotations

import os
import secrets
import stat
from pathlib import Path
from typing import Any


def json_bytes(document: Any) -> bytes:
    """A JSON document as people read it, with a line break at its end."""
    from msgspec import json  # noqa: PLC0415 - slow to import, and only what writes needs it

    return json.format(json.encode(document), indent=2) + b"\n"


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
