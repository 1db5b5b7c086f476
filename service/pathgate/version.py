"""Which version of Pathgate this is, from the installed package."""

from __future__ import annotations

from importlib.metadata import PackageNotFoundError, version


def _installed() -> str:
    try:
        return version("pathgate")
    except PackageNotFoundError:  # a bare source tree on the import path
        return "0+unknown"


VERSION = _installed()
