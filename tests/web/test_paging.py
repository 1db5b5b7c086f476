"""Pages of a listing when the time runs out: before the first item, among them, and while passing over some."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import pytest

from pathgate.criteria import Deadline, OutOfTime
from pathgate.web.operations import Call
from pathgate.web.paging import page_at, page_of
from pathgate.web.settings import Settings


def call_of(deadline: Deadline, **body: Any) -> Call:
    return Call(body=body, graphs={}, faults=[], settings=Settings(), deadline=deadline, whole=body)


def looking(times: int) -> Deadline:
    """A deadline that comes after so many looks at the clock; making it takes the first."""
    moments = iter([0.0] * (times + 1))
    return Deadline(1, clock=lambda: next(moments, 2.0))


def test_a_page_holds_what_was_found_in_time_and_the_rest_follows():
    found, page = page_of(call_of(looking(3), limit=10), "trial", iter(range(8)))
    assert found == [0, 1, 2, 3]
    assert page["complete"] is False
    rest, last = page_of(call_of(Deadline.never(), limit=10, cursor=page["cursor"]), "trial", iter(range(8)))
    assert (found + rest, last) == (list(range(8)), {"complete": True})


def test_time_that_runs_out_inside_the_listing_leaves_what_it_gave_before():
    def listing() -> Iterator[int]:
        yield from (0, 1)
        raise OutOfTime(1)

    found, page = page_of(call_of(Deadline.never()), "trial", listing())
    assert (found, page["complete"]) == ([0, 1], False)


def test_a_page_is_not_called_complete_where_time_runs_out_before_it_begins():
    cursor = page_of(call_of(Deadline.never(), limit=500), "trial", iter(range(900)))[1]["cursor"]
    with pytest.raises(OutOfTime):
        page_of(call_of(looking(100), limit=500, cursor=cursor), "trial", iter(range(900)))


def test_a_listing_that_can_begin_anywhere_is_told_where_to_begin():
    starts = []

    def listing(start: int) -> Iterator[tuple[int, str]]:
        starts.append(start)
        yield from ((place, "ab"[place % 2]) for place in (0, 5, 6, 30, 41) if place >= start)

    first, page = page_at(call_of(Deadline.never(), limit=3), "trial", listing)
    second, last = page_at(call_of(Deadline.never(), limit=3, cursor=page["cursor"]), "trial", listing)
    assert (first, second, last, starts) == (["a", "b", "a"], ["a", "b"], {"complete": True}, [0, 30])


def test_a_listing_that_is_cut_short_goes_on_after_the_last_item_given():
    starts = []

    def listing(start: int) -> Iterator[tuple[int, int]]:
        starts.append(start)
        yield from ((place, place) for place in (0, 20, 40) if place >= start)

    first, page = page_at(call_of(looking(1)), "trial", listing)
    second, last = page_at(call_of(Deadline.never(), cursor=page["cursor"]), "trial", listing)
    assert (first, second, last, starts) == ([0, 20], [40], {"complete": True}, [0, 21])


def test_a_first_page_may_be_empty_where_the_rest_of_the_answer_should_not_be_lost():
    def listing(_start: int) -> Iterator[tuple[int, int]]:
        raise OutOfTime(1)
        yield 0, 0

    found, page = page_at(call_of(Deadline.never()), "trial", listing, first_may_be_empty=True)
    assert (found, page["complete"]) == ([], False)
    again = call_of(Deadline.never(), cursor=page["cursor"])
    with pytest.raises(OutOfTime):
        page_at(again, "trial", listing, first_may_be_empty=True)
    found, page = page_at(again, "trial", lambda start: [(start, "first")], first_may_be_empty=True)
    assert (found, page) == (["first"], {"complete": True})
