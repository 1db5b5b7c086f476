"""How long may a call last in all, and how long does it wait before it tries again?

One budget of seconds covers everything: looking up the name, connecting, sending, each byte of the answer, and the
pauses. The pauses are exponential with full jitter: each is drawn evenly between nothing and twice the bound of
the one before, so that many callers of a service that was down do not come back at once.
"""

from __future__ import annotations

import random
import time
from collections.abc import Callable
from dataclasses import dataclass
from datetime import UTC
from email.utils import parsedate_to_datetime

from pathgate.client.errors import Unreachable

FIRST_PAUSE_SECONDS = 0.25
LONGEST_PAUSE_SECONDS = 15.0


@dataclass(frozen=True, slots=True)
class Surroundings:
    """What a call takes from outside itself; tests put in their own.

    Attributes:
        clock: seconds that only ever go forward.
        now: seconds since 1970, for what the service says as a date.
        sleep: waits.
        chance: a number from 0 up to 1.
    """

    clock: Callable[[], float] = time.monotonic
    now: Callable[[], float] = time.time
    sleep: Callable[[float], None] = time.sleep
    chance: Callable[[], float] = random.random


class Budget:
    """The seconds that one call may last."""

    def __init__(self, seconds: float, clock: Callable[[], float]) -> None:
        self._seconds = seconds
        self._clock = clock
        self._ends = clock() + seconds

    def left(self) -> float:
        """What is left of them.

        Raises:
            Unreachable: nothing is.
        """
        left = self._ends - self._clock()
        if left <= 0:
            raise Unreachable(f"the service gave no whole answer within {self._seconds:g} seconds")
        return left


def pause_before(attempt: int, retry_after: float | None, chance: float) -> float:
    """The seconds to wait before an attempt; never fewer than the service asks for.

    Args:
        attempt: 1 for the second attempt, and so on.
        retry_after: the seconds that the service asks for.
        chance: a number from 0 up to 1.

    >>> pause_before(3, None, 0.5), pause_before(1, 7.0, 0.5)
    (0.5, 7.125)
    """
    # The exponent is bounded too: a float has an end.
    bound = min(LONGEST_PAUSE_SECONDS, FIRST_PAUSE_SECONDS * 2.0 ** min(attempt - 1, 30))
    return (retry_after or 0.0) + chance * bound


def read_retry_after(said: str | None, now: float) -> float | None:
    """The seconds that a Retry-After header asks for, as a number or as a date (RFC 9110); None for anything else.

    >>> read_retry_after("Tue, 01 Dec 2026 10:00:30 GMT", 1796119200.0), read_retry_after("soon", 0.0)
    (30.0, None)
    """
    if said is None:
        return None
    said = said.strip()
    if said.isascii() and said.isdigit():
        return float(said[:12])
    try:
        when = parsedate_to_datetime(said)
        # A date without a zone is meant in UTC here, not where the caller happens to be.
        return max(0.0, (when if when.tzinfo else when.replace(tzinfo=UTC)).timestamp() - now)
    except (ValueError, OverflowError):
        return None
