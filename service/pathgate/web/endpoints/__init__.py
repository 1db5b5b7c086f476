"""The operations this service answers, one module each."""

from __future__ import annotations

from pathgate.web.endpoints import (
    adjustment,
    changes,
    colliders,
    constraints,
    equivalence,
    graph_check,
    independencies,
    review,
    reviews,
    separation,
)
from pathgate.web.operations import Operation

OPERATIONS: tuple[Operation, ...] = (
    review.OPERATION,
    reviews.OPERATION,
    changes.OPERATION,
    adjustment.OPERATION,
    separation.OPERATION,
    colliders.OPERATION,
    independencies.OPERATION,
    constraints.OPERATION,
    equivalence.OPERATION,
    graph_check.OPERATION,
)
