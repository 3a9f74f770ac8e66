"""Sublimation lines of carbon dioxide and water against published values."""

import math

import numpy as np
import pytest

from gasapi.engine.phase.saturation import SaturationCurve
from gasapi.engine.phase.sublimation import SublimationLine
from gasapi.gases.equation_files import load_reference

_IDS = ["carbon-dioxide", "water"]


def _line(id: str) -> SublimationLine:
    curve = load_reference(id).sublimation
    assert curve is not None
    return SublimationLine(curve)


def test_ice_meets_the_release() -> None:
    """Ice at 230 K: 8.94735 Pa, the check value of IAPWS R14-08(2011), table 3."""
    assert pytest.approx(8.94735, abs=6e-6) == _line("water").pressure(230.0)


@pytest.mark.parametrize(("celsius", "pressure"), [(-10.0, 259.90), (-20.0, 103.26), (-40.0, 12.84)])
def test_ice_meets_the_handbook(celsius: float, pressure: float) -> None:
    """Vapour pressure of ice, CRC Handbook of Chemistry and Physics, section 6 (figures from memory)."""
    assert pytest.approx(pressure, rel=1e-3) == _line("water").pressure(celsius + 273.15)


def test_dry_ice_at_one_atmosphere() -> None:
    """Carbon dioxide sublimes at 194.686 K under 101325 Pa (secondary fixed point of ITS-90; -78.464 degC)."""
    assert pytest.approx(194.686, abs=2e-3) == _line("carbon-dioxide").temperature(101325.0)


@pytest.mark.parametrize("id", _IDS)
def test_line_meets_the_saturation_curve_at_the_triple_point(id: str) -> None:
    """Sublimation line and saturation curve meet within their digits: the triple pressure differs by 3e-5 at most."""
    line, table = _line(id), load_reference(id).saturation
    assert table is not None
    pressure = SaturationCurve(table).pressure(line.temperature_max)
    assert pytest.approx(pressure, rel=3e-5) == line.pressure(line.temperature_max)
    assert line.pressure(line.temperature_max) == line.triple_pressure


@pytest.mark.parametrize("id", _IDS)
def test_temperature_inverts_pressure_and_a_float_has_the_bits_of_its_row(id: str) -> None:
    """A round trip ends within 1e-14, and floats and blocks have the same bits, off the line too."""
    line = _line(id)
    low, high = line.temperature_min, line.temperature_max
    t = np.concatenate([np.random.default_rng(2).uniform(low, high, 2000), [low, high]])
    p = line.pressure(t)
    assert np.max(np.abs(line.temperature(p) / t - 1.0)) < 1e-14
    t = np.append(t, [low - 1.0, high + 1e-9, math.nan])
    p = np.append(p, [0.0, 2.0 * line.triple_pressure, math.nan])
    for function, values in ((line.pressure, t), (line.slope, t), (line.temperature, p)):
        block = function(values)
        np.testing.assert_array_equal(np.array([function(value) for value in values.tolist()]), block)
        assert np.isnan(block[-3:]).tolist() == [True] * 3
        assert not np.isnan(block[:-3]).any()


@pytest.mark.parametrize("id", _IDS)
def test_slope_is_the_derivative(id: str) -> None:
    """dp/dT agrees with a central difference."""
    line = _line(id)
    for t in np.linspace(line.temperature_min + 5.0, line.temperature_max - 1.0, 20).tolist():
        step = 1e-4
        expected = (line.pressure(t + step) - line.pressure(t - step)) / (2.0 * step)
        assert pytest.approx(expected, rel=1e-6) == line.slope(t)
