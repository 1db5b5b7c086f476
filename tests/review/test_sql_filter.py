"""Row filters in SQL: their parts, what those read and fix, and that hostile text gets a clear answer."""

from __future__ import annotations

import random
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from sqlglot.dialects.dialect import Dialect

from pathgate.graphs import read_graph
from pathgate.graphs.names import quoted
from pathgate.review import InvalidConfig, read_config
from pathgate.review.schema import DIALECTS, MOST_SQL_CHARACTERS, STANDARD_DIALECT
from pathgate.review.sql_bounds import MOST_NESTING
from tests.review.random_configs import random_config, review_of

GRAPH: dict[str, Any] = {
    "nodes": [
        {"id": "late", "columns": ["deliveries.late", "is_late"]},
        *(
            "refund",
            "depot",
            "weight",
            "ticket",
            "Rain",
            "rain",
            "order",
            "two words",
            "été",
            "tickets.opened",
        ),
        {"id": "mood", "measured": False},
    ],
    "edges": [{"source": "late", "target": "refund"}],
}
READ = read_graph(GRAPH)

Said = list[tuple[str, set[str], bool]]


def config_of(row_filter: str, dialect: str = STANDARD_DIALECT) -> Any:
    value = {"treatment": "late", "outcome": "refund", "covariates": []}
    return read_config(value | {"row_filter": row_filter, "dialect": dialect}, READ)


def parts_of(row_filter: str, dialect: str = STANDARD_DIALECT) -> Said:
    """Each part as written, the columns it reads, whether it fixes."""
    parts = [one.part for one in config_of(row_filter, dialect).rows.filter_parts]
    return [(str(part.written), set(READ.names_of(part.columns)), part.fixed) for part in parts]


def fault_of(row_filter: str, dialect: str = STANDARD_DIALECT) -> tuple[str, str]:
    with pytest.raises(InvalidConfig) as caught:
        config_of(row_filter, dialect)
    (fault,) = caught.value.faults
    assert fault.place == ("row_filter",)
    return fault.slug, fault.detail


@pytest.mark.parametrize(
    "condition",
    [
        *("depot = 'north'", "'north' = depot", "(depot) = ('north')", "depot = -1", "depot IS FALSE"),
        *("depot", "NOT depot", "depot IS TRUE", "depot = TRUE", "NOT (depot <> 1)", "NOT NOT depot"),
        *(
            "depot IN ('a')",
            "depot IN ('a', 'a', NULL)",
            "depot BETWEEN 3 AND 3",
            "depot = DATE '2026-01-01'",
        ),
        *("depot IS NOT DISTINCT FROM 'a'", "depot = :ds", "depot = CAST('3' AS INT)"),
    ],
)
def test_what_leaves_one_constant_fixes_its_column(condition: str):
    assert parts_of(condition) == [(condition, {"depot"}, True)]


@pytest.mark.parametrize(
    "condition",
    [
        *("depot <> 'a'", "depot > 3", "depot IN ('a', 'b')", "depot NOT IN ('a')", "depot BETWEEN 1 AND 2"),
        *("depot IS NOT TRUE", "depot IS NOT FALSE", "lower(depot) = 'a'", "CAST(depot AS INT) = 1"),
        *("depot LIKE 'a'", "depot = 'a' OR depot = 'b'", "depot = 1 OR FALSE", "NOT (depot = 1)"),
        *(
            "depot = random()",
            "depot IN (:depots)",
            "CASE WHEN depot = 1 THEN TRUE END",
            "COALESCE(depot, 1) = 1",
        ),
        *(
            "depot = depot",
            "depot IS DISTINCT FROM 'a'",
            "(depot IS NULL) = FALSE",
            "depot = 'a' OR depot IS NULL",
        ),
    ],
)
def test_what_may_leave_more_fixes_nothing(condition: str):
    assert parts_of(condition) == [(condition, {"depot"}, False)]


