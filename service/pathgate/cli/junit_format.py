"""A run as a JUnit report, which build servers show as tests: a case for each config, a suite for each file.

A config that falls short is a failure, one that could not be judged an error, one that was left alone because of
something else, or let pass unjudged, is skipped; what else was found stands in the output of its case.
"""

from __future__ import annotations

from collections.abc import Iterable
from itertools import groupby
from xml.etree import ElementTree as Xml

from pathgate.cli.files import shown
from pathgate.cli.run import Fault, Item, Run, Weighed
from pathgate.cli.wording import counts_text, finding_line, gone_text
from pathgate.review.visible import visible


def run_junit(run: Run) -> bytes:
    """The report. What XML cannot carry is shown by its number."""
    root = Xml.Element("testsuites", name="pathgate")
    if run.problem or not run.items:
        _suite(root, "pathgate", [_nothing_judged(run)])
    for file, items in groupby(run.items, key=lambda item: item.place.file):
        _suite(root, visible(shown(file)), [_case(item) for item in items])
    for counted in ("tests", "failures", "errors", "skipped"):
        root.set(counted, str(sum(int(suite.get(counted, "0")) for suite in root)))
    notes = [counts_text(run), *run.notes, *(visible(gone_text(entry)) for entry in run.gone)]
    Xml.SubElement(root[0], "system-out").text = "\n".join(notes)
    Xml.indent(root)
    return f'<?xml version="1.0" encoding="utf-8"?>\n{Xml.tostring(root, encoding="unicode")}\n'.encode()


def _suite(root: Xml.Element, name: str, cases: list[Xml.Element]) -> None:
    counts = {
        "tests": len(cases),
        "failures": sum(case.find("failure") is not None for case in cases),
        "errors": sum(case.find("error") is not None for case in cases),
        "skipped": sum(case.find("skipped") is not None for case in cases),
    }
    suite = Xml.SubElement(
        root, "testsuite", {"name": name, **{key: str(said) for key, said in counts.items()}}
    )
    suite.extend(cases)


def _case(item: Item) -> Xml.Element:
    region = item.place.region
    said = {"classname": visible(shown(item.place.file)), "name": visible(item.name)}
    said |= {"file": said["classname"], **({"line": str(region.line)} if region else {})}
    case = Xml.Element("testcase", said)
    if item.review is None:
        tag = "skipped" if item.is_skipped or item.is_let_pass else "error"
        _add(case, tag, "not judged", _fault_texts(item.faults))
        return case
    short = [finding for finding in item.findings if finding.standing == "new"]
    others = [finding for finding in item.findings if finding.standing != "new"]
    if item.falls_short:
        _add(case, "failure", item.outcome, [item.review["summary"], *_lines(short)])
    if others:
        Xml.SubElement(case, "system-out").text = "\n".join(_lines(others))
    return case


def _add(case: Xml.Element, tag: str, kind: str, lines: list[str]) -> None:
    first, *others = [visible(line) for line in lines]
    Xml.SubElement(case, tag, type=kind, message=first).text = "\n".join(others or [first])


def _nothing_judged(run: Run) -> Xml.Element:
    case = Xml.Element("testcase", classname="pathgate", name="nothing could be judged")
    _add(case, "error", "not judged", _fault_texts(run.faults) or ["no config was found"])
    return case


def _fault_texts(faults: Iterable[Fault]) -> list[str]:
    return [f"{fault.place}: {fault.message}" for fault in faults]


def _lines(findings: Iterable[Weighed]) -> list[str]:
    return [finding_line(finding) for finding in findings]
