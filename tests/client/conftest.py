"""A real service for the tests of the client, and surroundings in which no time passes."""

from __future__ import annotations

from collections.abc import Iterator

import pytest

from tests.client.fakes import Fakes
from tests.client.loopback import serving


@pytest.fixture(scope="session")
def service_url() -> Iterator[str]:
    with serving() as url:
        yield url


@pytest.fixture
def fakes() -> Fakes:
    return Fakes()
