"""The terms of a model: which coefficients it has, and what each of them multiplies.

A formula tells them; without one each treatment and covariate is a term by itself.
"""

from __future__ import annotations

from dataclasses import dataclass

from pathgate.graphs.errors import Place


@dataclass(frozen=True, slots=True)
class ModelTerm:
    """One term of a model.

    Attributes:
        written: the term as the config writes it.
        place: where.
        node: the column that it is, computed ones included; None for a product of columns that stand alone as well,
            and for what is outside the graph.
        crossed: mask of the columns that it is multiplied with, or for a product of all its columns.
        is_bent: do other terms hold further functions of the same column?
    """

    written: str
    place: Place
    node: int | None
    crossed: int = 0
    is_bent: bool = False
