"""Molar masses: against densities of handbooks; candidates against a search without the sieve, and the warning before all."""

from __future__ import annotations

import random

import pytest

from gasapi.service import molar_mass
from gasapi.service.molar_mass import MolarMassQuestion, MolarMassResult, answer_molar_mass
from gasapi.service.questions import GasSpec, StateQuestion

R = 8.314462618

# Density at 0 degC and 101.325 kPa, kg/m3, and molar mass, g/mol, from handbooks of chemistry. Recalled from memory.
HANDBOOK = (
    ("oxygen", 1.4290, 31.998),
    ("nitrogen", 1.2506, 28.013),
    ("carbon dioxide", 1.9769, 44.009),
    ("ammonia", 0.7714, 17.031),
    ("chlorine", 3.214, 70.90),
    ("sulfur dioxide", 2.926, 64.06),
    ("methane", 0.7175, 16.043),
    ("argon", 1.784, 39.95),
)


def ask_mass(context, density, pressure, temperature, like=None, **uncertainty):
    spec = GasSpec("") if like is None else GasSpec(like)
    state = StateQuestion(spec, pressure, temperature)
    return answer_molar_mass(context, MolarMassQuestion(state, density, like is not None, **uncertainty))


@pytest.mark.parametrize(("gas", "density", "molar_mass"), HANDBOOK)
def test_handbook_densities_give_the_molar_mass(context, gas, density, molar_mass):
    """With the Z of the gas itself to 0.15 %; the gas is among the candidates, and near the top."""
    result = ask_mass(context, density, 101325.0, 273.15, gas).result
    assert molar_mass == pytest.approx(1000.0 * result.molar_mass, rel=1.5e-3)
    ids = [candidate.id for candidate in result.candidates]
    assert context.catalogue.find(gas).id in ids
    assert abs(result.candidates[ids.index(context.catalogue.find(gas).id)].relative_difference) < 1.5e-3


def test_ideal_molar_mass_by_hand(context):
    """1.429 g/L at 0 degC and 1 atm: 1.429 x 22.414 = 32.03 g/mol, the classroom value for oxygen."""
    result = ask_mass(context, 1.429, 101325.0, 273.15).result
    assert 1.429 * 22.41397 == pytest.approx(1000.0 * result.molar_mass, rel=1e-6)
    assert (result.molar_mass, 1.0) == (result.molar_mass_ideal, result.compressibility_factor)


def test_nitrogen_may_be_carbon_monoxide(context):
    """Both have 28.01 g/mol: no density tells them apart, and the toxic one is named first."""
    answer = ask_mass(context, 1.1455, 101325.0, 298.15, "nitrogen")
    candidates = {candidate.id: candidate for candidate in answer.result.candidates}
    assert candidates["carbon-monoxide"].toxic
    assert not candidates["nitrogen"].toxic
    first = answer.state.cautions[0]
    assert "never a proof" in first
    assert "Carbon monoxide" in first
    assert "not_a_proof_of_identity" == answer.state.phase.warnings[0].code


def test_candidates_come_nearest_first(context):
    """By the size of the difference, each with its own real-gas density."""
    answer = ask_mass(context, 1.84, 101325.0, 293.15)
    sizes = [abs(candidate.relative_difference) for candidate in answer.result.candidates]
    assert len(sizes) > 1
    assert sorted(sizes) == sizes
    assert sizes[-1] <= 0.01
    for candidate in answer.result.candidates:
        assert (candidate.density - 1.84) / 1.84 == candidate.relative_difference


def test_stated_uncertainty_narrows_the_candidates(context):
    """Nitrogen and ethylene are 0.7 % apart: 1 % allows both, 0.1 % only one of them."""
    loose = {c.id for c in ask_mass(context, 1.1453, 101325.0, 298.15).result.candidates}
    tight = {c.id for c in ask_mass(context, 1.1453, 101325.0, 298.15, density_uncertainty=0.0005).result.candidates}
    assert {"nitrogen", "ethylene"} <= loose
    assert "nitrogen" in tight
    assert "ethylene" not in tight


def test_uncertainty_by_hand(context):
    """M = d R T / p: U/M = 2 sqrt(u_d^2 + u_p^2 + u_T^2), all relative (JCGM 100, 5.1.6)."""
    result = ask_mass(
        context, 1.2, 1e5, 300.0, density_uncertainty=0.002, pressure_uncertainty=100.0, temperature_uncertainty=0.3
    ).result
    expected = 2.0 * (0.002**2 + 0.001**2 + 0.001**2) ** 0.5
    assert expected == pytest.approx(result.molar_mass_expanded_uncertainty / result.molar_mass, rel=1e-12)


def test_z_of_a_dense_gas_is_taken_from_the_like(context, ask):
    """Carbon dioxide at 50 bar and 300 K: the ideal molar mass is off by the third that Z is below 1."""
    state = ask("carbon-dioxide", 300.0, 50e5)
    result = ask_mass(context, state.density, 50e5, 300.0, "carbon dioxide").result
    assert state.gas.molar_mass == pytest.approx(result.molar_mass, rel=1e-14)
    assert state.compressibility_factor == result.compressibility_factor
    assert result.molar_mass_ideal > 1.3 * result.molar_mass


def test_no_like_is_never_good(context):
    """An ideal molar mass is an assumption."""
    assert "good" != ask_mass(context, 1.2, 101325.0, 293.15).state.quality.level


def test_bad_like_gives_no_number(context):
    """A gas whose state cannot be told lends no Z."""
    answer = ask_mass(context, 1.2, 1e12, 293.15, "nitrogen")
    assert ("bad", MolarMassResult()) == (answer.state.quality.level, answer.result)


def test_no_candidate_says_so(context):
    """Nothing in the catalogue is as light as this."""
    answer = ask_mass(context, 0.001, 101325.0, 293.15)
    assert () == answer.result.candidates
    assert "No gas of the catalogue" in answer.state.cautions[0]


def test_the_sieve_lets_no_candidate_slip(context, ask, monkeypatch):
    """Readings over the whole range of states, dense ones too, have the candidates of a search without the sieve."""
    chance = random.Random(7)
    found = 0
    for _ in range(10):
        gas = chance.choice(context.catalogue.gases).id
        temperature, pressure = chance.uniform(230.0, 500.0), 10.0 ** chance.uniform(4.5, 7.5)
        density = ask(gas, temperature, pressure).density
        if density is None:
            continue
        reading = density * chance.uniform(0.985, 1.015)
        sieved = ask_mass(context, reading, pressure, temperature).result.candidates
        with monkeypatch.context() as patch:
            patch.setattr(molar_mass, "_possible", lambda *_: True)
            assert ask_mass(context, reading, pressure, temperature).result.candidates == sieved
        found += len(sieved)
    assert found > 20
