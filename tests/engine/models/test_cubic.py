"""The machinery that the cubic equations share: mixing, fugacities, many compositions at once."""

from __future__ import annotations

import numpy as np
import pytest
from generalised import NATURAL_GAS, interaction, substances

from gasapi.engine.models import peng_robinson, soave_redlich_kwong, van_der_waals
from gasapi.engine.models.cubic import CubicMixture
from gasapi.engine.protocol import Branch, Status

MODULES = (van_der_waals, soave_redlich_kwong, peng_robinson)
EVERY_FORM = pytest.mark.parametrize("module", MODULES, ids=lambda module: module.ID)
IDS = tuple(NATURAL_GAS)
FRACTIONS = tuple(NATURAL_GAS.values())


def natural_gas(module):
    return CubicMixture(module.FORM, substances(*IDS), interaction)


def direct_pressure(module, ids, fractions, t, rho):
    """Write the mixing rules out as published, absolute values included."""
    form = module.FORM
    parts = substances(*ids)
    r = 8.314462618
    roots, b = [], 0.0
    for x, s in zip(fractions, parts, strict=True):
        m = 0.0 if form.temperature_slope is None else form.temperature_slope(s.acentric_factor)
        ac = form.omega_a * (r * s.critical_temperature) ** 2 / s.critical_pressure
        roots.append(np.sqrt(ac * (1.0 + m * (1.0 - np.sqrt(t / s.critical_temperature))) ** 2))
        b += x * form.omega_b * r * s.critical_temperature / s.critical_pressure
    a = 0.0
    for i, first in enumerate(ids):
        for j, second in enumerate(ids):
            pair = interaction(first, second) if i != j else None
            k = form.interaction(pair) if pair is not None else 0.0
            a += fractions[i] * fractions[j] * roots[i] * roots[j] * (1.0 - k)
    v = 1.0 / rho
    return r * t / (v - b) - a / ((v + form.delta1 * b) * (v + form.delta2 * b))


@EVERY_FORM
@pytest.mark.parametrize("t", [120.0, 300.0, 1450.0, 1900.0, 2600.0, 6000.0])
def test_the_collected_mixing_rule_is_the_published_one(module, t):
    """Between and beyond the temperatures at which some sqrt(alpha) is zero, a(T) is the double sum with absolute values."""
    fluid = natural_gas(module).fluid(FRACTIONS)
    expected = direct_pressure(module, IDS, FRACTIONS, t, 4000.0)
    assert fluid.pressure(t, 4000.0).pressure == pytest.approx(expected, rel=1e-13)


@EVERY_FORM
def test_derivatives_agree_with_the_complex_step(module):
    """The derivative formulas meet a complex step of the pressure, which has no rounding of differences, to 1e-13."""
    fluid = natural_gas(module).fluid(FRACTIONS)
    h = 1e-30
    for t, rho in ((150.0, 30.0), (300.0, 9000.0), (700.0, 100.0), (1900.0, 5000.0)):
        at = fluid.pressure(t, rho)
        by_density = fluid.pressure(np.array([t + 0j]), np.array([rho + 1j * h])).pressure.imag[0] / h
        by_temperature = fluid.pressure(np.array([t + 1j * h]), np.array([rho + 0j])).pressure.imag[0] / h
        assert at.density_derivative == pytest.approx(by_density, rel=1e-13)
        assert at.temperature_derivative == pytest.approx(by_temperature, rel=1e-12)


@EVERY_FORM
def test_fugacity_coefficients_sum_to_the_residual_gibbs_energy(module):
    """sum x_i ln(phi_i) = g_res/RT, also where signs have changed and in blocks with the same bits."""
    fluid = natural_gas(module).fluid(FRACTIONS)
    t = np.array([200.0, 300.0, 1000.0, 1900.0, 2600.0, 8000.0])
    rho = np.array([100.0, 9000.0, 3000.0, 3000.0, 8000.0, 10.0])
    block = fluid.log_fugacity_coefficients(t, rho)
    for row in range(t.size):
        alone = fluid.log_fugacity_coefficients(float(t[row]), float(rho[row]))
        assert alone == tuple(float(column[row]) for column in block)
        total = sum(x * value for x, value in zip(FRACTIONS, alone, strict=True))
        assert total == pytest.approx(fluid.residual_gibbs(float(t[row]), float(rho[row])), rel=1e-12, abs=1e-13)


