"""How much of one column does a value computed from it keep? The words for it, whatever the value is written in.

What is not known to be one-to-one is coarse, which is the cautious reading.
"""

from __future__ import annotations

from typing import Literal

Keeps = Literal["column", "one-to-one", "coarse", "computed"]
"""The column itself, all of its values, fewer; or it mixes several columns."""
