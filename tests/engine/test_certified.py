"""Certified tables against the exact solve: the error that is stated, the same bits in every order, fixed patches."""

from __future__ import annotations

import numpy as np
import pytest

from gasapi.engine import certified
from gasapi.engine.certified import CertifiedFluid
from gasapi.engine.models.gerg_2008 import GergSystem
from gasapi.engine.models.reference import ReferenceFluid
from gasapi.engine.phase.saturation import SaturationCurve
from gasapi.engine.protocol import Branch
from gasapi.gases.loader import load_gerg, load_reference

NATURAL_GAS = {"methane": 0.85, "nitrogen": 0.03, "carbon-dioxide": 0.02, "ethane": 0.07, "propane": 0.03}


def reference(id):
    equation = load_reference(id)
    return ReferenceFluid(equation, SaturationCurve(equation.saturation))


@pytest.fixture(scope="module")
def fluids():
    mixture = GergSystem(load_gerg(), list(NATURAL_GAS)).fluid(list(NATURAL_GAS.values()))
    return {"nitrogen": reference("nitrogen"), "carbon-dioxide": reference("carbon-dioxide"), "natural gas": mixture}


def states(fluid, rows=4000, seed=1):
    """States from far below to far above the reducing temperature, and from none to a high pressure."""
    rng = np.random.default_rng(seed)
    temperature = fluid.reducing_temperature * rng.uniform(0.8, 6.0, rows)
    pressure = fluid.reducing_density * fluid.gas_constant * fluid.reducing_temperature * 10.0 ** rng.uniform(-5.0, 0.6, rows)
    return temperature, pressure


@pytest.mark.parametrize("name", ["nitrogen", "carbon-dioxide", "natural gas"])
@pytest.mark.parametrize("accuracy", [1e-4, 1e-6, 1e-9, 1e-12])
def test_the_error_is_the_one_that_is_allowed(fluids, name, accuracy):
    """At states that no grid has; and what is stated is no smaller than half of what is found."""
    exact = fluids[name]
    table = CertifiedFluid(exact, accuracy)
    temperature, pressure = states(exact)
    expected, found = (f.density(temperature, pressure, Branch.GAS) for f in (exact, table))
    assert np.array_equal(expected.status, found.status)
    solved = expected.status == 0
    error = np.abs(found.density[solved] / expected.density[solved] - 1.0)
    assert error.max() <= accuracy
    certificate = table.certificate(temperature, pressure)
    assert certificate.rows >= np.count_nonzero(error)
    if certificate.rows:
        assert error.max() <= 2.0 * certificate.largest_error + 1e-14


def test_tables_are_used_where_gases_are(fluids):
    """Most states of a plant come from a table, at 1 part in a million."""
    table = CertifiedFluid(fluids["natural gas"], 1e-6)
    rng = np.random.default_rng(2)
    certificate = table.certificate(rng.uniform(260.0, 340.0, 1000), rng.uniform(1e5, 1.2e7, 1000))
    assert certificate.rows > 900
    assert certificate.largest_error < 5e-7


@pytest.mark.parametrize("name", ["nitrogen", "natural gas"])
def test_bits_do_not_depend_on_what_was_asked_before(fluids, name):
    """Alone, in a block, shuffled, and from tables that were built for other states first."""
    exact = fluids[name]
    temperature, pressure = states(exact, 600)
    expected = CertifiedFluid(exact, 1e-6).density(temperature, pressure, Branch.GAS).density
    order = np.random.default_rng(3).permutation(600)
    table = CertifiedFluid(exact, 1e-6)
    pieces = [table.density(temperature[i : i + 7], pressure[i : i + 7], Branch.GAS).density for i in range(595, -1, -7)]
    shuffled = table.density(temperature[order], pressure[order], Branch.GAS).density
    assert np.array_equal(expected, np.concatenate(pieces[::-1])[-600:])
    assert np.array_equal(expected[order], shuffled)
    fresh = CertifiedFluid(exact, 1e-6)
    alone = [fresh.density(t, p, Branch.GAS).density for t, p in zip(temperature.tolist(), pressure.tolist(), strict=True)]
    assert np.array_equal(expected, alone)


def test_edges_belong_to_one_patch(fluids):
    """The same one for a float and for a block, exactly on an edge and a step beside it."""
    exact = fluids["nitrogen"]
    scale = exact.reducing_density * exact.gas_constant * exact.reducing_temperature
    edges = [exact.reducing_temperature / tau for tau in certified._TAU_EDGES]
    temperature = np.repeat([np.nextafter(t, t + way) for t in edges for way in (-1.0, 0.0, 1.0)], 11)
    pressure = np.tile(np.array([max(p * scale, 1.0) for p in certified._PRESSURE_EDGES]), len(edges) * 3)
    table = CertifiedFluid(exact, 1e-6)
    block = table.density(temperature, pressure, Branch.GAS).density
    alone = [table.density(t, p, Branch.GAS).density for t, p in zip(temperature.tolist(), pressure.tolist(), strict=True)]
    assert np.array_equal(block, alone)


def test_everything_else_is_exact(fluids):
    """Liquids, derivatives, and the Gibbs energy."""
    exact = fluids["nitrogen"]
    table = CertifiedFluid(exact, 1e-6)
    assert exact.density(90.0, 1e6, Branch.LIQUID) == table.density(90.0, 1e6, Branch.LIQUID)
    assert exact.pressure(300.0, 1000.0) == table.pressure(300.0, 1000.0)
    assert exact.residual_gibbs(300.0, 1000.0) == table.residual_gibbs(300.0, 1000.0)
    assert exact.density(80.0, 1e5, Branch.GAS) == table.density(80.0, 1e5, Branch.GAS)
    assert table.certificate(np.array([80.0]), np.array([1e5])) == (0, None)
