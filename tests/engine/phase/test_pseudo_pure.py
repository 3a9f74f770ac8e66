"""The phase of air."""

import math
from typing import Any

import CoolProp
import numpy as np
import pytest
from CoolProp import AbstractState

from gasapi.engine.models import ideal_gas
from gasapi.engine.models.reference import ReferenceFluid
from gasapi.engine.phase.bubble_dew import BubbleDewLines
from gasapi.engine.phase.pseudo_pure import PseudoPureVerdict
from gasapi.engine.phase.region import Region
from gasapi.engine.protocol import Branch, Status
from gasapi.gases.equation_files import load_reference
from gasapi.gases.records import Substance

GAS, SUPERCRITICAL, LIQUID, TWO_PHASE, SOLID, UNKNOWN = Region


@pytest.fixture(scope="module")
def air() -> PseudoPureVerdict:
    equation = load_reference("air")
    assert equation.bubble_dew is not None
    assert equation.triple is not None
    return PseudoPureVerdict(ReferenceFluid(equation, None), BubbleDewLines(equation.bubble_dew), equation.triple.temperature)


def _full_region(judge: Any, temperature: float, pressure: float) -> int:
    region = judge.region_float(temperature, pressure)
    if region not in (GAS, LIQUID):
        return int(region)
    root = judge.fluid.density(temperature, pressure, Branch.LIQUID if region == LIQUID else Branch.GAS)
    assert root.status == Status.CONVERGED
    return int(judge.refine_float(temperature, pressure, root.density, region))


@pytest.mark.parametrize(
    ("temperature", "pressure", "expected"),
    [
        (300.0, 1e5, GAS),
        (300.0, 30e6, GAS),  # a charged breathing-air cylinder
        (140.0, 20e6, SUPERCRITICAL),
        (80.0, 101325.0, TWO_PHASE),
        (82.0, 101325.0, GAS),
        (78.0, 101325.0, LIQUID),
        (132.58, 6e6, SUPERCRITICAL),  # between the critical point and the point where the lines meet
        (132.58, 3e6, GAS),
        (58.0, 101325.0, SOLID),
        (58.0, 10.0, GAS),
        (math.nan, 1e5, UNKNOWN),
    ],
)
def test_regions_of_air(temperature: float, pressure: float, expected: Region, air: PseudoPureVerdict) -> None:
    """Air at 1 atm boils at 78.9 K and condenses at 81.7 K (from memory); the rest is common knowledge."""
    assert expected == _full_region(air, temperature, pressure)


def test_regions_agree_with_an_independent_library(air: PseudoPureVerdict) -> None:
    """At random states off the lines the region is CoolProp's."""
    state = AbstractState("HEOS", "Air")
    rng = np.random.default_rng(23)
    seen = set()
    for _ in range(400):
        t = rng.uniform(62.0, 132.0)
        dew, bubble = air.lines.dew_pressure(t), air.lines.bubble_pressure(t)
        p = dew * (bubble / dew) ** rng.uniform(-1.0, 2.0)
        if min(abs(p / dew - 1.0), abs(p / bubble - 1.0)) < 1e-5 or dew < p < bubble:
            continue
        state.update(CoolProp.PT_INPUTS, p, t)
        phase = state.phase()
        expected = LIQUID if phase in (CoolProp.iphase_liquid, CoolProp.iphase_supercritical_liquid) else GAS
        assert expected == _full_region(air, t, p)
        seen.add(expected)
    assert {GAS, LIQUID} == seen


def test_the_lines_belong_to_the_two_phase_region(air: PseudoPureVerdict) -> None:
    """On either line, to 1 part in 1e9, and between them air is two-phase."""
    for t in np.linspace(60.0, 132.5, 40).tolist():
        dew, bubble = air.lines.dew_pressure(t), air.lines.bubble_pressure(t)
        for p in (dew, bubble, 0.5 * (dew + bubble), dew * (1.0 - 5e-10), bubble * (1.0 + 5e-10)):
            assert air.region_float(t, p) == TWO_PHASE
        assert air.region_float(t, dew * (1.0 - 2e-9)) == GAS
        assert air.region_float(t, bubble * (1.0 + 2e-9)) == LIQUID


def test_margins_of_air(air: PseudoPureVerdict) -> None:
    """Margins are to the dew line; a compressed-air line above the critical pressure has none."""
    found = air.margins(90.0, 101325.0)
    assert pytest.approx(81.72, abs=0.01) == found.dew_point_temperature
    assert pytest.approx(8.28, abs=0.01) == found.margin_temperature
    assert found.margin_pressure is not None
    assert found.margin_pressure > 0.0
    assert air.margins(300.0, 20e6) == (None, None, None)
    assert air.survey_float(84.0, 101325.0, 5.0) == (GAS, True)
    assert air.survey_float(90.0, 101325.0, 5.0) == (GAS, False)
    assert {sign.code for sign in air.signs(84.0, 101325.0, 150.0, GAS)} == {"near_dew_point"}


def test_a_float_has_the_verdict_of_its_row(air: PseudoPureVerdict) -> None:
    """Region and nearness are the same for a float and for an element of a block."""
    rng = np.random.default_rng(29)
    t = np.concatenate([rng.uniform(40.0, 160.0, 2000), rng.uniform(132.4, 132.7, 500), [math.nan]])
    p = np.concatenate([10.0 ** rng.uniform(2.0, 7.0, 2000), rng.uniform(3.7e6, 3.8e6, 500), [1e5]])
    region, near = air.survey_block(t, p, 5.0)
    singles = [air.survey_float(a, b, 5.0) for a, b in zip(t.tolist(), p.tolist(), strict=True)]
    assert singles == list(zip(region.tolist(), near.tolist(), strict=True))


def test_a_fluid_without_a_critical_point_is_refused(air: PseudoPureVerdict) -> None:
    """Without a critical point there is no supercritical region to tell."""
    fluid = ideal_gas.build([Substance("demo", 0.029, 132.0, 3.8e6, 0.04)], [1.0], lambda a, b: None)
    with pytest.raises(ValueError, match="no critical point"):
        PseudoPureVerdict(fluid, air.lines)
