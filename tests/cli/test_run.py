"""What the gate makes of findings, by cases: no combination passes by accident."""

from __future__ import annotations

from collections import Counter
from pathlib import Path
from typing import Any

import pytest

from pathgate.cli.baseline import Baseline
from pathgate.cli.finding import Found
from pathgate.cli.run import Item, Place, Run
from pathgate.cli.weighing import Scales
from tests.cli.shelf import WAIVER


def weighed(severity: str, *, accepted: bool, known: bool, fail_on: Any, verdict: str = "biased") -> Item:
    found = Found(Path("c.json"), {"name": "one"})
    finding = {"rule": "r", "severity": severity, "columns": ["a"], "message": "m", "pointer": "#/config"}
    finding |= {"accepted": WAIVER} if accepted else {}
    baseline = Baseline(Path("base.json"), Counter())
    if known:
        baseline.known[baseline.entry(found.file, "one", "r", ["a"])] = 1
    return Scales(fail_on, baseline).item(found, {"review": {"verdict": verdict, "findings": [finding]}})


@pytest.mark.parametrize(
    ("severity", "accepted", "known", "fail_on", "standing"),
    [
        ("error", False, False, "error", "new"),
        ("error", False, True, "error", "known"),
        ("error", True, False, "error", "accepted"),
        # A waiver says why, and so goes before the baseline.
        ("error", True, True, "error", "accepted"),
        ("warning", False, False, "error", "aside"),
        ("warning", True, True, "error", "aside"),
        ("warning", False, False, "warning", "new"),
        ("warning", False, True, "warning", "known"),
        ("warning", True, False, "warning", "accepted"),
        ("note", False, False, "warning", "aside"),
    ],
)
def test_a_finding_counts_by_its_severity_its_waiver_and_the_baseline(
    severity, accepted, known, fail_on, standing
):
    verdict = "biased" if severity == "error" else "sound"
    item = weighed(severity, accepted=accepted, known=known, fail_on=fail_on, verdict=verdict)
    assert item.findings[0].standing == standing
    assert item.falls_short == (standing == "new")
    assert Run((item,)).exit_status == int(standing == "new")


@pytest.mark.parametrize("verdict", ["biased", "unanswerable", "a word of a later version"])
def test_a_verdict_that_no_error_explains_falls_short(verdict):
    item = weighed("warning", accepted=False, known=False, fail_on="error", verdict=verdict)
    assert item.falls_short


@pytest.mark.parametrize("is_skipped", [False, True])
def test_what_was_not_judged_outranks_what_falls_short(is_skipped):
    short = weighed("error", accepted=False, known=False, fail_on="error")
    lost = Item("lost", Place(Path("c.json")), problem={}, is_skipped=is_skipped)
    assert Run((short,)).exit_status == 1
    assert Run((short, lost)).exit_status == 2
    assert Run((lost,)).exit_status == 2
    assert Run().exit_status == 2
