"""The rules that a review can find broken: their names, how grave each is, and what each means.

What a reader needs beside that to act on a finding stands in ``error_texts`` and ``notice_texts``, by name.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Literal

from pathgate.review.error_texts import ERROR_TEXTS
from pathgate.review.notice_texts import NOTICE_TEXTS

Severity = Literal["error", "warning", "note"]

SEVERITIES: dict[Severity, str] = {
    "error": "the number is not the effect it is read as",
    "warning": "the number may be right and is easily misread",
    "note": "what the review took for granted",
}
"""From the gravest to the lightest, with what each means."""


@dataclass(frozen=True, slots=True)
class Rule:
    """One way in which a config can fall short.

    Attributes:
        name: stable, kebab-case.
        severity: with an ``error`` the config is not sound.
        meaning: one sentence.
        why_it_matters, example, what_to_do: see ``RuleText``; names of columns stand in backticks.
        may_be_waived: can a team accept it? Not where no number could mean anything.
    """

    name: str
    severity: Severity
    meaning: str
    why_it_matters: str = ""
    example: str = ""
    what_to_do: str = ""
    may_be_waived: bool = True

    @property
    def page(self) -> str:
        """Where the service shows all of this."""
        return f"/docs/rules/{self.name}"


def _with_texts(rule: Rule) -> Rule:
    texts = (ERROR_TEXTS if rule.severity == "error" else NOTICE_TEXTS).get(rule.name)
    return replace(rule, **texts._asdict()) if texts else rule


RULES: dict[str, Rule] = {
    rule.name: _with_texts(rule)
    for rule in (
        Rule(
            "missing-covariate",
            "error",
            "A path that is not the effect joins treatment and outcome, and a measured column would block it.",
        ),
        Rule(
            "unmeasured-cause",
            "error",
            "A path that is not the effect joins treatment and outcome through something unmeasured, and nothing"
            " measured on it may be adjusted for.",
        ),
        Rule(
            "unblockable-path",
            "error",
            "A path that is not the effect joins treatment and outcome, and nothing on it may be adjusted for.",
        ),
        Rule(
            "covariate-on-causal-path",
            "error",
            "The model adjusts for a mediator, and so takes away part of the effect it claims.",
        ),
        Rule(
            "covariate-below-causal-path",
            "error",
            "The model adjusts for a consequence of the outcome or of a mediator.",
        ),
        Rule(
            "covariate-on-collider",
            "error",
            "The model adjusts for a common consequence, and so joins its causes.",
        ),
        Rule(
            "covariate-below-collider",
            "error",
            "The model adjusts for a descendant of a common consequence, and so joins the causes above it.",
        ),
        Rule(
            "filter-on-causal-path",
            "error",
            "The rows are kept by the outcome or by a mediator, so who is compared depends on the effect.",
        ),
        Rule(
            "filter-below-causal-path",
            "error",
            "The rows are kept by a consequence of the outcome or of a mediator.",
        ),
        Rule(
            "filter-on-collider",
            "error",
            "The rows are kept by a common consequence, and so its causes are joined among them.",
        ),
        Rule(
            "filter-below-collider",
            "error",
            "The rows are kept by a descendant of a common consequence, and so the causes above it are joined.",
        ),
        Rule(
            "lost-rows-on-causal-path",
            "error",
            "Rows go missing by the outcome or by a mediator, so who is compared depends on the effect.",
        ),
        Rule(
            "lost-rows-below-causal-path",
            "error",
            "Rows go missing by a consequence of the outcome or of a mediator.",
        ),
        Rule(
            "lost-rows-on-collider",
            "error",
            "Rows go missing by a common consequence, and so its causes are joined among those that are left.",
        ),
        Rule(
            "lost-rows-below-collider",
            "error",
            "Rows go missing by a descendant of a common consequence, and so the causes above it are joined.",
        ),
        Rule(
            "not-recovered",
            "error",
            "The effect in everybody is claimed, and adjusting does not recover it from the rows kept.",
        ),
        Rule(
            "no-variation-left",
            "error",
            "What the model holds fixed leaves treatment or outcome no variation of its own.",
            may_be_waived=False,
        ),
        Rule(
            "treatment-among-covariates",
            "error",
            "The model adjusts for its own treatment.",
            may_be_waived=False,
        ),
        Rule(
            "outcome-among-covariates", "error", "The model adjusts for its own outcome.", may_be_waived=False
        ),
        Rule(
            "treatment-fixed",
            "error",
            "The rows kept hold one value of the treatment: nothing to compare.",
            may_be_waived=False,
        ),
        Rule(
            "outcome-fixed",
            "error",
            "The rows kept hold one value of the outcome: nothing to compare.",
            may_be_waived=False,
        ),
        Rule(
            "unmeasured-covariate",
            "error",
            "The model adjusts for something the platform does not hold.",
            may_be_waived=False,
        ),
        Rule(
            "unmeasured-filter-column",
            "error",
            "The rows are kept by something the platform does not hold.",
            may_be_waived=False,
        ),
        Rule(
            "unmeasured-treatment",
            "error",
            "The treatment is something the platform does not hold.",
            may_be_waived=False,
        ),
        Rule(
            "unmeasured-outcome",
            "error",
            "The outcome is something the platform does not hold.",
            may_be_waived=False,
        ),
        Rule("filter-depends-on-treatment", "warning", "Who is kept depends on the treatment."),
        Rule("lost-rows-depend-on-treatment", "warning", "Which rows go missing depends on the treatment."),
        Rule(
            "weighting-column-filtered",
            "warning",
            "The row filter reads a column that the effect in everybody has to be weighted by.",
        ),
        Rule(
            "covariate-recorded-after-treatment",
            "warning",
            "The model adjusts for something that is recorded after the treatment.",
        ),
        Rule(
            "covariate-recorded-after-outcome",
            "warning",
            "The model adjusts for something that is recorded after the outcome.",
        ),
        Rule(
            "treatment-of-several-columns",
            "warning",
            "The treatment is computed from several columns, so setting it is not one well-defined action.",
        ),
        Rule(
            "coarse-covariate",
            "warning",
            "The model adjusts for a bucket or threshold of a column, and so only for a part of it.",
        ),
        Rule(
            "treatment-in-product",
            "warning",
            "A term multiplies the treatment with another column, so its own coefficient is not the effect.",
        ),
        Rule(
            "redundant-covariate",
            "warning",
            "The model adjusts for something that its other covariates determine.",
        ),
        Rule("no-causal-path", "warning", "No directed path leads from the treatment to the outcome."),
        Rule(
            "no-arrow",
            "warning",
            "No arrow leads from the treatment to the outcome: no direct effect is drawn.",
        ),
        Rule("outcome-precedes-treatment", "warning", "The outcome is a cause of the treatment."),
        Rule("treatment-precedes-treatment", "warning", "One treatment is a cause of another."),
        Rule(
            "missing-at-random-assumed",
            "note",
            "Rows go missing where a column is null: assumed unrelated to everything in the graph.",
        ),
        Rule(
            "join-selects-rows",
            "note",
            "A join keeps only rows with a partner: assumed unrelated to everything in the graph.",
        ),
        Rule(
            "waiver-expired",
            "warning",
            "A waiver has run out, and accepts nothing any more.",
            may_be_waived=False,
        ),
        Rule(
            "waiver-without-reason",
            "warning",
            "A waiver gives no reason, and so accepts nothing.",
            may_be_waived=False,
        ),
        Rule("waiver-unused", "warning", "A waiver meets no finding.", may_be_waived=False),
        Rule(
            "waiver-not-allowed",
            "warning",
            "A waiver names a rule that cannot be waived.",
            may_be_waived=False,
        ),
        Rule(
            "kept-rows-only",
            "note",
            "The number speaks of the rows kept: the effect in everybody is not recovered from them by adjusting.",
        ),
        Rule(
            "outside-graph",
            "note",
            "The config uses a column that is declared as outside the graph: nothing is known of it.",
        ),
        Rule("rows-are-groups", "note", "The rows are groups: the graph is taken to speak of them."),
    )
}
