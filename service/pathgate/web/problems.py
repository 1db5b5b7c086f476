"""Every way a request can fail: one table from slug to status, words and whether a retry helps (RFC 9457).

A slug is the last part of the problem's ``type``, the word in the log and the label of the metric. The pages
under ``/problems/`` and the answers in the OpenAPI document are made from the same table.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import Any

from pathgate.graphs.errors import Fault, FaultyInput, PathgateError, pointer
from pathgate.web.json_faults import LONGEST_NUMBER


@dataclass(frozen=True, slots=True)
class ProblemType:
    """One kind of failure.

    Attributes:
        slug: its stable name.
        status: the HTTP status it is answered with.
        title: a few words, the same each time.
        text: what it means and what to do, for its page.
        retryable: may the same request succeed later, unchanged?
    """

    slug: str
    status: int
    title: str
    text: str
    retryable: bool = False

    @property
    def reference(self) -> str:
        """The problem's ``type``: a relative reference to its page."""
        return f"/problems/{self.slug}"


_TYPES = (
    ProblemType(
        "not-json",
        400,
        "The body is not JSON",
        "The body could not be read as JSON (RFC 8259) in UTF-8; line and column say where reading stopped,"
        " counted from 1. Besides broken syntax, the service refuses what different readers would understand"
        " differently: a key that stands twice in one object, NaN and Infinity, numbers beyond the range of a"
        f" double or longer than {LONGEST_NUMBER} characters, lone surrogates, a byte order mark, and very"
        " deep nesting."
        " Write the body with a JSON library, and send it unchanged.",
    ),
    ProblemType(
        "not-found",
        404,
        "Nothing is served at this path",
        "The path is not one of this service's. All operations are under /v1/; the reference at /docs lists"
        " them. A missing letter or a trailing slash is the usual reason.",
    ),
    ProblemType(
        "method-not-allowed",
        405,
        "This path does not take this method",
        "The path exists, but not for this method; the Allow header of the answer names those it takes."
        " Questions are asked by POST with a JSON body, and everything else is read by GET.",
    ),
    ProblemType(
        "not-acceptable",
        406,
        "The answer exists in no form that the request accepts",
        "The Accept header of the request rules out every form in which the answer can be given. Send"
        " application/json or */*, or leave the header out.",
    ),
    ProblemType(
        "falls-short",
        409,
        "The config falls short of what it claims",
        "The request asked for the review of a config as a gate, and the config is not sound: its number is not the"
        " effect that it claims, by an error that no waiver accepts. The member review holds the whole review, with"
        " what is wrong and what to change. Without as_gate the same review comes with status 200.",
    ),
    ProblemType(
        "request-timeout",
        408,
        "The request did not arrive in time",
        "The body had not arrived in full when the service stopped waiting for it. Nothing was computed, so"
        " the same request can be sent again. Where it happens often, look at the network or at a proxy that"
        " passes the body on slowly.",
        retryable=True,
    ),
    ProblemType(
        "body-too-large",
        413,
        "The body is larger than this service takes",
        "The body holds more bytes than the operator allows; /version shows the limit in force as"
        " max_body_bytes. Send a smaller graph, for instance without attributes that no question needs, or"
        " ask the operator to raise the limit.",
    ),
    ProblemType(
        "unsupported-media-type",
        415,
        "The body is not declared as JSON",
        "The request must say what its body is: Content-Type: application/json, with no charset but utf-8."
        " It said something else, or nothing. Compressed bodies are not taken either.",
    ),
    ProblemType(
        "invalid-request",
        422,
        "The request does not fit its schema",
        "The body is JSON, yet members are missing, unknown, or of the wrong kind. Every fault is listed in"
        " errors, each with a pointer to its place. Members that the service does not know are refused rather"
        " than ignored, so that a misspelt one cannot pass unnoticed. The schemas are in the reference at"
        " /docs.",
    ),
    ProblemType(
        "not-supported",
        422,
        "The request asks for something this version does not do",
        "The members listed in errors belong to the interface, but this version of the service cannot honour"
        " them. They are refused, since an answer that left them out could be wrong. Leave them out where"
        " the question allows it, or use a later version.",
    ),
    ProblemType(
        "invalid-graph",
        422,
        "The graph is not a causal graph",
        "The graph can be read, yet it cannot be a causal graph as it stands: an id or an edge stands twice,"
        " an edge joins a node to itself, or an arrow runs back in time. Every fault is listed in errors. The"
        " operation /v1/graph-check lists the same as findings, with status 200.",
    ),
    ProblemType(
        "cycle",
        422,
        "The arrows form a directed cycle",
        "Following the arrows of the graph leads back to where one started, so some column would be its own"
        " cause. The member cycle shows one such round, its first node repeated at the end. Where two columns"
        " influence each other over time, give each moment a node of its own.",
    ),
    ProblemType(
        "unknown-node",
        422,
        "A name is not in the graph",
        "The request names a column that is no node of the graph. Names are matched exactly; errors lists"
        " each unknown name with the nearest known ones. Correct the spelling, or declare the node.",
    ),
    ProblemType(
        "over-limit",
        422,
        "The request holds more than this service takes",
        "The request fits its schema, but holds more nodes, edges or statements than the operator allows;"
        " /version shows the limits in force. Split the request, or ask the operator to raise the limit.",
    ),
    ProblemType(
        "bad-cursor",
        422,
        "The cursor does not belong to this request",
        "A cursor continues exactly the request that it was given for: the same operation, graph and members,"
        " on the same version of the service. Repeat the request without the cursor to start from its first"
        " page.",
    ),
    ProblemType(
        "too-costly",
        422,
        "The question needs more time than a request may take",
        "The service stopped because the question had used up the whole time budget of a request; /version"
        " shows it as time_budget_seconds. Sending the same again will end the same way. Ask about a smaller"
        " graph or about fewer columns, or ask the operator to raise the budget.",
    ),
    ProblemType(
        "internal-error",
        500,
        "The service failed",
        "This is a fault of the service and not of the request. Nothing was stored, so the request can be"
        " sent again; where it fails again, tell the operator the instance of the problem, which is in the"
        " log too.",
        retryable=True,
    ),
    ProblemType(
        "overloaded",
        503,
        "The service is busy or about to stop",
        "The service takes no further request at the moment. Wait for as many seconds as the Retry-After"
        " header says, then send the same request again.",
        retryable=True,
    ),
)

