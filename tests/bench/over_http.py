"""Figures that need real servers: what a small request costs over HTTP, and what memory a large one leaves."""

from __future__ import annotations

import http.client
import json
import multiprocessing
import os
import socket
import statistics
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from itertools import islice
from pathlib import Path
from typing import Any

from pathgate.demo import demo_configs, demo_graph
from pathgate.graphs import read_graph
from tests.bench.harness import Figure, times_slower
from tests.bench.reviewing import ARROWS, NODES, random_configs, separation_tests
from tests.bench.worlds import body_of, graph_value, peer_graph, random_pairs, random_statements

REQUESTS_A_ROUND = 200


def small_review() -> Iterator[Figure]:
    """One demo config over HTTP, without and with what it hinges on, against an empty JSON endpoint under the same
    server settings."""
    asked = {"graph": demo_graph(), "config": demo_configs()[0]}
    with _server(_serve_pathgate, {}) as ours, _server(_serve_empty, {}) as floor:
        empty = _Caller(floor, "/", b"{}")
        for what, hinges in (("the verdict", False), ("the verdict and what it hinges on", True)):
            review = _Caller(ours, "/v1/review", body_of({**asked, "hinges": hinges}))
            yield times_slower(
                f"/v1/review of a demo config over HTTP: {what}",
                review.round,
                "an empty Flask JSON endpoint under the same server",
                empty.round,
                wanted="<= 3",
                rounds=9,
            )


def memory_after_a_large_request() -> Iterator[Figure]:
    """What a worker holds after a request of 100,000 nodes, against what it held before."""
    pairs = random_pairs(100_000, 400_000)
    large = body_of(
        {"graph": graph_value(100_000, pairs), "statements": random_statements(100_000, 2), "explain": False}
    )
    small = body_of({"graph": demo_graph(), "config": demo_configs()[0]})
    limits = {
        "PATHGATE_MAX_NODES": "100000",
        "PATHGATE_MAX_EDGES": "400000",
        "PATHGATE_MAX_BODY_BYTES": "100000000",
    }
    with _server(_serve_pathgate, limits) as port:
        usual, heavy = _Caller(port, "/v1/review", small), _Caller(port, "/v1/separation", large)
        usual.round()
        # One large request first: libraries load lazily, and that is no leak.
        heavy.ask()
        usual.round()
        before = _worker_memory(port)
        for _ in range(3):
            heavy.ask()
        usual.round()
        after = _worker_memory(port)
    yield Figure(
        what="memory of a worker after requests of 100,000 nodes",
        peer="before them",
        seen=after / before,
        wanted="<= 1.1",
        ours=after / 1e6,
        theirs=before / 1e6,
        unit="MB",
    )


BATCH = 1_000


def batch_of_reviews() -> Iterator[Figure]:
    """1,000 configs against a 100-node graph over HTTP, line by line, against networkx separation tests there."""
    pairs = random_pairs(NODES, ARROWS)
    graph, peer = read_graph(graph_value(NODES, pairs)), peer_graph(NODES, pairs)
    configs = list(islice(random_configs(graph), BATCH))
    body = body_of({"graph": graph_value(NODES, pairs), "configs": configs})
    with _server(_serve_pathgate, {}) as port:
        caller = _Caller(port, "/v1/reviews", body, accept="application/x-ndjson")
        yield times_slower(
            f"{BATCH:,} configs in one /v1/reviews over HTTP, 100 nodes",
            caller.ask,
            "networkx separation tests",
            separation_tests(peer, configs),
            wanted="<= 10",
            rounds=5,
        )


def memory_of_a_long_stream() -> Iterator[Figure]:
    """What a worker holds while 10,000 configs stream, against what it holds while 1,000 do."""
    pairs = random_pairs(NODES, ARROWS)
    graph = read_graph(graph_value(NODES, pairs))
    configs = list(islice(random_configs(graph), BATCH))
    with _server(_serve_pathgate, {}) as port:
        peaks = []
        for times in (1, 10):
            body = body_of({"graph": graph_value(NODES, pairs), "configs": configs * times})
            caller = _Caller(port, "/v1/reviews", body, accept="application/x-ndjson")
            peaks.append(max(caller.watched(lambda: _worker_memory(port))))
    yield Figure(
        what="peak memory of a worker while 10,000 configs stream",
        peer="while 1,000 do",
        seen=peaks[1] / peaks[0],
        wanted="<= 1.2",
        ours=peaks[1] / 1e6,
        theirs=peaks[0] / 1e6,
        unit="MB",
    )


