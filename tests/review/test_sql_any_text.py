"""Row filters of any text: read or refused in words, whatever stands in brackets and strings."""

from __future__ import annotations

import random
from typing import Any

from hypothesis import given, settings
from hypothesis import strategies as st

from pathgate.review import InvalidConfig
from pathgate.review.schema import DIALECTS
from tests.review.sql_asking import config_of, parts_of

_WORDS = (
    *(
        "(",
        ")",
        "[",
        "]",
        "depot",
        "weight",
        "late",
        "'a'",
        "1",
        "=",
        "<",
        ">",
        "AND",
        "OR",
        "NOT",
        "IS",
        "NULL",
    ),
    *(
        "IN",
        "BETWEEN",
        "CASE",
        "WHEN",
        "THEN",
        "ELSE",
        "END",
        "CAST(",
        "AS",
        "DATE",
        ";",
        ",",
        ".",
        "::",
        "->",
    ),
    *("?", "@", "--", "/*", "*/", '"', "`", "SELECT", "FROM", "WHERE", "JOIN", "ON", "x", "LIKE", "INTERVAL"),
    *("{{", "}}", "IF", "*", "+", "-", "||"),
)
_BITS = ("'", '"', ";", "--", "/*", "*/", "(", ")", "AND", "OR", "\\", "\u202e", "\x07", "é", "🙂")
_ATOMS = st.sampled_from(
    ["depot = 1", "weight BETWEEN 1 AND 2", "ticket", "(rain > 1 OR ticket)", "order IN (1, 2)"]
)


@given(st.recursive(_ATOMS, lambda few: st.lists(few, min_size=2, max_size=3), max_leaves=9))
@settings(max_examples=150, deadline=None)
def test_brackets_around_ands_change_nothing(tree: Any):
    def written(node: Any) -> str:
        return node if isinstance(node, str) else "(" + " AND ".join(map(written, node)) + ")"

    def leaves(node: Any) -> list[str]:
        return [node] if isinstance(node, str) else [leaf for one in node for leaf in leaves(one)]

    said = [text for text, _, _ in parts_of(written(tree))]
    assert said == list(dict.fromkeys(leaves(tree)))


@given(
    st.lists(
        st.sampled_from(_WORDS) | st.text(max_size=3),
        max_size=25,
    ),
    st.sampled_from(DIALECTS),
)
@settings(max_examples=400, deadline=None)
def test_any_text_is_read_or_refused_in_words(words: list[str], dialect: str):
    text = " ".join(words)
    try:
        config = config_of(text, dialect)
    except InvalidConfig as refused:
        is_in_order = all(fault.detail and fault.place == ("row_filter",) for fault in refused.faults)
    else:
        is_in_order = all(
            str(one.part.written) in text and one.part.columns for one in config.rows.filter_parts
        )
    assert is_in_order


def test_text_of_every_kind_stays_within_strings():
    rng = random.Random(5)
    for _ in range(300):
        value = "".join(rng.choice(_BITS) for _ in range(8))
        written = "depot = '" + value.replace("'", "''") + "'"
        assert parts_of(written + " AND weight > 1") == [
            (written, {"depot"}, True),
            ("weight > 1", {"weight"}, False),
        ]
