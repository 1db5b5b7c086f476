"""Where is the service? The parts of its URL, or what is wrong with it."""

from __future__ import annotations

import re
from dataclasses import dataclass
from urllib.parse import urlsplit

_HOST = re.compile(r"[A-Za-z0-9._-]+|[0-9a-fA-F:.]+")
_PATH = re.compile(r"[A-Za-z0-9/._~!$&'()*+,;=:@%-]*")
_PORTS = {"http": 80, "https": 443}


@dataclass(frozen=True, slots=True)
class Address:
    """A service; ``path`` is what stands before ``/v1``, without a slash at its end."""

    is_secure: bool
    host: str
    port: int
    path: str

    def __str__(self) -> str:
        """As a URL."""
        scheme = "https" if self.is_secure else "http"
        host = f"[{self.host}]" if ":" in self.host else self.host
        port = "" if self.port == _PORTS[scheme] else f":{self.port}"
        return f"{scheme}://{host}{port}{self.path}"


def read_address(url: str) -> Address:
    """The parts of a URL.

    Raises:
        ValueError: it is none of a service.

    >>> str(read_address("http://gate.parcels.invalid:80/team/"))
    'http://gate.parcels.invalid/team'
    """
    try:
        parts = urlsplit(url)
        port = parts.port
    except ValueError as error:
        raise ValueError(f"{url!r} is no URL: {error}") from None
    if parts.scheme not in _PORTS:
        raise ValueError(f"{url!r} is no address of a service: it has to start with http:// or https://")
    if parts.username is not None or parts.password is not None:
        # It is not repeated here, since it may hold a password.
        raise ValueError("the address of the service must not hold a user or a password; give a token")
    if parts.query or parts.fragment:
        raise ValueError(f"{url!r} is no address of a service: it must end with its path")
    host = parts.hostname or ""
    if not _HOST.fullmatch(host) or not _PATH.fullmatch(parts.path) or not _is_sound_name(host):
        raise ValueError(f"{url!r} is no address of a service: its host or its path cannot be")
    port = _PORTS[parts.scheme] if port is None else port
    return Address(parts.scheme == "https", host, port, parts.path.rstrip("/"))


def _is_sound_name(host: str) -> bool:
    labels = host.removesuffix(".").split(".")
    return len(host) <= 253 and all(0 < len(label) <= 63 for label in labels)
