"""The rules below the end of a vapour-pressure curve, held against curves that are known there."""

import math
from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from gasapi.engine.phase.cold_side import ColdSide, CurveEnd
from gasapi.engine.phase.region import Region
from gasapi.engine.phase.sublimation import SublimationLine
from gasapi.gases.equation_files import load_reference, reference_ids

_PURE = [id for id in reference_ids() if load_reference(id).saturation is not None]


def _end(curve: Any, temperature: float) -> CurveEnd:
    pressure = curve.pressure(temperature)
    return CurveEnd(temperature, pressure, temperature * curve.slope(temperature) / pressure)


@pytest.mark.parametrize("id", _PURE)
def test_a_curve_that_is_cut_off_stays_within_its_bounds(id: str, reference_gas: Callable[[str], Any]) -> None:
    """Cut off at 0.4, 0.55 or 0.7 Tc, the liquid's own vapour pressure never leaves the bounds: vapour below it is gas or
    unknown, never liquid, and liquid above it is liquid or unknown, never gas."""
    curve = reference_gas(id).curve
    tc = curve.critical.temperature
    for cut in (0.4, 0.55, 0.7):
        if cut * tc <= curve.temperature_min:
            continue
        cold = ColdSide(_end(curve, cut * tc), None, None)
        for t in np.linspace(curve.temperature_min, cut * tc, 12, endpoint=False).tolist():
            p = curve.pressure(t)
            assert cold.region_float(t, 0.999 * p) in (Region.GAS, Region.UNKNOWN)
            assert cold.region_float(t, 1.001 * p) in (Region.LIQUID, Region.UNKNOWN)
            assert cold.region_float(t, 1e-4 * p * (t / (cut * tc)) ** 12) == Region.GAS
            assert cold.region_float(t, 3.0 * curve.pressure(cut * tc)) == Region.LIQUID


@pytest.mark.parametrize("id", ["carbon-dioxide", "water"])
def test_the_bound_without_a_sublimation_line_is_safe(id: str, reference_gas: Callable[[str], Any]) -> None:
    """The pressure below which a state counts as gas lies below the sublimation line, where that is known."""
    gas = reference_gas(id)
    triple = gas.equation.triple.temperature
    line = SublimationLine(gas.equation.sublimation)
    cold = ColdSide(_end(gas.curve, triple), triple, None)
    for t in np.linspace(0.75 * triple, triple, 30, endpoint=False).tolist():
        assert cold.vapour_below(t) < line.pressure(t)
        assert cold.region_float(t, 1.001 * line.pressure(t)) == Region.SOLID_POSSIBLE


# Temperatures at which the solid has a vapour pressure of 1 and of 10 mmHg: Stull, Ind. Eng. Chem. 39 (1947) 517, as reprinted
# in Perry's Chemical Engineers' Handbook (degC, from memory; old values, good to 20 % of the pressure)
_SOLIDS = {
    "argon": (-218.2, -210.9),
    "benzene": (-36.7, -11.5),
    "carbon-dioxide": (-134.3, -119.5),
    "cyclohexane": (-45.3, -15.9),
    "krypton": (-199.3, -187.2),
    "methane": (-205.9, -195.5),
    "nitrogen": (-226.1, -219.1),
    "nitrous-oxide": (-143.4, -128.7),
    "sulfur-hexafluoride": (-132.7, -114.7),
    "xenon": (-168.5, -152.8),
}


@pytest.mark.parametrize(("id", "celsius"), _SOLIDS.items())
def test_the_bound_is_below_measured_sublimation_pressures(
    id: str, celsius: tuple[float, float], reference_gas: Callable[[str], Any]
) -> None:
    """The bound is a safe one for solids whose vapour pressure is known, without being useless."""
    gas = reference_gas(id)
    triple = gas.equation.triple.temperature
    cold = ColdSide(_end(gas.curve, triple), triple, None)
    for temperature, millimetres in zip(celsius, (1.0, 10.0), strict=True):
        assert 1e-4 < cold.vapour_below(temperature + 273.15) / (133.322 * millimetres) < 0.8


def test_on_a_sublimation_line_the_solid_counts(reference_gas: Callable[[str], Any]) -> None:
    """Carbon dioxide below its triple point: gas below the line, solid-possible on it (to 1 part in 1e9) and above it, also
    below 154 K, where the line is not known."""
    gas = reference_gas("carbon-dioxide")
    line = SublimationLine(gas.equation.sublimation)
    cold = ColdSide(_end(gas.curve, 216.592), 216.592, line)
    p = line.pressure(190.0)
    assert cold.region_float(190.0, p * (1.0 - 2e-9)) == Region.GAS
    assert cold.region_float(190.0, p) == Region.SOLID_POSSIBLE
    assert cold.region_float(190.0, p * (1.0 - 5e-10)) == Region.SOLID_POSSIBLE
    assert cold.region_float(190.0, 1e6) == Region.SOLID_POSSIBLE
    assert cold.region_float(100.0, 1e-6) == Region.GAS
    assert cold.region_float(100.0, 10.0) == Region.SOLID_POSSIBLE


@pytest.mark.parametrize("freezing", [None, 150.0, 250.0])
@pytest.mark.parametrize("with_line", [False, True])
def test_a_float_has_the_verdict_of_its_row(freezing: float | None, with_line: bool) -> None:
    """Floats and blocks come to the same verdict, whatever is known."""
    line = None
    if with_line:
        curve = load_reference("carbon-dioxide").sublimation
        assert curve is not None
        line = SublimationLine(curve)
    cold = ColdSide(CurveEnd(216.592, 517950.0, 14.0), freezing, line)
    rng = np.random.default_rng(6)
    t = rng.uniform(50.0, 216.0, 3000)
    p = 10.0 ** rng.uniform(-8.0, 7.0, t.size)
    block = cold.region_block(t, p)
    assert [cold.region_float(a, b) for a, b in zip(t.tolist(), p.tolist(), strict=True)] == block.tolist()
    bounds = cold.vapour_below(t)
    assert [cold.vapour_below(a) for a in t.tolist()] == bounds.tolist()
    assert not any(math.isnan(bound) for bound in bounds.tolist())
