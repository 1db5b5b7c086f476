"""What a verdict rests on as the JSON that HTTP callers and the command print beside it."""

from __future__ import annotations

from typing import Any

from pathgate.criteria.deadline import Deadline
from pathgate.criteria.independencies import Independency
from pathgate.graphs.graph import CausalGraph, Edge
from pathgate.review.document import Json, review_document
from pathgate.review.doubtful import Doubtful, judge_doubtful
from pathgate.review.hinges import HingesOn, hinges_of, plain_name, question
from pathgate.review.provenance import provenance_document
from pathgate.review.review import Review


def whole_document(
    answer: Review, deadline: Deadline, *, hinges: bool, known_digest: str | None = None
) -> Json:
    """The answer of /v1/review, with what the verdict hinges on where that is asked for.

    Whoever reviews many configs against one graph hands over its digest as ``known_digest``.

    Raises:
        OutOfTime: the deadline came before it was known whether the doubtful edges matter at all.
    """
    document = review_document(answer)
    graph, is_sound = answer.claim.graph, answer.verdict == "sound"
    if graph.doubtful:
        found = judge_doubtful(answer.claim, deadline, is_sound=is_sound)
        document["doubtful"] = doubtful_document(graph, found)
    if hinges:
        document["hinges_on"] = hinges_document(graph, hinges_of(answer.claim, deadline, is_sound=is_sound))
    written = answer.config.written or {}
    document["provenance"] = provenance_document(answer.graph, written, known_digest=known_digest)
    return document


def hinges_document(graph: CausalGraph, found: HingesOn) -> Json:
    """The three lists; ``removed`` is empty, since no sound verdict is lost with an edge less."""
    names = graph.names
    shown = list(map(plain_name, names)) if found.absent_edges or found.reversed else []
    return {
        "absent_edges": [
            {
                "source": names[source],
                "target": names[target],
                "kind": kind,
                "question": question(kind, shown[source], shown[target]),
                "exposed_by": None if exposed_by is None else _statement(graph, exposed_by),
            }
            for absent in found.absent_edges
            for (kind, source, target), exposed_by in ((absent.edge, absent.exposed_by),)
        ],
        "reversed": [
            {
                **edge_document(graph, ("directed", source, target)),
                "question": question("directed", shown[source], shown[target], is_turned=True),
            }
            for _, source, target in found.reversed
        ],
        "removed": [],
        "complete": found.is_complete,
    }


def doubtful_document(graph: CausalGraph, found: Doubtful) -> Json:
    """Whether and on which doubtful edges soundness depends."""
    return {
        "verdict": found.verdict,
        "depends_on": [edge_document(graph, edge) for edge in found.depends_on],
        "complete": found.is_complete,
    }


def edge_document(graph: CausalGraph, edge: Edge) -> dict[str, Any]:
    """An edge by its ends and kind."""
    kind, source, target = edge
    return {"source": graph.name(source), "target": graph.name(target), "kind": kind}


def _statement(graph: CausalGraph, statement: Independency) -> Json:
    return {
        "x": graph.name(statement.x),
        "y": graph.names_of(statement.y)[0],
        "given": list(graph.names_of(statement.given)),
    }
