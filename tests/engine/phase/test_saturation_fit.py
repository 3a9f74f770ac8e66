"""Saturation curves solved from equations of state: against exact solutions, other solvers and the stored curves."""

from collections.abc import Callable
from decimal import Decimal, localcontext
from typing import Any

import numpy as np
import pytest
import teqp

from gasapi.engine.models import ideal_gas, peng_robinson, soave_redlich_kwong, van_der_waals
from gasapi.engine.models.gerg_2008 import GergSystem
from gasapi.engine.phase.saturation import Saturation, SaturationCurve
from gasapi.engine.phase.saturation_fit import fit_saturation, solve_saturation
from gasapi.engine.protocol import Fluid
from gasapi.gases.equation_files import load_gerg, load_reference, reference_ids
from gasapi.gases.records import Substance

_PURE = [id for id in reference_ids() if load_reference(id).saturation is not None]
_TC, _PC = 370.0, 4.2e6


def _cubic(module: Any, acentric_factor: float) -> Fluid:
    fluid: Fluid = module.build([Substance("demo", 0.044, _TC, _PC, acentric_factor)], [1.0], lambda a, b: None)
    return fluid


def _worst(found: Saturation[float], expected: Saturation[float]) -> tuple[float, ...]:
    return tuple(abs(a / b - 1.0) for a, b in zip(found, expected, strict=True))


def _van_der_waals_exact(y: Decimal) -> tuple[float, float, float, float]:
    """Return reduced temperature, pressure, liquid and vapour density of the van der Waals fluid.

    Lekner, Am. J. Phys. 50 (1982) 161: closed form in y, half the entropy difference over R. Fifty digits, since it cancels
    near the critical point (y = 0).
    """
    with localcontext() as context:
        context.prec = 50
        up, down = y.exp(), (-y).exp()
        cosh, sinh = (up + down) / 2, (up - down) / 2
        f = (y * cosh - sinh) / (sinh * cosh - y)
        g = 1 + 2 * f * cosh + f * f
        temperature = 27 * f * (f + cosh) / (4 * g * g)
        pressure = 27 * f * f * (1 - f * f) / (g * g)
        liquid, vapour = 3 / (1 + down / f), 3 / (1 + up / f)
        return float(temperature), float(pressure), float(liquid), float(vapour)


_Y = ["0.03", "0.1", "0.3", "0.7", "1.2", "2", "3", "4.5", "6", "8"]


@pytest.mark.parametrize("y", _Y)
def test_van_der_waals_is_the_exact_solution(y: str) -> None:
    """Solution and fit meet the closed form from 0.9999 Tc down to 0.21 Tc: p to 5e-12, densities to 2e-11."""
    fluid = _cubic(van_der_waals, 0.0)
    critical = fluid.critical
    assert critical is not None
    reduced = _van_der_waals_exact(Decimal(y))
    t = reduced[0] * critical.temperature
    expected = Saturation(reduced[1] * critical.pressure, reduced[2] * critical.density, reduced[3] * critical.density)
    fitted = SaturationCurve(fit_saturation(fluid, 0.2 * critical.temperature)).saturation(t)
    assert max(_worst(fitted, expected)) < 2e-11
    assert _worst(fitted, expected)[0] < 5e-12
    guess = Saturation(1.001 * expected[0], expected[1] * (1.0 + 1e-4), expected[2] * (1.0 - 1e-4))
    solved = solve_saturation(fluid, t, guess)
    assert solved is not None
    assert max(_worst(solved, expected)) < 2e-11
    assert _worst(solved, expected)[0] < 5e-12


def test_the_closed_form_is_the_published_one() -> None:
    """The oracle itself: at 0.9 Tc p/pc is 0.6470, v_l/vc 0.6034 and v_v/vc 2.3488 (textbook; from memory)."""
    low, high = Decimal("0.5"), Decimal("2")
    for _ in range(60):
        middle = (low + high) / 2
        low, high = (middle, high) if _van_der_waals_exact(middle)[0] > 0.9 else (low, middle)
    _, pressure, liquid, vapour = _van_der_waals_exact(low)
    assert pytest.approx(0.6470, abs=5e-5) == pressure
    assert pytest.approx(0.6034, abs=5e-5) == 1.0 / liquid
    assert pytest.approx(2.3488, abs=2e-4) == 1.0 / vapour


@pytest.mark.parametrize("module", [peng_robinson, soave_redlich_kwong, van_der_waals])
@pytest.mark.parametrize("acentric_factor", [-0.38, 0.0, 0.2, 0.6, 1.3])
def test_cubic_fit_is_the_direct_solution(module: Any, acentric_factor: float) -> None:
    """A fit agrees with the direct solution to 5e-11 in p and 1e-9 in the densities from 0.9999 Tc down to its end."""
    fluid = _cubic(module, acentric_factor)
    table = fit_saturation(fluid)
    curve = SaturationCurve(table)
    assert table.temperature_min < 0.45 * _TC
    rng = np.random.default_rng(8)
    reduced = np.concatenate([1.0 - 10.0 ** rng.uniform(-4.0, -1.0, 40), rng.uniform(table.temperature_min / _TC, 0.9999, 60)])
    for t in (reduced * _TC).tolist():
        found = curve.saturation(t)
        direct = solve_saturation(fluid, t, found)
        assert direct is not None
        assert _worst(found, direct)[0] < 5e-11
        assert max(_worst(found, direct)) < 1e-9


