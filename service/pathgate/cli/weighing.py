"""Which findings make a config fall short? Those grave enough that are neither accepted nor known."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass, field

from pathgate.cli.baseline import Baseline, Entry
from pathgate.cli.choices import FailOn
from pathgate.cli.finding import Found, Json, faults_of
from pathgate.cli.run import Item, Standing, Weighed

_COUNTING: dict[FailOn, tuple[str, ...]] = {"error": ("error",), "warning": ("error", "warning")}


@dataclass(slots=True)
class Scales:
    """Weighs the findings of one run, in its order; an entry of the baseline answers for as many as it says.

    Attributes:
        fail_on: from which severity on a finding counts.
        baseline: what was known before.
        left: how often each entry can still answer.
    """

    fail_on: FailOn
    baseline: Baseline | None = None
    left: Counter[Entry] = field(init=False)

    def __post_init__(self) -> None:
        self.left = Counter(self.baseline.known) if self.baseline else Counter()

    def item(self, found: Found, answer: Json) -> Item:
        """A config with its findings weighed, or with its problem."""
        problem = answer.get("problem")
        if problem is not None:
            faults = faults_of(problem, found)
            is_let_pass = answer.get("let_pass", False)
            return Item(found.name, found.place(), problem=problem, faults=faults, is_let_pass=is_let_pass)
        review = answer["review"]
        weighed = tuple(
            Weighed(each, found.place(each["pointer"], each.get("part")), self._standing(found, each))
            for each in review["findings"]
        )
        return Item(found.name, found.place(), review=review, findings=weighed)

    def _standing(self, found: Found, finding: Json) -> Standing:
        if finding["severity"] not in _COUNTING[self.fail_on]:
            return "aside"
        if finding.get("accepted") is not None:
            return "accepted"
        if self.baseline is not None:
            entry = self.baseline.entry(found.file, found.own_name, finding["rule"], finding["columns"])
            if self.left[entry] > 0:
                self.left[entry] -= 1
                return "known"
        return "new"


def to_be_known(
    baseline: Baseline, founds: Sequence[Found], items: Sequence[Item], fail_on: FailOn
) -> Counter[Entry]:
    """What a baseline written now would hold: all that counts and is not accepted."""
    return Counter(
        baseline.entry(found.file, found.own_name, each.rule, each.columns)
        for found, item in zip(founds, items, strict=True)
        for each in item.findings
        if each.severity in _COUNTING[fail_on] and each.standing != "accepted"
    )


def gone_entries(
    baseline: Baseline, left: Counter[Entry], founds: Iterable[Found], items: Iterable[Item]
) -> Counter[Entry]:
    """The entries that no longer occur, as far as this run could see.

    What stands in a file that was not looked at, or belongs to a config that could not be judged, may still be
    there.
    """
    looked_at: set[str] = set()
    unknown: set[tuple[str, str | None]] = set()
    for found, item in zip(founds, items, strict=True):
        file = baseline.entry(found.file, "", "", ()).file
        looked_at.add(file)
        if item.review is None:
            # A file that cannot be read may hold any config.
            unknown.add((file, found.own_name if found.source else None))
    return Counter(dict(_gone(baseline, left, looked_at, unknown)))


def _gone(
    baseline: Baseline, left: Counter[Entry], looked_at: set[str], unknown: set[tuple[str, str | None]]
) -> Iterator[tuple[Entry, int]]:
    for entry, times in sorted(left.items()):
        was_seen = entry.file in looked_at or not baseline.file_of(entry).exists()
        is_unknown = bool({(entry.file, entry.config), (entry.file, None)} & unknown)
        if times > 0 and was_seen and not is_unknown:
            yield entry, times
