"""``python -m pathgate.demo``: a table where a service answers, one clear line where none does."""

from __future__ import annotations

import json
import shlex
import socket
import threading
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from http.server import BaseHTTPRequestHandler, ThreadingHTTPServer
from typing import Any

import pytest

from pathgate.demo import demo_configs
from pathgate.demo.__main__ import curl_line, main
from pathgate.graphs import read_graph
from pathgate.review import read_config, review, review_document

Answer = Callable[[str, Any], tuple[int, bytes]]


@contextmanager
def a_service(answer: Answer) -> Iterator[str]:
    """The address of a server that answers each POST with what ``answer`` makes of its path and body."""

    class Handler(BaseHTTPRequestHandler):
        def do_POST(self):
            body = json.loads(self.rfile.read(int(self.headers["Content-Length"])))
            status, content = answer(self.path, body)
            self.send_response(status)
            self.send_header("Content-Length", str(len(content)))
            self.end_headers()
            self.wfile.write(content)

        def log_message(self, *args):
            pass

    server = ThreadingHTTPServer(("127.0.0.1", 0), Handler)
    thread = threading.Thread(target=server.serve_forever)
    thread.start()
    try:
        yield f"http://127.0.0.1:{server.server_port}"
    finally:
        server.shutdown()
        thread.join()
        server.server_close()


def honest(path: str, body: Any) -> tuple[int, bytes]:
    """What the real service would say."""
    assert path == "/v1/review"
    graph = read_graph(body["graph"])
    return 200, json.dumps(review_document(review(graph, read_config(body["config"], graph)))).encode()


def the_one_line(capsys: pytest.CaptureFixture[str]) -> str:
    said = capsys.readouterr()
    assert said.out == ""
    assert len(said.err.splitlines()) == 1
    assert said.err.startswith("pathgate.demo: ")
    return said.err


def test_every_config_has_its_row_and_the_way_on_stands_below(capsys):
    with a_service(honest) as url:
        assert main(["--url", url + "/"]) == 0
    out = capsys.readouterr().out
    rows = {line.split()[0]: line.split()[1:2] for line in out.splitlines() if line.strip()}
    verdicts = {config["name"]: rows[config["name"]] for config in demo_configs()}
    assert list(verdicts.values()) == [["sound"], *[["biased"]] * 6, ["unanswerable"]]
    assert f"{url}/docs" in out
    assert out.splitlines()[-1] == curl_line(url)


def test_without_a_terminal_the_table_is_plain_and_of_sensible_width(capsys):
    with a_service(honest) as url:
        main(["--url", url])
    out = capsys.readouterr().out
    assert "\x1b" not in out
    assert all(len(line) <= 100 for line in out.splitlines()[:-1])


def test_the_curl_line_is_a_request_that_the_service_takes():
    words = shlex.split(curl_line("http://127.0.0.1:8080"))
    assert words[:3] == ["curl", "-s", "http://127.0.0.1:8080/v1/review"]
    assert words[3:5] == ["-H", "Content-Type: application/json"]
    status, answer = honest("/v1/review", json.loads(words[words.index("-d") + 1]))
    assert (status, json.loads(answer)["verdict"]) == (200, "biased")


def test_nobody_listening_is_said_in_one_line(capsys):
    with socket.create_server(("127.0.0.1", 0)) as server:
        port = server.getsockname()[1]
    assert main(["--url", f"http://127.0.0.1:{port}"]) == 1
    assert f"http://127.0.0.1:{port}/v1/review cannot be reached: Connection refused" in the_one_line(capsys)


def test_a_refusal_is_said_with_its_reason_and_cannot_steer_the_terminal(capsys):
    problem = json.dumps({"detail": "the \x1b[31mgraph\n is refused"}).encode()
    with a_service(lambda _path, _body: (422, problem)) as url:
        assert main(["--url", url]) == 1
    assert "answered 422: the \\u001b[31mgraph\\u000a is refused" in the_one_line(capsys)


@pytest.mark.parametrize(
    "content", [b"<html>", b"[]", b"{}", b'{"verdict": "biased", "findings": [{"severity": "error"}]}']
)
def test_another_service_on_that_port_is_told_apart(capsys, content):
    with a_service(lambda _path, _body: (200, content)) as url:
        assert main(["--url", url]) == 1
    assert "is not this service" in the_one_line(capsys)


@pytest.mark.parametrize("url", ["127.0.0.1:8080", "file:///etc/hostname", "http://[", "http://a b"])
def test_an_address_that_is_none_is_refused(capsys, url):
    assert main(["--url", url]) == 1
    assert the_one_line(capsys)
