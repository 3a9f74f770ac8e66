"""Fractions from a density: against an independent GERG-2008, by hand with the ideal gas, and where there is no answer."""

from __future__ import annotations

import pyaga8
import pytest

from gasapi.errors import ModelCannotServe, UnknownGas
from gasapi.service.fraction_from_density import (
    DensityUncertainties,
    FractionFromDensityQuestion,
    FractionFromDensityResult,
    SameGas,
    answer_fraction_from_density,
)
from gasapi.service.questions import GasSpec, StateQuestion

R = 8.314462618


def solve(context, gases, density, pressure, temperature, model="auto", uncertainty=None):
    first, second = (GasSpec(name) for name in gases)
    state = StateQuestion(first, pressure, temperature, model)
    return answer_fraction_from_density(context, FractionFromDensityQuestion(state, first, second, density, uncertainty))


def aga8(pressure, temperature, **fractions):
    """Return density (kg/m3) and molar mass (kg/mol) by the GERG-2008 of an independent library."""
    composition = pyaga8.Composition()
    for name, x in fractions.items():
        setattr(composition, name, x)
    gerg = pyaga8.Gerg2008()
    gerg.set_composition(composition)
    gerg.pressure, gerg.temperature = pressure / 1000.0, temperature
    gerg.calc_density(0)
    gerg.calc_molar_mass()
    return gerg.d * gerg.mm, gerg.mm / 1000.0


# generator casing, argon in welding gas, inerting of a tank, biogas; states invented
BLENDS = (
    (("hydrogen", "nitrogen"), 0.97, 4.0e5, 313.15),
    (("argon", "carbon dioxide"), 0.18, 30.0e5, 293.15),
    (("nitrogen", "methane"), 0.5, 1.05e5, 288.15),
    (("methane", "carbon dioxide"), 0.65, 12.0e5, 300.0),
    (("helium", "argon"), 0.02, 150.0e5, 300.0),
)


@pytest.mark.parametrize(("gases", "x", "pressure", "temperature"), BLENDS)
def test_finds_the_fraction_that_an_independent_equation_was_given(context, gases, x, pressure, temperature):
    """The density comes from another implementation of GERG-2008."""
    names = [name.replace(" ", "_") for name in gases]
    density, molar_mass = aga8(pressure, temperature, **{names[0]: x, names[1]: 1.0 - x})
    result = solve(context, gases, density, pressure, temperature, "gerg-2008").result
    assert result.explained is True
    assert x == pytest.approx(result.mole_fraction, abs=2e-6)
    assert molar_mass == pytest.approx(result.molar_mass, rel=1e-5)


@pytest.mark.parametrize("x", [0.0, 1e-6, 0.25, 0.5, 0.999, 1.0])
def test_leads_back_to_the_fraction_of_the_service(context, ask, x):
    """A density that the service gave for a mixture has that mixture again, the pure gases included."""
    gas = {"hydrogen": x, "nitrogen": 1.0 - x}
    density = ask({k: v for k, v in gas.items() if v}, 320.0, 20e5, "gerg-2008").density
    result = solve(context, ("hydrogen", "nitrogen"), density, 20e5, 320.0).result
    assert (True, pytest.approx(x, abs=1e-11)) == (result.explained, result.mole_fraction)


def test_ideal_gas_by_hand(context):
    """M = d R T / p lies between both molar masses as the fraction does."""
    density, pressure, temperature = 0.6, 1e5, 300.0
    result = solve(context, ("helium", "argon"), density, pressure, temperature, "ideal-gas").result
    molar_mass = density * R * temperature / pressure
    # 4.0026 and 39.95 g/mol, standard atomic weights
    assert (39.95 - 1000.0 * molar_mass) / (39.95 - 4.0026) == pytest.approx(result.mole_fraction, abs=1e-4)
    assert molar_mass == pytest.approx(result.molar_mass, rel=1e-12)


def test_order_of_the_gases_turns_the_fraction_round(context):
    """The fraction is that of the first."""
    one = solve(context, ("hydrogen", "nitrogen"), 3.0, 10e5, 300.0).result.mole_fraction
    other = solve(context, ("nitrogen", "hydrogen"), 3.0, 10e5, 300.0).result.mole_fraction
    assert 1.0 == pytest.approx(one + other, abs=1e-12)


@pytest.mark.parametrize("factor", [0.5, 0.99, 1.01, 3.0])
def test_a_reading_beyond_both_gases_is_not_explained(context, ask, factor):
    """Lighter than the light gas or heavier than the heavy one: no number, and a plain sentence."""
    light, heavy = (ask(gas, 300.0, 10e5).density for gas in ("hydrogen", "nitrogen"))
    answer = solve(context, ("hydrogen", "nitrogen"), (light if factor < 1.0 else heavy) * factor, 10e5, 300.0)
    assert FractionFromDensityResult(None, None, False, None) == answer.result
    assert ["reading_not_explained"] == [w.code for w in answer.state.phase.warnings if "reading" in w.code]


