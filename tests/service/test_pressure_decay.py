"""Leak tests: by hand with the ideal gas, against a Monte Carlo of the readings (JCGM 101), and what must never mislead."""

from __future__ import annotations

import math

import numpy as np
import pytest

from gasapi.service.evaluation import evaluate_block
from gasapi.service.pressure_decay import (
    Correlation,
    LeakLimit,
    PressureDecayQuestion,
    PressureDecayResult,
    answer_pressure_decay,
)
from gasapi.service.questions import GasSpec, InputUncertainty, StateQuestion
from gasapi.units import REFERENCE_CONDITIONS, ReferenceCondition

R = 8.314462618
IDEAL = StateQuestion(GasSpec("nitrogen"), 7e5, 293.15, "ideal-gas")
REAL = StateQuestion(GasSpec("nitrogen"), 200e5, 293.15)


def test_throughput_of_an_isothermal_test_by_hand(context):
    """q = V dp / dt: 1 L that loses 10 mbar in 100 s leaks 0.1 mbar L/s = 0.01 Pa m3/s (common practice of leak testing)."""
    question = PressureDecayQuestion(IDEAL, IDEAL._replace(pressure=7e5 - 1000.0), 1e-3, 100.0)
    result = answer_pressure_decay(context, question).result
    assert 0.01 == pytest.approx(result.throughput, rel=1e-11)
    molar_mass = context.models(context.gas(IDEAL.gas)).prepared("ideal-gas").fluid.molar_mass
    assert 1000.0 * 1e-3 * molar_mass / (R * 293.15) == pytest.approx(result.lost_mass, rel=1e-10)
    assert result.lost_mass / 100.0 == result.leak_rate


def test_temperature_is_compensated(context):
    """A closed ideal volume that cools by 3 K loses pressure and no mass."""
    end = IDEAL._replace(pressure=7e5 * 290.15 / 293.15, temperature=290.15)
    result = answer_pressure_decay(context, PressureDecayQuestion(IDEAL, end, 0.1, 3600.0)).result
    assert 0.0 == pytest.approx(result.lost_mass, abs=1e-13)


def test_real_gas_matters_at_200_bar(context, ask):
    """Nitrogen at 200 bar that cools by 10 K: by p/T alone there seems to be a leak of more than 0.5 % of the content."""
    start = ask("nitrogen", 293.15, 200e5)
    # the pressure at which the closed volume stands 10 K colder, by halving
    low, high = 150e5, 200e5
    while high - low > 1e-6 * high:
        middle = 0.5 * (low + high)
        low, high = (middle, high) if ask("nitrogen", 283.15, middle).density < start.density else (low, middle)
    end = REAL._replace(pressure=low, temperature=283.15)
    lost = answer_pressure_decay(context, PressureDecayQuestion(REAL, end, 0.05, 3600.0)).result.lost_mass
    content = 0.05 * start.density
    assert abs(lost) < 2e-6 * content
    assert abs(1.0 - (low / 283.15) / (200e5 / 293.15)) > 0.005


def test_uncertainty_by_hand(context):
    """Four independent readings of an ideal gas: U = 2 (V M / R T) sqrt(2 (u_p^2 + (p u_T / T)^2)), JCGM 100, eq. 10."""
    question = PressureDecayQuestion(IDEAL, IDEAL, 2.0, 100.0, InputUncertainty(150.0, 0.1))
    result = answer_pressure_decay(context, question).result
    molar_mass = context.models(context.gas(IDEAL.gas)).prepared("ideal-gas").fluid.molar_mass
    slope = 2.0 * molar_mass / (R * 293.15)
    expected = 2.0 * slope * math.sqrt(2.0 * (150.0**2 + (7e5 * 0.1 / 293.15) ** 2))
    assert expected == pytest.approx(result.lost_mass_expanded_uncertainty, rel=1e-10)
    assert expected / 100.0 == pytest.approx(result.leak_rate_expanded_uncertainty, rel=1e-10)


def test_uncertainty_against_a_monte_carlo(context):
    """200,000 draws of the four readings, solved with the real gas (JCGM 101): the standard deviation, doubled."""
    end = REAL._replace(pressure=199e5, temperature=292.0)
    u = InputUncertainty(5000.0, 0.1)
    result = answer_pressure_decay(context, PressureDecayQuestion(REAL, end, 0.05, 3600.0, u)).result
    model = context.models(context.gas(REAL.gas)).prepared("reference")
    rng = np.random.default_rng(20261201)

    def mass(question):
        t = rng.normal(question.temperature, u.temperature, 200_000)
        p = rng.normal(question.pressure, u.pressure, 200_000)
        return 0.05 * evaluate_block(model, t, p, 5.0).density * model.fluid.molar_mass

    drawn = mass(REAL) - mass(end)
    assert 2.0 * drawn.std() == pytest.approx(result.lost_mass_expanded_uncertainty, rel=0.01)
    assert drawn.mean() == pytest.approx(result.lost_mass, abs=4.0 * drawn.std() / math.sqrt(200_000))


