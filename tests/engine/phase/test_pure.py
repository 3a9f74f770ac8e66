"""Regions, margins and signs of pure gases against an independent library and the contract."""

import math
from collections.abc import Callable
from functools import cache
from typing import Any

import CoolProp
import numpy as np
import pytest

from gasapi.engine.models import peng_robinson
from gasapi.engine.models.gerg_2008 import GergSystem
from gasapi.engine.phase.pure import PureVerdict, reference_verdict
from gasapi.engine.phase.region import Region
from gasapi.engine.phase.saturation import SaturationCurve
from gasapi.engine.phase.saturation_fit import fit_saturation
from gasapi.engine.protocol import Branch, Status
from gasapi.gases.equation_files import load_gerg, load_reference, reference_ids
from gasapi.gases.records import Substance

_PURE = [id for id in reference_ids() if load_reference(id).saturation is not None]

GAS, SUPERCRITICAL, LIQUID, TWO_PHASE, SOLID, UNKNOWN = Region


@pytest.fixture(scope="module")
def verdict(reference_gas: Callable[[str], Any]) -> Callable[[str], PureVerdict]:
    @cache
    def build(id: str) -> PureVerdict:
        gas = reference_gas(id)
        return reference_verdict(gas.equation, gas.fluid, gas.curve)

    return build


def _full_region(verdict: PureVerdict, temperature: float, pressure: float) -> int:
    """Return the final region, the density solved on the branch that the survey names."""
    region = verdict.region_float(temperature, pressure)
    if region not in (GAS, LIQUID):
        return region
    root = verdict.fluid.density(temperature, pressure, Branch.LIQUID if region == LIQUID else Branch.GAS)
    assert root.status == Status.CONVERGED
    return verdict.refine_float(temperature, pressure, root.density, region)


@pytest.mark.parametrize(
    ("id", "temperature", "pressure", "expected"),
    [
        ("nitrogen", 300.0, 20e6, GAS),  # a compressed line, above critical temperature and pressure
        ("nitrogen", 130.0, 20e6, SUPERCRITICAL),
        ("nitrogen", 100.0, 1e5, GAS),
        ("nitrogen", 100.0, 1e6, LIQUID),
        ("carbon-dioxide", 320.0, 30e6, SUPERCRITICAL),
        ("carbon-dioxide", 320.0, 1e6, GAS),
        ("carbon-dioxide", 290.0, 30e6, LIQUID),  # above the critical pressure only
        ("carbon-dioxide", 200.0, 1e5, GAS),
        ("carbon-dioxide", 200.0, 3e5, SOLID),
        ("propane", 300.0, 2e6, LIQUID),
        ("water", 373.0, 101325.0, LIQUID),
        ("water", 374.0, 101325.0, GAS),
        ("water", 263.0, 101325.0, SOLID),
        ("water", 263.0, 100.0, GAS),
        ("benzene", 270.0, 1e5, SOLID),
        ("benzene", 270.0, 500.0, GAS),
        ("cyclopropane", 250.0, 1e3, GAS),  # the curve begins at 273 K, the solid at 145.7 K
        ("cyclopropane", 250.0, 1e6, LIQUID),
        ("cyclopropane", 140.0, 1e6, SOLID),
        ("helium", 2.0, 1e5, LIQUID),  # below the lambda point, and no solid
        ("helium", 2.0, 100.0, GAS),
        ("methane", math.nan, 1e5, UNKNOWN),
        ("methane", 200.0, math.nan, UNKNOWN),
        ("methane", 200.0, 0.0, UNKNOWN),
        ("methane", -1.0, 1e5, UNKNOWN),
    ],
)
def test_regions_are_those_of_the_contract(
    id: str, temperature: float, pressure: float, expected: Region, verdict: Callable[[str], PureVerdict]
) -> None:
    """States whose region anyone in the trade would name (common knowledge, phase diagrams of handbooks)."""
    assert expected == _full_region(verdict(id), temperature, pressure)