@pytest.mark.parametrize("dialect", ["duckdb", "mysql", "snowflake", "sqlite"])
def test_where_numbers_count_as_truth_values_only_false_is_one_value(dialect: str):
    written = "depot AND weight IS TRUE AND NOT ticket AND rain = TRUE"
    assert [fixed for _, _, fixed in parts_of(written, dialect)] == [False, False, True, True]


@pytest.mark.parametrize(
    ("row_filter", "said"),
    [
        (
            "depot = 'a AND b' AND weight BETWEEN 1 AND 2 AND ticket",
            [
                ("depot = 'a AND b'", "depot", True),
                ("weight BETWEEN 1 AND 2", "weight", False),
                ("ticket", "ticket", True),
            ],
        ),
        (
            "((depot = 1 AND (weight = 2))) AND (ticket)",
            [("depot = 1", "depot", True), ("(weight = 2)", "weight", True), ("(ticket)", "ticket", True)],
        ),
        ("depot = 1 AND weight = 2 OR ticket", [("depot = 1 AND weight = 2 OR ticket", "depot weight ticket", False)]),
        (
            "depot = 1 AND (weight = 2 OR ticket)",
            [("depot = 1", "depot", True), ("(weight = 2 OR ticket)", "weight ticket", False)],
        ),
        ("NOT (depot = 1 AND weight = 2)", [("NOT (depot = 1 AND weight = 2)", "depot weight", False)]),
        (
            "CASE WHEN depot = 1 AND weight = 2 THEN ticket END",
            [("CASE WHEN depot = 1 AND weight = 2 THEN ticket END", "depot weight ticket", False)],
        ),
        (
            "depot = 1 /* ) AND ( */\n AND -- AND\n weight > 2 -- end",
            [("depot = 1", "depot", True), ("weight > 2", "weight", False)],
        ),
        ("depot = 1 AND 1 = 1 AND TRUE AND depot = 1;", [("depot = 1", "depot", True)]),
        ("1 = 1", []),
        ("weight < depot", [("weight < depot", "weight depot", False)]),
    ],
)  # fmt: skip
def test_a_filter_is_split_at_its_top_level_ands(row_filter: str, said: list[tuple[str, str, bool]]):
    assert parts_of(row_filter) == [(text, set(names.split()), fixed) for text, names, fixed in said]


def test_the_operators_of_a_dialect_are_its_own():
    assert len(parts_of('depot = "north" && weight = 1', "mysql")) == 2
    for loose in ("depot = 1 || weight = 2", "depot = 1 XOR weight = 2 AND depot = 3"):
        assert parts_of(loose, "mysql") == [(loose, {"depot", "weight"}, False)]


@pytest.mark.parametrize(
    ("name", "dialect", "column"),
    [
        ("late", "standard", "late"),
        ("IS_LATE", "standard", "late"),
        ("Rain", "standard", "Rain"),
        ('"rain"', "standard", "rain"),
        ("d.weight", "standard", "weight"),
        ("warehouse.d.WEIGHT", "standard", "weight"),
        ("tickets.opened", "standard", "tickets.opened"),
        ("warehouse.Tickets.Opened", "standard", "tickets.opened"),
        ('"two words"', "standard", "two words"),
        ('"order"', "standard", "order"),
        ("`order`", "bigquery", "order"),
        ("[two words]", "tsql", "two words"),
        ("été", "standard", "été"),
        ("ÉTÉ", "standard", "été"),
        ('"LATE"', "snowflake", "late"),
        ('"LATE"', "duckdb", "late"),
        ("WEIGHT", "mysql", "weight"),
    ],
)
def test_names_fit_exactly_or_by_folding(name: str, dialect: str, column: str):
    assert parts_of(f"{name} = 1", dialect) == [(f"{name} = 1", {column}, True)]


@pytest.mark.parametrize(
    ("row_filter", "dialect", "words"),
    [
        ("dpot = 1", "standard", 'no node is named "dpot" (did you mean "depot"?)'),
        ("RAIN = 1", "standard", 'fits "Rain" and "rain"'),
        ('"LATE" = 1', "postgres", 'no node is named "LATE"'),
        ("LATE = 1", "clickhouse", 'no node is named "LATE"'),
        ('depot = "north"', "standard", "'single ones' a text"),
    ],
)
def test_unknown_names_are_faults_with_the_nearest_ones(row_filter: str, dialect: str, words: str):
    slug, detail = fault_of(row_filter, dialect)
    assert slug == "unknown-node"
    assert words in detail