@pytest.mark.parametrize("acentric_factor", [0.0, 0.152, 0.45])
def test_peng_robinson_agrees_with_another_library(acentric_factor: float) -> None:
    """The curve of Peng-Robinson agrees with teqp's own (densities from its superancillary, to 1e-10 below 0.99 Tc)."""
    curve = SaturationCurve(fit_saturation(_cubic(peng_robinson, acentric_factor)))
    other = teqp.canonical_PR([_TC], [_PC], [acentric_factor])
    for reduced in np.linspace(0.45, 0.99, 25).tolist():
        t = reduced * _TC
        liquid, vapour = other.superanc_rhoLV(t)
        found = curve.saturation(t)
        assert pytest.approx(liquid, rel=1e-9) == found.liquid_density
        assert pytest.approx(vapour, rel=1e-9) == found.vapour_density


@pytest.mark.parametrize("id", [component.id for component in load_gerg().components])
def test_gerg_component_agrees_with_another_library(id: str) -> None:
    """The curve of every component of GERG-2008 agrees with teqp's solution of the same equation between 0.45 and 0.99 Tc."""
    data = load_gerg()
    fluid = GergSystem(data, [id]).fluid([1.0])
    critical = fluid.critical
    assert critical is not None
    curve = SaturationCurve(fit_saturation(fluid, 0.45 * critical.temperature))
    name = {"carbon-dioxide": "carbondioxide", "carbon-monoxide": "carbonmonoxide", "hydrogen-sulfide": "hydrogensulfide"}
    other = teqp.make_model({"kind": "GERG2008resid", "model": {"names": [name.get(id, id)]}})
    for reduced in np.linspace(0.45, 0.99, 12).tolist():
        t = reduced * critical.temperature
        found = curve.saturation(t)
        liquid, vapour = other.pure_VLE_T(t, found.liquid_density * 1.0001, found.vapour_density * 0.9999, 20)
        assert pytest.approx(liquid, rel=1e-8) == found.liquid_density
        assert pytest.approx(vapour, rel=1e-8) == found.vapour_density


@pytest.mark.parametrize("id", _PURE)
def test_fit_reproduces_the_stored_curve(id: str, reference_gas: Callable[[str], Any]) -> None:
    """Solving a reference equation here gives its stored curve, which was solved in 40-digit arithmetic.

    Within 3e-9 below 0.9999 Tc: the largest error that the stored fits of r134a, ethylene and n-butane own up to.
    """
    gas = reference_gas(id)
    stored = gas.curve
    fitted = SaturationCurve(fit_saturation(gas.fluid, stored.temperature_min))
    assert stored.temperature_min == fitted.temperature_min
    rng = np.random.default_rng(9)
    tc = stored.critical.temperature
    t = np.concatenate([rng.uniform(stored.temperature_min, tc, 200), tc * (1.0 - 10.0 ** rng.uniform(-4.0, -1.0, 100))])
    t = np.clip(t, stored.temperature_min, tc * (1.0 - 1e-4))
    for found, expected in zip(fitted.saturation(t), stored.saturation(t), strict=True):
        assert np.max(np.abs(found / expected - 1.0)) < 3e-9


def test_the_same_fluid_gives_the_same_table() -> None:
    """A fit does not depend on what was fitted before."""
    first = fit_saturation(_cubic(peng_robinson, 0.3))
    fit_saturation(_cubic(peng_robinson, 0.7))
    assert first == fit_saturation(_cubic(peng_robinson, 0.3))


def test_an_end_near_the_critical_point_is_kept() -> None:
    """A curve may be asked for next to the critical point only, and ends exactly where it was told to."""
    fluid = _cubic(peng_robinson, 0.2)
    curve = SaturationCurve(fit_saturation(fluid, 0.9995 * _TC))
    assert curve.temperature_min == 0.9995 * _TC
    found = curve.saturation(0.9997 * _TC)
    direct = solve_saturation(fluid, 0.9997 * _TC, found)
    assert direct is not None
    assert _worst(found, direct)[0] < 1e-10


def test_a_fluid_without_a_critical_point_has_no_curve() -> None:
    """The ideal gas does not condense."""
    fluid = ideal_gas.build([Substance("demo", 0.044, _TC, _PC, 0.1)], [1.0], lambda a, b: None)
    with pytest.raises(ValueError, match="no critical point"):
        fit_saturation(fluid)
