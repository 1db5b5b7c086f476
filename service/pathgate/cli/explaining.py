"""What does a rule mean, and what is to be done where it is broken? The same as its page says."""

from __future__ import annotations

import textwrap
from collections.abc import Iterator
from dataclasses import fields

from pathgate.cli.choices import NOT_JUDGED_MEANS, NOT_JUDGED_RULE
from pathgate.graphs.names import did_you_mean
from pathgate.review.rules import RULES, Rule

_FIRST = ("name", "severity", "meaning")


class NoSuchRule(Exception):
    """A name that no rule bears; the text names those that are near."""


def rule_text(name: str) -> str:
    """All that is said about a rule, as paragraphs.

    Raises:
        NoSuchRule: there is none of this name.
    """
    if name == NOT_JUDGED_RULE:
        return f"{name} (error)\n\n{NOT_JUDGED_MEANS}\n"
    if name not in RULES:
        raise NoSuchRule(
            f"no rule is called {name!r}{did_you_mean(name, list(RULES))}; pathgate explain lists them"
        )
    return "\n\n".join(_paragraphs(RULES[name])) + "\n"


def broken_at(text: str, width: int | None) -> str:
    """The text with its lines broken at a width; None breaks none."""
    if width is None:
        return text
    return "".join(f"{textwrap.fill(line, width, break_on_hyphens=False)}\n" for line in text.splitlines())


def rules_text() -> str:
    """Every rule in a line."""
    widest = max(map(len, RULES))
    return "".join(f"{rule.severity:<7}  {rule.name:<{widest}}  {rule.meaning}\n" for rule in RULES.values())


def _paragraphs(rule: Rule) -> Iterator[str]:
    yield f"{rule.name} ({rule.severity})"
    yield rule.meaning
    for each in fields(rule):
        text = "" if each.name in _FIRST else _as_text(getattr(rule, each.name))
        if text:
            yield f"{each.name.replace('_', ' ').capitalize()}\n{text}"


def _as_text(said: object) -> str:
    if isinstance(said, bool):
        return "yes" if said else "no"
    if isinstance(said, str):
        return said.strip()
    if isinstance(said, tuple | list):
        return "\n".join(f"- {each}" for each in said)
    return ""
