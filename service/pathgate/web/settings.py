"""What may an operator set, within which bounds, and what is in force?

Each setting is declared once, as a field of ``Settings``: its default, its bounds and one line of text. The
names of the environment variables, the checks at start-up, ``/version`` and the table in the README all come
from that declaration.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import Field, asdict, dataclass, field, fields
from math import isfinite
from typing import Any

from pathgate.graphs.names import misspelt_member

PREFIX = "PATHGATE_"


class InvalidSettings(ValueError):
    """Settings that cannot be used; ``faults`` holds a sentence for each."""

    def __init__(self, faults: list[str]) -> None:
        super().__init__("\n".join(faults))
        self.faults = tuple(faults)


def _setting(default: float, *, least: float, most: float, text: str) -> Any:
    return field(default=default, metadata={"least": least, "most": most, "text": text})


@dataclass(frozen=True, slots=True, kw_only=True)
class Settings:
    """The limits in force.

    Raises:
        InvalidSettings: some value lies outside its bounds; all such values are named at once.

    >>> Settings(max_nodes=500).max_nodes
    500
    """

    max_nodes: int = _setting(20_000, least=1, most=1_000_000, text="most nodes in a graph")
    max_edges: int = _setting(100_000, least=1, most=5_000_000, text="most edges in a graph")
    max_statements: int = _setting(
        5_000, least=1, most=1_000_000, text="most statements and sweeps in one request"
    )
    max_body_bytes: int = _setting(
        8_000_000, least=1_000, most=1_000_000_000, text="most bytes in a request's body"
    )
    max_depth: int = _setting(
        100, least=10, most=200, text="most levels of arrays and objects inside each other in a body"
    )
    time_budget_seconds: float = _setting(
        10.0, least=0.05, most=3_600, text="seconds one request may compute before it is cut off"
    )
    max_page: int = _setting(
        1_000, least=1, most=100_000, text="most items on a page; a higher `limit` is lowered to it"
    )
    max_errors: int = _setting(
        100, least=1, most=10_000, text="most faults listed in one problem; the rest are counted"
    )

    def __post_init__(self) -> None:
        faults = [fault for each in fields(self) if (fault := _out_of_bounds(each, getattr(self, each.name)))]
        if faults:
            raise InvalidSettings(faults)

    @classmethod
    def from_environment(cls, environment: Mapping[str, str]) -> Settings:
        """The settings that an environment asks for; what it leaves out keeps its default.

        Raises:
            InvalidSettings: with a sentence for every value that is no number or lies outside its bounds, and
                for every variable whose name is a misspelt setting. Other names with our prefix are let be:
                a cluster puts some into every container (``PATHGATE_PORT`` for a service of that name).

        >>> Settings.from_environment({"PATHGATE_MAX_NODES": "500"}).max_nodes
        500
        """
        names = {environment_name(each.name): each for each in fields(cls)}
        faults = _misspelt(environment, names)
        values: dict[str, Any] = {}
        for name, each in names.items():
            if name in environment:
                try:
                    values[each.name] = _number(environment[name], whole=isinstance(each.default, int))
                except ValueError as error:
                    faults.append(f"{name}: {error}")
        return cls._checked(values, faults)

    @classmethod
    def _checked(cls, values: dict[str, Any], faults: list[str]) -> Settings:
        try:
            settings = cls(**values)
        except InvalidSettings as error:
            faults.extend(error.faults)
        if faults:
            raise InvalidSettings(faults)
        return settings

    def as_dict(self) -> dict[str, float]:
        """Name → value, in the order of declaration."""
        return asdict(self)


def environment_name(setting: str) -> str:
    """The environment variable that sets ``setting``."""
    return PREFIX + setting.upper()


def settings_table() -> str:
    """The table of all settings, in Markdown."""
    rows = [
        f"| `{environment_name(each.name)}` | {each.default:,} | "
        f"{each.metadata['least']:,} to {each.metadata['most']:,} | {each.metadata['text']} |"
        for each in fields(Settings)
    ]
    return "\n".join(["| Variable | Default | Bounds | What it sets |", "|---|---|---|---|", *rows]) + "\n"


def _number(written: str, *, whole: bool) -> float:
    kind = "a whole number" if whole else "a number"
    try:
        value = int(written) if whole else float(written)
    except ValueError:
        raise ValueError(f"{written!r} is not {kind}") from None
    return value


def _out_of_bounds(setting: Field[float], value: float) -> str | None:
    least, most = setting.metadata["least"], setting.metadata["most"]
    if isfinite(value) and least <= value <= most:
        return None
    return f"{environment_name(setting.name)}: {value} is not between {least:,} and {most:,}"


def _misspelt(environment: Mapping[str, str], names: Mapping[str, object]) -> list[str]:
    unknown = (name for name in sorted(environment) if name.startswith(PREFIX) and name not in names)
    return [
        f"{name}: no such setting (did you mean {meant}?)"
        for name in unknown
        if (meant := misspelt_member(name, names))
    ]
