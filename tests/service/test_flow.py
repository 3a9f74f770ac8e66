"""Flows: against the relations of ISO 5167 and ISO 6976, published compression factors, and hand-worked conversions."""

from __future__ import annotations

import math

import pytest

from gasapi.errors import ModelCannotServe
from gasapi.service.flow import FlowQuestion, FlowResult, Meter, answer_flow, correction_factor
from gasapi.service.questions import GasSpec, InputUncertainty, StateQuestion
from gasapi.units import REFERENCE_CONDITIONS, ReferenceCondition

R = 8.314462618
NITROGEN = StateQuestion(GasSpec("nitrogen"), 4101325.0, 298.15)
DIN = REFERENCE_CONDITIONS["din-1343"]

# Compression factors at 101.325 kPa, ISO 6976:1995, table 2. Recalled from memory.
ISO_6976_Z = (
    ("methane", 273.15, 0.9976),
    ("methane", 288.15, 0.9980),
    ("ethane", 273.15, 0.9900),
    ("ethane", 288.15, 0.9915),
    ("nitrogen", 273.15, 0.9995),
    ("nitrogen", 288.15, 0.9997),
    ("carbon dioxide", 273.15, 0.9933),
    ("carbon dioxide", 288.15, 0.9944),
    ("oxygen", 273.15, 0.9990),
    ("hydrogen", 273.15, 1.0006),
)

# Gas 1 of ISO 12213-2:2006, annex C, with its Z at 60 bar. Recalled from memory.
ISO_12213_GAS_1 = {
    "carbon dioxide": 0.006,
    "nitrogen": 0.003,
    "methane": 0.965,
    "ethane": 0.018,
    "propane": 0.0045,
    "isobutane": 0.001,
    "n-butane": 0.001,
    "isopentane": 0.0005,
    "n-pentane": 0.0003,
    "n-hexane": 0.0007,
}
ISO_12213_Z = ((280.0, 0.86199), (290.0, 0.88006), (310.0, 0.90867), (330.0, 0.93011))


def flow(context, state, kind, value, reference=None, meter=None):
    return answer_flow(context, FlowQuestion(state, kind, value, reference, meter)).result


@pytest.mark.parametrize(("gas", "temperature", "z"), ISO_6976_Z)
def test_reference_volume_has_the_published_compression_factor(context, gas, temperature, z):
    """A mole of real gas at a reference condition takes Z R T / p, with the Z that ISO 6976 lists."""
    state = StateQuestion(GasSpec(gas), 101325.0, 300.0)
    result = flow(context, state, "amount", 1.0, ReferenceCondition(temperature, 101325.0))
    assert z == pytest.approx(result.reference_volume * 101325.0 / (R * temperature), abs=1.5e-4)


@pytest.mark.parametrize(("temperature", "z"), ISO_12213_Z)
def test_conversion_of_a_natural_gas_follows_the_published_factors(context, temperature, z):
    """Volume at base conditions over volume at the line is (p/pn)(Tn/T)(Zn/Z), ISO 12213-1, with the published Z."""
    state = StateQuestion(GasSpec(None, tuple(ISO_12213_GAS_1.items())), 6e6, temperature)
    result = flow(context, state, "actual_volume", 1.0, DIN)
    # Zn by ISO 6976: 1 - (sum of x sqrt(b))^2 with sqrt(b) 0.0490, 0.1000, 0.1453, 0.1871, 0.2069, 0.0224, 0.0819 for
    # methane to n-butane, nitrogen and carbon dioxide (0 degC); heavier ones as 0.28. From memory.
    roots = (0.006 * 0.0819, 0.003 * 0.0224, 0.965 * 0.049, 0.018 * 0.1, 0.0045 * 0.1453, 0.001 * 0.1871, 0.001 * 0.2069)
    z_base = 1.0 - (sum(roots) + 0.0015 * 0.28) ** 2
    expected = (6e6 / 101325.0) * (273.15 / temperature) * (z_base / z)
    assert result.reference_volume == pytest.approx(expected, rel=1e-3)


@pytest.mark.parametrize("kind", ["actual_volume", "reference_volume", "mass", "amount"])
def test_every_measure_leads_back_to_itself(context, kind):
    """A flow asked in any of its answered measures has the same other measures."""
    first = flow(context, NITROGEN, "actual_volume", 0.0333, DIN)
    again = flow(context, NITROGEN, kind, getattr(first, kind), DIN)
    assert first[:4] == pytest.approx(again[:4], rel=1e-14)


def test_measures_by_hand(context, ask):
    """120 m3/h of nitrogen at 40 barg and 25 degC: by its density and its molar mass."""
    result = flow(context, NITROGEN, "actual_volume", 120.0 / 3600.0, DIN)
    line, base = ask("nitrogen", 298.15, 4101325.0), ask("nitrogen", 273.15, 101325.0)
    assert result.mass == pytest.approx(120.0 / 3600.0 * line.density, rel=1e-14)
    assert result.amount == pytest.approx(result.mass / 0.02801348, rel=1e-14)
    assert result.reference_volume == pytest.approx(result.mass / base.density, rel=1e-14)
    # density of nitrogen at 0 degC and 101.325 kPa: 1.2504 to 1.2506 kg/m3 in handbooks (from memory)
    assert result.mass / result.reference_volume == pytest.approx(1.2505, abs=2e-4)


