"""Steps between numbered states as compressed rows, and what a chain of steps reaches.

The search is scipy's breadth-first search, so that depth costs nothing: O(states + steps).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from pathgate.graphs.masks import BoolArray, IntArray


@dataclass(frozen=True, slots=True)
class Rows:
    """Where each of ``size`` states leads to: the ends of state i are ``ends[begins[i]:begins[i + 1]]``."""

    size: int
    begins: npt.NDArray[np.int32]
    ends: npt.NDArray[np.int32]

    @classmethod
    def of(cls, size: int, starts: IntArray, ends: IntArray | npt.NDArray[np.int32]) -> Rows:
        """The rows of the steps ``starts[i] → ends[i]``, which must be sorted by start."""
        begins = np.zeros(size + 1, dtype=np.int32)
        np.cumsum(np.bincount(starts, minlength=size), out=begins[1:])
        return cls(size, begins, ends.astype(np.int32))

    def reached_from(self, seeds: IntArray) -> BoolArray:
        """Which states some chain of steps reaches from the seeds, these included."""
        from scipy.sparse import csr_array  # noqa: PLC0415 - slow to import, and small graphs do without
        from scipy.sparse.csgraph import breadth_first_order  # noqa: PLC0415 - as above

        # One more state that steps to every seed makes several seeds a single start.
        ends = np.concatenate([self.ends, seeds.astype(np.int32)])
        begins = np.append(self.begins, np.int32(len(ends)))
        steps = csr_array((np.ones(len(ends)), ends, begins), shape=(self.size + 1, self.size + 1))
        order = breadth_first_order(steps, self.size, directed=True, return_predecessors=False)
        flags = np.zeros(self.size + 1, dtype=np.bool_)
        flags[order] = True
        return flags[: self.size]
