"""Servers on the loopback for whoever asks a service: the real one, and ones that go wrong in every way.

A faulty server is a list of acts, one for each connection, of which the last is repeated; it keeps every request.
Nothing here waits for a fixed time: what holds an answer back holds it until the server ends.
"""

from __future__ import annotations

import socket
import struct
import threading
from collections.abc import Callable, Iterator
from contextlib import contextmanager, suppress
from dataclasses import dataclass, field

import msgspec
from werkzeug.serving import WSGIRequestHandler, make_server

from pathgate.web.app import create_app
from pathgate.web.settings import Settings


@dataclass
class Meeting:
    """One connection: the request that came, the socket to answer it on, and when the server ends."""

    request: bytes
    sock: socket.socket
    ended: threading.Event


Act = Callable[[Meeting], None]

# So that a reader without a deadline fails its test rather than hang in it.
MOST_DRIPS = 500


@dataclass
class Faulty:
    """A server that plays its acts; ``requests`` holds each request as it came."""

    url: str
    requests: list[bytes] = field(default_factory=list)


@contextmanager
def faulty(*acts: Act, reads: bool = True) -> Iterator[Faulty]:
    """A server that answers its connections one after the other, each by the next act.

    Args:
        reads: does it read each request first? Else the act does, if anybody.
    """
    ended = threading.Event()
    with socket.create_server(("127.0.0.1", 0)) as listener:
        server = Faulty(f"http://127.0.0.1:{listener.getsockname()[1]}")
        thread = threading.Thread(target=_play, args=(listener, acts, server, ended), kwargs={"reads": reads})
        thread.start()
        try:
            yield server
        finally:
            ended.set()
            # Wakes the thread from waiting for one more.
            with suppress(OSError):
                socket.create_connection(listener.getsockname(), timeout=5).close()
            thread.join(30)
            assert not thread.is_alive()


def _play(
    listener: socket.socket, acts: tuple[Act, ...], server: Faulty, ended: threading.Event, *, reads: bool
) -> None:
    turn = 0
    while True:
        sock, _ = listener.accept()
        with sock:
            if ended.is_set():
                return
            act = acts[min(turn, len(acts) - 1)]
            turn += 1
            # The client may be gone by then, which is what many of the tests are about.
            with suppress(OSError):
                request = read_request(sock) if reads else b""
                server.requests.append(request)
                act(Meeting(request, sock, ended))


def read_request(sock: socket.socket) -> bytes:
    """A request, its body included."""
    content = b""
    while b"\r\n\r\n" not in content:
        piece = sock.recv(65_536)
        if not piece:
            return content
        content += piece
    head, _, body = content.partition(b"\r\n\r\n")
    length = next(
        (int(line[15:]) for line in head.split(b"\r\n") if line.lower().startswith(b"content-length:")), 0
    )
    while len(body) < length:
        body += sock.recv(65_536)
    return head + b"\r\n\r\n" + body


def body_of(request: bytes) -> object:
    """The JSON that a request asks with."""
    return msgspec.json.decode(request.partition(b"\r\n\r\n")[2])


def answering(content: object, status: int = 200, media: str = "application/json", **headers: str) -> Act:
    """Answers with a body of bytes, or a value as JSON, whole and with its length."""
    body = content if isinstance(content, bytes) else msgspec.json.encode(content)
    named = {"Content-Type": media, "Content-Length": str(len(body))}
    named |= {name.replace("_", "-"): said for name, said in headers.items()}
    return sending(_head(status, named) + body)


def in_chunks(*chunks: bytes, media: str = "application/x-ndjson", is_ended: bool = True) -> Act:
    """Answers in chunks, and leaves out the end where that is asked for."""
    told = b"".join(b"%x\r\n%s\r\n" % (len(chunk), chunk) for chunk in chunks)
    head = _head(200, {"Content-Type": media, "Transfer-Encoding": "chunked"})
    return sending(head + told + (b"0\r\n\r\n" if is_ended else b""))


def problem(status: int, *, retryable: bool, slug: str = "overloaded", **headers: str) -> Act:
    """Answers with a problem document of the service."""
    document = {"type": f"/problems/{slug}", "title": "T", "status": status, "detail": f"said {slug}"}
    document["retryable"] = retryable
    return answering(document, status, "application/problem+json", **headers)


def sending(content: bytes) -> Act:
    """Sends bytes and ends."""
    return lambda meeting: meeting.sock.sendall(content)


def hanging_up(meeting: Meeting) -> None:
    """Ends without a byte."""


def resetting(meeting: Meeting) -> None:
    """Ends with a reset, which loses what was under way."""
    meeting.sock.setsockopt(socket.SOL_SOCKET, socket.SO_LINGER, struct.pack("ii", 1, 0))


def stalling_after(content: bytes) -> Act:
    """Sends bytes and then nothing more until the server ends."""

    def act(meeting: Meeting) -> None:
        meeting.sock.sendall(content)
        meeting.ended.wait()

    return act


def dripping(content: bytes) -> Act:
    """Sends one byte after the other, each long before a reader would give up waiting for it, for some seconds."""

    def act(meeting: Meeting) -> None:
        meeting.sock.sendall(content)
        drips = 0
        while drips < MOST_DRIPS and not meeting.ended.wait(0.01):
            meeting.sock.sendall(b" ")
            drips += 1

    return act


def _head(status: int, headers: dict[str, str]) -> bytes:
    lines = [f"HTTP/1.1 {status} Said", *(f"{name}: {said}" for name, said in headers.items())]
    return "\r\n".join([*lines, "", ""]).encode()


class _Quiet(WSGIRequestHandler):
    protocol_version = "HTTP/1.1"

    def log(self, *_said: object) -> None:
        pass


@contextmanager
def serving(settings: Settings | None = None) -> Iterator[str]:
    """The service itself, in threads of this process; its URL."""
    server = make_server(
        "127.0.0.1", 0, create_app(settings or Settings()), threaded=True, request_handler=_Quiet
    )
    thread = threading.Thread(target=server.serve_forever)
    thread.start()
    try:
        yield f"http://127.0.0.1:{server.server_port}"
    finally:
        server.shutdown()
        thread.join(30)
        server.server_close()


def nobody_at() -> str:
    """The URL of a port that nobody listens on."""
    with socket.create_server(("127.0.0.1", 0)) as listener:
        return f"http://127.0.0.1:{listener.getsockname()[1]}"
