"""Two phases at a state: material balance, equal fugacities by another library, near-critical and aqueous splits."""

import numpy as np
import pytest
import teqp
from gerg_mixtures import DRY_AIR, NATURAL_GAS, gerg_phase, with_water

from gasapi.engine.phase.flash import vapour_fraction
from gasapi.engine.phase.stability import Stability

_TEQP = {"carbon-dioxide": "carbondioxide"}
_SPLITS = [
    (NATURAL_GAS, 240.0, 5e6),
    (NATURAL_GAS, 200.0, 4e6),
    (NATURAL_GAS, 212.0, 6.6e6),
    ({"methane": 0.8, "ethane": 0.2}, 226.0, 6.5e6),
    ({"methane": 0.99, "n-decane": 0.01}, 300.0, 2e7),
    ({"methane": 0.5, "n-butane": 0.5}, 365.0, 1.02e7),
    ({"hydrogen": 0.6, "propane": 0.4}, 300.0, 1e7),
]


@pytest.mark.parametrize(("gas", "temperature", "pressure"), _SPLITS)
def test_equilibrium(gas, temperature, pressure):
    """Both phases have the pressure, teqp gives every component the same fugacity in them, and they add up to the feed."""
    phase = gerg_phase(gas)
    split = phase.flash(temperature, pressure)
    assert split.status == Stability.UNSTABLE
    assert not split.third_phase
    beta = split.vapour_fraction
    assert 0.0 < beta < 1.0
    assert beta * split.vapour + (1.0 - beta) * split.liquid == pytest.approx(np.array(phase.fractions), abs=1e-12)
    assert split.vapour_density < split.density < split.liquid_density
    assert 1.0 / split.density == pytest.approx(beta / split.vapour_density + (1.0 - beta) / split.liquid_density)
    model = teqp.make_model({"kind": "GERG2008resid", "model": {"names": [_TEQP.get(c, c) for c in gas]}})
    fugacities = []
    for fractions, density in ((split.vapour, split.vapour_density), (split.liquid, split.liquid_density)):
        densities = density * fractions
        residual = model.get_pr(temperature, densities)
        ideal = phase.energy.gas_constant * temperature * density
        assert ideal + residual == pytest.approx(pressure, rel=1e-7)
        fugacities.append(np.log(fractions) + np.log(model.get_fugacity_coefficients(temperature, densities)))
    assert fugacities[0] == pytest.approx(fugacities[1], abs=1e-7)


def test_single_phase():
    """A stable state comes back as one phase with the feed's density and no vapour fraction."""
    phase = gerg_phase(NATURAL_GAS)
    split = phase.flash(300.0, 5e6)
    assert split.status == Stability.STABLE
    assert np.isnan(split.vapour_fraction)
    assert split.density == pytest.approx(phase.fluid.density(300.0, 5e6, 0).density, rel=1e-10)


def test_water_from_air():
    """Water condenses from compressed air as a nearly pure liquid; what is left is saturated."""
    phase = gerg_phase(with_water(DRY_AIR, 0.02))
    split = phase.flash(300.0, 1e6)
    assert split.aqueous
    assert not split.third_phase
    assert split.liquid[-1] > 0.999
    # vapour pressure of water at 300 K is 3537 Pa (IAPWS-95), enhancement 1.031 (Greenspan 1976), both from memory; GERG-2008
    # is 3.5 % high
    assert split.vapour[-1] * 1e6 == pytest.approx(3537.0 * 1.031, rel=0.05)


def test_a_third_phase_is_told():
    """Below both dew points two phases are not all."""
    phase = gerg_phase({"methane": 0.9, "n-heptane": 0.05, "water": 0.05})
    assert phase.flash(300.0, 3e6).third_phase


def test_vapour_fraction():
    """Rachford and Rice's equation is met between its poles, in and out of the two-phase range."""
    z, k = np.array([0.5, 0.3, 0.2]), np.array([3.0, 0.7, 0.1])
    beta = vapour_fraction(z, k)
    assert abs((z * (k - 1.0) / (1.0 + beta * (k - 1.0))).sum()) < 1e-13
    assert vapour_fraction(z, np.array([1.2, 0.5, 0.1])) < 0.0
    assert vapour_fraction(z, np.array([9.0, 3.0, 0.9])) > 1.0
