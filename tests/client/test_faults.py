"""Whatever goes wrong between the caller and the service, or in it, raises: nothing of it is ever a pass."""

from __future__ import annotations

import os
import shutil
import socket
import ssl
import subprocess
import threading
import time
from pathlib import Path
from typing import Any

import msgspec
import pytest

from pathgate.client import Client, FallsShort, NotAnAnswer, Refused, Unreachable
from pathgate.client.answers import MOST_BYTES
from pathgate.demo import demo_configs, demo_graph
from pathgate.graphs import read_graph
from pathgate.web.judging import judged
from pathgate.web.settings import Settings
from tests.client.loopback import (
    Act,
    Meeting,
    answering,
    dripping,
    faulty,
    hanging_up,
    in_chunks,
    nobody_at,
    problem,
    read_request,
    resetting,
    sending,
    stalling_after,
)

GRAPH, CONFIGS = demo_graph(), demo_configs()
SOUND, BIASED = CONFIGS[0], CONFIGS[1]
JSON_HEAD = b"HTTP/1.1 200 OK\r\nContent-Type: application/json\r\n"
LINES_HEAD = b"HTTP/1.1 200 OK\r\nContent-Type: application/x-ndjson\r\n"
HTML = b"<html><body>Bad gateway</body></html>"


def review_of(config: Any) -> dict[str, Any]:
    review: dict[str, Any] = judged(config, read_graph(GRAPH), Settings(), hinges=False)["review"]
    return review


GOOD = review_of(SOUND)
# Of the same name, so that the name alone gives none of it away.
BAD = {**review_of(BIASED), "name": GOOD["name"]}
GOOD_BYTES = msgspec.json.encode(GOOD)
BUSY = {"type": "/problems/overloaded", "title": "T", "status": 503, "detail": "d", "retryable": True}
OPTIONAL = ("meta", "hinges_on", "doubtful", "measure_next")


def line(index: int, count: int, review: dict[str, Any] = GOOD, **more: Any) -> bytes:
    said = {"index": index, "count": count, "name": review["name"], "review": review, **more}
    return msgspec.json.encode(said) + b"\n"


def without(value: dict[str, Any], member: str) -> dict[str, Any]:
    return {key: said for key, said in value.items() if key != member}


def test_the_answer_that_the_faulty_ones_are_made_from_passes(fakes):
    """Else the tests below could pass for a reason of their own."""
    for act in (
        answering(GOOD),
        answering(GOOD, media="application/json; charset=UTF-8"),
        in_chunks(GOOD_BYTES[:100], GOOD_BYTES[100:], media="application/json"),
        sending(JSON_HEAD + b"\r\n" + GOOD_BYTES),
    ):
        with faulty(act) as server:
            assert fakes.client(server.url).gate(GRAPH, SOUND) == GOOD
    with faulty(answering({**GOOD, "added_later": 1})) as server:
        assert fakes.client(server.url).gate(GRAPH, SOUND)["added_later"] == 1
    for act in (
        in_chunks(line(0, 2) + line(1, 2)[:50], line(1, 2)[50:]),
        sending(LINES_HEAD + b"\r\n" + line(0, 2) + line(1, 2)),
    ):
        with faulty(act) as server:
            lines = list(fakes.client(server.url).reviews(GRAPH, [SOUND, SOUND]))
        assert [each["index"] for each in lines] == [0, 1]


