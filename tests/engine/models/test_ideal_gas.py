"""The ideal gas law against textbook numbers."""

from __future__ import annotations

import numpy as np
import pytest
from generalised import built, substances

from gasapi.engine.models import ideal_gas
from gasapi.engine.protocol import Branch, Status

LITRE_ATMOSPHERE = 101.325
"""J; exact, since 1 L is 1e-3 m3 and 1 atm is 101 325 Pa (SI brochure)."""


def test_the_gas_constant_in_litre_atmospheres():
    """R is 0.082057 L atm/(mol K) (CODATA 2018)."""
    gas = built(ideal_gas.build, ["argon"], [1.0])
    assert gas.gas_constant / LITRE_ATMOSPHERE == pytest.approx(0.082057, abs=5e-7)


def test_the_molar_volume_at_standard_conditions():
    """22.41396954 L/mol at 273.15 K and 101 325 Pa, 22.71095464 L/mol at 100 kPa (CODATA 2018)."""
    gas = built(ideal_gas.build, ["nitrogen"], [1.0])
    assert 1e3 / gas.density(273.15, 101325.0, Branch.GAS).density == pytest.approx(22.41396954, abs=1e-8)
    assert 1e3 / gas.density(273.15, 1e5, Branch.GAS).density == pytest.approx(22.71095464, abs=1e-8)


def test_a_vapour_density_gives_the_molar_mass():
    """M = d R T/p: 2.0 g in 0.75 L at 373.15 K and 1 atm is a vapour of 81.65 g/mol (worked by hand with R = 0.082057)."""
    gas = built(ideal_gas.build, ["n-hexane"], [1.0])
    amount = gas.density(373.15, 101325.0, Branch.GAS).density * 0.75e-3
    assert 2.0 / amount == pytest.approx(2.0 / 0.75 * 0.082057 * 373.15, rel=1e-5)


def test_both_branches_return_the_only_root():
    """The isotherm is a straight line, so that a liquid asked for is the same root."""
    gas = built(ideal_gas.build, ["water"], [1.0])
    p = np.array([1.0, 1e5, 1e9])
    t = np.full(3, 300.0)
    assert np.array_equal(gas.density(t, p, Branch.GAS).density, gas.density(t, p, Branch.LIQUID).density)
    assert np.all(gas.density(t, p, Branch.LIQUID).status == Status.CONVERGED)


def test_every_substance_is_served():
    """Even an associating vapour has an ideal gas limit."""
    assert ideal_gas.serves(substances("acetic-acid", "helium")) is None
