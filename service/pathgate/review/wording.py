"""How findings name columns, parts and paths in plain text.

A conditioned node stands in [brackets], an unmeasured one in (parentheses), a condition on the rows in
{braces}; arrows are drawn as they point, ↔ for an unmeasured common cause.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from pathgate.criteria.paths import Trail
from pathgate.criteria.selection import Kept
from pathgate.graphs.masks import members
from pathgate.graphs.names import quoted
from pathgate.review.visible import visible

_ARROWS = {"forward": "→", "backward": "←", "both": "↔"}


def listed(names: Sequence[str], joined: str = "and") -> str:
    """Names in double quotes, as a list in a sentence; long lists are cut short.

    >>> listed(["rain", "promo", "depot"])
    '"rain", "promo" and "depot"'
    """
    is_long = len(names) > 6
    shown = [quoted(name) for name in (names[:5] if is_long else names)]
    if is_long:
        shown.append(f"{len(names) - 5} more")
    return shown[0] if len(shown) == 1 else f"{', '.join(shown[:-1])} {joined} {shown[-1]}"


def part_text(part: object) -> str:
    """A condition on the rows, in a sentence.

    >>> part_text(["region", "depot"]), part_text({"columns": "region", "fixed": True})
    ('"region" and "depot"', 'one value of "region"')
    >>> part_text("depot = 'north'")
    "`depot = 'north'`"
    """
    if isinstance(part, str):
        return f"`{shortened(part)}`"
    if isinstance(part, Mapping):
        if "columns" not in part:
            return silent_text(part)
        columns = part["columns"]
        shown = listed([columns] if isinstance(columns, str) else columns)
        return f"one value of {shown}" if part.get("fixed") else shown
    return listed(part)  # type: ignore[arg-type] # a list of names


def condition_text(part: object) -> str:
    """A condition on the rows as the subject of a sentence.

    >>> condition_text("depot = 'north'"), condition_text({"columns": "depot", "fixed": True})
    ("The condition `depot = 'north'`", 'The row filter')
    """
    return f"The condition {part_text(part)}" if isinstance(part, str) else "The row filter"


def silent_text(written: object) -> str:
    """What makes rows go missing beside the row filter, as the subject of a sentence.

    >>> silent_text({"rows_exist_because": "courier_app"}), silent_text({"missing_because": {"weight": ["depot"]}})
    ('having only rows that exist because of "courier_app"', 'losing the rows without "weight" because of "depot"')
    """
    said = written if isinstance(written, Mapping) else {}
    if "rows_exist_because" in said:
        return f"having only rows that exist because of {_listed_one_or_more(said['rows_exist_because'])}"
    ((column, causes),) = said["missing_because"].items()
    return f"losing the rows without {quoted(column)} because of {_listed_one_or_more(causes)}"


def silent_label(written: object) -> str:
    """The same in a few words, for the drawing of a path.

    >>> silent_label({"rows_exist_because": "courier_app"}), silent_label({"missing_because": {"weight": ["depot"]}})
    ('row exists', '"weight" recorded')
    """
    said = written if isinstance(written, Mapping) else {}
    if "rows_exist_because" in said:
        return "row exists"
    (column,) = said["missing_because"]
    return f"{quoted(column)} recorded"


def _listed_one_or_more(names: str | Sequence[str]) -> str:
    return listed([names] if isinstance(names, str) else names)


def capital(sentence: str) -> str:
    """The sentence with a capital letter first."""
    return sentence[:1].upper() + sentence[1:]


def shortened(sql: str) -> str:
    """SQL text on one line, cut short where it is long.

    >>> shortened("depot  IN\\n('north')")
    "depot IN ('north')"
    """
    line = visible(" ".join(sql[:400].split()))
    return line if len(line) <= 120 else line[:117] + "…"


def arrow_text(kept: Kept, trail: Trail, conditioned: int) -> str:
    """A path on one line."""
    shown = [_node(kept, node, conditioned) for node in trail.nodes]
    joints = [f" {_ARROWS[arrow]} " for arrow in trail.arrows]
    return shown[0] + "".join(joint + node for joint, node in zip(joints, shown[1:], strict=True))


def names_in(kept: Kept, nodes: int) -> tuple[str, ...]:
    """The names of a set of columns, selection nodes left out."""
    return tuple(name for node in members(nodes) if (name := kept.graph.name(node)))


def _node(kept: Kept, node: int, conditioned: int) -> str:
    name = kept.graph.name(node)
    if not name:
        written = kept.part_of[node].written
        if isinstance(written, Mapping) and "columns" not in written:
            return "{" + silent_label(written) + "}"
        return "{" + (shortened(written) if isinstance(written, str) else part_text(written)) + "}"
    # Quotes only where a name could be misread as part of the drawing.
    shown = name if name.isprintable() and not set(name) & set(' →←↔[](){}"') else quoted(name)
    if conditioned >> node & 1:
        return f"[{shown}]"
    return shown if kept.graph.measured >> node & 1 else f"({shown})"
