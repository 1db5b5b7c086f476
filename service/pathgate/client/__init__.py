"""Asks a running service, from a program that must not go on where the answer is missing.

Closed on failure: whatever is not a whole, well-formed answer of the service is an exception, and nothing is ever
taken for a pass. The standard library alone is used, so that the module can be carried into any environment.
"""

from pathgate.client.errors import ClientError, FallsShort, NotAnAnswer, Refused, Unreachable
from pathgate.client.service import Client
from pathgate.client.waiting import Surroundings

__all__ = ["Client", "ClientError", "FallsShort", "NotAnAnswer", "Refused", "Surroundings", "Unreachable"]
