"""The shape of a model config, as JSON Schema 2020-12: what is checked is what is published."""

from __future__ import annotations

from typing import Any

Schema = dict[str, Any]

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
            **PARTS,
            "description": "which rows the model sees: the columns its filter reads (together one condition),"
            " or one {columns, fixed} for each condition joined by AND",
            "x-not-yet-types": {
                "string": "a row filter as SQL text is not supported by this version;"
                " list the columns it reads, or its conditions as {columns, fixed}"
            },
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
        "dialect",
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
