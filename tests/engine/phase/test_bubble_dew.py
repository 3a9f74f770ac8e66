"""Bubble and dew lines of air against an independent library and handbook values."""

import math

import numpy as np
import pytest
from CoolProp.CoolProp import PropsSI

from gasapi.engine.phase.bubble_dew import BubbleDewLines
from gasapi.gases.equation_files import load_reference


@pytest.fixture(scope="module")
def lines() -> BubbleDewLines:
    curve = load_reference("air").bubble_dew
    assert curve is not None
    return BubbleDewLines(curve)


def test_lines_agree_with_an_independent_library(lines: BubbleDewLines) -> None:
    """Pressures agree with CoolProp to rounding; its densities are the equation's own, which the published ancillary
    densities meet to 0.3 % below 130 K."""
    for t in np.linspace(60.0, 130.0, 29).tolist():
        assert pytest.approx(PropsSI("P", "T", t, "Q", 0, "Air"), rel=1e-13) == lines.bubble_pressure(t)
        assert pytest.approx(PropsSI("P", "T", t, "Q", 1, "Air"), rel=1e-13) == lines.dew_pressure(t)
        assert pytest.approx(PropsSI("Dmolar", "T", t, "Q", 0, "Air"), rel=3e-3) == lines.bubble_density(t)
        assert pytest.approx(PropsSI("Dmolar", "T", t, "Q", 1, "Air"), rel=3e-3) == lines.dew_density(t)


def test_air_boils_and_condenses_where_handbooks_say(lines: BubbleDewLines) -> None:
    """At 101325 Pa air begins to boil at 78.90 K and to condense at 81.72 K (Lemmon et al. 2000; from memory)."""
    assert pytest.approx(78.90, abs=0.01) == lines.bubble_temperature(101325.0)
    assert pytest.approx(81.72, abs=0.01) == lines.dew_temperature(101325.0)


def test_temperatures_invert_pressures(lines: BubbleDewLines) -> None:
    """Round trips end within 1e-14, up to the point where the lines meet (dew) or the critical point (bubble)."""
    rng = np.random.default_rng(4)
    low, high = lines.temperature_min, lines.temperature_max
    t = np.concatenate([rng.uniform(low, high, 2000), high * (1.0 - 10.0 ** rng.uniform(-14.0, -2.0, 500)), [low, high]])
    assert np.max(np.abs(lines.dew_temperature(lines.dew_pressure(t)) / t - 1.0)) < 1e-14
    critical = load_reference("air").critical.temperature
    t = np.append(t[t < critical], critical)
    assert np.max(np.abs(lines.bubble_temperature(lines.bubble_pressure(t)) / t - 1.0)) < 1e-14


def test_dew_lies_below_bubble_and_they_meet(lines: BubbleDewLines) -> None:
    """At every temperature the dew pressure is the lower one, and both end in one point."""
    t = np.linspace(lines.temperature_min, lines.temperature_max, 5000)
    assert np.all(lines.dew_pressure(t[:-1]) < lines.bubble_pressure(t[:-1]))
    assert lines.dew_pressure(lines.temperature_max) == lines.bubble_pressure(lines.temperature_max)


def test_a_float_has_the_bits_of_its_row_and_nothing_is_extrapolated(lines: BubbleDewLines) -> None:
    """Floats and blocks have the same bits; off the lines both say NaN."""
    t = np.concatenate([np.linspace(lines.temperature_min, lines.temperature_max, 700), [50.0, 132.7, math.nan]])
    p = np.concatenate([10.0 ** np.linspace(4.0, 6.55, 700), [-1.0, 0.0, 1e7, math.nan]])
    for function, values in (
        (lines.bubble_pressure, t),
        (lines.dew_pressure, t),
        (lines.bubble_density, t),
        (lines.dew_density, t),
        (lines.bubble_temperature, p),
        (lines.dew_temperature, p),
    ):
        block = function(values)
        np.testing.assert_array_equal(np.array([function(value) for value in values.tolist()]), block)
        assert np.isnan(block[700:]).all()
        assert not np.isnan(block[:600]).any()
