"""The shape of a model config, as JSON Schema 2020-12: what is checked is what is published."""

from __future__ import annotations

from typing import Any

Schema = dict[str, Any]

STANDARD_DIALECT = "standard"
"""The SQL of the standard, as far as most engines agree on it."""

DIALECTS = (
    STANDARD_DIALECT,
    *(
        "athena",
        "bigquery",
        "clickhouse",
        "databricks",
        "doris",
        "dremio",
        "drill",
        "druid",
        "duckdb",
        "exasol",
    ),
    *("fabric", "hive", "materialize", "mysql", "oracle", "postgres", "presto", "redshift", "risingwave"),
    *("snowflake", "spark", "spark2", "sqlite", "starrocks", "teradata", "trino", "tsql"),
)

MOST_SQL_CHARACTERS = 20_000

NAME: Schema = {"type": "string", "minLength": 1, "maxLength": 200, "title": "a column name"}

NAMES: Schema = {
    "title": "a column name or a list of column names",
    "anyOf": [
        {"type": "string", "minLength": 1, "maxLength": 200},
        {"type": "array", "items": {"type": "string", "minLength": 1, "maxLength": 200}},
    ],
}

SOME_NAMES: Schema = {
    "title": "a column name or a list of at least one column name",
    "anyOf": [
        {"type": "string", "minLength": 1, "maxLength": 200},
        {"type": "array", "minItems": 1, "items": {"type": "string", "minLength": 1, "maxLength": 200}},
    ],
}

PART: Schema = {
    "type": "object",
    "title": "a condition {columns, fixed}",
    "description": "one condition on the rows: the columns it reads, and whether it holds one column at one value",
    "properties": {
        "columns": {**SOME_NAMES, "description": "the column or columns that the condition reads"},
        "fixed": {
            "type": "boolean",
            "default": False,
            "description": "true where the condition holds its one column at one value",
        },
    },
    "required": ["columns"],
    "additionalProperties": False,
}

PARTS: Schema = {
    "type": "array",
    "title": "a list of column names (together one condition that reads them all) and conditions",
    "items": {
        "title": "a column name or a condition {columns, fixed}",
        "anyOf": [{"type": "string", "minLength": 1, "maxLength": 200}, PART],
    },
}

ASKS: Schema = {
    "enum": ["total", "direct"],
    "default": "total",
    "description": "which effect: the total one, or the direct one (the arrow's own, in linear models; one"
    " treatment and one outcome)",
}

CONFIG_SCHEMA: Schema = {
    "type": "object",
    "description": "What one model claims: which effect it reports, adjusted for what, on which rows.",
    "properties": {
        "$schema": {"type": "string", "description": "for editors; not read"},
        "name": {"type": "string", "maxLength": 200, "description": "what the config is called in answers"},
        "treatment": {**SOME_NAMES, "description": "the column or columns whose effect is claimed"},
        "outcome": {**SOME_NAMES, "description": "the column or columns on which the effect is claimed"},
        "asks": ASKS,
        "covariates": {**NAMES, "description": "the columns that the model adjusts for"},
        "row_filter": {
            "title": "a SQL condition, a SELECT, or a list of column names and conditions",
            "description": "which rows the model sees: a SQL condition (or the whole SELECT that it stands in),"
            " or a list: the columns its filter reads (together one condition), or one {columns, fixed} for each"
            " condition joined by AND",
            "anyOf": [
                {
                    "type": "string",
                    "title": "a SQL condition or a SELECT",
                    "minLength": 1,
                    "maxLength": MOST_SQL_CHARACTERS,
                },
                PARTS,
            ],
        },
        "dialect": {
            "enum": list(DIALECTS),
            "default": STANDARD_DIALECT,
            "description": "in whose SQL the row filter is written",
        },
        "row_filter_fixed": {
            "type": "boolean",
            "default": False,
            "description": "true where no condition of the row filter may be dropped",
        },
        "population": {
            "enum": ["kept"],
            "default": "kept",
            "description": "whose effect is claimed: of the rows kept",
        },
        "meta": {"description": "anything; returned as it is"},
    },
    "required": ["treatment", "outcome", "covariates"],
    "additionalProperties": False,
    "x-not-yet": [
        "formula",
        "derived",
        "rows_exist_because",
        "missing_because",
        "measured_everywhere",
        "fixed_effects",
        "weighted_by",
        "matched_on",
        "outside_graph",
        "accept",
    ],
}
