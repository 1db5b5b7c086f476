"""A run as one JSON document: that of /v1/reviews, and beside it what only the gate knows."""

from __future__ import annotations

from dataclasses import asdict
from typing import Any

from pathgate.cli.files import shown
from pathgate.cli.run import Item, Place, Run
from pathgate.cli.writing import json_bytes

Json = dict[str, Any]


def run_json(run: Run) -> bytes:
    """The document, as people can read it too."""
    document: Json = {"reviews": [_review(item, index, run) for index, item in enumerate(run.items)]}
    if run.problem:
        document["problem"] = run.problem
    return json_bytes({**document, "gate": _gate(run)})


def _review(item: Item, index: int, run: Run) -> Json:
    answer = {"problem": item.problem}
    if item.review is not None:
        left_out = () if run.shows_hinges else ("hinges_on",)
        answer = {"review": {key: said for key, said in item.review.items() if key not in left_out}}
    return {"index": index, "count": len(run.items), "name": item.name, **answer}


def _gate(run: Run) -> Json:
    """What became of each config and each of its findings; ``finding`` counts as the review lists them."""
    counts = run.counts
    return {
        "exit_status": run.exit_status,
        "fail_on": run.fail_on,
        "counts": {
            "found": counts.found,
            "reviewed": counts.reviewed,
            **counts.verdicts,
            "not_judged": counts.not_judged,
            "skipped": counts.skipped,
            "let_pass": counts.let_pass,
            "new": counts.new,
            "known": counts.known,
            "accepted": counts.accepted,
        },
        "configs": [_config(item, index) for index, item in enumerate(run.items)],
        "faults": [{"message": each.message, **_place(each.place)} for each in run.faults],
        "baseline": None if run.baseline is None else shown(run.baseline),
        "gone": [asdict(entry) for entry in run.gone],
        "notes": list(run.notes),
    }


def _config(item: Item, index: int) -> Json:
    findings = [
        {"finding": number, "rule": each.rule, "standing": each.standing, **_place(each.place)}
        for number, each in enumerate(item.findings)
    ]
    return {
        "index": index,
        "outcome": item.outcome,
        "let_pass": item.is_let_pass,
        "falls_short": item.falls_short,
        **_place(item.place),
        "findings": findings,
        "faults": [{"message": each.message, **_place(each.place)} for each in item.faults],
    }


def _place(place: Place) -> Json:
    region = place.region
    at = {"line": region.line, "column": region.column} if region else {}
    return {"file": shown(place.file), **at}
