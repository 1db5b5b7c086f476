"""One request over one connection: sent, and its answer read piece by piece, all within a budget of seconds.

Redirects are not followed and proxies that the environment names are not used: whoever names a service as a gate
means that one. Certificates and host names are verified. Whether the answer is complete is seen here, where its
length is known; what it says is read elsewhere.
"""

from __future__ import annotations

import io
import socket
import ssl
from collections.abc import Iterator, Mapping
from concurrent.futures import Future
from contextlib import contextmanager, suppress
from dataclasses import dataclass
from http.client import HTTPConnection, HTTPException, HTTPResponse, IncompleteRead
from threading import Thread
from typing import Any

from pathgate.client.address import Address
from pathgate.client.errors import ClientError, NotAnAnswer, Unreachable, plain
from pathgate.client.waiting import Budget

# A host that drops packets must not eat a long budget before another attempt is made.
CONNECT_SECONDS = 10.0
_PIECE = 65_536


@dataclass(frozen=True, slots=True)
class Request:
    """What is asked: a GET where there is no body."""

    path: str
    headers: Mapping[str, str]
    body: bytes | None = None


class Answer:
    """The head of an answer, and its body as it comes."""

    def __init__(self, response: HTTPResponse, wire: _Wire) -> None:
        self._response = response
        self._wire = wire
        self.status = response.status

    def header(self, name: str) -> str | None:
        """What a header says; where it stands twice, both."""
        said = self._response.headers.get_all(name)
        return ", ".join(said) if said else None

    def pieces(self) -> Iterator[bytes]:
        """The bytes of the body.

        Raises:
            Unreachable: they did not come in time.
            NotAnAnswer: the body was cut short.
        """
        while True:
            with _explained(self._wire):
                piece = self._next_piece()
            if not piece:
                break
            yield piece
        if self._response.length:
            raise NotAnAnswer(f"the answer of {self._wire.address} was cut short")

    def _next_piece(self) -> bytes:
        left = self._response.length
        if left is None:
            # In chunks, or until the connection ends: what is there is handed on at once.
            return self._response.read1(_PIECE)
        return self._response.read(min(left, _PIECE))

    def close(self) -> None:
        """End the connection."""
        self._response.close()
        self._wire.end()


def ask(address: Address, request: Request, budget: Budget, trust: ssl.SSLContext | None) -> Answer:
    """Send a request; its answer, as soon as its head is there.

    Args:
        trust: which certificates to trust; the system's where None.

    Raises:
        Unreachable: no connection, or no answer in time.
        NotAnAnswer: whoever answers does not speak HTTP, or cannot be trusted.
    """
    wire = _Wire(address, budget)
    try:
        with _explained(wire):
            wire.connect(trust)
            return Answer(_exchanged(wire, request), wire)
    except BaseException:
        wire.end()
        raise


def _exchanged(wire: _Wire, request: Request) -> HTTPResponse:
    address = wire.address
    connection = HTTPConnection(address.host, address.port)
    connection.default_port = 443 if address.is_secure else 80
    connection.sock = wire  # all that is used of it is there
    method = "GET" if request.body is None else "POST"
    # Whoever refuses a body may answer without reading it: the answer counts, if there is one.
    with suppress(BrokenPipeError, ConnectionResetError):
        connection.request(method, address.path + request.path, request.body, dict(request.headers))
    return connection.getresponse()


class _Wire:
    """A connection of which every wait ends with the budget."""

    def __init__(self, address: Address, budget: Budget) -> None:
        self.address = address
        self.budget = budget
        self.received = 0
        self._socket: socket.socket | None = None

    def connect(self, trust: ssl.SSLContext | None) -> None:
        found = _dialled(self.address, self.budget)
        self._socket = found
        if self.address.is_secure:
            trust = trust or ssl.create_default_context()
            found.settimeout(self.budget.left())
            self._socket = trust.wrap_socket(found, server_hostname=self.address.host)

    def sendall(self, content: bytes) -> None:
        """Send all of it, as http.client asks for it."""
        left = memoryview(content)
        while left:
            left = left[self._ready().send(left[:_PIECE]) :]

    def receive_into(self, buffer: Any) -> int:
        """Wait for the next bytes; how many came, 0 at the end."""
        count = self._ready().recv_into(buffer)
        self.received += count
        return count

    def makefile(self, _mode: str) -> io.BufferedReader:
        """What http.client reads answers from."""
        return io.BufferedReader(_Reader(self))

    def close(self) -> None:
        """Nothing yet: http.client closes what it has sent on before the answer is read."""

    def end(self) -> None:
        """Close the connection."""
        if self._socket is not None:
            self._socket.close()

    def _ready(self) -> socket.socket:
        if self._socket is None:
            raise ConnectionError("not connected")
        self._socket.settimeout(self.budget.left())
        return self._socket


class _Reader(io.RawIOBase):
    def __init__(self, wire: _Wire) -> None:
        super().__init__()
        self._wire = wire

    def readable(self) -> bool:
        return True

    def readinto(self, buffer: Any) -> int:
        return self._wire.receive_into(buffer)


def _dialled(address: Address, budget: Budget) -> socket.socket:
    """A connection to the first of the host's addresses that takes one."""
    failure = OSError("the host has no address")
    for family, kind, protocol, _name, where in _looked_up(address, budget):
        tried = socket.socket(family, kind, protocol)
        try:
            tried.settimeout(min(budget.left(), CONNECT_SECONDS))
            tried.connect(where)
            tried.setsockopt(socket.IPPROTO_TCP, socket.TCP_NODELAY, 1)
        except OSError as error:
            tried.close()
            failure = error
        except BaseException:
            tried.close()
            raise
        else:
            return tried
    raise failure


def _looked_up(address: Address, budget: Budget) -> list[Any]:
    """The host's addresses. The system cannot be told how long to look: it is left to itself where it lasts."""
    found: Future[list[Any]] = Future()

    def look_up() -> None:
        try:
            found.set_result(socket.getaddrinfo(address.host, address.port, type=socket.SOCK_STREAM))
        except Exception as error:  # raised where the result is asked for
            found.set_exception(error)

    Thread(target=look_up, name="pathgate-look-up", daemon=True).start()
    return found.result(budget.left())


@contextmanager
def _explained(wire: _Wire) -> Iterator[None]:
    """Every way in which a connection fails becomes one of ours."""
    try:
        yield
    except ClientError:
        raise
    except IncompleteRead:
        raise NotAnAnswer(f"the answer of {wire.address} was cut short") from None
    except OSError as error:
        raise _broken(error, wire) from None
    except (HTTPException, ValueError) as error:
        what = plain(f"{type(error).__name__}: {error}")
        raise NotAnAnswer(f"what answers at {wire.address} does not speak HTTP: {what}") from None


def _broken(error: OSError, wire: _Wire) -> ClientError:
    """What a connection that does not work stands for."""
    where, is_early = wire.address, wire.received == 0
    said = plain(error.strerror or str(error) or type(error).__name__)
    match error:
        case TimeoutError():
            return Unreachable(f"{where} did not answer in time", may_retry=is_early)
        case ssl.SSLCertVerificationError():
            return NotAnAnswer(f"{where} cannot be trusted: {plain(error.verify_message)}")
        case ssl.SSLError() if not isinstance(error, ssl.SSLEOFError):
            return NotAnAnswer(f"{where} does not speak TLS as it should: {said}")
    if is_early:
        return Unreachable(f"{where} cannot be reached: {said}", may_retry=True)
    return NotAnAnswer(f"the answer of {where} was cut short: {said}")