def test_correlation_takes_common_errors_out(context):
    """A gauge that is off by the same at both ends makes no leak; readings that err oppositely make it worse."""

    def expanded(r):
        question = PressureDecayQuestion(IDEAL, IDEAL, 1.0, 100.0, InputUncertainty(100.0, 0.1), Correlation(r, r))
        return answer_pressure_decay(context, question).result.lost_mass_expanded_uncertainty

    assert 0.0 == expanded(1.0)
    assert math.sqrt(0.5) * expanded(0.0) == pytest.approx(expanded(0.5), rel=1e-12)
    assert math.sqrt(2.0) * expanded(0.0) == pytest.approx(expanded(-1.0), rel=1e-12)


@pytest.mark.parametrize(("loss", "resolved"), [(100.0, False), (2000.0, True), (-2000.0, False)])
def test_resolved_means_larger_than_the_uncertainty(context, loss, resolved):
    """u(p) = 200 Pa at either end is 566 Pa expanded; a gain is never a leak, and says so."""
    end = IDEAL._replace(pressure=7e5 - loss)
    answer = answer_pressure_decay(context, PressureDecayQuestion(IDEAL, end, 1.0, 60.0, InputUncertainty(200.0, 0.0)))
    assert resolved is answer.result.resolved
    assert (loss < -566.0) is ("mass_gained" in [w.code for w in answer.state.phase.warnings])


def test_without_uncertainty_nothing_is_said_of_it(context):
    """The contract: the last three are null."""
    result = answer_pressure_decay(context, PressureDecayQuestion(IDEAL, IDEAL, 1.0, 60.0)).result
    assert (None, None, None) == (
        result.lost_mass_expanded_uncertainty,
        result.leak_rate_expanded_uncertainty,
        result.resolved,
    )


def test_duration_to_resolve_makes_the_limit_equal_the_uncertainty(context):
    """At that time a leak at the limit has lost exactly its expanded uncertainty, whichever unit the limit has."""
    u = InputUncertainty(150.0, 0.1)
    by_mass = answer_pressure_decay(
        context, PressureDecayQuestion(IDEAL, IDEAL, 1.0, 60.0, u, limit=LeakLimit(1e-6, False))
    ).result
    assert by_mass.lost_mass_expanded_uncertainty == pytest.approx(1e-6 * by_mass.duration_to_resolve, rel=1e-13)
    molar_mass = context.models(context.gas(IDEAL.gas)).prepared("ideal-gas").fluid.molar_mass
    throughput = 1e-6 / molar_mass * R * 293.15
    by_throughput = answer_pressure_decay(
        context, PressureDecayQuestion(IDEAL, IDEAL, 1.0, 60.0, u, limit=LeakLimit(throughput, True))
    ).result
    assert by_mass.duration_to_resolve == pytest.approx(by_throughput.duration_to_resolve, rel=1e-9)


def test_reference_flow_is_the_real_gas_there(context, ask):
    """The volume flow at reference is the mass flow over the density there; the throughput takes that temperature."""
    reference = REFERENCE_CONDITIONS["20C-101.325kPa"]
    end = REAL._replace(pressure=199e5)
    result = answer_pressure_decay(context, PressureDecayQuestion(REAL, end, 0.05, 3600.0, reference=reference)).result
    density = ask("nitrogen", 293.15, 101325.0).density
    assert result.leak_rate / density == pytest.approx(result.reference_volume_flow, rel=1e-13)
    assert 293.15 == result.throughput_temperature
    # p V at the reference condition and n R T differ by Z there only
    z = ask("nitrogen", 293.15, 101325.0).compressibility_factor
    assert result.throughput * z == pytest.approx(result.reference_volume_flow * 101325.0, rel=1e-9)


def test_a_warmer_end_is_answered_with_a_warning(context):
    """Warming can hide a leak."""
    answer = answer_pressure_decay(context, PressureDecayQuestion(IDEAL, IDEAL._replace(temperature=293.65), 1.0, 60.0))
    assert answer.result.lost_mass > 0.0
    assert ["end_warmer_than_start"] == [w.code for w in answer.state.phase.warnings]
    assert "0.5 K warmer" in answer.state.phase.warnings[0].message


def test_one_equation_serves_both_states(context):
    """A start inside and an end outside the range of an equation must not differ by the step between two equations."""
    start = StateQuestion(GasSpec(None, (("methane", 0.9), ("ethane", 0.1))), 300e5, 300.0)
    end = start._replace(temperature=460.0)
    answer = answer_pressure_decay(context, PressureDecayQuestion(start, end, 1.0, 60.0))
    assert ("gerg-2008", "uncertain") == (answer.state.model.id, answer.state.quality.level)
    assert "outside_validity" in answer.state.quality.reasons


@pytest.mark.parametrize("bad", ["start", "end"])
def test_a_bad_state_gives_no_number(context, bad):
    """At either end."""
    states = {"start": IDEAL, "end": IDEAL}
    states[bad] = IDEAL._replace(pressure=1e12)
    answer = answer_pressure_decay(
        context, PressureDecayQuestion(states["start"], states["end"], 1.0, 60.0, InputUncertainty(1.0, 1.0))
    )
    assert ("bad", PressureDecayResult()) == (answer.state.quality.level, answer.result)


def test_a_reference_condition_of_ones_own(context):
    """Any temperature and pressure will do."""
    question = PressureDecayQuestion(REAL, REAL._replace(pressure=199e5), 0.05, 60.0, reference=ReferenceCondition(300.0, 1e5))
    assert 300.0 == answer_pressure_decay(context, question).result.throughput_temperature