@pytest.mark.parametrize("id", ["carbon-dioxide", "helium", "water", "r134a"])
def test_the_saturation_line_is_two_phase_to_one_part_in_1e9(id: str, verdict: Callable[[str], PureVerdict]) -> None:
    """On the line within 1e-9 of the pressure both phases are there; 2e-9 away one is."""
    judge = verdict(id)
    tc = judge.critical.temperature
    for t in np.linspace(judge.curve.temperature_min, tc, 50).tolist():
        p = judge.curve.pressure(t)
        assert judge.region_float(t, p) == TWO_PHASE
        assert judge.region_float(t, p * (1.0 + 9e-10)) == TWO_PHASE
        assert judge.region_float(t, p * (1.0 - 9e-10)) == TWO_PHASE
        assert judge.region_float(t, p * (1.0 - 2e-9)) == GAS
        assert judge.region_float(t, p * (1.0 + 2e-9)) == LIQUID


def _library_region(state: Any, temperature: float, pressure: float) -> int | None:
    """Return the library's region, or None where it refuses the state as solid."""
    try:
        state.update(CoolProp.PT_INPUTS, pressure, temperature)
    except ValueError as error:
        if "below Tmelt" in str(error):
            return None
        raise
    phase = state.phase()
    if phase in (CoolProp.iphase_liquid, CoolProp.iphase_supercritical_liquid):
        return LIQUID
    if phase == CoolProp.iphase_supercritical:
        return SUPERCRITICAL if state.rhomolar() >= state.rhomolar_critical() else GAS
    assert phase in (CoolProp.iphase_gas, CoolProp.iphase_supercritical_gas)
    return GAS


def test_regions_agree_with_an_independent_library(
    verdict: Callable[[str], PureVerdict], library_state: Callable[[str], Any]
) -> None:
    """At random states of all pure gases, 1e-6 or more away from the line, at least 99.9 % of the regions are the library's.

    Half of the states lie within a factor of two of the saturation line. Where the accepted critical point is not the
    equation's own the library switches its rules at the accepted one: states between the two are left out.
    """
    rng = np.random.default_rng(21)
    asked = differing = 0
    for id in _PURE:
        judge, state = verdict(id), library_state(id)
        equation = load_reference(id)
        tc, pc, _ = judge.critical
        low, high = judge.curve.temperature_min, min(1.5 * tc, equation.validity.temperature_max)
        for k, t in enumerate(rng.uniform(low, high, 60).tolist()):
            p = min(pc * 10.0 ** rng.uniform(-4.0, 0.7), equation.validity.pressure_max)
            if k % 2 and t < tc:
                p = judge.curve.pressure(t) * 2.0 ** rng.uniform(-1.0, 1.0)
            own, accepted = sorted((tc, state.T_critical()))
            if own * (1.0 - 1e-6) <= t <= accepted * (1.0 + 1e-6) or (t < tc and abs(p / judge.curve.pressure(t) - 1.0) < 1e-6):
                continue
            expected = _library_region(state, t, p)
            if expected is not None:
                asked += 1
                differing += expected != _full_region(judge, t, p)
    assert asked > 4000
    assert differing <= 0.001 * asked


