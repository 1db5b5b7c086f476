"""Which known name did the writer of an unknown one mean?

Edit distance (Levenshtein 1966) over all known names, computed by rapidfuzz in C++: about 2 ms for one name
against 20,000.
"""

from __future__ import annotations

from collections.abc import Collection, Iterable, Sized
from itertools import chain

from rapidfuzz import process
from rapidfuzz.distance import OSA, Levenshtein

# A misspelt member must not pass as a free attribute: this many letters apart counts as misspelt …
MISSPELT_WITHIN = 2
# … of names long enough that so few letters cannot turn one honest word into another.
MISSPELT_FROM_LENGTH = 6
# Faults of one input that are found before hints are no longer looked for.
MOST_HINTS = 50


def nearest_names(name: str, known: Collection[str], *, most: int = 3) -> tuple[str, ...]:
    """The known names nearest to ``name``, best first; empty where none is near.

    >>> nearest_names("wether", ["weather", "locker", "whether"])
    ('weather', 'whether')
    """
    # At least one letter must agree, or every name of one letter would be near every other.
    cutoff = min(max(len(name) - 1, 0), 4, len(name) // 3 + 1)
    plain = _fold(name)
    found = process.extract(
        plain, known, scorer=OSA.distance, processor=_fold, score_cutoff=cutoff, limit=most
    )
    return tuple(match for match, _distance, _place in found)


def did_you_mean(name: str, known: Collection[str]) -> str:
    """`` (did you mean "a" or "b"?)``, or nothing where no known name is near."""
    near = nearest_names(name, known)
    return f" (did you mean {' or '.join(quoted(other) for other in near)}?)" if near else ""


def hint_within(faults: Sized, name: str, *known: Collection[str]) -> str:
    """The same for one more fault of an input, as long as few have been found.

    Past ``MOST_HINTS`` faults nobody reads hints any more, and a hundred thousand would take minutes.
    """
    return did_you_mean(name, [*chain(*known)]) if len(faults) < MOST_HINTS else ""


def misspelt_member(name: str, known: Iterable[str]) -> str | None:
    """The known member that a free attribute's name is suspiciously close to, or None.

    >>> misspelt_member("mesured", ["id", "measured"]), misspelt_member("team", ["id", "measured"])
    ('measured', None)
    """
    for member in known:
        if len(member) >= MISSPELT_FROM_LENGTH and (
            Levenshtein.distance(name, member, score_cutoff=MISSPELT_WITHIN) <= MISSPELT_WITHIN
        ):
            return member
    return None


def quoted(name: str) -> str:
    """A name as messages show it: in double quotes, long ones cut short, control characters made visible."""
    shown = name if len(name) <= 80 else name[:77] + "…"
    return '"' + "".join(c if c.isprintable() else f"\\u{ord(c):04x}" for c in shown) + '"'


def _fold(name: str) -> str:
    return name.casefold().replace("-", "_").replace(" ", "_")
