"""Where does each value of a YAML text stand? Taken from the events that its values are made from.

What an alias stands for has the places of what it names, since that is where it can be mended.
"""

from __future__ import annotations

from dataclasses import dataclass, field

from ruamel.yaml.events import (
    AliasEvent,
    CollectionEndEvent,
    Event,
    MappingStartEvent,
    NodeEvent,
    ScalarEvent,
)

from pathgate.cli.spots import Map, Spot
from pathgate.cli.spotting import Spotting


@dataclass(slots=True)
class YamlSpotting:
    """The places of a text's values, taken down one event at a time."""

    text: str
    spotting: Spotting = field(init=False)
    anchors: dict[str | None, tuple[Spot, str]] = field(default_factory=dict)

    def __post_init__(self) -> None:
        self.spotting = Spotting(self.text)

    def take(self, event: Event) -> None:
        """Go one event further, which must be one that the values accept."""
        if isinstance(event, CollectionEndEvent):
            self.spotting.closing()
        elif isinstance(event, AliasEvent):
            spot, value = self.anchors[event.anchor]
            self.spotting.put(spot, lambda: value)
        elif isinstance(event, ScalarEvent):
            value, start = event.value, event.start_mark.index
            # A block's end mark lies behind the empty lines that follow it.
            raw = self.text[start : event.end_mark.index].rstrip()
            if not raw:
                # A value that is left out is marked where the next one begins; it belongs behind its own key.
                start = len(self.text[:start].rstrip())
            spot = self.spotting.scalar(start, start + len(raw), lambda: value)
            self.anchors[event.anchor] = spot, value
        elif isinstance(event, NodeEvent):
            is_object = isinstance(event, MappingStartEvent)
            self.anchors[event.anchor] = (
                self.spotting.opening(event.start_mark.index, is_object=is_object),
                "",
            )

    def map(self) -> Map:
        """The places of all values."""
        return self.spotting.map()
