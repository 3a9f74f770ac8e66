"""The verdict on mixtures: regions, margins and flags, and that rows have the bits of states."""

import math
import threading

import numpy as np
import pytest
from gerg_mixtures import DRY_AIR, NATURAL_GAS, gerg_phase, with_water

from gasapi.engine.models.gerg_2008 import GergSystem
from gasapi.engine.phase.mixture import DewKind, MixtureFlag, mixture_phase
from gasapi.engine.phase.region import Region
from gasapi.engine.phase.stability import Stability
from gasapi.gases.loader import load_gerg

_METHANE_DECANE = {"methane": 0.99, "n-decane": 0.01}
_GASES = {
    "binary": {"methane": 0.8, "ethane": 0.2},
    "natural gas": NATURAL_GAS,
    "wet natural gas": with_water(NATURAL_GAS, 5e-5),
    "wet carbon dioxide": {"carbon-dioxide": 0.9995, "water": 0.0005},
    "wet hydrogen": {"hydrogen": 0.99, "water": 0.01},
    "moist air": with_water(DRY_AIR, 0.02),
    "wide-boiling": _METHANE_DECANE,
    "hydrogen and nitrogen": {"hydrogen": 0.75, "nitrogen": 0.25},
    "helium and hydrogen": {"helium": 0.5, "hydrogen": 0.5},
    "sour gas": {"methane": 0.5, "carbon-dioxide": 0.2, "hydrogen-sulfide": 0.3},
}


@pytest.mark.parametrize("name", _GASES)
def test_rows_have_the_bits_of_states(name):
    """A row of any block says what the state alone says, to the last bit."""
    phase = gerg_phase(_GASES[name])
    rng = np.random.default_rng(5)
    t = rng.uniform(150.0, 450.0, 1500)
    p = np.exp(rng.uniform(np.log(1e2), np.log(2e8), 1500))
    # a few rows that the curves leave to the direct test are enough: each costs milliseconds
    direct = (phase.block(t, p).flags if name == "hydrogen and nitrogen" else _direct_rows(phase, t, p)) & 32 != 0
    keep = np.sort(np.concatenate([np.flatnonzero(~direct), np.flatnonzero(direct)[:2]]))
    t, p = t[keep], p[keep]
    t[:4], p[:4] = [math.nan, -1.0, 300.0, 300.0], [1e5, 1e5, math.inf, 0.0]
    block, regions = phase.block(t, p), phase.region_block(t, p)
    for i in range(t.size):
        alone = [math.nan if x is None else float(x) for x in phase.at(float(t[i]), float(p[i]))]
        assert np.array_equal(alone, [float(column[i]) for column in block], equal_nan=True)
        assert regions[i] == alone[0]
    order = rng.permutation(t.size)[:300]
    parts = phase.block(t[order], p[order])
    for column, part in zip(block, parts, strict=True):
        assert np.array_equal(column[order], part, equal_nan=True)


def _direct_rows(phase, t, p):
    region, _, _, _ = phase._survey_block(t, np.log(p))
    return np.where(region == -1, 32, 0)


def test_large_blocks_are_cut():
    """A block above the size of a part gives the rows of its parts."""
    phase = gerg_phase(NATURAL_GAS)
    t, p = np.linspace(230.0, 330.0, 9001), np.linspace(1e5, 1e7, 9001)
    whole = phase.block(t, p)
    assert np.array_equal(whole.region, phase.region_block(t, p))
    assert np.array_equal(whole.margin_temperature[-20:], phase.block(t[-20:], p[-20:]).margin_temperature, equal_nan=True)
    assert phase.region_block(t[:0], p[:0]).size == 0


