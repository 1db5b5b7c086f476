"""Graphs that many tests ask about, and how a test says which problem it expects."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import AbstractContextManager, contextmanager
from typing import Any

import pytest
from hypothesis import settings

from pathgate.graphs import CausalGraph, PathgateError

# How long an example takes says more of the machine's other work than of the code.
settings.register_profile("untimed", deadline=None)
settings.load_profile("untimed")

RaisesProblem = Callable[..., AbstractContextManager[None]]


@pytest.fixture
def parcel_chain() -> CausalGraph:
    # weather → late_van → full_locker → refund
    return CausalGraph.of(("weather", "late_van"), ("late_van", "full_locker"), ("full_locker", "refund"))


@pytest.fixture
def ticket_graph() -> CausalGraph:
    # order_value → late_delivery, order_value → refund, late_delivery → refund,
    # late_delivery → ticket_opened ← refund
    return CausalGraph.of(
        ("order_value", "late_delivery"),
        ("order_value", "refund"),
        ("late_delivery", "refund"),
        ("late_delivery", "ticket_opened"),
        ("refund", "ticket_opened"),
    )


@pytest.fixture
def raises_problem() -> RaisesProblem:
    """``with raises_problem(slug, detail=value)``: the block raises that problem with those details."""

    @contextmanager
    def expecting(slug: str, **details: Any) -> Iterator[None]:
        with pytest.raises(PathgateError) as caught:
            yield
        assert caught.value.slug == slug
        assert {name: caught.value.details[name] for name in details} == details

    return expecting
