"""The shape of a review, as /v1/review, /v1/reviews and whatever else holds one publish it.

Words that a review can use (rules, roles, verdicts, advice) are taken from where they are declared, so that a new one
is published as soon as it is there.
"""

from __future__ import annotations

from typing import Any, get_args

from pathgate.review.coefficients import ReadsAs
from pathgate.review.config import Claimed
from pathgate.review.findings import Verdict
from pathgate.review.optional import Precision
from pathgate.review.roles import ROLES, Advice
from pathgate.review.rules import RULES, SEVERITIES
from pathgate.review.schema import CONFIG_SCHEMA
from pathgate.web.endpoints.hinge_schema import HINGE_COMPONENTS
from pathgate.web.endpoints.shared_schemas import MEASURE_NEXT, NAME_LIST, PATH_COMPONENTS

_LABELS: dict[str, Any] = {"type": "array", "items": {"$ref": "#/components/schemas/Label"}}

FINDING: dict[str, Any] = {
    "type": "object",
    "properties": {
        "rule": {"enum": list(RULES)},
        "severity": {"enum": list(SEVERITIES)},
        "columns": {**NAME_LIST, "description": "the columns to blame"},
        "message": {
            "type": "string",
            "description": "plain sentences; [x] is conditioned on, (x) is unmeasured",
        },
        "pointer": {"type": "string", "description": "where in the request"},
        "help": {"type": "string", "description": "the page that explains the rule"},
        "part": {"description": "the condition on the rows it is about, as written"},
        "accepted": {
            "type": "object",
            "description": "the waiver that accepts it; the verdict stays what it is",
            "properties": {
                "why": {"type": "string"},
                "owner": {"type": "string"},
                "until": {"type": ["string", "null"]},
            },
            "required": ["why", "owner", "until"],
            "additionalProperties": False,
        },
        "open_path": {"$ref": "#/components/schemas/Path"},
        "causal_path": {**_LABELS, "description": "the causal path that forbids the column"},
        "descent": {**_LABELS, "description": "from that path down to what is conditioned on"},
    },
    "required": ["rule", "severity", "columns", "message", "pointer", "help"],
    "additionalProperties": False,
}

COEFFICIENT: dict[str, Any] = {
    "type": "object",
    "description": "what one coefficient of the model may be read as; the treatment's verdict does not carry over to"
    " the covariates",
    "properties": {
        "term": {"type": "string", "description": "the term, as the config writes it"},
        "reads_as": {
            "enum": list(get_args(ReadsAs)),
            "description": "the total effect of the column on the outcome, its direct effect in a linear model, or"
            " neither",
        },
        "why": {"type": "string"},
    },
    "required": ["term", "reads_as", "why"],
    "additionalProperties": False,
}

REMEDY: dict[str, Any] = {
    "type": "object",
    "properties": {
        "covariates": {
            **NAME_LIST,
            "description": "all covariates to have, beside what stays of weights, matching and fixed effects",
        },
        "add": NAME_LIST,
        "drop": {
            **NAME_LIST,
            "description": "to take out of covariates, weights, matching and fixed effects",
        },
        "drop_filter_parts": {"type": "array", "description": "conditions to drop, as written"},
        "population": {"enum": list(get_args(Claimed)), "description": "whose effect it then is"},
        "message": {"type": "string"},
    },
    "required": ["covariates", "add", "drop", "drop_filter_parts", "population", "message"],
    "additionalProperties": False,
}

PROVENANCE: dict[str, Any] = {
    "type": "object",
    "description": "what the verdict was given on: digests (SHA-256 over the RFC 8785 form, defaults filled in) that"
    " stay the same where nothing that is read differs",
    "properties": {
        "version": {"type": "string", "description": "of Pathgate"},
        "graph_digest": {"type": "string", "pattern": "^sha256:[0-9a-f]{64}$"},
        "config_digest": {"type": "string", "pattern": "^sha256:[0-9a-f]{64}$"},
    },
    "required": ["version", "graph_digest", "config_digest"],
    "additionalProperties": False,
}

REVIEW: dict[str, Any] = {
    "type": "object",
    "properties": {
        "name": {"type": "string"},
        "verdict": {
            "enum": list(get_args(Verdict)),
            "description": (
                "sound: these covariates on these rows carry the effect claimed, if the graph is right;"
                " unanswerable: no choice of measured covariates and filter parts would; biased: a remedy exists"
            ),
        },
        "summary": {"type": "string", "description": "the whole in one sentence"},
        "findings": {"type": "array", "items": {"$ref": "#/components/schemas/Finding"}},
        "columns": {
            "type": "array",
            "items": {
                "type": "object",
                "properties": {
                    "column": {"type": "string"},
                    "role": {
                        "enum": list(ROLES),
                        "description": "the first that fits: "
                        + "; ".join(f"{r}: {m}" for r, m in ROLES.items()),
                    },
                    "advice": {
                        "enum": list(get_args(Advice)),
                        "description": "what the config should do with it; optional: it may be adjusted for or not",
                    },
                    "precision": {
                        "enum": list(get_args(Precision)),
                        "description": "where a column may be in or out: what adjusting for it does to the precision"
                        " of a linear model",
                    },
                },
                "required": ["column", "role", "advice"],
                "additionalProperties": False,
            },
        },
        "coefficients": {
            "type": "array",
            "description": "one for each term of the model, the treatment's included",
            "items": {"$ref": "#/components/schemas/Coefficient"},
        },
        "remedies": {
            "type": "array",
            "description": "fewest changes first; each one, applied, reviews as sound",
            "items": {"$ref": "#/components/schemas/Remedy"},
        },
        "measure_next": {
            "description": "where unanswerable: the cheapest unmeasured nodes and common causes behind bidirected"
            " edges whose measuring would make some choice do; null where none would",
            "anyOf": [MEASURE_NEXT, {"type": "null"}],
        },
        "hinges_on": {"$ref": "#/components/schemas/HingesOn"},
        "doubtful": {"$ref": "#/components/schemas/Doubtful"},
        "provenance": {"$ref": "#/components/schemas/Provenance"},
        "cautions": {"type": "array", "items": {"type": "string"}},
        "meta": {"description": "the config's own meta"},
    },
    "required": [
        "name",
        "verdict",
        "summary",
        "findings",
        "columns",
        "coefficients",
        "remedies",
        "provenance",
        "cautions",
    ],
    "additionalProperties": False,
}

REVIEW_COMPONENTS = {
    **PATH_COMPONENTS,
    "Config": CONFIG_SCHEMA,
    "Finding": FINDING,
    "Coefficient": COEFFICIENT,
    "Provenance": PROVENANCE,
    "Remedy": REMEDY,
    "Review": REVIEW,
    **HINGE_COMPONENTS,
}
