"""POST /v1/independencies: which independencies does the graph promise for the columns, for data to contradict?"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import islice
from math import inf
from typing import Any

from pathgate.criteria.deadline import Deadline
from pathgate.criteria.independencies import (
    Independency,
    basis,
    basis_sets,
    minimal_about,
    separable_pairs,
    sequential,
    smallest,
)
from pathgate.criteria.selection import Kept, keep_rows
from pathgate.criteria.separable import Pairs, is_fully_measured
from pathgate.demo import demo_graph
from pathgate.graphs.errors import Fault
from pathgate.graphs.masks import members
from pathgate.review.parts import read_parts
from pathgate.review.wording import arrow_text
from pathgate.web.endpoints.reading import graph_of, names_of
from pathgate.web.endpoints.shared_schemas import CURSOR, GRAPH, LIMIT, NAME_LIST, NEXT_PAGE, SELECTED_ON
from pathgate.web.operations import Call, Example, Json, Operation
from pathgate.web.paging import page_at

# More minimal sets of one pair than any caller pages through; places of pairs are so far apart.
_MOST_MINIMAL = 2**28

FORMS = ("smallest", "every-minimal", "basis", "basis-sets", "sequential")


def answer(call: Call) -> Json:
    """The statements of the form asked for, a page at a time; on the last page the pairs no statement is about."""
    graph = graph_of(call)
    parts = read_parts(call.body.get("selected_on", []), names_of(call, graph), ("selected_on",))
    call.refuse_faults()
    kept = keep_rows(graph, (one.part for one in parts))
    form = call.body.get("form", "smallest")
    _refuse_combination(call, kept, form)
    call.refuse_faults()
    pairs = Pairs(kept)
    listing = _Listing(pairs, form, call.body.get("max_given"), call.deadline)
    found, page = page_at(call, "independencies", listing.documents)
    document: Json = {"independencies": found, **page}
    if page["complete"]:
        document["inseparable"] = [_inseparable(pairs, *pair) for pair in pairs.inseparable(call.deadline)]
    return document


def _refuse_combination(call: Call, kept: Kept, form: str) -> None:
    if form in ("basis-sets", "sequential") and kept.conditioned:
        detail = f'the form "{form}" is defined on all rows only; leave out selected_on, or ask for "basis"'
        call.faults.append(Fault("invalid-request", ("form",), detail))
    if form == "sequential" and not is_fully_measured(kept.graph) and not kept.conditioned:
        detail = (
            'the form "sequential" needs every node measured and no bidirected edge; ask for "basis-sets"'
        )
        call.faults.append(Fault("invalid-request", ("form",), detail))


@dataclass(frozen=True, slots=True)
class _Listing:
    """The statements of one form, from any place on; every one is worked out when its turn comes."""

    pairs: Pairs
    form: str
    max_given: int | None
    deadline: Deadline

    def documents(self, start: int) -> Iterator[tuple[int, Json]]:
        """The statements from a place on, each with its place and with what a contradiction of it would mean."""
        for place, statement in self._statements(start):
            self.deadline.poll()
            if self.max_given is None or statement.given.bit_count() <= self.max_given:
                yield place, self._document(statement)

    def _statements(self, start: int) -> Iterator[tuple[int, Independency]]:
        graph = self.pairs.kept.graph
        match self.form:
            case "smallest" | "basis":
                return self._one_a_pair(start)
            case "every-minimal":
                return self._minimal(start)
            case "basis-sets":
                return self._numbered(basis_sets(graph, self.deadline), start)
            case _:
                return self._numbered(sequential(graph), start)

    def _one_a_pair(self, start: int) -> Iterator[tuple[int, Independency]]:
        form = smallest if self.form == "smallest" else basis
        for place, pair in self._pairs(start):
            yield place, form(self.pairs, *pair)

    def _numbered(self, found: Iterator[Independency], start: int) -> Iterator[tuple[int, Independency]]:
        for place, statement in enumerate(found):
            self.deadline.poll()
            if place >= start:
                yield place, statement

    def _pairs(self, start: int) -> Iterator[tuple[int, tuple[int, int]]]:
        size = max(1, self.pairs.kept.graph.size)
        for first, second in separable_pairs(self.pairs, self.deadline, start=divmod(start, size)):
            yield first * size + second, (first, second)

    def _minimal(self, start: int) -> Iterator[tuple[int, Independency]]:
        begin, skipped = divmod(start, _MOST_MINIMAL)
        for place, pair in self._pairs(begin):
            found = minimal_about(self.pairs, *pair, self.deadline)
            numbered = enumerate(found, start=place * _MOST_MINIMAL)
            yield from islice(numbered, skipped if place == begin else 0, None)

    def _document(self, statement: Independency) -> Json:
        names, given = self.pairs.kept.graph.names, statement.given
        others = [names[node] for node in members(statement.y)]
        return {
            "x": names[statement.x],
            "y": others if self.form == "basis-sets" else others[0],
            "given": [names[node] for node in members(given)] if given else [],
            "cheaper_exists": self._has_cheaper(statement),
            "tests_absence_of": _absent_edges(self.pairs, statement),
        }

    def _has_cheaper(self, statement: Independency) -> bool:
        """Does some statement about the same pair condition on fewer columns?"""
        if self.form in ("smallest", "basis-sets") or not statement.given:
            return False
        first, second = sorted((statement.x, statement.y.bit_length() - 1))
        return smallest(self.pairs, first, second).given.bit_count() < statement.given.bit_count()


def _absent_edges(pairs: Pairs, statement: Independency) -> list[Json]:
    """The edges between the two sides that the graph lacks and could hold: any of them would break the statement."""
    names, x = pairs.kept.graph.names, statement.x
    absent = []
    for y in members(statement.y):
        if _could_cause(pairs, x, y):
            absent.append({"source": names[x], "target": names[y], "kind": "directed"})
        if _could_cause(pairs, y, x):
            absent.append({"source": names[y], "target": names[x], "kind": "directed"})
        absent.append({"source": names[x], "target": names[y], "kind": "bidirected"})
    return absent


def _could_cause(pairs: Pairs, source: int, target: int) -> bool:
    """Would an arrow between the two neither close a cycle nor run back in time?"""
    if pairs.below[target] >> source & 1:
        return False
    recorded = pairs.kept.graph.recorded
    return not recorded or recorded.get(source, -inf) <= recorded.get(target, inf)


def _inseparable(pairs: Pairs, first: int, second: int) -> Json:
    kept = pairs.kept
    trail = pairs.inducing_path(first, second)
    colliders = [node for node, role in trail.inner if role == "collider"]
    drawn = arrow_text(kept, trail, kept.conditioned)
    if not colliders:
        why = f"the unmeasured path {drawn} stays open whatever is conditioned on"
    else:
        why = (
            f"the path {drawn} stays open whatever is conditioned on: its colliders lie above one of the two (or"
            " above what rows are kept by), and nothing else on it is measured"
        )
    return {"x": kept.graph.name(first), "y": kept.graph.name(second), "why": why}


_EDGE: dict[str, Any] = {
    "type": "object",
    "properties": {
        "source": {"type": "string"},
        "target": {"type": "string"},
        "kind": {"enum": ["directed", "bidirected"]},
    },
    "required": ["source", "target", "kind"],
    "additionalProperties": False,
}

OPERATION = Operation(
    name="independencies",
    summary="Which independencies does the graph promise, for data to contradict?",
    description=(
        "Only measured columns appear, and every statement is true in the graph, on the rows kept where"
        " `selected_on` says which. `smallest`: for each pair that can be separated, one statement with the"
        " fewest columns given; `every-minimal`: all statements from which nothing can be left out; `basis`: one"
        " statement a pair, from which the others follow by the graphoid rules with composition, so for linear"
        " Gaussian columns, not for counts in general; `basis-sets`: each column against sets of earlier ones,"
        " from which the others follow for every distribution; `sequential` (every node measured, no bidirected"
        " edge): statements whose tests do not overlap, for one overall test. On the last page `inseparable`"
        " names the pairs without an edge that no columns separate."
    ),
    request_schema={
        "type": "object",
        "properties": {
            "graph": GRAPH,
            "form": {"enum": list(FORMS), "default": "smallest", "description": "which statements to list"},
            "selected_on": SELECTED_ON,
            "max_given": {
                "type": "integer",
                "minimum": 0,
                "description": "leave out statements with more columns given",
            },
            "limit": LIMIT,
            "cursor": CURSOR,
        },
        "required": ["graph"],
        "additionalProperties": False,
    },
    response_schema={
        "type": "object",
        "properties": {
            "independencies": {
                "type": "array",
                "items": {
                    "type": "object",
                    "properties": {
                        "x": {"type": "string"},
                        "y": {
                            "description": "a column; in basis-sets a list of columns",
                            "anyOf": [{"type": "string"}, NAME_LIST],
                        },
                        "given": NAME_LIST,
                        "cheaper_exists": {
                            "type": "boolean",
                            "description": "does a statement about the same pair with fewer columns given exist?",
                        },
                        "tests_absence_of": {
                            "type": "array",
                            "description": "edges the graph lacks, any of which would break the statement",
                            "items": _EDGE,
                        },
                    },
                    "required": ["x", "y", "given", "cheaper_exists", "tests_absence_of"],
                    "additionalProperties": False,
                },
            },
            **NEXT_PAGE,
            "inseparable": {
                "type": "array",
                "description": "on the last page only",
                "items": {
                    "type": "object",
                    "properties": {
                        "x": {"type": "string"},
                        "y": {"type": "string"},
                        "why": {"type": "string"},
                    },
                    "required": ["x", "y", "why"],
                    "additionalProperties": False,
                },
            },
        },
        "required": ["independencies", "complete"],
        "additionalProperties": False,
    },
    examples=(
        Example(
            "cheapest-tests",
            "The first five independencies of the demo's graph, each with the fewest columns to hold fixed.",
            {"graph": demo_graph(), "limit": 5},
        ),
        Example(
            "an-inseparable-pair",
            "A habit that nobody measures ties two columns: no independency can test the missing arrow.",
            {
                "graph": {
                    "nodes": [
                        "weather",
                        "late_pickup",
                        "ticket_opened",
                        {"id": "complaint_habit", "measured": False},
                    ],
                    "edges": [
                        {"source": "weather", "target": "late_pickup"},
                        {"source": "complaint_habit", "target": "late_pickup"},
                        {"source": "complaint_habit", "target": "ticket_opened"},
                    ],
                },
                "form": "basis",
            },
        ),
    ),
    answer=answer,
)