@pytest.mark.parametrize("id", ["carbon-dioxide", "cyclopropane", "helium", "nitrogen", "water"])
def test_a_float_has_the_verdict_of_its_row(id: str, verdict: Callable[[str], PureVerdict]) -> None:
    """Region, nearness and refinement are the same for a float and for an element of a block."""
    judge = verdict(id)
    tc, pc, rhoc = judge.critical
    rng = np.random.default_rng(13)
    t = np.concatenate([rng.uniform(0.2, 1.5, 1500), 1.0 + rng.normal(0.0, 1e-3, 500), [math.nan, -1.0, 0.0, 1.0, 1.0]]) * tc
    p = np.concatenate([10.0 ** rng.uniform(-6.0, 1.0, 2000), [1.0, 1.0, 1.0, math.nan, 1.0]]) * pc
    region, near = judge.survey_block(t, p, 5.0)
    assert region.dtype == np.int8
    singles = [judge.survey_float(a, b, 5.0) for a, b in zip(t.tolist(), p.tolist(), strict=True)]
    assert singles == list(zip(region.tolist(), near.tolist(), strict=True))
    rho = 10.0 ** rng.uniform(-1.0, 0.4, t.size) * rhoc
    refined = judge.refine_block(t, p, rho, region)
    assert [
        judge.refine_float(*row) for row in zip(t.tolist(), p.tolist(), rho.tolist(), region.tolist(), strict=True)
    ] == refined.tolist()
    critical = judge.near_critical_block(t[:-5], rho[:-5])
    assert [judge.near_critical_float(a, b) for a, b in zip(t[:-5].tolist(), rho.tolist(), strict=False)] == critical.tolist()
    assert 0 < np.count_nonzero(critical) < 600


@pytest.mark.parametrize("id", ["ammonia", "carbon-dioxide", "propane", "water"])
def test_nearness_is_a_small_margin(id: str, verdict: Callable[[str], PureVerdict]) -> None:
    """A gas is near its dew point exactly where the temperature margin is below the one asked for."""
    judge = verdict(id)
    tc, pc, _ = judge.critical
    rng = np.random.default_rng(17)
    seen = set()
    for _ in range(1500):
        t, p = rng.uniform(0.5, 1.05) * tc, pc * 10.0 ** rng.uniform(-4.0, 0.1)
        region, near = judge.survey_float(t, p, 8.0)
        margins = judge.margins(t, p)
        if region == GAS and margins.margin_temperature is not None:
            assert near == (margins.margin_temperature < 8.0)
            seen.add(near)
        if margins.margin_temperature is not None and region in (GAS, LIQUID):
            assert (margins.margin_temperature > 0.0) == (region == GAS)
        if margins.margin_pressure is not None and region in (GAS, LIQUID):
            assert (margins.margin_pressure > 0.0) == (region == GAS)
    assert {False, True} == seen


def test_margins_of_known_states(verdict: Callable[[str], PureVerdict]) -> None:
    """Steam at 110 degC and 1 atm is 10.03 K above saturation (373.12 K) and 42 kPa below (143.4 kPa; from memory);
    there is no dew point above the critical pressure and no saturation pressure above the critical temperature."""
    steam = verdict("water").margins(383.15, 101325.0)
    assert pytest.approx(373.124, abs=2e-3) == steam.dew_point_temperature
    assert pytest.approx(10.026, abs=2e-3) == steam.margin_temperature
    assert pytest.approx(143.4e3 - 101325.0, abs=150.0) == steam.margin_pressure
    assert verdict("nitrogen").margins(300.0, 20e6) == (None, None, None)
    below_critical_pressure = verdict("nitrogen").margins(300.0, 1e6)
    assert below_critical_pressure.margin_pressure is None
    assert pytest.approx(103.75, abs=0.05) == below_critical_pressure.dew_point_temperature  # handbook, from memory


def test_margins_below_the_triple_point(verdict: Callable[[str], PureVerdict]) -> None:
    """Frost points are given where the sublimation line is known, and nothing where it is not."""
    frost = verdict("water").margins(260.0, 100.0)
    assert pytest.approx(252.8, abs=0.1) == frost.dew_point_temperature  # 100 Pa over ice: -20.3 degC (handbook, from memory)
    assert frost.margin_pressure is not None
    assert frost.margin_pressure > 0.0
    assert verdict("benzene").margins(260.0, 100.0) == (None, None, None)
    at_triple = verdict("carbon-dioxide").margins(250.0, 517955.0)
    assert pytest.approx(216.592, abs=1e-3) == at_triple.dew_point_temperature


