"""The Soave-Redlich-Kwong equation against its published constants, a worked example and independent libraries."""

from __future__ import annotations

import numpy as np
import pytest
import teqp
from cubic_checks import coolprop_deviation, library_states, teqp_deviation
from generalised import built, interaction, substances

from gasapi.engine.models import soave_redlich_kwong
from gasapi.engine.protocol import Branch
from gasapi.gases.records import Substance

BUTANE = Substance("butane", 0.058122, 425.1, 37.96e5, 0.200)


def test_the_exact_constants_round_to_the_published_ones():
    """Soave (1972): 0.42747 and 0.08664; Zc is 1/3."""
    assert round(soave_redlich_kwong.FORM.omega_a, 5) == 0.42748
    assert soave_redlich_kwong.FORM.omega_a == pytest.approx(0.42747, abs=1.1e-5)
    assert round(soave_redlich_kwong.FORM.omega_b, 5) == 0.08664
    assert soave_redlich_kwong.FORM.critical_compressibility == pytest.approx(1.0 / 3.0, rel=1e-15)


def test_the_slope_of_1972():
    """m = 0.480 + 1.574 w - 0.176 w^2, by hand for w = 0.3: 0.93636."""
    assert soave_redlich_kwong.acentric_slope(0.3) == pytest.approx(0.93636, abs=1e-12)


def test_saturated_butane_of_the_textbook():
    """Smith, Van Ness, Abbott, section 3.5 (from memory): n-butane at 350 K and 9.4573 bar has 2 520 and 127.8 cm3/mol."""
    fluid = soave_redlich_kwong.build([BUTANE], [1.0], interaction)
    assert 1e6 / fluid.density(350.0, 9.4573e5, Branch.GAS).density == pytest.approx(2520.0, abs=0.5)
    assert 1e6 / fluid.density(350.0, 9.4573e5, Branch.LIQUID).density == pytest.approx(127.8, abs=0.05)


@pytest.mark.parametrize("ids", library_states())
def test_agrees_with_teqp(ids):
    """Pressure and fugacity coefficients of pure gases and mixtures meet teqp's model with the same constants."""
    assert teqp_deviation(soave_redlich_kwong, teqp.canonical_SRK, ids) < 1e-9


@pytest.mark.parametrize("ids", [("methane",), ("carbon-dioxide", "methane"), ("propane", "nitrogen", "ethane")])
def test_densities_agree_with_coolprop(ids):
    """CoolProp's cubic with the same constants has the same densities on both branches."""
    assert coolprop_deviation(soave_redlich_kwong, "SRK", ids) < 1e-8


def test_hydrogen_keeps_the_published_function_far_above_its_critical_temperature():
    """At 500 K alpha of hydrogen is (1 + m (1 - sqrt(500/33.145)))^2 with m = 0.480 + 1.574 w - 0.176 w^2, by hand 0.402."""
    hydrogen = substances("hydrogen")[0]
    part = soave_redlich_kwong.FORM.component(hydrogen)
    m = 0.480 + 1.574 * hydrogen.acentric_factor - 0.176 * hydrogen.acentric_factor**2
    alpha = (1.0 + m * (1.0 - np.sqrt(500.0 / hydrogen.critical_temperature))) ** 2
    ac = 0.42748 * (8.314462618 * hydrogen.critical_temperature) ** 2 / hydrogen.critical_pressure
    assert alpha == pytest.approx(0.402, abs=5e-4)
    assert (part.constant - part.slope * np.sqrt(500.0)) ** 2 == pytest.approx(ac * alpha, rel=2e-5)


def test_pairs_without_a_published_parameter_are_named():
    """Helium with stibine has no k_ij: zero is used, and the fluid says so."""
    fluid = built(soave_redlich_kwong.build, ["helium", "methane", "stibine"], [0.2, 0.5, 0.3])
    assert ("helium", "stibine") in fluid.missing_pairs


def test_an_absurd_acentric_factor_is_refused_in_words():
    """A user's substance with omega = 7 gets a reason, not a number."""
    odd = Substance("odd", 0.05, 400.0, 4e6, 7.0)
    assert "acentric factor of 7 (odd)" in (soave_redlich_kwong.serves([odd]) or "")
    assert soave_redlich_kwong.serves(substances("helium", "water")) is None