LYING: dict[str, Act] = {
    "an HTML page": answering(HTML, media="text/html"),
    "an HTML page that calls itself JSON": answering(HTML),
    "an HTML page with an error": answering(HTML, 500, "text/html"),
    "JSON that calls itself a text": answering(GOOD, media="text/plain"),
    "JSON that says nothing of itself": sending(b"HTTP/1.1 200 OK\r\n\r\n" + GOOD_BYTES),
    "JSON in another charset": answering(GOOD, media="application/json; charset=latin-1"),
    "JSON that says it is compressed": answering(GOOD, Content_Encoding="gzip"),
    "lines in place of a document": answering(GOOD, media="application/x-ndjson"),
    "a problem with status 200": answering(BUSY),
    "a problem of its own media type with status 200": problem(200, retryable=True),
    "a review with status 201": answering(GOOD, 201),
    "a review with status 206": answering(GOOD, 206),
    "a review with status 500": answering(GOOD, 500),
    "a review as a problem": answering(GOOD, 409, "application/problem+json"),
    "an empty body": answering(b""),
    "nothing with status 204": sending(b"HTTP/1.1 204 No Content\r\n\r\n"),
    "a body that is longer than it says": sending(JSON_HEAD + b"Content-Length: 40\r\n\r\n" + GOOD_BYTES),
    "a body that is shorter than it says": sending(JSON_HEAD + b"Content-Length: 99999\r\n\r\n" + GOOD_BYTES),
    "a body that is cut where nothing says its length": sending(JSON_HEAD + b"\r\n" + GOOD_BYTES[:-1]),
    "chunks without an end": in_chunks(GOOD_BYTES, media="application/json", is_ended=False),
    "a chunk that is cut": sending(JSON_HEAD + b"Transfer-Encoding: chunked\r\n\r\nfff\r\n" + GOOD_BYTES[:50]),
    "chunks that are none": sending(JSON_HEAD + b"Transfer-Encoding: chunked\r\n\r\nzz\r\n" + GOOD_BYTES),
    "a head that is cut": sending(b"HTTP/1.1 200 OK\r\nContent-Type: applica"),
    "a first line that is cut": sending(b"HTTP/1"),
    "no HTTP": sending(b"220 mail.parcels.invalid ready\r\n"),
    "endless headers": sending(b"HTTP/1.1 200 OK\r\n" + b"X: y\r\n" * 500),
    "two documents": answering(GOOD_BYTES * 2),
    "text after the document": answering(GOOD_BYTES + b"x"),
    "a member twice": answering(b'{"verdict": "biased", ' + GOOD_BYTES[1:]),
    "no number": answering(GOOD_BYTES[:-1] + b', "x": NaN}'),
    "no UTF-8": answering(GOOD_BYTES[:-1] + b', "x": "\xff"}'),
    "deep nesting": answering(b"[" * 100_000),
    "a redirect": answering(b"", 302, Location="/elsewhere"),
    "a permanent redirect": answering(b"", 308, Location="https://elsewhere.invalid/"),
    "a list": answering([GOOD]),
    "null": answering(None),
    "a verdict alone": answering({"verdict": "sound"}),
    "an unknown verdict": answering({**GOOD, "verdict": "fine"}),
    "a verdict that is true": answering({**GOOD, "verdict": True}),
    "sound beside an error": answering({**BAD, "verdict": "sound"}),
    "biased without an error": answering({**GOOD, "verdict": "biased"}),
    "a finding that is a text": answering({**GOOD, "findings": ["error"]}),
    "a finding of an unknown severity": answering({**GOOD, "findings": [{**BAD["findings"][0], "severity": "fatal"}]}),
    "a finding without columns": answering({**BAD, "findings": [without(BAD["findings"][0], "columns")]}),
    "columns without names": answering({**BAD, "findings": [{**BAD["findings"][0], "columns": [1]}]}),
    "a waiver that is true": answering({**BAD, "findings": [{**each, "accepted": True} for each in BAD["findings"]]}),
    "a remedy without a message": answering({**BAD, "remedies": [{}]}),
    "a caution that is a number": answering({**GOOD, "cautions": [1]}),
    "falls short without a review": problem(409, retryable=False, slug="falls-short"),
    "a problem whose status is another": answering(BUSY, 500, "application/problem+json"),
    **{
        f"a review without {member}": answering(without(GOOD, member)) for member in GOOD if member not in OPTIONAL
    },
    **{
        f"a review whose {member} is null": answering({**GOOD, member: None})
        for member in ("verdict", "findings", "remedies", "provenance")
    },
}  # fmt: skip


@pytest.mark.parametrize("act", LYING.values(), ids=LYING.keys())
def test_what_is_no_answer_raises_at_once_and_is_not_asked_again(fakes, act):
    with faulty(act) as server, pytest.raises(NotAnAnswer):
        fakes.client(server.url).gate(GRAPH, SOUND)
    assert len(server.requests) == 1
    assert fakes.slept == []


@pytest.mark.parametrize("waiver", [True, "yes", {}, {"why": 1, "owner": "refunds team"}])
def test_a_review_with_a_waiver_that_is_none_is_no_answer(fakes, waiver):
    findings = [{**each, "accepted": waiver} for each in BAD["findings"]]
    with (
        faulty(answering({**BAD, "findings": findings})) as server,
        pytest.raises(NotAnAnswer, match="a waiver"),
    ):
        fakes.client(server.url).review(GRAPH, SOUND)


def test_an_answer_that_passes_what_its_own_review_does_not_is_none(fakes):
    with faulty(answering(BAD)) as server, pytest.raises(NotAnAnswer, match="let pass"):
        fakes.client(server.url).gate(GRAPH, SOUND)