@pytest.mark.parametrize(
    ("row_filter", "slug", "words"),
    [
        ("depot IN (SELECT depot FROM t)", "not-supported", "a query inside"),
        ("EXISTS (SELECT 1)", "not-supported", "a query inside"),
        ("SELECT late FROM (SELECT 1) AS t", "not-supported", "a query inside"),
        ("SELECT late FROM a UNION SELECT late FROM b", "not-supported", "UNION"),
        ("WITH a AS (SELECT 1) SELECT late FROM a", "not-supported", "WITH"),
        ("SELECT late FROM a LIMIT 3", "not-supported", "LIMIT"),
        ("SELECT DISTINCT late FROM a", "not-supported", "DISTINCT"),
        ("SELECT late FROM a ANTI JOIN b ON a.x = b.x", "not-supported", "ANTI JOIN"),
        ("SELECT late FROM a GROUP BY 1", "not-supported", "GROUP BY"),
        (
            "SELECT weight + 1 AS depot FROM a WHERE depot = 1",
            "unknown-node",
            "something the SELECT computes",
        ),
        ("count(*) > 1", "invalid-request", "aggregate"),
        ("row_number() OVER (ORDER BY late) = 1", "invalid-request", "window"),
        ("1 = 0", "invalid-request", "reads no column"),
        ("depot = 1 AND FALSE", "invalid-request", "reads no column"),
        ("random() < 0.1", "invalid-request", "reads no column"),
        ("'depot'", "invalid-request", "reads no column"),
        ("depot = NULL", "invalid-request", "IS NULL"),
        ("late IS NULL", "invalid-request", "needs its values"),
        ("depot = 1; DROP TABLE parcels", "invalid-request", "(line 1, column 10)"),
        ("depot = 1\n  AND weight >", "invalid-request", '">" (line 2, column 14)'),
        ("WHERE depot = 1", "invalid-request", "leave out the word WHERE"),
        ("depot = 'a", "invalid-request", "not closed"),
        ('"depot = 1', "invalid-request", "not closed"),
        ("depot = 1 /* a", "invalid-request", "not closed"),
        ("  ", "invalid-request", "no condition"),
        ("-- nothing", "invalid-request", "no condition"),
        ("DROP TABLE parcels", "invalid-request", "not a condition"),
        ("depot, weight", "invalid-request", "not a condition"),
    ],
)
def test_what_cannot_be_read_is_refused_by_name(row_filter: str, slug: str, words: str):
    found, detail = fault_of(row_filter)
    assert found == slug
    assert words in detail


@pytest.mark.parametrize(
    "row_filter",
    [
        "(" * 10_000 + "depot" + ")" * 10_000,
        "(" * 9_000 + "depot" + ")" * 9_000,
        "CASE WHEN " * 900 + "depot" + " THEN 1 END" * 900,
        "NOT " * 4_000 + "depot",
        "depot = " + "- " * 4_000 + "1",
        "f(" * 5_000 + "depot" + ")" * 5_000,
        "end(" * 4_000 + "depot" + ")" * 4_000,
        "DATE(" * 24 + "depot" + ")" * 24,
        "ARRAY<" * 3_000,
        "INTERVAL " * 2_000 + "1 DAY",
        "depot" + "[1]" * 5_000,
    ],
)
def test_deep_nesting_is_refused_before_it_can_hurt(row_filter: str):
    _, detail = fault_of(row_filter)
    assert "nested too deeply" in detail or f"at most {MOST_SQL_CHARACTERS:,} characters" in detail


