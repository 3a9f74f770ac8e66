"""GERG-2008 in component densities against teqp, a general library with automatic differentiation."""

import numpy as np
import pytest
import teqp

from gasapi.engine.models.gerg_2008 import GergSystem
from gasapi.engine.models.gerg_2008_fugacity import GergEnergy
from gasapi.engine.protocol import Branch, Status
from gasapi.gases.loader import load_gerg

_TEQP = {"carbon-dioxide": "carbondioxide", "carbon-monoxide": "carbonmonoxide", "hydrogen-sulfide": "hydrogensulfide"}
_SETS = (
    ("methane", "ethane"),
    ("methane", "nitrogen", "carbon-dioxide", "ethane", "propane", "n-butane", "isobutane", "n-pentane", "n-hexane", "water"),
    ("hydrogen", "helium", "nitrogen", "carbon-monoxide"),
    ("hydrogen-sulfide", "carbon-dioxide", "n-decane", "oxygen", "argon", "n-nonane"),
)


def _states(components, count):
    """Return an energy, a teqp model, and random temperatures and component densities (invented)."""
    energy = GergEnergy(GergSystem(load_gerg(), components))
    model = teqp.make_model({"kind": "GERG2008resid", "model": {"names": [_TEQP.get(c, c) for c in components]}})
    rng = np.random.default_rng(len(components))
    fractions = rng.dirichlet(np.full(len(components), 0.5), count)
    densities = rng.uniform(10.0, 9000.0, count)[:, None] * np.maximum(fractions, 1e-6)
    return energy, model, rng.uniform(250.0, 450.0, count), densities


@pytest.mark.parametrize("components", _SETS)
def test_hessian(components):
    """The second derivatives in component densities agree with automatic differentiation."""
    energy, model, temperature, densities = _states(components, 6)
    d = energy.derivatives(temperature, densities)
    for i in range(temperature.size):
        expected = model.build_Psir_Hessian_autodiff(temperature[i], densities[i])
        expected = expected * densities[i].sum() / (energy.gas_constant * temperature[i])
        assert np.abs(d.hessian[i] - expected).max() < 1e-12 * np.abs(expected).max()


@pytest.mark.parametrize("components", _SETS)
def test_fugacity_coefficients(components):
    """Fugacity coefficients agree wherever the pressure is positive."""
    energy, model, temperature, densities = _states(components, 6)
    d = energy.derivatives(temperature, densities)
    compared = 0
    for i in np.flatnonzero(d.compressibility > 0.0):
        expected = model.get_fugacity_coefficients(temperature[i], densities[i])
        assert np.exp(d.potential[i]) / d.compressibility[i] == pytest.approx(expected, rel=1e-10)
        compared += 1
    assert compared >= 2


@pytest.mark.parametrize("components", _SETS)
def test_temperature_slopes(components):
    """The temperature derivatives agree with central differences."""
    energy, _, temperature, densities = _states(components, 6)
    d = energy.derivatives(temperature, densities)
    above, below = (energy.derivatives(temperature + h, densities) for h in (1e-3, -1e-3))
    slope = (above.potential - below.potential) / 2e-3 * temperature[:, None]
    assert np.abs(slope - d.potential_slope).max() < 1e-7 * np.abs(slope).max()
    slope = (above.compressibility - below.compressibility) / 2e-3 * temperature
    assert np.abs(slope - d.compressibility_slope).max() < 1e-7 * np.abs(slope).max()


def test_a_component_that_is_absent_changes_nothing():
    """A zero density gives the numbers of the smaller set, and a finite potential of the absent component."""
    data = load_gerg()
    small = GergEnergy(GergSystem(data, ("methane", "propane")))
    large = GergEnergy(GergSystem(data, ("methane", "propane", "water", "n-decane")))
    t = np.array([300.0, 320.0])
    some = np.array([[800.0, 150.0], [3000.0, 4000.0]])
    more = np.concatenate([some, np.zeros((2, 2))], axis=1)
    a, b = small.derivatives(t, some), large.derivatives(t, more)
    assert b.compressibility == pytest.approx(a.compressibility, rel=1e-13)
    assert b.potential[:, :2] == pytest.approx(a.potential, rel=1e-13)
    assert np.isfinite(b.hessian).all()


@pytest.mark.parametrize("branch", [Branch.GAS, Branch.LIQUID])
def test_density_roots(branch):
    """Roots for many compositions at once are those of the equation at each composition by itself."""
    system = GergSystem(load_gerg(), ("methane", "carbon-dioxide", "propane", "n-hexane"))
    energy = GergEnergy(system)
    rng = np.random.default_rng(8)
    fractions = rng.dirichlet(np.full(4, 0.7), 40)
    temperature, pressure = rng.uniform(200.0, 450.0, 40), np.exp(rng.uniform(np.log(1e4), np.log(3e7), 40))
    density, status = energy.density(temperature, pressure, fractions, branch)
    both = 0
    for i in range(40):
        root = system.fluid(fractions[i].tolist()).density(float(temperature[i]), float(pressure[i]), branch)
        if root.status == Status.CONVERGED and status[i] == Status.CONVERGED:
            assert density[i] == pytest.approx(root.density, rel=1e-10)
            both += 1
    assert both >= 25


def test_false_root_of_cold_water():
    """At 278 K and 1 bar the liquid root is the one near close packing, not the one in the loop with a lower Gibbs energy."""
    energy = GergEnergy(GergSystem(load_gerg(), ("water",)))
    density, status = energy.density(np.array([278.0]), np.array([1e5]), np.ones((1, 1)), Branch.LIQUID)
    assert status[0] == Status.CONVERGED
    # 999.9 kg/m3: handbook value of water near 5 degC, from memory
    assert density[0] * 0.01801528 == pytest.approx(999.9, rel=2e-3)
