"""The van der Waals equation against handbook constants, a worked example, its reduced form and an independent library."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest
import teqp
from generalised import built, interaction, substances

from gasapi.engine.models import van_der_waals
from gasapi.engine.protocol import Branch, Status
from gasapi.gases.records import Substance

HANDBOOK = json.loads((Path(__file__).parents[1] / "published" / "van_der_waals_handbook.json").read_bytes())["gases"]

# the handbook computed these three from older critical points
OLDER_CRITICAL_POINT = {"chlorine": 0.05, "neon": 0.04, "furan": 0.04}

BUTANE = Substance("butane", 0.058122, 425.1, 37.96e5, 0.200)


@pytest.mark.parametrize("entry", HANDBOOK, ids=lambda entry: entry["id"])
def test_constants_agree_with_the_handbook(entry):
    """a and b of 45 gases within 3 % of the CRC Handbook, save three with older critical points."""
    form = van_der_waals.FORM.component(substances(entry["id"])[0])
    tolerance = OLDER_CRITICAL_POINT.get(entry["id"], 0.03)
    assert form.constant**2 == pytest.approx(entry["a_Pa_m6_per_mol2"], rel=tolerance)
    # b is printed to 1e-7 m3/mol
    assert form.covolume == pytest.approx(entry["b_m3_per_mol"], rel=tolerance, abs=0.5e-7)


def test_helium_attracts_far_less_than_carbon_tetrachloride():
    """Common knowledge of the trade: a differs by hundreds of times, b by several."""
    helium, tetrachloride = (van_der_waals.FORM.component(s) for s in substances("helium", "carbon-tetrachloride"))
    assert tetrachloride.constant**2 > 300.0 * helium.constant**2
    assert tetrachloride.covolume > 4.0 * helium.covolume


def test_saturated_butane_of_the_textbook():
    """J. M. Smith, H. C. Van Ness, M. M. Abbott, Introduction to Chemical Engineering Thermodynamics, table in section 3.5
    (from memory): n-butane at 350 K and 9.4573 bar has 2 667 and 191.0 cm3/mol.
    """
    fluid = van_der_waals.build([BUTANE], [1.0], interaction)
    assert 1e6 / fluid.density(350.0, 9.4573e5, Branch.GAS).density == pytest.approx(2667.0, abs=0.5)
    assert 1e6 / fluid.density(350.0, 9.4573e5, Branch.LIQUID).density == pytest.approx(191.0, abs=0.05)


def test_given_constants_make_the_same_equation():
    """Carbon dioxide with a = 0.3658 Pa m6/mol2 and b = 42.9e-6 m3/mol (CRC Handbook) has its critical point at 8a/(27Rb)."""
    a, b = 0.3658, 42.9e-6
    fluid = van_der_waals.from_constants(a, b, 0.04401)
    assert fluid.critical is not None
    assert fluid.critical.temperature == pytest.approx(8.0 * a / (27.0 * b * 8.314462618), rel=1e-15)
    assert fluid.critical.pressure == pytest.approx(a / (27.0 * b * b), rel=1e-15)
    assert fluid.critical.density == pytest.approx(1.0 / (3.0 * b), rel=1e-14)
    rho = 2000.0
    expected = rho * 8.314462618 * 320.0 / (1.0 - b * rho) - a * rho**2
    assert fluid.pressure(320.0, rho).pressure == pytest.approx(expected, rel=1e-14)
    assert fluid.density(320.0, expected, Branch.GAS).density == pytest.approx(rho, rel=1e-13)


def test_the_reduced_isotherm_is_the_same_for_every_gas():
    """(p_r + 3/v_r^2)(3 v_r - 1) = 8 T_r, the law of corresponding states of 1880, holds for the density solved."""
    for id in ("helium", "nitrogen", "water", "n-decane"):
        fluid = built(van_der_waals.build, [id], [1.0])
        assert fluid.critical is not None
        for t_r, p_r in ((0.85, 0.3), (1.1, 1.7), (2.5, 8.0)):
            point = fluid.density(t_r * fluid.critical.temperature, p_r * fluid.critical.pressure, Branch.GAS)
            v_r = fluid.critical.density / point.density
            assert (p_r + 3.0 / v_r**2) * (3.0 * v_r - 1.0) == pytest.approx(8.0 * t_r, rel=1e-13)


def test_agrees_with_an_independent_library():
    """teqp's van der Waals model gives the same residual energy derivatives at 200 random states."""
    random = np.random.default_rng(1)
    a, b = 0.2, 4e-5
    fluid = van_der_waals.from_constants(a, b, 0.03)
    model = teqp.vdWEOS1(a, b)
    for t, rho in zip(random.uniform(100.0, 900.0, 200), random.uniform(1.0, 0.9 / b, 200), strict=True):
        z = 1.0 + model.get_Ar01(t, rho, np.array([1.0]))
        assert fluid.pressure(t, rho).pressure == pytest.approx(z * rho * 8.314462618 * t, rel=1e-9, abs=1e-3)


def test_mixtures_follow_the_rules_of_1890():
    """a = (sum x sqrt(a))^2 and b = sum x b, and no interaction parameter is missed."""
    ids, x = ["methane", "carbon-dioxide", "helium"], [0.5, 0.3, 0.2]
    parts = [van_der_waals.FORM.component(s) for s in substances(*ids)]
    a = sum(xi * part.constant for xi, part in zip(x, parts, strict=True)) ** 2
    b = sum(xi * part.covolume for xi, part in zip(x, parts, strict=True))
    fluid = built(van_der_waals.build, ids, x)
    rho, t = 5000.0, 250.0
    expected = rho * 8.314462618 * t / (1.0 - b * rho) - a * rho**2
    assert fluid.pressure(t, rho).pressure == pytest.approx(expected, rel=1e-13)
    assert fluid.missing_pairs == ()
    assert fluid.critical is None


def test_the_critical_point_is_the_substance_own():
    """Tc and pc are given back exactly, Zc is 3/8, and the density is found there."""
    fluid = built(van_der_waals.build, ["argon"], [1.0])
    argon = substances("argon")[0]
    assert fluid.critical is not None
    assert (argon.critical_temperature, argon.critical_pressure) == fluid.critical[:2]
    z = argon.critical_pressure / (fluid.critical.density * 8.314462618 * argon.critical_temperature)
    assert z == pytest.approx(0.375, rel=1e-15)
    root = fluid.density(*fluid.critical[:2], Branch.GAS)
    assert root.status == Status.CONVERGED
    assert root.density == pytest.approx(fluid.critical.density, rel=2e-5)
