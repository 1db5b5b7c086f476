"""Surroundings in which no time passes unless somebody sleeps, and chance is always the same."""

from __future__ import annotations

from dataclasses import dataclass, field

from pathgate.client import Client, Surroundings


@dataclass
class Fakes:
    """A clock that only sleeping moves; chance is always the same."""

    clock: float = 1_000.0
    slept: list[float] = field(default_factory=list)

    def sleep(self, seconds: float) -> None:
        self.slept.append(seconds)
        self.clock += seconds

    def client(self, url: str, **others: object) -> Client:
        around = Surroundings(lambda: self.clock, lambda: self.clock, self.sleep, lambda: 0.5)
        return Client(url, surroundings=around, **{"timeout": 30.0, **others})
