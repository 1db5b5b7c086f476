"""Deadlines by a clock that tells what it is told."""

from __future__ import annotations

import pytest

from pathgate.criteria.deadline import Deadline
from pathgate.criteria.errors import CriterionError, OutOfTime


class Clock:
    """Stands still until it is moved."""

    now = 100.0

    def __call__(self) -> float:
        return self.now


def test_a_question_goes_on_until_its_time_is_used_up():
    clock = Clock()
    deadline = Deadline(2, clock)
    clock.now += 1.999
    deadline.poll()
    assert not deadline.expired
    clock.now += 0.001
    assert deadline.expired
    with pytest.raises(OutOfTime) as cut:
        deadline.poll()
    assert (cut.value.slug, cut.value.details) == ("too-costly", {"seconds": 2})
    assert isinstance(cut.value, CriterionError)


def test_the_budget_starts_when_the_deadline_is_made():
    clock = Clock()
    first = Deadline(2, clock)
    clock.now += 1.5
    second = Deadline(2, clock)
    clock.now += 1
    assert (first.expired, second.expired) == (True, False)


def test_a_deadline_that_never_comes_never_comes():
    deadline = Deadline.never()
    deadline.poll()
    assert not deadline.expired
