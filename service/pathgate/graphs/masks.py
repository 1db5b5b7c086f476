"""Sets of nodes as bit masks: node i is in the set when bit i is one.

Python's integers make fast sets up to thousands of nodes. Where a mask is wide, going through it bit by bit
would cost a copy per bit, so wide masks are unpacked by numpy in one linear pass.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator

import numpy as np
import numpy.typing as npt

BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]

_WIDE = 2048


def members(mask: int) -> Iterator[int]:
    """The set bits of a mask, lowest first."""
    if mask.bit_length() > _WIDE:
        yield from np.flatnonzero(unpack(mask, mask.bit_length())).tolist()
        return
    while mask:
        lowest = mask & -mask
        yield lowest.bit_length() - 1
        mask ^= lowest


def mask_of(indices: Iterable[int]) -> int:
    """The mask with these bits set."""
    listed = list(indices)
    if len(listed) < 64:
        mask = 0
        for index in listed:
            mask |= 1 << index
        return mask
    flags = np.zeros(max(listed) + 1, dtype=np.bool_)
    flags[listed] = True
    return pack(flags)


def unpack(mask: int, size: int) -> BoolArray:
    """The mask as ``size`` booleans."""
    raw = mask.to_bytes((size + 7) // 8, "little")
    return np.unpackbits(np.frombuffer(raw, dtype=np.uint8), count=size, bitorder="little").view(np.bool_)


def pack(flags: BoolArray) -> int:
    """The mask of the true positions."""
    return int.from_bytes(np.packbits(flags, bitorder="little").tobytes(), "little")