@EVERY_FORM
def test_fugacity_coefficients_are_derivatives_of_the_gibbs_energy(module):
    """ln(phi_i) is d(n g_res/RT)/dn_i at fixed temperature and pressure, by differences in the amounts."""
    mixture = natural_gas(module)
    t, p = 290.0, 4e6
    fluid = mixture.fluid(FRACTIONS)
    values = fluid.log_fugacity_coefficients(t, fluid.density(t, p, Branch.GAS).density)

    def total(amounts):
        n = sum(amounts)
        other = mixture.fluid([a / n for a in amounts])
        return n * other.residual_gibbs(t, other.density(t, p, Branch.GAS).density)

    for i in range(len(IDS)):
        h = 1e-4
        up = [x + h * (k == i) for k, x in enumerate(FRACTIONS)]
        down = [x - h * (k == i) for k, x in enumerate(FRACTIONS)]
        assert values[i] == pytest.approx((total(up) - total(down)) / (2.0 * h), rel=2e-6, abs=1e-9)


@EVERY_FORM
def test_many_compositions_at_once_meet_single_fluids(module):
    """The vectorised routine gives what a fluid of each composition gives, and NaN where the branch has no root."""
    mixture = natural_gas(module)
    random = np.random.default_rng(5)
    x = random.dirichlet(np.full(len(IDS), 0.4), 60)
    seen = set()
    for t, p in ((180.0, 2e6), (250.0, 6e6), (400.0, 1e7), (2600.0, 1e7)):
        for branch in Branch:
            values = mixture.log_fugacity(t, p, x, branch)
            assert values.shape == x.shape
            for row in range(x.shape[0]):
                fluid = mixture.fluid([float(v) for v in x[row]])
                root = fluid.density(t, p, branch)
                seen.add((branch, int(root.status)))
                if root.status == Status.CONVERGED:
                    expected = fluid.log_fugacity_coefficients(t, root.density)
                    assert values[row] == pytest.approx(np.array(expected), rel=1e-9, abs=1e-11)
                else:
                    assert np.all(np.isnan(values[row]))
    assert seen == {(branch, status) for branch in Branch for status in (Status.CONVERGED, Status.NO_ROOT)}


def test_the_stable_root_is_the_one_of_lower_gibbs_energy():
    """Without a branch each row has the root whose Gibbs energy is lower, whichever exists."""
    mixture = natural_gas(peng_robinson)
    x = np.random.default_rng(6).dirichlet(np.full(len(IDS), 0.4), 80)
    t, p = 200.0, 2e6
    gas, liquid, stable = (mixture.log_fugacity(t, p, x, branch) for branch in (Branch.GAS, Branch.LIQUID, None))
    energies = np.array([(x * gas).sum(axis=1), (x * liquid).sum(axis=1)])
    expected = np.where(np.nanargmin(energies, axis=0)[:, None] == 0, gas, liquid)
    assert not np.isnan(stable).any()
    assert np.array_equal(expected, stable)
    assert {0, 1} == set(np.nanargmin(energies, axis=0).tolist())


@EVERY_FORM
def test_a_mixture_of_one_gas_is_that_gas(module):
    """Other components at zero do not matter, and the critical point is there."""
    pure = CubicMixture(module.FORM, substances("ethane"), interaction).fluid([1.0])
    mixed = CubicMixture(module.FORM, substances("methane", "ethane", "water"), interaction).fluid([0.0, 1.0, 0.0])
    assert pure.critical == mixed.critical
    assert mixed.missing_pairs == ()
    root, other = (fluid.density(300.0, 2e6, Branch.GAS).density for fluid in (pure, mixed))
    assert root == pytest.approx(other, rel=1e-14)


def test_interaction_parameters_are_those_of_298_kelvin_at_every_temperature():
    """A pair that gives A and B for a temperature function is used with its tabulated number."""
    ids = ("methane", "n-decane")
    pair = interaction(*ids)
    assert pair is not None
    for module, value in ((peng_robinson, pair.peng_robinson), (soave_redlich_kwong, pair.soave_redlich_kwong)):
        mixture = CubicMixture(module.FORM, substances(*ids), interaction)
        assert mixture.interaction_parameters[0, 1] == pytest.approx(value, abs=1e-15)
        for t in (250.0, 500.0):
            expected = direct_pressure(module, ids, (0.6, 0.4), t, 1000.0)
            assert mixture.fluid([0.6, 0.4]).pressure(t, 1000.0).pressure == pytest.approx(expected, rel=1e-13)