class _Caller:
    """Sends the same request over one kept connection."""

    def __init__(self, port: int, path: str, body: bytes, *, accept: str = "application/json") -> None:
        self._headers = {"Content-Type": "application/json", "Accept": accept}
        self._connection = http.client.HTTPConnection("127.0.0.1", port, timeout=120)
        self._path = path
        self._body = body

    def ask(self) -> None:
        self._connection.request("POST", self._path, self._body, self._headers)
        answer = self._connection.getresponse()
        content = answer.read()
        if answer.status != 200:
            raise RuntimeError(f"{self._path} answered {answer.status}: {content[:300]!r}")

    def watched(self, look: Callable[[], float]) -> list[float]:
        """What is seen at ten places of the answer while it arrives line by line."""
        self._connection.request("POST", self._path, self._body, self._headers)
        answer = self._connection.getresponse()
        lines = 0
        seen = []
        while line := answer.readline():
            lines += 1
            count = json.loads(line)["count"]
            if lines % (count // 10) == 0:
                seen.append(look())
        if not lines or lines != count:
            raise RuntimeError(f"the stream of {self._path} broke off after {lines} lines")
        return seen

    def round(self) -> None:
        # The server ends a connection that was idle for long; each round opens its own.
        self._connection.close()
        for _ in range(REQUESTS_A_ROUND):
            self.ask()


@contextmanager
def _server(serve: Any, environment: dict[str, str]) -> Iterator[int]:
    with socket.create_server(("127.0.0.1", 0)) as probe:
        port = probe.getsockname()[1]
    process = multiprocessing.get_context("spawn").Process(target=_run, args=(serve, port, environment))
    process.start()
    try:
        _wait_for(port)
        yield port
    finally:
        process.terminate()
        process.join(40)


def _run(serve: Any, port: int, environment: dict[str, str]) -> None:
    os.environ.update(environment)
    serve(f"127.0.0.1:{port}")


def _serve_pathgate(bind: str) -> None:
    from pathgate.web.serving import serve  # noqa: PLC0415

    serve(bind, 1)


def _serve_empty(bind: str) -> None:
    from flask import Flask, jsonify, request  # noqa: PLC0415
    from gunicorn.app.base import BaseApplication  # type: ignore[import-untyped] # noqa: PLC0415

    from pathgate.web.serving import gunicorn_options  # noqa: PLC0415

    app = Flask("empty")

    @app.post("/")
    def answer() -> Any:
        request.get_json()
        return jsonify(answer="ok")

    class Server(BaseApplication):  # type: ignore[misc]
        def load_config(self) -> None:
            for name, value in gunicorn_options(bind, 1).items():
                self.cfg.set(name, value)

        def load(self) -> Any:
            return app

    Server().run()


def _wait_for(port: int) -> None:
    deadline = time.monotonic() + 60
    while True:
        try:
            with socket.create_connection(("127.0.0.1", port), timeout=1):
                return
        except OSError:
            if time.monotonic() > deadline:
                raise
            # Nothing to wait on but the port itself.
            time.sleep(0.02)


def _worker_memory(port: int) -> float:
    """Resident bytes of the one worker, the median of a few readings."""
    listening = f":{port:04X}"
    inodes = {
        line.split()[9]
        for line in Path("/proc/net/tcp").read_text().splitlines()[1:]
        if line.split()[1].endswith(listening) and line.split()[3] == "0A"
    }
    holders = [pid for pid in map(int, filter(str.isdigit, _names_in("/proc"))) if _holds(pid, inodes)]
    worker = max(holders)
    return statistics.median(_resident(worker) for _ in range(3))


def _names_in(folder: str) -> list[str]:
    return [entry.name for entry in Path(folder).iterdir()]


def _holds(pid: int, inodes: set[str]) -> bool:
    try:
        links = [str(link.readlink()) for link in Path(f"/proc/{pid}/fd").iterdir()]
    except OSError:
        return False
    return any(link == f"socket:[{inode}]" for link in links for inode in inodes)


def _resident(pid: int) -> float:
    pages = int(Path(f"/proc/{pid}/statm").read_text().split()[1])
    return pages * os.sysconf("SC_PAGE_SIZE")
