"""The shape of a model config, as JSON Schema 2020-12: what is checked is what is published."""

from __future__ import annotations

from typing import Any

from pathgate.graphs.node_list import MAX_NAME

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

MOST_FORMULA_CHARACTERS = 10_000

BARE_NAME: Schema = {"type": "string", "minLength": 1, "maxLength": MAX_NAME}

NAME: Schema = {**BARE_NAME, "title": "a column name"}

NAMES: Schema = {
    "title": "a column name or a list of column names",
    "anyOf": [
        BARE_NAME,
        {"type": "array", "items": BARE_NAME},
    ],
}

SOME_NAMES: Schema = {
    "title": "a column name or a list of at least one column name",
    "anyOf": [
        BARE_NAME,
        {"type": "array", "minItems": 1, "items": BARE_NAME},
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
        "anyOf": [BARE_NAME, PART],
    },
}

ASKS: Schema = {
    "enum": ["total", "direct"],
    "default": "total",
    "description": "which effect: the total one, or the direct one (the arrow's own, in linear models; one"
    " treatment and one outcome)",
}

DERIVED: Schema = {
    "type": "object",
    "title": "an object of {from}, {recodes} and {sql}, one for each computed column",
    "description": "the columns that the config computes from others, by name",
    "maxProperties": 1000,
    "additionalProperties": {
        "title": "{from: columns}, {recodes: a column} or {sql: an expression}",
        "anyOf": [
            {
                "type": "object",
                "title": "{from: columns}",
                "description": "computed from these columns alone, in whichever way",
                "properties": {"from": SOME_NAMES},
                "required": ["from"],
                "additionalProperties": False,
            },
            {
                "type": "object",
                "title": "{recodes: a column}",
                "description": "the same column in other units, on another scale or in buckets",
                "properties": {
                    "recodes": NAME,
                    "coarse": {
                        "type": "boolean",
                        "default": False,
                        "description": "true where different values become one (a bucket, a threshold)",
                    },
                },
                "required": ["recodes"],
                "additionalProperties": False,
            },
            {
                "type": "object",
                "title": "{sql: an expression}",
                "description": "computed as this SQL expression says; one that is one-to-one in one column recodes it",
                "properties": {
                    "sql": {
                        "title": "a SQL expression",
                        "type": "string",
                        "minLength": 1,
                        "maxLength": MOST_SQL_CHARACTERS,
                    }
                },
                "required": ["sql"],
                "additionalProperties": False,
            },
        ],
    },
}

MISSING: Schema = {
    "type": "object",
    "title": "an object: for each column the columns that make it go missing",
    "description": "for each column that may be null, what decides whether it is (nothing in the graph: an empty"
    " list); rows are dropped where it is null",
    "additionalProperties": NAMES,
}

ACCEPT: Schema = {
    "type": "array",
    "title": "a list of waivers {rule, columns, why, owner, until}",
    "description": "findings that the team knows of and accepts; a waiver never changes the verdict, and is shown with"
    " what it accepts",
    "maxItems": 1000,
    "items": {
        "type": "object",
        "title": "a waiver {rule, columns, why, owner, until}",
        "properties": {
            "rule": {
                "type": "string",
                "maxLength": 100,
                "description": "the rule whose findings are accepted",
            },
            "columns": {
                **SOME_NAMES,
                "description": "only the finding that blames exactly these columns; without it every one of the rule",
            },
            "why": {
                "type": "string",
                "maxLength": 2000,
                "description": "the reason; without one nothing is accepted",
            },
            "owner": {"type": "string", "maxLength": 200, "description": "who answers for it"},
            "until": {
                "type": "string",
                "title": "a date as YYYY-MM-DD",
                "pattern": "^[0-9]{4}-[0-9]{2}-[0-9]{2}$",
                "description": "the last day on which it holds, YYYY-MM-DD (days in UTC)",
            },
        },
        "required": ["rule"],
        "additionalProperties": False,
    },
}

CONFIG_SCHEMA: Schema = {
    "type": "object",
    "description": "What one model claims: which effect it reports, adjusted for what, on which rows. Without a"
    " formula, outcome and covariates are needed too.",
    "properties": {
        "$schema": {"type": "string", "description": "for editors; not read"},
        "name": {"type": "string", "maxLength": 200, "description": "what the config is called in answers"},
        "treatment": {**SOME_NAMES, "description": "the column or columns whose effect is claimed"},
        "outcome": {**SOME_NAMES, "description": "the column or columns on which the effect is claimed"},
        "asks": ASKS,
        "covariates": {**NAMES, "description": "the columns that the model adjusts for"},
        "formula": {
            "type": "string",
            "title": "a model formula",
            "description": "the model in Wilkinson notation, outcome ~ terms; outcome and covariates may then be left"
            " out, and must agree with it where they are given",
            "minLength": 1,
            "maxLength": MOST_FORMULA_CHARACTERS,
        },
        "fixed_effects": {
            **NAMES,
            "description": "the columns whose fixed effects the model absorbs, and with each whatever the graph"
            " marks as constant within it, measured or not",
        },
        "weighted_by": {**NAMES, "description": "the columns that its weights are made of: adjusted for"},
        "matched_on": {**NAMES, "description": "the columns that it matches rows on: adjusted for"},
        "derived": DERIVED,
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
            "description": "in whose SQL the row filter and derived columns are written",
        },
        "row_filter_fixed": {
            "type": "boolean",
            "default": False,
            "description": "true where no condition of the row filter may be dropped",
        },
        "rows_exist_because": {
            **NAMES,
            "description": "what decides, beside the row filter, whether a row is there at all (an inner join, a"
            " rule of retention): nodes of the graph, measured or not",
        },
        "missing_because": MISSING,
        "population": {
            "enum": ["kept", "whole"],
            "default": "kept",
            "description": "whose effect is claimed: of the rows kept, or of everybody",
        },
        "measured_everywhere": {
            **NAMES,
            "description": "the columns whose distribution over everybody is known, for the effect in everybody",
        },
        "outside_graph": {
            **NAMES,
            "description": "names of columns that the graph does not have and the config may use",
        },
        "accept": ACCEPT,
        "meta": {"description": "anything; returned as it is"},
    },
    "required": ["treatment"],
    "additionalProperties": False,
}
