"""What can a program ask the service? One review, many of them, or whether a config may go ahead.

Each method returns only what the service answered whole and well-formed with status 200; anything else raises.
A request is tried again where no byte of an answer had come, or where the service says that it may be
(``retryable``), as long as the total deadline allows; everything asked is safe to ask twice.
"""

from __future__ import annotations

import json
import math
import ssl
from collections.abc import Iterator, Mapping, Sequence
from contextlib import closing
from dataclasses import KW_ONLY, dataclass, field
from typing import Any

from pathgate.client.address import Address, read_address
from pathgate.client.answers import (
    JSON,
    LINES,
    PROBLEM,
    check_success,
    document_of,
    line_of,
    lines_of,
    passes,
    review_of,
)
from pathgate.client.errors import ClientError, FallsShort, NotAnAnswer, Refused
from pathgate.client.waiting import Budget, Surroundings, pause_before
from pathgate.client.wire import Answer, Request, ask
from pathgate.version import VERSION

Json = dict[str, Any]

DEFAULT_TIMEOUT = 60.0
DEFAULT_RETRIES = 3


@dataclass(frozen=True, slots=True)
class Client:
    """A service, and how long and how often to try it. Holds no connection, and may be used by several threads.

    Attributes:
        url: where the service is, with the path before ``/v1`` if there is one.
        timeout: the seconds that one call may last in all, pauses and retries included.
        retries: how often a request is tried again.
        token: sent as ``Authorization: Bearer``; over plain http anybody on the way can read it.
        trust: which certificates to trust; those of the system where None.
        surroundings: clocks, sleep and chance, for tests.

    Raises:
        ValueError: one of them cannot be used.
    """

    url: str
    _: KW_ONLY
    timeout: float = DEFAULT_TIMEOUT
    retries: int = DEFAULT_RETRIES
    token: str | None = field(default=None, repr=False)
    trust: ssl.SSLContext | None = None
    surroundings: Surroundings = field(default_factory=Surroundings, repr=False)
    address: Address = field(init=False, repr=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "address", read_address(self.url))
        _check_seconds(self.timeout)
        if self.retries < 0:
            raise ValueError("retries cannot be negative")
        if self.token is not None and not (self.token.isascii() and self.token.isprintable() and self.token):
            # It is not repeated here: messages end up in logs.
            raise ValueError("the token is empty, or holds what cannot stand in a header")

    def review(
        self,
        graph: Any,
        config: Any,
        *,
        hinges: bool = True,
        all_columns: bool = False,
        timeout: float | None = None,
    ) -> Json:
        """The review of one config: the answer of /v1/review, whatever its verdict.

        Raises:
            ClientError: there is none.
            ValueError, TypeError: the graph or the config is no JSON.
        """
        question = {"graph": graph, "config": config, "hinges": hinges}
        if all_columns:
            question["columns"] = "all"
        return review_of(self._document("/v1/review", question, timeout), _name_of(config))

    def gate(self, graph: Any, config: Any, *, hinges: bool = False, timeout: float | None = None) -> Json:
        """The review of a config that passes: sound, or every error accepted by a waiver. Nothing else returns.

        Raises:
            FallsShort: the config was judged, and does not pass.
            ClientError: it could not be judged.
            ValueError, TypeError: the graph or the config is no JSON.
        """
        question = {"graph": graph, "config": config, "hinges": hinges, "as_gate": True}
        try:
            review = review_of(self._document("/v1/review", question, timeout), _name_of(config))
        except Refused as refused:
            if (refused.status, refused.problem["type"]) != (409, "/problems/falls-short"):
                raise
            short = review_of(refused.problem.get("review"), _name_of(config))
            if passes(short):
                raise NotAnAnswer("the service stopped what its own review says passes") from None
            raise FallsShort(short) from None
        if not passes(review):
            raise NotAnAnswer("the service let pass what its own review says falls short")
        return review

    def reviews(
        self, graph: Any, configs: Sequence[Any], *, hinges: bool = False, timeout: float | None = None
    ) -> Iterator[Json]:
        """A line of /v1/reviews for each config, in order, as soon as it is there: its review or its problem.

        A stream that ends early raises, after the lines that came; so the caller has them all only once the
        iterator ends by itself. Leaving it early ends the connection, and with it the service's work. The timeout
        covers all of it, what the caller does between two lines included.

        Raises:
            ClientError: there is no answer, or it ended early.
            ValueError, TypeError: the graph or a config is no JSON.
        """
        if not configs:
            return
        question = {"graph": graph, "configs": list(configs), "hinges": hinges}
        budget = self._budget(timeout)
        count = 0
        with closing(self._answer("/v1/reviews", question, LINES, budget)) as answer:
            for value in lines_of(answer):
                if count == len(configs):
                    raise NotAnAnswer(f"more lines came than the {count:,} that were due")
                yield line_of(value, (count, len(configs)), _name_of(configs[count]))
                count += 1
        if count < len(configs):
            raise NotAnAnswer(f"the answer was cut short: {count:,} of {len(configs):,} lines came")

    def read(self, path: str, *, timeout: float | None = None) -> Json:
        """The JSON object that the service gives at a path such as ``/version``.

        Raises:
            ClientError: there is none.
        """
        value = self._document(path, None, timeout)
        if not isinstance(value, dict):
            raise NotAnAnswer(f"what stands at {path} is no object")
        return value

    def _document(self, path: str, question: Json | None, timeout: float | None) -> Any:
        with closing(self._answer(path, question, JSON, self._budget(timeout))) as answer:
            return document_of(answer)

    def _budget(self, timeout: float | None) -> Budget:
        seconds = self.timeout if timeout is None else timeout
        _check_seconds(seconds)
        return Budget(seconds, self.surroundings.clock)

    def _answer(self, path: str, question: Json | None, media_type: str, budget: Budget) -> Answer:
        """A success with that media type, after as many attempts as are allowed; the caller closes it."""
        request = Request(path, self._headers(media_type, question), _encoded(question))
        attempt = 0
        while True:
            try:
                return self._attempt(request, media_type, budget)
            except ClientError as error:
                attempt += 1
                if attempt > self.retries or not error.may_retry:
                    raise
                pause = pause_before(attempt, error.retry_after, self.surroundings.chance())
                if pause >= budget.left():
                    # The deadline would be over before the service may be asked again.
                    raise
                self.surroundings.sleep(pause)

    def _attempt(self, request: Request, media_type: str, budget: Budget) -> Answer:
        answer = ask(self.address, request, budget, self.trust)
        try:
            check_success(answer, media_type, self.surroundings.now())
        except BaseException:
            answer.close()
            raise
        return answer

    def _headers(self, media_type: str, question: Json | None) -> Mapping[str, str]:
        headers = {
            "Accept": f"{media_type}, {PROBLEM}",
            "Accept-Encoding": "identity",
            "Connection": "close",
            "User-Agent": f"pathgate/{VERSION}",
        }
        if question is not None:
            headers["Content-Type"] = JSON
        if self.token is not None:
            headers["Authorization"] = f"Bearer {self.token}"
        return headers


def _encoded(question: Json | None) -> bytes | None:
    if question is None:
        return None
    return json.dumps(question, ensure_ascii=False, allow_nan=False, separators=(",", ":")).encode()


def _name_of(config: Any) -> str | None:
    """What the answer has to be called, so that no answer to another question is taken for this one's."""
    if not isinstance(config, Mapping):
        return None
    name = config.get("name")
    return name if isinstance(name, str) else None


def _check_seconds(seconds: float) -> None:
    if not (math.isfinite(seconds) and seconds > 0):
        raise ValueError("the timeout has to be a number of seconds above 0")