def test_a_reading_beyond_by_less_than_its_uncertainty_is_the_pure_gas(context, ask):
    """Half a per mille above nitrogen with a meter of one per mille is nitrogen; without a stated meter it is not."""
    density = ask("nitrogen", 300.0, 10e5, "gerg-2008").density * 1.0015
    pure = solve(context, ("hydrogen", "nitrogen"), density, 10e5, 300.0, "auto", DensityUncertainties(0.001 * density))
    assert (0.0, True) == (pure.result.mole_fraction, pure.result.explained)
    assert "at_pure_gas" in [w.code for w in pure.state.phase.warnings]
    assert False is solve(context, ("hydrogen", "nitrogen"), density, 10e5, 300.0).result.explained


def test_uncertainty_is_the_readings_over_the_slope(context):
    """Ideal helium in argon: d = (M1 x + M2 (1 - x)) p/(RT), so U(x) = U(d)/d (M/(M2 - M1)), worked by hand."""
    u = DensityUncertainties(0.0006, 100.0, 0.3)
    result = solve(context, ("helium", "argon"), 0.6, 1e5, 300.0, "ideal-gas", u).result
    model = context.models(context.gas(GasSpec(None, (("helium", result.mole_fraction), ("argon", 1 - result.mole_fraction)))))
    part = model.prepared("ideal-gas").uncertainty.at(300.0, 1e5, 0.6 / result.molar_mass)
    relative = 2.0 * ((0.0006 / 0.6) ** 2 + 0.001**2 + 0.001**2 + (part / 2.0) ** 2) ** 0.5
    assert relative * result.molar_mass / (0.03995 - 0.0040026) == pytest.approx(
        result.mole_fraction_expanded_uncertainty, rel=1e-3
    )


def test_without_uncertainty_none_is_told(context):
    """What was not asked is not known."""
    assert None is solve(context, ("hydrogen", "nitrogen"), 3.0, 10e5, 300.0).result.mole_fraction_expanded_uncertainty


def test_two_mixtures_with_one_density(context, ask):
    """Ethylene bends far from ideal at 45 bar, argon does not: on the way from one to the other the density turns round."""

    def density(x):
        return ask({"ethylene": x, "argon": 1.0 - x}, 300.0, 45e5, "peng-robinson").density

    assert density(0.3) > density(0.6) < density(0.9)
    for reading in (density(0.4), density(0.6) * 1.000001):
        answer = solve(context, ("ethylene", "argon"), reading, 45e5, 300.0, "peng-robinson")
        assert FractionFromDensityResult(None, None, True, None) == answer.result
        (message,) = [w.message for w in answer.state.phase.warnings if w.code == "ambiguous_fraction"]
        fractions = [float(text) for text in message.partition("first: ")[2].partition(")")[0].split(", ")]
        assert 2 == len(fractions)
        for x in fractions:
            assert reading == pytest.approx(density(x), rel=1e-5)
    beyond = solve(context, ("ethylene", "argon"), density(0.6) * 0.98, 45e5, 300.0, "peng-robinson")
    assert beyond.result.explained is False


def test_a_two_phase_mixture_is_bad(context, ask):
    """At 9 bar and 290 K propane with little nitrogen condenses: no gas of that density is stable."""
    assert "two-phase" == ask({"nitrogen": 0.05, "propane": 0.95}, 290.0, 9e5, "gerg-2008").phase.region
    gas = ask({"nitrogen": 0.3, "propane": 0.7}, 290.0, 9e5, "gerg-2008")
    assert "gas" == gas.phase.region
    answer = solve(context, ("nitrogen", "propane"), 1.2 * gas.density, 9e5, 290.0, "gerg-2008")
    assert ("bad", FractionFromDensityResult()) == (answer.state.quality.level, answer.result)
    assert "two_phase" in answer.state.quality.reasons
    explained = solve(context, ("nitrogen", "propane"), gas.density, 9e5, 290.0, "gerg-2008").result
    assert 0.3 == pytest.approx(explained.mole_fraction, abs=1e-11)


def test_one_gas_is_no_blend(context):
    """Under whatever name."""
    with pytest.raises(SameGas):
        solve(context, ("hydrogen", "H2"), 1.0, 1e5, 300.0)


def test_unknown_names_and_models_are_refused(context):
    """As for a state."""
    with pytest.raises(UnknownGas):
        solve(context, ("hydrogen", "no such gas"), 1.0, 1e5, 300.0)
    with pytest.raises(ModelCannotServe):
        solve(context, ("hydrogen", "nitrogen"), 1.0, 1e5, 300.0, "reference")