def test_a_composition_gives_the_same_bits_whenever_it_is_built():
    """Neither what was built before nor a thread beside changes a bit of the curves."""
    system = GergSystem(load_gerg(), list(NATURAL_GAS))
    fractions = [x / sum(NATURAL_GAS.values()) for x in NATURAL_GAS.values()]
    first = mixture_phase(system, fractions)
    gerg_phase(_GASES["sour gas"]).at(300.0, 1e6)
    found = []
    threads = [threading.Thread(target=lambda: found.append(mixture_phase(system, fractions))) for _ in range(2)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    t, p = np.linspace(200.0, 300.0, 200), np.linspace(1e5, 7.8e6, 200)
    expected = first.block(t, p)
    for other in found:
        for column, same in zip(expected, other.block(t, p), strict=True):
            assert np.array_equal(column, same, equal_nan=True)


def test_gas_above_its_dew_point():
    """A warm natural gas is a gas, its margins are positive, and crossing them leads into two phases."""
    phase = gerg_phase(NATURAL_GAS)
    verdict = phase.at(253.0, 5e5)
    assert verdict.region == Region.GAS
    assert verdict.dew_kind == DewKind.HYDROCARBON
    assert verdict.margin_temperature == pytest.approx(253.0 - verdict.dew_point_temperature)
    assert verdict.margin_temperature > 0.0
    assert verdict.margin_pressure > 0.0
    assert phase.at(253.0 - verdict.margin_temperature - 0.01, 5e5).region == Region.TWO_PHASE
    assert phase.at(253.0, 5e5 + verdict.margin_pressure * 1.001).region == Region.TWO_PHASE
    assert phase.at(253.0, 5e5 + verdict.margin_pressure * 0.999).region == Region.GAS


def test_retrograde_margins_go_to_the_nearer_boundary():
    """Above the retrograde line the pressure margin points down, and below the dew line up."""
    phase = gerg_phase(NATURAL_GAS)
    t = 248.0
    dense = phase.at(t, 8e6)
    assert dense.region in (Region.GAS, Region.SUPERCRITICAL)
    assert dense.dew_point_temperature is None
    assert dense.flags & MixtureFlag.ABOVE_CRICONDENBAR
    assert phase.at(t, 8e6 - dense.margin_pressure * 1.001).region == Region.TWO_PHASE
    inside = phase.at(t, 6.5e6)
    assert inside.region == Region.TWO_PHASE
    assert inside.margin_pressure < 0.0
    assert phase.at(t, 6.5e6 - inside.margin_pressure * 1.001).region != Region.TWO_PHASE


def test_no_dew_point_above_the_cricondenbar():
    """Above the cricondenbar there is none, and no margin in temperature; the warm margin in pressure is gone as well."""
    phase = gerg_phase(NATURAL_GAS)
    bar, therm = phase.outline().cricondenbar, phase.outline().cricondentherm
    above = phase.at(300.0, bar.pressure * 1.001)
    assert (above.dew_point_temperature, above.margin_temperature, above.margin_pressure) == (None, None, None)
    below = phase.at(300.0, bar.pressure * 0.999)
    assert below.dew_point_temperature == pytest.approx(bar.temperature, abs=5.0)
    assert phase.at(300.0, therm.pressure).dew_point_temperature == pytest.approx(therm.temperature, abs=1e-4)


def test_regions_around_the_critical_point():
    """Compressed gas above the critical temperature is a gas below critical density and supercritical above it."""
    phase = gerg_phase(NATURAL_GAS)
    tc, pc, rhoc = phase.critical
    assert phase.at(300.0, 2e7).region == (
        Region.SUPERCRITICAL if phase.fluid.density(300.0, 2e7, 0).density >= rhoc else Region.GAS
    )
    assert phase.at(300.0, 6e7).region == Region.SUPERCRITICAL
    assert phase.at(400.0, 1.2 * pc).region == Region.GAS
    assert phase.at(0.9 * tc, 1.5e7).region == Region.LIQUID
    assert phase.at(1.005 * tc, 1.02 * pc).flags & MixtureFlag.NEAR_CRITICAL


def test_what_never_condenses_is_a_gas():
    """Helium and hydrogen have no dew point in the range of the equation, and say so."""
    verdict = gerg_phase(_GASES["helium and hydrogen"]).at(293.15, 1e7)
    assert verdict.region == Region.GAS
    assert verdict.dew_point_temperature is None
    assert verdict.flags & MixtureFlag.DEW_BELOW_RANGE


def test_the_higher_dew_point_is_the_one():
    """With little water hydrocarbons come first, with more of it water; the answer says which."""
    dry, wet = gerg_phase(with_water(NATURAL_GAS, 2e-5)), gerg_phase(with_water(NATURAL_GAS, 5e-4))
    assert dry.at(300.0, 4e6).dew_kind == DewKind.HYDROCARBON
    verdict = wet.at(300.0, 4e6)
    assert verdict.dew_kind == DewKind.WATER
    assert verdict.dew_point_temperature > dry.at(300.0, 4e6).dew_point_temperature
    assert verdict.dew_point_uncertainty == pytest.approx(0.5 + 0.6e-6 * 4e6)
    assert wet.at(verdict.dew_point_temperature - 0.5, 4e6).region == Region.TWO_PHASE


def test_hydrate_and_ice_are_warned_of():
    """Near the water dew point below 303 K a hydrate is possible in methane, below 273 K ice in air; a warm gas has neither."""
    gas = gerg_phase(with_water(NATURAL_GAS, 5e-4))
    assert gas.at(278.0, 4e6).flags & MixtureFlag.HYDRATE_POSSIBLE
    assert not gas.at(330.0, 4e6).flags & (MixtureFlag.HYDRATE_POSSIBLE | MixtureFlag.ICE_POSSIBLE)
    air = gerg_phase(with_water(DRY_AIR, 1e-3))
    dew = air.at(300.0, 1e5).dew_point_temperature
    assert dew < 273.0
    # frost forms before supercooled water does
    assert air.at(dew + 0.5, 1e5).flags & MixtureFlag.ICE_POSSIBLE
    assert air.at(dew + 0.5, 1e5).region == Region.GAS
    assert not air.at(dew + 15.0, 1e5).flags & MixtureFlag.ICE_POSSIBLE


def test_components_with_fraction_zero_are_left_out():
    """A zero fraction gives the bits of the smaller set."""
    data = load_gerg()
    some = mixture_phase(GergSystem(data, ["methane", "ethane"]), [0.8, 0.2])
    more = mixture_phase(GergSystem(data, ["methane", "water", "ethane"]), [0.8, 0.0, 0.2])
    assert some.at(250.0, 4e6) == more.at(250.0, 4e6)


@pytest.mark.parametrize("name", ["binary", "natural gas", "sour gas", "wide-boiling"])
def test_curves_meet_direct_solves(name):
    """Between its nodes the dew curve is within 5 mK of the point solved there by Newton's method."""
    phase = gerg_phase(_GASES[name])
    b = phase.boundary
    k = b.system.active.size
    rising = int((np.diff(b.log_pressure) > 0.0).argmin())
    rows = np.arange(2, rising - 2)
    start = 0.5 * (b.unknown[rows] + b.unknown[rows + 1])
    points = b.system.solve(start, k, start[:, k])
    good = points.converged & (np.abs(points.unknown[:, :k]).max(axis=1) > 0.05)
    assert good.sum() > 0.8 * rows.size
    for t, lp in zip(np.exp(points.unknown[good, k + 1]), points.log_pressure[good], strict=True):
        assert phase.at(900.0, float(np.exp(lp))).dew_point_temperature == pytest.approx(t, abs=5e-3)


def test_outline():
    """The outline names the critical point between cricondenbar and bubble line and holds the water line beside it."""
    outline = gerg_phase(with_water(NATURAL_GAS, 2e-4)).outline()
    assert outline.temperature.size == outline.pressure.size > 50
    assert outline.critical.temperature < outline.cricondenbar.temperature < outline.cricondentherm.temperature
    assert outline.cricondentherm.pressure < outline.cricondenbar.pressure == pytest.approx(outline.pressure.max(), rel=1e-9)
    assert outline.water_temperature.size == outline.water_pressure.size > 10


def test_a_direct_test_stands_in_where_the_curves_end():
    """A cold dense state beyond the traced bubble line is judged by itself, without a margin in pressure."""
    phase = gerg_phase(NATURAL_GAS)
    t, p = 85.0, 6e7
    verdict = phase.at(t, p)
    assert verdict.flags & MixtureFlag.DIRECT
    assert verdict.margin_pressure is None
    expected = phase.stability(t, p).verdict
    assert verdict.region == {Stability.STABLE: Region.LIQUID, Stability.UNSTABLE: Region.TWO_PHASE}[expected]


def test_what_is_close_to_condensing():
    """A gas 3 K above its dew point is close to it at a margin of 5 K and not at 2 K; rows say the same as states."""
    phase = gerg_phase(NATURAL_GAS)
    dew = phase.at(300.0, 2e6).dew_point_temperature
    assert phase.survey_float(dew + 3.0, 2e6, 5.0) == (Region.GAS, True)
    assert phase.survey_float(dew + 3.0, 2e6, 2.0) == (Region.GAS, False)
    assert phase.survey_float(dew - 3.0, 2e6, 5.0) == (Region.TWO_PHASE, False)
    bar = phase.outline().cricondenbar
    assert phase.survey_float(bar.temperature, bar.pressure * 1.01, 5.0)[1]
    assert not phase.survey_float(bar.temperature, bar.pressure * 1.3, 5.0)[1]
    t, p = np.linspace(235.0, 275.0, 400), np.linspace(9e6, 2e6, 400)
    regions, near = phase.survey_block(t, p, 5.0)
    assert near.any()
    for i in range(400):
        assert phase.survey_float(float(t[i]), float(p[i]), 5.0) == (regions[i], near[i])
