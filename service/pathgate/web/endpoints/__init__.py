"""The operations this service answers, one module each."""

from __future__ import annotations

from pathgate.web.operations import Operation

OPERATIONS: tuple[Operation, ...] = ()
