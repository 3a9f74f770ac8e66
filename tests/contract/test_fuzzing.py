"""Every operation of the OpenAPI document, asked with data made from its schemas, right and wrong (schemathesis)."""

from __future__ import annotations

import pytest
import schemathesis
from hypothesis import HealthCheck, settings
from schemathesis.checks import not_a_server_error
from schemathesis.specs.openapi.checks import (
    content_type_conformance,
    response_headers_conformance,
    response_schema_conformance,
    status_code_conformance,
)

from gasapi.app import create_app
from gasapi.settings import Settings

CHECKS = [
    not_a_server_error,
    status_code_conformance,
    content_type_conformance,
    response_headers_conformance,
    response_schema_conformance,
]

schema = schemathesis.openapi.from_wsgi("/openapi.json", create_app(Settings()))


@pytest.mark.slow
@schema.parametrize()
@settings(max_examples=8, deadline=None, derandomize=True, database=None, suppress_health_check=list(HealthCheck))
def test_answers_conform_to_the_document(case):
    """No answer is a 5xx; status, media type, header fields and body are those that the document describes."""
    case.call_and_validate(checks=CHECKS)