def test_differential_pressure_factor_is_that_of_the_orifice_equation(context, ask):
    """The same differential pressure through the same orifice gives mass flows in the ratio of the factor."""
    rho, design = ask("nitrogen", 298.15, 4101325.0).density, 40.0

    def orifice(density):
        # q_m = C / sqrt(1 - beta^4) eps (pi/4) d^2 sqrt(2 dp rho), ISO 5167-2:2022, eq. 1; invented plate
        return 0.6 / math.sqrt(1.0 - 0.5**4) * 0.99 * math.pi / 4.0 * 0.05**2 * math.sqrt(2.0 * 12000.0 * density)

    result = flow(context, NITROGEN, "mass", 1.0, None, Meter("differential_pressure", design))
    assert orifice(rho) / orifice(design) == pytest.approx(result.correction_factor, rel=1e-14)


def test_volumetric_factor_is_the_density_ratio(context, ask):
    """A turbine's pulse is a volume: twice the density is twice the mass."""
    rho = ask("nitrogen", 298.15, 4101325.0).density
    result = flow(context, NITROGEN, "mass", 1.0, None, Meter("volumetric", rho / 2.0))
    assert 2.0 == pytest.approx(result.correction_factor, rel=1e-15)
    assert 4.0 == correction_factor("volumetric", 40.0, 10.0) == correction_factor("differential_pressure", 160.0, 10.0)


def test_design_density_comes_from_the_design_state(context, ask):
    """A meter made for 35 bar and 20 degC has the density there, by the equation of the line."""
    meter = Meter("volumetric", None, (3.5e6, 293.15))
    result = flow(context, NITROGEN, "mass", 1.0, None, meter)
    assert ask("nitrogen", 293.15, 3.5e6).density == result.design_density


def test_no_reference_condition_no_reference_volume(context):
    """What was not asked is not known."""
    assert None is flow(context, NITROGEN, "mass", 1.0).reference_volume


def test_bad_line_state_gives_no_number(context):
    """On the saturation side there is nothing to convert with."""
    state = StateQuestion(GasSpec("nitrogen"), 1e12, 298.15)
    answer = answer_flow(context, FlowQuestion(state, "mass", 1.0, DIN, Meter("volumetric", 10.0)))
    assert (FlowResult(), "bad") == (answer.result, answer.state.quality.level)


def test_steam_has_no_reference_volume(context):
    """Water is liquid or ice at every usual reference condition: the mass is known, that volume is not, and why is told."""
    state = StateQuestion(GasSpec("water"), 1e5, 450.0)
    for name in ("din-1343", "iso-13443"):
        answer = answer_flow(context, FlowQuestion(state, "mass", 1.0, REFERENCE_CONDITIONS[name]))
        assert answer.result.mass == 1.0
        assert answer.result.reference_volume is None
        assert "no_gas_at_reference" in [warning.code for warning in answer.state.phase.warnings]


def test_a_flow_stated_where_the_gas_is_none_is_bad(context):
    """A volume of steam at 0 degC says nothing of its amount."""
    state = StateQuestion(GasSpec("water"), 1e5, 450.0)
    answer = answer_flow(context, FlowQuestion(state, "reference_volume", 1.0, DIN))
    assert (FlowResult(), "bad") == (answer.result, answer.state.quality.level)


def test_bad_design_state_takes_the_whole_answer_along(context):
    """A design density that cannot be had is no reason to invent a factor."""
    meter = Meter("volumetric", None, (1e12, 293.15))
    answer = answer_flow(context, FlowQuestion(NITROGEN, "mass", 1.0, None, meter))
    assert (FlowResult(), "bad") == (answer.result, answer.state.quality.level)


def test_uncertainty_of_a_conversion_is_that_of_the_density(context, ask):
    """0.1 % of the pressure (k = 2: 0.2 %) dominates for a gas near to ideal."""
    state = NITROGEN._replace(input_uncertainty=InputUncertainty(4101.325, 0.0))
    result = flow(context, state, "mass", 1.0)
    assert 0.002 == pytest.approx(result.relative_expanded_uncertainty, rel=0.02)


def test_named_model_serves_all_states(context):
    """The ideal gas asked by name has Z of 1 at the reference condition, too."""
    result = flow(context, NITROGEN._replace(model="ideal-gas"), "amount", 1.0, DIN)
    assert R * 273.15 / 101325.0 == pytest.approx(result.reference_volume, rel=1e-14)
    with pytest.raises(ModelCannotServe):
        flow(context, StateQuestion(GasSpec("silane"), 1e5, 300.0, "gerg-2008"), "amount", 1.0)
