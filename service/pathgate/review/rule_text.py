"""What is said of a rule beside its one sentence of meaning, for somebody who has to act on a finding.

Kept apart from the table of rules, so that all texts of one kind can be read next to each other.
"""

from __future__ import annotations

from typing import NamedTuple


class RuleText(NamedTuple):
    """The texts of one rule, for a reader without training in causes; names of columns stand in backticks.

    Attributes:
        why_it_matters: what happens to the number.
        example: one case from the parcel lockers: who did what with which columns, and why it misleads.
        what_to_do: one or two sentences.
    """

    why_it_matters: str
    example: str
    what_to_do: str
