"""One application for all contract tests; answers do not depend on what was asked before."""

from __future__ import annotations

import pytest

from gasapi.app import create_app
from gasapi.settings import Settings


@pytest.fixture(scope="session")
def app():
    return create_app(Settings())


@pytest.fixture
def client(app):
    return app.test_client()
