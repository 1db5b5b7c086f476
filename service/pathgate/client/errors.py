"""What can come instead of an answer, and which of it may be tried again.

``FallsShort`` stands apart: it is an answer, and whoever decides to live without a service that is down must not
catch it by the way.
"""

from __future__ import annotations

from typing import Any

Json = dict[str, Any]

# What a gateway answers in place of a service that it cannot reach, or a service that takes no more.
OUT_OF_REACH = frozenset({429, 502, 503, 504})
_LONGEST = 300


class ClientError(Exception):
    """There is no answer; the text says why, on one line.

    Attributes:
        may_retry: may the same request succeed a little later?
        is_out_of_reach: did the service not get to answer, rather than answer wrongly or refuse?
        retry_after: the seconds that the service asks to wait.
    """

    may_retry = False
    is_out_of_reach = False
    retry_after: float | None = None


class Unreachable(ClientError):
    """The service cannot be reached, or gave no whole answer in time."""

    is_out_of_reach = True

    def __init__(self, detail: str, *, may_retry: bool = False) -> None:
        super().__init__(detail)
        self.may_retry = may_retry


class NotAnAnswer(ClientError):
    """What came back is nothing that the service says: cut short, of another kind, or contradicting itself."""


class Refused(ClientError):
    """The service says why it does not answer.

    Attributes:
        status: the HTTP status.
        problem: the document (RFC 9457).
    """

    def __init__(self, status: int, problem: Json, retry_after: float | None = None) -> None:
        super().__init__(plain(problem["detail"]))
        self.status = status
        self.problem = problem
        self.may_retry = problem["retryable"]
        self.is_out_of_reach = self.may_retry and status in OUT_OF_REACH
        self.retry_after = retry_after


class FallsShort(Exception):
    """The config was reviewed and does not pass; ``review`` is the whole review."""

    def __init__(self, review: Json) -> None:
        super().__init__(plain(review["summary"]))
        self.review = review


def plain(text: str) -> str:
    r"""A text from elsewhere on one line that steers no terminal.

    >>> plain("red\x1b[31m\n")
    'red\\x1b[31m\\n'
    """
    shown = text[:_LONGEST] + ("…" if len(text) > _LONGEST else "")
    return "".join(each if each.isprintable() else repr(each)[1:-1] for each in shown)
