"""Requests made up from the OpenAPI document: is it neither looser nor stricter than the service?

All default checks of schemathesis but one: a graph can fit its schema and still mean nothing, which is refused.
"""

from __future__ import annotations

import pytest
import schemathesis
from hypothesis import HealthCheck, settings
from schemathesis.specs.openapi.checks import positive_data_acceptance

from pathgate.web.app import create_app
from pathgate.web.settings import Settings

APP = create_app(Settings())
schema = schemathesis.openapi.from_wsgi("/openapi.json", APP)


@pytest.mark.slow
@schema.parametrize()
@settings(max_examples=60, deadline=None, suppress_health_check=list(HealthCheck))
def test_the_service_does_what_its_document_says(case):
    case.call_and_validate(excluded_checks=[positive_data_acceptance])