def test_covers_where_a_region_can_be_told(verdict: Callable[[str], PureVerdict]) -> None:
    """Temperature and pressure alone decide everywhere but above the critical point and where curves are missing."""
    assert verdict("nitrogen").covers(300.0, 1e6)
    assert not verdict("nitrogen").covers(300.0, 20e6)
    assert verdict("water").covers(250.0, 10.0)
    assert not verdict("water").covers(math.nan, 10.0)
    assert not verdict("helium").covers(2.0, 3.13e3)  # its vapour pressure there (from memory)


def _codes(judge: PureVerdict, temperature: float, pressure: float) -> set[str]:
    region = judge.region_float(temperature, pressure)
    density = None
    if region in (GAS, LIQUID):
        density = judge.fluid.density(temperature, pressure, Branch.LIQUID if region == LIQUID else Branch.GAS).density
        region = judge.refine_float(temperature, pressure, density, region)
    signs = judge.signs(temperature, pressure, density, region)
    assert signs == judge.signs(temperature, pressure, density, region, margins=judge.margins(temperature, pressure))
    return {sign.code for sign in signs}


@pytest.mark.parametrize(
    ("id", "temperature", "pressure", "expected"),
    [
        ("nitrogen", 300.0, 20e6, set()),
        ("nitrogen", 300.0, 1e5, set()),
        ("propane", 300.0, 9e5, {"near_dew_point"}),
        ("propane", 300.0, 7e5, set()),
        ("propane", 300.0, 1.05e6, {"near_saturation"}),
        ("carbon-dioxide", 305.0, 7.5e6, {"near_critical"}),
        ("carbon-dioxide", 340.0, 9e6, set()),
        ("water", 274.0, 1e5, {"freezing_possible"}),
        ("water", 265.0, 50.0, {"below_triple_point"}),
        ("benzene", 300.0, 50e6, {"freezing_possible"}),  # benzene freezes at 300 K under 70 MPa
        ("methane", 120.0, 1e6, set()),
        ("methyl-chloride", 415.0, 1e6, {"critical_point_shifted"}),
        ("methyl-chloride", 300.0, 1e5, set()),
    ],
)
def test_signs_at_known_states(
    id: str, temperature: float, pressure: float, expected: set[str], verdict: Callable[[str], PureVerdict]
) -> None:
    """What there is to warn of, at states where it is plain."""
    assert expected == _codes(verdict(id), temperature, pressure)


_MELTING = [
    "argon",
    "carbon-dioxide",
    "carbon-monoxide",
    "cyclohexane",
    "deuterium",
    "ethane",
    "ethanol",
    "ethylene",
    "isopentane",
    "krypton",
    "methane",
    "methanol",
    "n-butane",
    "n-pentane",
    "neon",
    "nitrogen",
    "parahydrogen",
    "propane",
    "propylene",
]


@pytest.mark.parametrize("id", _MELTING)
def test_states_below_a_melting_line_are_told(
    id: str, verdict: Callable[[str], PureVerdict], library_state: Callable[[str], Any]
) -> None:
    """Up to 100 MPa a dense state on the published melting line, as the library holds it, is said to be able to freeze."""
    judge, state = verdict(id), library_state(id)
    assert state.has_melting_line()
    triple = judge.triple_temperature
    assert triple is not None
    for p in (10.0 ** np.linspace(6.0, 8.0, 9)).tolist():
        t = max(state.melting_line(CoolProp.iT, CoolProp.iP, p), triple)
        assert {"freezing_possible"} == {sign.code for sign in judge.signs(t, p, None, LIQUID)}
        assert "freezing_possible" not in {sign.code for sign in judge.signs(t, 1.0, None, GAS)}


def test_shifted_critical_points_are_the_known_ones(verdict: Callable[[str], PureVerdict]) -> None:
    """The threshold singles out the equations that the data note names, and no other."""
    shifted = {
        id for id in _PURE if "critical_point_shifted" in _codes(verdict(id), 0.99 * verdict(id).critical.temperature, 1e5)
    }
    assert {
        "cyclopropane",
        "fluorine",
        "methanol",
        "methyl-chloride",
        "n-heptane",
        "n-octane",
        "propyne",
        "r13",
    } == shifted


