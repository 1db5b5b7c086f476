"""The server's settings are ones that the installed gunicorn knows, and mean what they are there for."""

from __future__ import annotations

import socket

import pytest
from gunicorn.config import KNOWN_SETTINGS, Config

from pathgate.web import serving
from pathgate.web.serving import gunicorn_options, serve
from pathgate.web.settings import InvalidSettings


def configured(**changes: object) -> Config:
    config = Config()
    for name, value in gunicorn_options("127.0.0.1:8123", 3, **changes).items():
        config.set(name, value)
    return config


def test_gunicorn_takes_every_setting():
    config = configured()
    assert config.address == [("127.0.0.1", 8123)]
    assert config.workers == 3
    assert config.worker_class_str == "gthread"


def test_a_client_cannot_choose_scheme_or_path_through_headers():
    config = configured()
    assert config.forwarded_allow_ips == []
    assert config.forwarder_headers == []
    assert config.secure_scheme_headers == {}


def test_no_control_socket_is_opened_where_gunicorn_has_one():
    known = {setting.name for setting in KNOWN_SETTINGS}
    assert ("control_socket_disable" in gunicorn_options("127.0.0.1:8123", 1)) == (
        "control_socket_disable" in known
    )


@pytest.mark.parametrize(("access_log", "goes_to"), [(False, None), (True, "-")])
def test_requests_are_logged_only_when_asked_for(*, access_log: bool, goes_to: str | None):
    assert configured(access_log=access_log).accesslog == goes_to


def test_settings_that_cannot_be_used_start_nothing(monkeypatch: pytest.MonkeyPatch):
    monkeypatch.setenv("PATHGATE_MAX_NODES", "many")
    with pytest.raises(InvalidSettings, match="PATHGATE_MAX_NODES"):
        serve("127.0.0.1:8123", 1)


class Server:
    """As much of gunicorn's master as the hook looks at."""

    class Listener:
        def __init__(self, sock: socket.socket) -> None:
            self.sock = sock

    def __init__(self, sock: socket.socket) -> None:
        self.LISTENERS = [self.Listener(sock)]


def test_no_connection_is_waited_for_for_ever(monkeypatch: pytest.MonkeyPatch):
    monkeypatch.setattr(serving, "WAITING_SECONDS", 1)
    with socket.create_server(("127.0.0.1", 0)) as listening:
        configured().when_ready(Server(listening))
        with socket.create_connection(listening.getsockname()):
            stalled, _address = listening.accept()
            with stalled, pytest.raises(BlockingIOError):
                stalled.recv(1)
