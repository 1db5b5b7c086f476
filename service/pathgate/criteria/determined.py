"""Which computed columns are determined by others, and what is a computed column made of?

A computed column is determined by its inputs and by nothing else. Linear in the computed columns.
"""

from __future__ import annotations

from collections.abc import Mapping


def determined_by(known: int, inputs: Mapping[int, int]) -> int:
    """What is known once some columns are: these, and whatever is computed from them alone.

    Args:
        known: mask of the columns to start from.
        inputs: for each computed column the mask of what it is computed from, inputs before what uses them.

    >>> bin(determined_by(0b011, {2: 0b011, 3: 0b100, 5: 0b10001}))
    '0b1111'
    """
    for node, made_of in inputs.items():
        if not made_of & ~known:
            known |= 1 << node
    return known


def determined_by_others(known: int, inputs: Mapping[int, int]) -> int:
    """Those of some columns that the others among them determine.

    >>> bin(determined_by_others(0b1011, {2: 0b011, 3: 0b100}))
    '0b1000'
    """
    found, settled = 0, known
    # Inputs stand before what uses them, so that what a column is determined by is settled when it comes.
    for node, made_of in inputs.items():
        if not made_of & ~settled:
            found |= known & 1 << node
            settled |= 1 << node
    return found


def made_of(columns: int, inputs: Mapping[int, int]) -> int:
    """Some columns with all that they are computed from, step by step.

    >>> bin(made_of(0b1000, {2: 0b011, 3: 0b100}))
    '0b1111'
    """
    for node, needed in reversed(list(inputs.items())):
        if columns >> node & 1:
            columns |= needed
    return columns
