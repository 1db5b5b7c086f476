"""What a row filter leaves unsaid and the review took for granted, as notes; none of them changes the verdict.

Each says what was assumed and, where a member of the config can say otherwise, which. Linear in what was assumed.
"""

from __future__ import annotations

from collections.abc import Iterator

from pathgate.review.assumed import Assumed
from pathgate.review.claims import Claim
from pathgate.review.config import Config
from pathgate.review.findings import Finding
from pathgate.review.wording import listed, part_text

_RULES = {
    "null-test": "missing-at-random-assumed",
    "comparison": "missing-at-random-assumed",
    "join": "join-selects-rows",
    "group": "rows-are-groups",
}


def assumption_findings(claim: Claim, config: Config) -> Iterator[Finding]:
    """A note for each thing assumed about the rows kept."""
    for assumed in config.rows.assumed:
        if assumed.kind == "outside" or (assumed.kind == "join" and _says_why_rows_exist(config)):
            continue  # told of with all other names outside the graph, or said by the config
        columns = (*claim.graph.names_of(assumed.columns), *assumed.names)
        yield Finding(
            _RULES[assumed.kind], columns, _message(assumed, columns), assumed.place, assumed.written
        )


def _says_why_rows_exist(config: Config) -> bool:
    return bool(config.written and "rows_exist_because" in config.written)


def _message(assumed: Assumed, columns: tuple[str, ...]) -> str:
    match assumed.kind:
        case "null-test":
            return (
                f"{part_text(assumed.written)} keeps rows by whether {listed(columns)} is recorded, not by its"
                " value. Assumed: it goes missing for reasons unrelated to everything in the graph. If not, say why"
                " under `missing_because`."
            )
        case "comparison":
            return (
                f"Conditions also drop or keep rows by whether {listed(columns, 'or')} is null. Assumed: nulls come"
                " about for reasons unrelated to everything in the graph. If not, say why under `missing_because`."
            )
        case "join":
            return (
                f"The join with {listed(assumed.tables)} keeps only rows that have a partner there. Assumed: which"
                " rows have one is unrelated to everything in the graph. If not, say what decides it under"
                " `rows_exist_because`."
            )
    return (
        f"GROUP BY makes one row for each value of {listed(columns)}. Assumed: the graph speaks of these"
        " rows, not of the single rows behind them."
    )
