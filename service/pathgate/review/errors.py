"""What keeps a config from being reviewed: it does not say anything that could be judged."""

from __future__ import annotations

from collections.abc import Sequence

from pathgate.graphs.errors import Fault, PathgateError


class ReviewError(PathgateError):
    """Base of the errors of this layer."""


class InvalidConfig(ReviewError):
    """The input is no model config of this graph; ``faults`` says all that is wrong with it."""

    slug = "invalid-request"

    def __init__(self, faults: Sequence[Fault]) -> None:
        more = f" (and {len(faults) - 1} more)" if len(faults) > 1 else ""
        super().__init__(f"{faults[0].detail}{more}")
        self.faults = tuple(faults)