@pytest.mark.parametrize("review", [GOOD, {**BAD, "findings": []}, "biased", {**BAD, "name": "another"}])
def test_a_409_whose_review_is_none_is_no_judgement(fakes, review):
    document = {
        "type": "/problems/falls-short",
        "title": "T",
        "status": 409,
        "detail": "d",
        "retryable": False,
    }
    act = answering({**document, "review": review}, 409, "application/problem+json")
    with faulty(act) as server, pytest.raises(NotAnAnswer):
        fakes.client(server.url).gate(GRAPH, SOUND)


CUT: dict[str, Act] = {
    "no line": in_chunks(),
    "one line too few": in_chunks(line(0, 2)),
    "one line too many": in_chunks(line(0, 2), line(1, 2), line(2, 2)),
    "a last line without its end": in_chunks(line(0, 2), line(1, 2)[:-1]),
    "something after the last line": in_chunks(line(0, 2), line(1, 2), b"x"),
    "a last line that is cut": in_chunks(line(0, 2), line(1, 2)[:-20]),
    "a stream that is cut between lines": in_chunks(line(0, 2), is_ended=False),
    "a stream that is cut after its last line": in_chunks(line(0, 2), line(1, 2), is_ended=False),
    "a body that is cut between lines": sending(LINES_HEAD + b"\r\n" + line(0, 2)),
    "another count": in_chunks(line(0, 3), line(1, 3)),
    "a count that changes": in_chunks(line(0, 2), line(1, 3)),
    "another order": in_chunks(line(1, 2), line(0, 2)),
    "the same line twice": in_chunks(line(0, 2), line(0, 2)),
    "a count that is true": in_chunks(line(0, 2), line(1, 2).replace(b'"index":1', b'"index":true')),
    "an empty line": in_chunks(line(0, 2), b"\n", line(1, 2)),
    "a line of another config": in_chunks(line(0, 2), line(1, 2, name="another")),
    "a line with both": in_chunks(line(0, 2), line(1, 2, problem={})),
    "a line with neither": in_chunks(line(0, 2), b'{"index":1,"count":2,"name":"late-delivery-refunds"}\n'),
    "a line with no problem": in_chunks(
        line(0, 2), b'{"index":1,"count":2,"name":"late-delivery-refunds","problem":{}}\n'
    ),
    "a document": answering({"reviews": []}),
    "an HTML page in the middle": in_chunks(line(0, 2), HTML),
    "a problem in the middle": in_chunks(line(0, 2), b'{"type":"/problems/overloaded","status":503}\n'),
}


@pytest.mark.parametrize("act", CUT.values(), ids=CUT.keys())
def test_a_stream_that_is_not_whole_raises(fakes, act):
    with faulty(act) as server, pytest.raises(NotAnAnswer):
        list(fakes.client(server.url).reviews(GRAPH, [SOUND, SOUND]))
    assert len(server.requests) == 1


