"""How much time may a question still take?

One deadline goes with a request into every criterion. A decision polls it, and is cut off by ``OutOfTime``;
a listing looks at ``expired`` and ends with what it has. Either costs one reading of the clock, about 0.1 µs.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from math import inf

from pathgate.criteria.errors import OutOfTime


class Deadline:
    """A moment after which no more time is spent; ``clock`` is any function that tells seconds.

    >>> moments = iter([0.0, 1.0, 3.0])
    >>> deadline = Deadline(2, clock=lambda: next(moments))
    >>> deadline.poll()
    >>> deadline.expired
    True
    """

    __slots__ = ("_clock", "_end", "seconds")

    def __init__(self, seconds: float, clock: Callable[[], float] = time.monotonic) -> None:
        self.seconds = seconds
        self._clock = clock
        self._end = clock() + seconds

    @classmethod
    def never(cls) -> Deadline:
        """A deadline that never comes, for callers with patience."""
        return cls(inf, clock=lambda: 0.0)

    @property
    def expired(self) -> bool:
        """Is the time used up? For listings, which end cleanly and say that they are incomplete."""
        return self._clock() >= self._end

    def poll(self) -> None:
        """Go on while there is time.

        Raises:
            OutOfTime: the time is used up.
        """
        if self._clock() >= self._end:
            raise OutOfTime(self.seconds)
