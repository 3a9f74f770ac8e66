"""Vessels: against tables of cylinder contents, and sums that must come out."""

from __future__ import annotations

import pytest

from gasapi.service.questions import GasSpec, StateQuestion
from gasapi.service.vessel import Content, DrawOff, VesselQuestion, VesselResult, answer_vessel
from gasapi.units import REFERENCE_CONDITIONS, ReferenceCondition

FULL = StateQuestion(GasSpec("nitrogen"), 200e5, 288.15)
ISO = REFERENCE_CONDITIONS["iso-13443"]

# Content of a 50 L cylinder at 200 bar and 15 degC in m3 at 15 degC and 1 bar, as suppliers' tables have it. From memory;
# the tables round to 0.1 m3 and differ among themselves by about 1 %.
CYLINDERS = (("oxygen", 10.7), ("nitrogen", 9.6), ("argon", 10.7), ("helium", 9.1), ("hydrogen", 8.9), ("air", 9.9))


@pytest.mark.parametrize(("gas", "content"), CYLINDERS)
def test_cylinders_hold_what_the_tables_say(context, gas, content):
    """The ideal gas would say 10 m3 for all of them."""
    state = StateQuestion(GasSpec(gas), 200e5, 288.15)
    held = answer_vessel(context, VesselQuestion(state, 0.05, ReferenceCondition(288.15, 1e5))).result.held
    assert content == pytest.approx(held.reference_volume, rel=0.015)


def test_ideal_vessel_by_hand(context):
    """n = p V / (R T): 1 m3 at 1 bar and 300 K holds 40.09 mol (worked by hand)."""
    state = StateQuestion(GasSpec("nitrogen"), 1e5, 300.0, "ideal-gas")
    held = answer_vessel(context, VesselQuestion(state, 1.0)).result.held
    assert 40.0908 == pytest.approx(held.amount, abs=1e-4)
    assert 40.0908 * 0.02801 == pytest.approx(held.mass, rel=2e-4)
    assert held.reference_volume is None


def test_used_and_left_make_the_whole(context):
    """What was used and what a second question finds in the vessel later sum to what was held."""
    later = FULL._replace(pressure=60e5, temperature=281.0)
    first = answer_vessel(context, VesselQuestion(FULL, 0.05, ISO, later)).result
    left = answer_vessel(context, VesselQuestion(later, 0.05, ISO)).result.held
    for held, used, rest in zip(first.held, first.used, left, strict=True):
        assert held == pytest.approx(used + rest, rel=1e-13)


def test_draw_off_lasts_as_long_as_the_usable_content(context):
    """12 L/min out of a cylinder down to 10 bar: the same gas by volume, mass or amount lasts as long."""
    usable = answer_vessel(context, VesselQuestion(FULL, 0.05, ISO, None, DrawOff("mass", 1.0, 10e5))).result.usable
    low = answer_vessel(context, VesselQuestion(FULL._replace(pressure=10e5), 0.05)).result.held
    full = answer_vessel(context, VesselQuestion(FULL, 0.05)).result.held
    assert full.mass - low.mass == pytest.approx(usable.mass, rel=1e-13)
    for kind, hourly in (("reference_volume", 0.72), ("mass", 0.72 * usable.mass / usable.reference_volume)):
        result = answer_vessel(context, VesselQuestion(FULL, 0.05, ISO, None, DrawOff(kind, hourly / 3600.0, 10e5))).result
        assert usable.reference_volume / 0.72 * 3600.0 == pytest.approx(result.duration, rel=1e-12)


def test_liquefied_gas_has_no_answer_from_pressure_alone(context, ask):
    """A propane cylinder with liquid in it stands at its vapour pressure whatever it holds: bad, no numbers."""
    saturation = ask("propane", 293.15, 5e5).phase
    assert saturation.region == "gas"
    on_the_line = 293.15, 836442.0  # vapour pressure at 20 degC by the reference equation, found here
    low, high = 8e5, 9e5
    for _ in range(200):
        middle = 0.5 * (low + high)
        region = ask("propane", on_the_line[0], middle).phase.region
        if region == "two-phase":
            break
        low, high = (middle, high) if region == "gas" else (low, middle)
    # 8.36 bar is the vapour pressure of propane at 20 degC in handbooks (from memory)
    assert 8.36e5 == pytest.approx(middle, rel=2e-3)
    answer = answer_vessel(context, VesselQuestion(StateQuestion(GasSpec("propane"), middle, 293.15), 0.05, ISO))
    assert ("bad", VesselResult()) == (answer.state.quality.level, answer.result)


def test_bad_later_state_leaves_no_number(context):
    """Half an answer would be read as a whole one."""
    later = FULL._replace(pressure=1e12)
    answer = answer_vessel(context, VesselQuestion(FULL, 0.05, ISO, later))
    assert ("bad", Content()) == (answer.state.quality.level, answer.result.held)


def test_quality_is_the_worst_of_all_states(context, ask):
    """A later state near the dew point makes the whole answer uncertain."""
    warm = StateQuestion(GasSpec("propane"), 5e5, 350.0)
    near = warm._replace(temperature=276.0)
    assert ("good", "uncertain") == tuple(ask("propane", q.temperature, q.pressure).quality.level for q in (warm, near))
    answer = answer_vessel(context, VesselQuestion(warm, 0.05, None, near))
    assert ("uncertain", ("near_dew_point",)) == (answer.state.quality.level, answer.state.quality.reasons)
