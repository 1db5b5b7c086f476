"""Notes down where each value of a text stands, one token at a time; YAML and JSON are noted alike."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

from pathgate.cli.spots import Map, Spot


@dataclass(slots=True)
class _Holder:
    """A list or object whose end has not come; ``key`` is the one that waits for its value."""

    spot: Spot
    is_object: bool
    key: str | None = None


@dataclass(slots=True)
class Spotting:
    """The places found so far. What is noted must be a value that was read without a fault."""

    text: str
    root: Spot = field(default_factory=lambda: Spot(0))
    holders: list[_Holder] = field(default_factory=list)

    def scalar(self, start: int, end: int, key: Callable[[], str]) -> Spot:
        """A value that holds no others; ``key`` says it as the key that it may be."""
        return self.put(Spot(start, end), key)

    def opening(self, start: int, *, is_object: bool) -> Spot:
        """A list or an object begins."""
        spot = self.put(Spot(start))
        self.holders.append(_Holder(spot, is_object))
        return spot

    def closing(self) -> None:
        """The list or object that began last ends."""
        self.holders.pop()

    def put(self, spot: Spot, key: Callable[[], str] | None = None) -> Spot:
        """A value that stands at ``spot``, perhaps once more."""
        holder = self.holders[-1] if self.holders else None
        if holder is None:
            self.root = spot
        elif not holder.is_object:
            holder.spot.inside[str(len(holder.spot.inside))] = spot
        elif holder.key is None:
            holder.key = key() if key else ""
        else:
            holder.spot.inside[holder.key] = spot
            holder.key = None
        return spot

    def map(self) -> Map:
        """The places of all values."""
        return Map(self.text, self.root)