@pytest.mark.parametrize("word", ["(", "NOT (", "CASE WHEN ", "coalesce("])
def test_as_deep_as_is_allowed_is_read_even_far_down_the_stack(word: str):
    levels = MOST_NESTING // (2 if word == "NOT (" else 1)
    text = word * levels + "depot > 1" + (" THEN TRUE END" if "CASE" in word else ")") * levels

    def from_depth(frames: int) -> Said:
        return from_depth(frames - 1) if frames else parts_of(text)

    assert from_depth(100) == [(text, {"depot"}, False)]


@pytest.mark.parametrize(
    "text",
    [
        " OR ".join(["depot = 1"] * 1_500),
        "+".join(["depot"] * 3_000) + " > 1",
        "depot IN (" + ", ".join(["1", "2"] * 3_000) + ")",
    ],
)
def test_long_flat_conditions_are_read(text: str):
    assert parts_of(text) == [(text, {"depot"}, False)]


def test_many_parts_are_read():
    text = " AND ".join(f"depot <> {number}" for number in range(1_000))
    assert [part for part, _, _ in parts_of(text)] == text.split(" AND ")


@pytest.mark.parametrize("dialect", DIALECTS[1:])
def test_every_dialect_that_is_offered_is_known(dialect: str):
    assert Dialect.get_or_raise(dialect)
    assert parts_of("depot = 'a' AND weight > 1", dialect) == [
        ("depot = 'a'", {"depot"}, True),
        ("weight > 1", {"weight"}, False),
    ]


def test_an_unknown_dialect_comes_with_the_nearest():
    with pytest.raises(InvalidConfig, match='did you mean "duckdb"') as caught:
        config_of('depot = "north', "duckbd")
    # In what words the filter is written is not known then, so nothing is said of it.
    assert [fault.place for fault in caught.value.faults] == [("dialect",)]


def notes_of(row_filter: str) -> list[tuple[str, list[str], Any]]:
    _, answer = review_of(
        GRAPH, {"treatment": "late", "outcome": "refund", "covariates": [], "row_filter": row_filter}
    )
    assert answer.verdict == "sound"
    return [(f.rule, list(f.columns), f.part) for f in answer.findings if f.severity == "note"]


def test_null_tests_select_on_being_recorded_and_are_noted():
    row_filter = "depot IS NOT NULL AND NOT weight IS NULL AND ticket IS NULL"
    assert parts_of(row_filter) == []
    assumed = "missing-at-random-assumed"
    assert notes_of(row_filter) == [
        (assumed, ["depot"], "depot IS NOT NULL"),
        (assumed, ["weight"], "NOT weight IS NULL"),
        (assumed, ["ticket"], "ticket IS NULL"),
    ]


def test_comparisons_get_one_note_for_all_of_them():
    assert notes_of("depot = 1 AND weight > 2") == [("missing-at-random-assumed", ["depot", "weight"], None)]
    assert notes_of("1 = 1") == []


def test_a_null_test_of_what_is_not_measured_is_an_error():
    _, answer = review_of(
        GRAPH, {"treatment": "late", "outcome": "refund", "covariates": [], "row_filter": "mood IS NOT NULL"}
    )
    assert [f.rule for f in answer.findings if f.severity == "error"] == ["unmeasured-filter-column"]


SELECT = """
SELECT d.*, LEFT(t.kind, 3) AS kind
FROM warehouse.deliveries AS d
JOIN tickets AS t ON d.id = t.delivery AND t.opened = TRUE AND d.depot = t.depot
LEFT JOIN scales AS s ON s.id = d.id AND s.unknown > 3
WHERE d.late > 2 AND (s.weight > 1 OR t.ticket)
GROUP BY d.depot HAVING COUNT(*) > 5 AND MAX(rain) > 1
ORDER BY d.depot
"""


def test_a_select_gives_the_conditions_of_where_having_and_inner_joins():
    assert parts_of(SELECT) == [
        ("t.opened = TRUE", {"tickets.opened"}, True),
        ("d.late > 2", {"late"}, False),
        ("(s.weight > 1 OR t.ticket)", {"weight", "ticket"}, False),
        ("COUNT(*) > 5", {"depot"}, False),
        ("MAX(rain) > 1", {"rain", "depot"}, False),
    ]