def test_an_answer_without_an_end_is_given_up(fakes):
    endless = in_chunks(*[b" " * 1_000_000] * (MOST_BYTES // 1_000_000 + 1))
    with faulty(endless) as server, pytest.raises(NotAnAnswer, match="larger than"):
        list(fakes.client(server.url).reviews(GRAPH, [SOUND]))


@pytest.mark.parametrize("status", [429, 502, 503, 504])
def test_a_gateway_that_cannot_reach_the_service_says_so_and_is_not_asked_again(fakes, status):
    with faulty(answering(HTML, status, "text/html", Retry_After="1")) as server, pytest.raises(Unreachable):
        fakes.client(server.url).gate(GRAPH, SOUND)
    assert len(server.requests) == 1


@pytest.mark.parametrize("act", [hanging_up, resetting], ids=["ends", "resets"])
def test_a_connection_that_ends_without_a_byte_is_tried_again(fakes, act):
    with faulty(act, act, answering(GOOD)) as server:
        assert fakes.client(server.url).gate(GRAPH, SOUND) == GOOD
    assert len(server.requests) == 3
    assert fakes.slept == [0.125, 0.25]


def test_nobody_there_is_tried_again_and_then_raises(fakes):
    with pytest.raises(Unreachable, match="refused"):
        fakes.client(nobody_at()).gate(GRAPH, SOUND)
    assert fakes.slept == [0.125, 0.25, 0.5]


def test_a_name_without_an_address_raises(fakes):
    with pytest.raises(Unreachable):
        fakes.client("http://gate.parcels.invalid", retries=1).gate(GRAPH, SOUND)
    assert fakes.slept == [0.125]


def test_a_retryable_problem_is_tried_again_and_another_is_not(fakes):
    with faulty(problem(503, retryable=True), answering(GOOD)) as server:
        assert fakes.client(server.url).gate(GRAPH, SOUND) == GOOD
    assert fakes.slept == [0.125]
    with faulty(problem(503, retryable=False), answering(GOOD)) as server, pytest.raises(Refused):
        fakes.client(server.url).gate(GRAPH, SOUND)
    assert len(server.requests) == 1
    with faulty(problem(503, retryable=False)) as server, pytest.raises(Refused) as caught:
        fakes.client(server.url).gate(GRAPH, SOUND)
    assert not caught.value.is_out_of_reach


def test_a_problem_that_stays_is_raised_after_the_last_try(fakes):
    with faulty(problem(503, retryable=True)) as server, pytest.raises(Refused) as caught:
        fakes.client(server.url, retries=2).gate(GRAPH, SOUND)
    assert len(server.requests) == 3
    assert caught.value.is_out_of_reach
    with (
        faulty(problem(500, retryable=True, slug="internal-error")) as server,
        pytest.raises(Refused) as caught,
    ):
        fakes.client(server.url, retries=0).gate(GRAPH, SOUND)
    assert not caught.value.is_out_of_reach


@pytest.mark.parametrize("said", ["7", "Thu, 01 Jan 1970 00:16:47 GMT"])
def test_retry_after_is_waited_for_in_seconds_and_as_a_date(fakes, said):
    with faulty(problem(503, retryable=True, Retry_After=said), answering(GOOD)) as server:
        fakes.client(server.url).gate(GRAPH, SOUND)
    assert fakes.slept == [7.125]


@pytest.mark.parametrize("said", ["30", "9" * 400, "Fri, 31 Dec 9999 23:59:59 GMT"])
def test_retry_after_past_the_deadline_is_not_waited_for(fakes, said):
    with faulty(problem(503, retryable=True, Retry_After=said)) as server, pytest.raises(Refused):
        fakes.client(server.url, timeout=30).gate(GRAPH, SOUND)
    assert fakes.slept == []


@pytest.mark.parametrize(
    "said", ["soon", "-5", "1.5", "", "Thu, 01 Jan 1970 00:00:00 GMT", "Thu, 99 Foo 1970"]
)
def test_retry_after_that_asks_for_nothing_leaves_the_jitter(fakes, said):
    with faulty(problem(503, retryable=True, Retry_After=said), answering(GOOD)) as server:
        fakes.client(server.url).gate(GRAPH, SOUND)
    assert fakes.slept == [0.125]


def test_pauses_grow_to_a_bound_and_end_with_the_deadline(fakes):
    with pytest.raises(Unreachable):
        fakes.client(nobody_at(), retries=1_000, timeout=60).gate(GRAPH, SOUND)
    assert fakes.slept[:8] == [0.125, 0.25, 0.5, 1.0, 2.0, 4.0, 7.5, 7.5]
    assert sum(fakes.slept) < 60
    assert sum(fakes.slept) + 7.5 >= 60


SLOW: dict[str, Act] = {
    "nothing comes": stalling_after(b""),
    "half a head": stalling_after(b"HTTP/1.1 200 OK\r\nContent-"),
    "half a body": stalling_after(JSON_HEAD + b"Content-Length: 5000\r\n\r\n" + GOOD_BYTES[:50]),
    "a whole body without its end": stalling_after(
        JSON_HEAD + b"Transfer-Encoding: chunked\r\n\r\n1\r\n{\r\n"
    ),
    "a head that drips": dripping(b"HTTP/1.1 200 OK\r\nX: "),
    "a body that drips": dripping(JSON_HEAD + b"Content-Length: 5000\r\n\r\n"),
    "a body without a length that drips": dripping(JSON_HEAD + b"\r\n"),
    "an error that drips": dripping(
        b"HTTP/1.1 503 X\r\nContent-Type: application/problem+json\r\nContent-Length: 500\r\n\r\n"
    ),
}


@pytest.mark.parametrize("act", SLOW.values(), ids=SLOW.keys())
def test_the_deadline_holds_however_slowly_the_answer_comes(act):
    begun = time.monotonic()
    with faulty(act) as server:
        with pytest.raises(Unreachable, match=r"in time|within 0\.3 seconds"):
            Client(server.url, timeout=0.3).gate(GRAPH, SOUND)
        # The server would go on until it is ended; the bound is wide for the sake of a busy machine.
        assert 0.25 < time.monotonic() - begun < 10
    assert len(server.requests) == 1


def test_a_server_that_reads_nothing_is_given_up(fakes):
    with socket.create_server(("127.0.0.1", 0)) as listener:
        url = f"http://127.0.0.1:{listener.getsockname()[1]}"
        large = {**SOUND, "meta": "x" * 30_000_000}
        with pytest.raises(Unreachable):
            Client(url, timeout=0.5).gate(GRAPH, large)


def test_a_refusal_that_comes_before_the_body_was_read_is_understood(fakes):
    """As a service does that takes no such large body: its answer stands in the connection."""
    refused = problem(413, retryable=False, slug="body-too-large")

    with faulty(refused) as server, pytest.raises(Refused) as caught:
        fakes.client(server.url).gate(GRAPH, SOUND)
    assert caught.value.status == 413


def test_proxies_that_the_environment_names_are_not_used(fakes, monkeypatch):
    with faulty(answering(HTML, media="text/html")) as proxy, faulty(answering(GOOD)) as server:
        for name in ("http_proxy", "HTTP_PROXY", "all_proxy", "https_proxy"):
            monkeypatch.setenv(name, proxy.url)
        assert fakes.client(server.url).gate(GRAPH, SOUND) == GOOD
    assert proxy.requests == []


def test_a_409_with_its_review_is_a_judgement(fakes):
    """What the contradictory ones above are made from."""
    document = {
        "type": "/problems/falls-short",
        "title": "T",
        "status": 409,
        "detail": "d",
        "retryable": False,
    }
    act = answering({**document, "review": BAD}, 409, "application/problem+json")
    with faulty(act) as server, pytest.raises(FallsShort) as caught:
        fakes.client(server.url).gate(GRAPH, SOUND)
    assert caught.value.review == BAD


def test_a_409_of_another_kind_is_a_refusal_whatever_it_holds(fakes):
    document = {"type": "/problems/conflict", "title": "T", "status": 409, "detail": "d", "retryable": False}
    act = answering({**document, "review": BAD}, 409, "application/problem+json")
    with faulty(act) as server, pytest.raises(Refused):
        fakes.client(server.url).gate(GRAPH, SOUND)


def test_what_does_not_speak_tls_is_not_spoken_to_without(fakes):
    plainly = sending(b"HTTP/1.1 400 Bad Request\r\n\r\n")
    with faulty(plainly, reads=False) as server, pytest.raises(NotAnAnswer, match="does not speak TLS"):
        fakes.client(server.url.replace("http:", "https:")).gate(GRAPH, SOUND)


@pytest.fixture(scope="module")
def certified(tmp_path_factory):
    """A certificate for localhost that nobody has signed but itself, with its key."""
    folder = tmp_path_factory.mktemp("certificate")
    openssl = shutil.which("openssl")
    if openssl is None:
        # Only a run that says so may do without: deploy/test installs it, or names it here.
        assert "openssl" in os.environ.get("PATHGATE_LEFT_OUT", "").split(",")
        pytest.skip("openssl is left out")
    words = (
        "req -x509 -newkey rsa:2048 -nodes -days 2 -subj /CN=localhost -addext subjectAltName=DNS:localhost"
    )
    files = ["-keyout", str(folder / "key.pem"), "-out", str(folder / "certificate.pem")]
    subprocess.run([openssl, *words.split(), *files], check=True, capture_output=True)
    return folder


def speaking_tls(folder: Path) -> Act:
    """Answers as the service does, over TLS."""
    context = ssl.SSLContext(ssl.PROTOCOL_TLS_SERVER)
    context.load_cert_chain(folder / "certificate.pem", folder / "key.pem")

    def act(meeting: Meeting) -> None:
        with context.wrap_socket(meeting.sock, server_side=True) as secure:
            read_request(secure)
            answering(GOOD)(Meeting(b"", secure, threading.Event()))

    return act


def test_certificates_are_verified_and_so_are_host_names(fakes, certified):
    trusting = ssl.create_default_context(cafile=str(certified / "certificate.pem"))
    for host, trust, is_trusted in (
        ("localhost", trusting, True),
        ("localhost", None, False),
        ("127.0.0.1", trusting, False),
    ):
        with faulty(speaking_tls(certified), reads=False) as server:
            client = fakes.client(server.url.replace("http://127.0.0.1", f"https://{host}"), trust=trust)
            if is_trusted:
                assert client.gate(GRAPH, SOUND) == GOOD
            else:
                with pytest.raises(NotAnAnswer, match="cannot be trusted"):
                    client.gate(GRAPH, SOUND)
    assert fakes.slept == []
