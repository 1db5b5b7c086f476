"""Pages of a long listing, without a store: the cursor says where to go on and which request it belongs to.

A cursor holds the place of the first item not given yet and a digest of that place, the operation, the version
and the request. So any replica takes it, and one that was made for another request is noticed. No secret is in it.
"""

from __future__ import annotations

import base64
import hashlib
import sys
from collections.abc import Callable, Iterable, Iterator
from typing import Any, TypeVar

import msgspec

from pathgate.criteria.errors import OutOfTime
from pathgate.version import VERSION
from pathgate.web.operations import Call
from pathgate.web.problems import Failed, Problem

Item = TypeVar("Item")

DEFAULT_LIMIT = 100
_DIGEST_BYTES = 16


def page_of(call: Call, operation: str, items: Iterable[Item]) -> tuple[list[Item], dict[str, Any]]:
    """The items of the page asked for, and the members ``complete`` and ``cursor`` that go beside them.

    A listing that the deadline cuts short ends as an incomplete page, unless it holds nothing at all.

    Raises:
        Failed: the cursor was not made for this request.
        OutOfTime: the time ran out before the first item.
    """
    return page_at(call, operation, lambda start: _after(call, items, start))


def page_at(
    call: Call,
    operation: str,
    listing: Callable[[int], Iterable[tuple[int, Item]]],
    *,
    first_may_be_empty: bool = False,
) -> tuple[list[Item], dict[str, Any]]:
    """As ``page_of``, for a listing that can go on at a place without making what comes before.

    Args:
        call: the request.
        operation: what it asks.
        listing: the items from a place on, each with its place; places rise, and 0 comes before all of them.
        first_may_be_empty: where the time runs out before the first item of all, is that an empty page? So that
            other members of the answer are not lost. Whoever goes on from there, and has no more luck, is refused.

    Raises:
        Failed: the cursor was not made for this request.
        OutOfTime: the time ran out before the first item.
    """
    limit = min(int(call.body.get("limit", DEFAULT_LIMIT)), call.settings.max_page)
    request = _request_digest(call, operation)
    start = _place_of(call.body["cursor"], request) if "cursor" in call.body else 0
    found: list[Item] = []
    after = start
    try:
        for place, item in listing(start):
            if len(found) == limit:
                return found, {"complete": False, "cursor": _cursor(place, request)}
            found.append(item)
            after = place + 1
            call.deadline.poll()
    except OutOfTime:
        if not found and not (first_may_be_empty and "cursor" not in call.body):
            raise
        return found, {"complete": False, "cursor": _cursor(after, request)}
    return found, {"complete": True}


def _after(call: Call, items: Iterable[Item], start: int) -> Iterator[tuple[int, Item]]:
    """The items from ``start`` on with their numbers; the time is watched while those before are passed over."""
    for place, item in enumerate(items):
        if place >= start:
            yield place, item
        else:
            call.deadline.poll()


def _request_digest(call: Call, operation: str) -> bytes:
    asked = {member: said for member, said in call.whole.items() if member not in ("limit", "cursor")}
    canonical = msgspec.json.encode([operation, VERSION, asked, call.graphs], order="deterministic")
    return hashlib.sha256(canonical).digest()


def _cursor(place: int, request: bytes) -> str:
    written = str(place).encode()
    seal = hashlib.sha256(request + written).digest()[:_DIGEST_BYTES]
    return base64.urlsafe_b64encode(seal + written).decode().rstrip("=")


def _place_of(cursor: str, request: bytes) -> int:
    try:
        held = base64.b64decode(cursor + "=" * (-len(cursor) % 4), altchars=b"-_", validate=True)
        place = int(held[_DIGEST_BYTES:])
    except ValueError:
        place = -1
    if not 0 <= place <= sys.maxsize or _cursor(place, request) != cursor:
        raise Failed(Problem.of("bad-cursor", "the cursor was not made for this request"))
    return place
