"""The words that the command and the project file take; nothing heavy, since ``--help`` names them."""

from __future__ import annotations

from typing import Literal, get_args

Form = Literal["text", "json", "sarif", "junit", "markdown"]
FORMS: tuple[Form, ...] = get_args(Form)

FailOn = Literal["error", "warning"]
FAIL_ON: tuple[FailOn, ...] = get_args(FailOn)

IF_UNREACHABLE = ("fail", "pass")

NOT_JUDGED_RULE = "config-not-judged"
NOT_JUDGED_MEANS = (
    "The config could not be judged, so nothing is known of it: the message says what is in the way."
)
