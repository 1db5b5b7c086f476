"""A run in the Static Analysis Results Interchange Format, version 2.1.0 (OASIS standard, 2020).

Every finding is a result, and so is whatever kept a config from being judged, under a rule of its own: a reader
that looks at results alone must not take it for a pass. What is accepted or known is a suppressed result.
"""

from __future__ import annotations

import hashlib
import os
from collections.abc import Iterator
from pathlib import Path
from typing import Any
from urllib.parse import quote

from pathgate.cli.choices import NOT_JUDGED_MEANS, NOT_JUDGED_RULE
from pathgate.cli.explaining import rule_text
from pathgate.cli.run import NOT_JUDGED, Fault, Item, Place, Run, Weighed
from pathgate.cli.wording import counts_text, gone_text, outcome_text, waiver_text
from pathgate.cli.writing import json_bytes
from pathgate.review.rules import RULES
from pathgate.review.visible import visible
from pathgate.version import VERSION

Json = dict[str, Any]

SCHEMA = "https://docs.oasis-open.org/sarif/sarif/v2.1.0/errata01/os/schemas/sarif-schema-2.1.0.json"
_ROOT = "ROOT"


def run_sarif(run: Run, root: Path | None = None) -> bytes:
    """The log; files below ``root`` (the working folder where None) are named as seen from there."""
    base = Path(os.path.realpath(root or Path.cwd()))
    rules = [*map(_rule, RULES), _described(NOT_JUDGED_RULE, NOT_JUDGED_MEANS, "error")]
    indices = {rule["id"]: index for index, rule in enumerate(rules)}
    driver = {"name": "Pathgate", "version": VERSION, "rules": rules}
    results = [result for item in run.items for result in _results(item, base)]
    for result in results:
        result["ruleIndex"] = indices[result["ruleId"]]
    log_run = {
        "tool": {"driver": driver},
        "columnKind": "unicodeCodePoints",
        "originalUriBaseIds": {_ROOT: {"description": {"text": "where the command was run"}}},
        "invocations": [_invocation(run, base)],
        "results": results,
    }
    return json_bytes({"$schema": SCHEMA, "version": "2.1.0", "runs": [log_run]})


def _rule(name: str) -> Json:
    return _described(name, RULES[name].meaning, RULES[name].severity)


def _described(name: str, meaning: str, level: str) -> Json:
    title = "".join(word.capitalize() for word in name.split("-"))
    return {
        "id": name,
        "name": title,
        "shortDescription": {"text": meaning},
        "help": {"text": rule_text(name)},
        "defaultConfiguration": {"level": level},
    }


def _invocation(run: Run, base: Path) -> Json:
    notes = [*run.notes, *map(gone_text, run.gone)]
    return {
        "executionSuccessful": run.exit_status < NOT_JUDGED and not run.counts.let_pass,
        "exitCode": run.exit_status,
        "exitCodeDescription": outcome_text(run),
        "toolExecutionNotifications": [
            *(_notification(fault.message, "error", _locations(fault.place, base)) for fault in run.faults),
            *(_notification(note, "note", []) for note in [*notes, counts_text(run)]),
        ],
    }


def _notification(text: str, level: str, locations: list[Json]) -> Json:
    return {"level": level, "message": {"text": visible(text)}, "locations": locations}


def _results(item: Item, base: Path) -> Iterator[Json]:
    for fault in item.faults:
        yield _not_judged(item, fault, base)
    for number, finding in enumerate(item.findings):
        yield {
            "ruleId": finding.rule,
            "level": finding.severity,
            "message": {"text": visible(f"{item.name}: {finding.message}")},
            "locations": _locations(finding.place, base, item.name),
            # The standard wants the list on every result or on none.
            "suppressions": _suppressions(finding),
            "partialFingerprints": {"pathgate/v1": _fingerprint(item, number, base)},
            "properties": {"columns": list(finding.columns), "standing": finding.standing},
        }


def _not_judged(item: Item, fault: Fault, base: Path) -> Json:
    return {
        "ruleId": NOT_JUDGED_RULE,
        "level": "warning" if item.is_let_pass else "error",
        "message": {"text": visible(f"{item.name}: {fault.message}")},
        "locations": _locations(fault.place, base, item.name),
        "suppressions": [],
    }


def _suppressions(finding: Weighed) -> list[Json]:
    if finding.waiver is not None:
        return [
            {
                "kind": "inSource",
                "status": "accepted",
                "justification": visible(waiver_text(finding.waiver)),
                "properties": finding.waiver,
            }
        ]
    if finding.standing == "known":
        return [{"kind": "external", "status": "accepted", "justification": "Known: it is in the baseline."}]
    return []


def _fingerprint(item: Item, number: int, base: Path) -> str:
    """Stays the same when lines move; the same finding a second time in one config counts on."""
    finding = item.findings[number]
    said = (finding.rule, *sorted(finding.columns), str(finding.document.get("part", "")))
    before = sum(
        each.rule == finding.rule and each.columns == finding.columns for each in item.findings[:number]
    )
    words = [_uri(finding.place.file, base)[0], item.name, *said, str(before)]
    return hashlib.sha256("\0".join(words).encode("utf-8", "surrogatepass")).hexdigest()[:32]


def _locations(place: Place, base: Path, config: str | None = None) -> list[Json]:
    uri, is_below = _uri(place.file, base)
    artifact: Json = {"uri": uri, **({"uriBaseId": _ROOT} if is_below else {})}
    physical: Json = {"artifactLocation": artifact}
    region = place.region
    if region is not None:
        physical["region"] = {"startLine": region.line, "startColumn": region.column}
        if region.end_line is not None and region.end_column is not None:
            physical["region"] |= {"endLine": region.end_line, "endColumn": region.end_column}
    logical = {} if config is None else {"logicalLocations": [{"name": visible(config), "kind": "object"}]}
    return [{"physicalLocation": physical, **logical}]


def _uri(file: Path, base: Path) -> tuple[str, bool]:
    """The URI of a file, and whether it is relative to ``base``."""
    real = Path(os.path.realpath(file.parent)) / file.name
    if real.is_relative_to(base):
        return quote(os.fsencode(real.relative_to(base))), True
    return "file://" + quote(os.fsencode(real)), False
