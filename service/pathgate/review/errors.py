"""What keeps a config from being reviewed: it does not say anything that could be judged."""

from __future__ import annotations

from pathgate.graphs.errors import FaultyInput, PathgateError


class ReviewError(PathgateError):
    """Base of the errors of this layer."""


class InvalidConfig(FaultyInput, ReviewError):
    """The input is no model config of this graph; ``faults`` says all that is wrong with it."""

    slug = "invalid-request"
