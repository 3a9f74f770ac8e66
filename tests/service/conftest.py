"""A context for the service tests; answers do not depend on what was asked before, so one serves all."""

from __future__ import annotations

import pytest

from gasapi.gases.catalogue import Catalogue
from gasapi.service.context import Context
from gasapi.service.questions import GasSpec, StateQuestion
from gasapi.service.state import solve_state


@pytest.fixture(scope="session")
def context():
    return Context(Catalogue.load())


@pytest.fixture(scope="session")
def ask(context):
    """Return a function that answers a state: gas as a name or fractions, K, Pa."""

    def asked(gas, temperature, pressure, model="auto", **more):
        spec = GasSpec(gas) if isinstance(gas, str) else GasSpec(None, tuple(gas.items()))
        return solve_state(context, StateQuestion(spec, pressure, temperature, model, **more))

    return asked
