"""The Peng-Robinson equation against its published constants, a worked example and independent libraries."""

from __future__ import annotations

import pytest
import teqp
from cubic_checks import coolprop_deviation, library_states, teqp_deviation
from generalised import built, interaction, substances

from gasapi.engine.models import peng_robinson
from gasapi.engine.protocol import Branch
from gasapi.gases.records import Substance

BUTANE = Substance("butane", 0.058122, 425.1, 37.96e5, 0.200)


def test_the_exact_constants_round_to_the_published_ones():
    """Peng and Robinson (1976), eqs. 9 to 11: 0.45724, 0.07780 and Zc = 0.307."""
    assert round(peng_robinson.FORM.omega_a, 5) == 0.45724
    assert round(peng_robinson.FORM.omega_b, 5) == 0.07780
    assert round(peng_robinson.FORM.critical_compressibility, 3) == 0.307


def test_the_slope_changes_at_an_acentric_factor_of_0_491():
    """1976 up to 0.491, 1978 beyond, where it starts 0.4 % higher; by hand 0.8130252 for 0.3 and 1.2150676 for 0.6."""
    assert peng_robinson.acentric_slope(0.3) == pytest.approx(0.8130252, abs=1e-12)
    assert peng_robinson.acentric_slope(0.6) == pytest.approx(1.215067576, abs=1e-9)
    assert peng_robinson.acentric_slope(0.491) == pytest.approx(1.0668171, abs=1e-7)
    assert peng_robinson.acentric_slope(0.4910001) == pytest.approx(1.0711254, abs=1e-7)


def test_saturated_butane_of_the_textbook():
    """Smith, Van Ness, Abbott, section 3.5 (from memory): n-butane at 350 K and 9.4573 bar has 2 486 and 112.6 cm3/mol."""
    fluid = peng_robinson.build([BUTANE], [1.0], interaction)
    # 2486.53 here: the table cuts, or rounds constants on the way
    assert 1e6 / fluid.density(350.0, 9.4573e5, Branch.GAS).density == pytest.approx(2486.0, abs=1.0)
    assert 1e6 / fluid.density(350.0, 9.4573e5, Branch.LIQUID).density == pytest.approx(112.6, abs=0.05)


@pytest.mark.parametrize("ids", library_states())
def test_agrees_with_teqp(ids):
    """Pressure and fugacity coefficients of pure gases and mixtures meet teqp's model with the same constants."""
    assert teqp_deviation(peng_robinson, teqp.canonical_PR, ids) < 1e-9


@pytest.mark.parametrize("ids", [("methane",), ("carbon-dioxide", "methane"), ("propane", "nitrogen", "ethane")])
def test_densities_agree_with_coolprop(ids):
    """CoolProp's cubic with the same constants has the same densities on both branches."""
    assert coolprop_deviation(peng_robinson, "PR", ids) < 1e-8


def test_published_interaction_parameters_are_used():
    """The k_ij of methane and carbon dioxide is the tabulated one, and the mixture knows no missing pair."""
    mixture = peng_robinson.mixture(substances("methane", "carbon-dioxide"), interaction)
    pair = interaction("methane", "carbon-dioxide")
    assert pair is not None
    assert pair.peng_robinson != 0.0
    assert mixture.interaction_parameters[0, 1] == pytest.approx(pair.peng_robinson, abs=1e-15)
    assert mixture.fluid([0.5, 0.5]).missing_pairs == ()


def test_the_critical_point_is_the_substance_own():
    """Tc and pc are given back exactly, with Zc = 0.3074013."""
    fluid = built(peng_robinson.build, ["propane"], [1.0])
    propane = substances("propane")[0]
    assert fluid.critical is not None
    assert (propane.critical_temperature, propane.critical_pressure) == fluid.critical[:2]
    at = fluid.pressure(fluid.critical.temperature, fluid.critical.density)
    assert at.pressure == pytest.approx(fluid.critical.pressure, rel=1e-13)
    assert at.density_derivative == pytest.approx(0.0, abs=1e-12 * fluid.critical.pressure / fluid.critical.density)


def test_an_absurd_acentric_factor_is_refused_in_words():
    """A user's substance with omega = -3 gets a reason, not a number."""
    odd = Substance("odd", 0.05, 400.0, 4e6, -3.0)
    assert "acentric factor of -3 (odd)" in (peng_robinson.serves([odd]) or "")
