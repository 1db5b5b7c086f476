"""The table of rules: named after themselves, and each with all that its reader needs to act."""

from __future__ import annotations

import re

import pytest

from pathgate.review.error_texts import ERROR_TEXTS
from pathgate.review.notice_texts import NOTICE_TEXTS
from pathgate.review.rules import RULES, SEVERITIES

TEXTS = ("why_it_matters", "example", "what_to_do")


@pytest.mark.parametrize("name", RULES)
def test_a_rule_says_what_it_means_why_it_matters_and_what_to_do(name):
    rule = RULES[name]
    assert rule.name == name
    assert rule.severity in SEVERITIES
    for text in (rule.meaning, *(getattr(rule, member) for member in TEXTS)):
        assert re.fullmatch(r"[A-Z`].*\.", text), text
        assert text.count("`") % 2 == 0, text
        assert "  " not in text
    for member in ("why_it_matters", "what_to_do"):
        assert 1 <= len(re.findall(r"\.(?= |$)", getattr(rule, member))) <= 3


@pytest.mark.parametrize("member", TEXTS)
def test_no_two_rules_share_an_example_or_a_reason(member):
    # What to do may be the same for rules that differ in where the column stands alone.
    said = [getattr(rule, member) for rule in RULES.values()]
    assert len(set(said)) == len(said)


def test_no_text_is_left_of_a_rule_that_is_gone():
    for texts, severities in ((ERROR_TEXTS, {"error"}), (NOTICE_TEXTS, {"warning", "note"})):
        assert texts.keys() == {name for name, rule in RULES.items() if rule.severity in severities}


def test_texts_name_only_rules_and_config_members_that_there_are():
    # A word with a hyphen in backticks is a rule.
    for rule in RULES.values():
        for text in (getattr(rule, member) for member in TEXTS):
            named = re.findall(r"`([a-z]+(?:-[a-z]+)+)`", text)
            assert set(named) <= RULES.keys(), rule.name