def test_joins_and_groups_are_noted():
    notes = {rule: columns for rule, columns, _ in notes_of(SELECT)}
    assert set(notes) == {"missing-at-random-assumed", "join-selects-rows", "rows-are-groups"}
    assert notes["rows-are-groups"] == ["depot"]
    assert notes["join-selects-rows"] == []
    assert [a.tables for a in config_of(SELECT).rows.assumed if a.kind == "join"] == [("tickets",)]


@pytest.mark.parametrize(
    ("joins", "tables"),
    [
        ("a, b WHERE a.id = b.id", ("b",)),
        ("a CROSS JOIN b", ("b",)),
        ("a NATURAL JOIN b", ("b",)),
        ("a RIGHT JOIN b ON LEFT(a.k, 1) = b.k", ("a",)),
        ("a LEFT JOIN b USING (k) JOIN c USING (k)", ("c",)),
        ("a FULL JOIN b ON a.k = b.k", None),
        ("a LEFT JOIN b ON a.k = b.k", None),
        ("a", None),
    ],
)
def test_only_joins_that_drop_rows_are_noted(joins: str, tables: tuple[str, ...] | None):
    config = config_of(" ".join(["SELECT late FROM", joins]))
    assert config.rows.filter_parts == ()
    assert next((assumed.tables for assumed in config.rows.assumed if assumed.kind == "join"), None) == tables


def test_keys_that_are_different_columns_of_the_graph_select():
    assert parts_of("SELECT late FROM a JOIN b ON a.depot = b.weight") == [
        ("a.depot = b.weight", {"depot", "weight"}, False)
    ]


def sql_of(parts: Any) -> str:
    """A filter in SQL that says what parts say; no two of its conditions are written alike."""
    shown = []
    for k, part in enumerate(parts):
        names = [quoted(name) for name in dict.fromkeys(part["columns"])]
        shown.append(f"{names[0]} = {k}" if part["fixed"] else " OR ".join(f"{name} > {k}" for name in names))
    return " AND ".join(f"({one})" if " OR " in one else one for one in shown)


@pytest.mark.parametrize("seeds", [range(300), pytest.param(range(300, 2500), marks=pytest.mark.slow)])
def test_sql_and_the_list_of_its_parts_review_alike(seeds: range):
    compared = remedied = 0
    for seed in seeds:
        question = random_config(seed)
        if not question.parts:
            continue
        config = question.config()
        sql = sql_of(question.parts)
        _, listed = review_of(question.graph, config)
        graph, said = review_of(question.graph, config | {"row_filter": sql})
        compared += 1
        assert said.verdict == listed.verdict, seed
        assert [(f.rule, f.columns) for f in said.findings if f.rule != "missing-at-random-assumed"] == [
            (f.rule, f.columns) for f in listed.findings
        ], seed
        assert [(r.covariates, len(r.drop_parts)) for r in said.remedies] == [
            (r.covariates, len(r.drop_parts)) for r in listed.remedies
        ], seed
        for remedy in said.remedies:
            dropped = {part.written for part in remedy.drop_parts}
            rest = " AND ".join(part for part in sql.split(" AND ") if part not in dropped)
            mended = config | {
                "covariates": list(graph.names_of(remedy.covariates)),
                "row_filter": rest or [],
            }
            assert review_of(question.graph, mended)[1].verdict == "sound", seed
            remedied += 1
    assert compared > len(seeds) // 3
    assert remedied > len(seeds) // 10


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


def test_a_function_without_brackets_is_not_taken_for_the_column_of_its_name():
    graph = read_graph({"nodes": ["late", "refund", "depot", "current_user"], "edges": []})
    value = {"treatment": "late", "outcome": "refund", "covariates": []}
    with pytest.raises(InvalidConfig, match="put the column's name in quotes"):
        read_config(value | {"row_filter": "CURRENT_USER = depot"}, graph)
    (part,) = read_config(value | {"row_filter": '"current_user" = depot'}, graph).rows.filter_parts
    assert graph.names_of(part.part.columns) == ("depot", "current_user")
