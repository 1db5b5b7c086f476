"""Masks are sets: narrow and wide ones behave alike. Names near to a misspelt one are found."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from pathgate.graphs import did_you_mean, nearest_names, quoted
from pathgate.graphs.masks import mask_of, members, pack, unpack
from tests.strategies import HOSTILE_NAMES

NARROW = st.sets(st.integers(0, 70), max_size=70)
WIDE = st.sets(st.one_of(st.integers(0, 5000), st.integers(2040, 2056)), max_size=300)


@given(nodes=st.one_of(NARROW, WIDE))
def test_a_mask_holds_its_members_in_order_whatever_its_width(nodes: set[int]):
    mask = mask_of(nodes)
    assert mask == sum(1 << node for node in nodes)
    assert list(members(mask)) == sorted(nodes)
    assert mask_of(members(mask)) == mask


@given(nodes=st.one_of(NARROW, WIDE), beyond=st.integers(0, 20))
def test_flags_and_masks_say_the_same(nodes: set[int], beyond: int):
    size = max(nodes, default=-1) + 1 + beyond
    flags = unpack(mask_of(nodes), size)
    assert (len(flags), flags.dtype) == (size, np.bool_)
    assert set(np.flatnonzero(flags).tolist()) == nodes
    assert pack(flags) == mask_of(nodes)


def test_repeated_and_unordered_indices_make_one_mask():
    assert mask_of([3, 1, 3]) == 0b1010
    assert mask_of(iter([5] * 100)) == 1 << 5
    assert mask_of([]) == 0


@pytest.mark.parametrize(
    ("name", "known", "nearest"),
    [
        ("wether", ["weather", "locker", "whether"], ("weather", "whether")),
        ("Order Value", ["order_value", "order"], ("order_value",)),
        ("refnud", ["refund"], ("refund",)),
        ("zzz", ["refund"], ()),
        ("", ["refund"], ()),
        ("a", [], ()),
    ],
)
def test_the_nearest_names_are_found(name: str, known: list[str], nearest: tuple[str, ...]):
    assert nearest_names(name, known) == nearest


def test_hints_name_what_is_near_or_nothing():
    assert did_you_mean("refnd", ["refund"]) == ' (did you mean "refund"?)'
    assert did_you_mean("moon", ["refund"]) == ""


@pytest.mark.parametrize("name", HOSTILE_NAMES)
def test_a_quoted_name_is_printable_and_short(name: str):
    shown = quoted(name)
    assert shown.isprintable()
    assert len(shown) <= 90
    assert (shown[0], shown[-1]) == ('"', '"')
