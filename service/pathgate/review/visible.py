"""How is text that others wrote shown on a terminal? So that it can neither steer the terminal nor hide.

Names may hold anything: escape sequences, line breaks, marks that turn the direction of writing. Whatever is
not a printable character is shown by its number.
"""

from __future__ import annotations


def visible(text: str) -> str:
    """The text on one line, unprintable characters as ``\\uXXXX``; O(length).

    >>> print(visible("plain, 'quoted' → as it is"))
    plain, 'quoted' → as it is
    >>> print(visible("\\x1b[31mred\\n"))
    \\u001b[31mred\\u000a
    """
    if text.isprintable():
        return text
    return "".join(c if c.isprintable() else f"\\u{ord(c):04x}" for c in text)