PROBLEM_TYPES: Mapping[str, ProblemType] = MappingProxyType({each.slug: each for each in _TYPES})


@dataclass(frozen=True, slots=True)
class Problem:
    """One failure of one request, before it is given a request id and written out.

    Attributes:
        type: what kind of failure.
        detail: a sentence about this one.
        faults: what is wrong with the input, in the order found.
        extras: further members (``cycle``, ``line`` …).
        headers: headers the answer needs (``Allow``, ``Retry-After``).
    """

    type: ProblemType
    detail: str
    faults: tuple[Fault, ...] = ()
    extras: Mapping[str, Any] = field(default_factory=dict)
    headers: Mapping[str, str] = field(default_factory=dict)

    @classmethod
    def of(cls, slug: str, detail: str, **extras: Any) -> Problem:
        """A problem of the kind ``slug`` that has no faults to list."""
        return cls(PROBLEM_TYPES[slug], detail, extras=extras)

    def members(self, request_id: str, max_errors: int) -> dict[str, Any]:
        """The members of the JSON document (RFC 9457), at most ``max_errors`` faults listed in it."""
        document: dict[str, Any] = {
            "type": self.type.reference,
            "title": self.type.title,
            "status": self.type.status,
            "detail": self.detail,
            "instance": f"urn:uuid:{request_id}",
            "retryable": self.type.retryable,
        }
        if self.faults:
            listed = self.faults[:max_errors]
            document["errors"] = [{"pointer": pointer(each.place), "detail": each.detail} for each in listed]
            if len(self.faults) > max_errors:
                document["errors_omitted"] = len(self.faults) - max_errors
        return {**document, **self.extras}


class Refused(Exception):
    """The request means nothing; ``faults`` holds all that is wrong with it, at least one."""

    def __init__(self, faults: Sequence[Fault]) -> None:
        super().__init__("; ".join(each.detail for each in faults))
        self.faults = tuple(faults)


class Failed(Exception):
    """A request that ends in ``problem``."""

    def __init__(self, problem: Problem) -> None:
        super().__init__(problem.detail)
        self.problem = problem


def refusal(faults: Sequence[Fault]) -> Problem:
    """The problem for faults of the input: of their kind where all share one, else ``invalid-request``."""
    slugs = {each.slug for each in faults}
    slug = slugs.pop() if len(slugs) == 1 else "invalid-request"
    extras: dict[str, Any] = {}
    cycle = next((each.cycle for each in faults if each.cycle), None)
    if cycle:
        extras["cycle"] = list(cycle)
    detail = faults[0].detail
    if len(faults) > 1:
        detail = f"the request has {len(faults):,} faults; the first: {detail}"
    return Problem(PROBLEM_TYPES[slug], detail, tuple(faults), extras)


def problem_of(error: PathgateError) -> Problem | None:
    """The problem that an error of a lower layer is, or None where it should never have come this far."""
    if isinstance(error, FaultyInput):
        return refusal(error.faults)
    known = PROBLEM_TYPES.get(getattr(error, "slug", ""))
    return Problem(known, str(error), extras=dict(error.details)) if known else None
