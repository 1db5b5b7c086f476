"""What a criterion raises: only for inputs that mean nothing, or when its time is used up.

"No such set exists" is an answer and never an error.
"""

from __future__ import annotations

from pathgate.graphs.errors import PathgateError


class CriterionError(PathgateError):
    """Base of the errors of this layer."""


class OutOfTime(CriterionError):
    """A decision needed more than the request's whole time budget; ``details`` holds its ``seconds``."""

    slug = "too-costly"

    def __init__(self, seconds: float) -> None:
        super().__init__(
            f"the question used up its time budget of {seconds:g} seconds; ask about a smaller graph,"
            " or about less at a time",
            seconds=seconds,
        )


class Overlapping(CriterionError):
    """Sets that must be disjoint share nodes, or one that must hold something is empty."""

    slug = "invalid-request"

    def __init__(self, columns: tuple[str, ...]) -> None:
        text = (
            f"named on more than one side: {', '.join(columns)}"
            if columns
            else "nothing is named on one side"
        )
        super().__init__(text, columns=list(columns))


class DifferentNodes(CriterionError):
    """Two graphs that are compared are not over the same nodes; ``details`` holds the names in one alone."""

    slug = "invalid-request"

    def __init__(self, columns: tuple[str, ...]) -> None:
        super().__init__(f"only one of the two graphs has: {', '.join(columns)}", columns=list(columns))