@pytest.mark.parametrize("id", ["argon", "carbon-dioxide", "ethane", "nitrogen", "propane", "water"])
def test_near_critical_means_ill_conditioned(id: str, verdict: Callable[[str], PureVerdict]) -> None:
    """Where the sign is given an error of 1e-6 in pressure moves the density by more than 2e-5, where not by less."""
    judge = verdict(id)
    tc, pc, _ = judge.critical
    seen = set()
    for reduced in np.linspace(1.0002, 1.08, 30).tolist():
        for p in (np.array([0.8, 0.95, 1.02, 1.1, 1.25, 1.5]) * pc).tolist():
            t = reduced * tc
            density = judge.fluid.density(t, p, Branch.GAS).density
            moved = judge.fluid.density(t, p * (1.0 + 1e-6), Branch.GAS).density
            sensitive = moved / density - 1.0 > 2e-5
            if not 1.9e-5 < moved / density - 1.0 < 2.1e-5:
                assert sensitive == judge.near_critical_float(t, density)
                seen.add(sensitive)
    assert {False, True} == seen


def _gibbs_region(fluid: Any, temperature: float, pressure: float) -> int | None:
    """Return the branch with the lower Gibbs energy; None where it is a matter of rounding."""
    gas = fluid.density(temperature, pressure, Branch.GAS)
    liquid = fluid.density(temperature, pressure, Branch.LIQUID)
    if liquid.status != Status.CONVERGED:
        return GAS
    if gas.status != Status.CONVERGED:
        return LIQUID
    difference = fluid.residual_gibbs(temperature, liquid.density) - fluid.residual_gibbs(temperature, gas.density)
    if abs(difference) < 1e-7:
        return None
    return LIQUID if difference < 0.0 else GAS


@pytest.mark.parametrize("kind", ["peng-robinson", "gerg-2008"])
def test_fitted_curves_choose_the_branch_of_lower_gibbs_energy(kind: str) -> None:
    """With a fitted curve the region is that of the branch with the lower Gibbs energy, by the equation itself."""
    if kind == "gerg-2008":
        fluid: Any = GergSystem(load_gerg(), ["propane"]).fluid([1.0])
    else:
        fluid = peng_robinson.build([Substance("demo", 0.044, 370.0, 4.2e6, 0.152)], [1.0], lambda a, b: None)
    judge = PureVerdict(fluid, SaturationCurve(fit_saturation(fluid)), 85.5)
    assert kind == judge.model
    tc = judge.critical.temperature
    rng = np.random.default_rng(19)
    regions = set()
    for _ in range(600):
        t = rng.uniform(0.45, 0.999) * tc
        p = judge.curve.pressure(t) * 10.0 ** rng.uniform(-0.5, 0.5)
        expected = _gibbs_region(fluid, t, p)
        if expected is not None:
            assert expected == judge.region_float(t, p)
            regions.add(expected)
    assert {GAS, LIQUID} == regions
    assert judge.region_float(84.0, 1e5) == SOLID


def test_a_curve_is_not_used_below_the_triple_point() -> None:
    """A generalised curve goes on below the triple point, where its liquid is not stable: the solid counts there."""
    fluid = peng_robinson.build([Substance("demo", 0.078, 562.0, 4.9e6, 0.21)], [1.0], lambda a, b: None)
    curve = SaturationCurve(fit_saturation(fluid))
    assert curve.temperature_min < 250.0
    judge = PureVerdict(fluid, curve, 278.7)
    assert judge.region_float(270.0, 2.0 * curve.pressure(270.0)) == SOLID
    assert judge.region_float(270.0, 0.9 * curve.pressure(270.0)) == SOLID
    assert judge.region_float(270.0, 0.1 * curve.pressure(270.0)) == GAS
    assert judge.margins(300.0, 0.9 * curve.pressure(278.7)).dew_point_temperature is None
    without = PureVerdict(fluid, curve)
    assert without.region_float(270.0, 2.0 * curve.pressure(270.0)) == LIQUID
