"""Conversion of units against printed factors of standards, and against exact arithmetic."""

from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from gasapi.units import QUANTITIES, SI_UNITS, UnknownQuantity, UnknownUnit, unit, unit_map

EVERY_UNIT = [u for units in QUANTITIES.values() for u in units.values()]

# NIST SP 811 (2008), appendix B.8 and B.9, as printed there (7 digits; exact where the table sets it in bold)
PRINTED = [
    ("pressure", "atm", 1.01325e5, 0.0),
    ("pressure", "bar", 1.0e5, 0.0),
    ("pressure", "kgf/cm2", 9.80665e4, 0.0),
    ("pressure", "psi", 6.894757e3, 1e-7),
    ("pressure", "lbf/ft2", 4.788026e1, 1e-7),
    ("pressure", "Torr", 1.333224e2, 4e-7),
    ("pressure", "mmHg", 1.333224e2, 4e-7),
    ("pressure", "inHg", 3.386389e3, 2e-7),
    ("pressure", "mmH2O", 9.80665, 0.0),
    ("pressure", "cmH2O", 9.80665e1, 0.0),
    ("pressure", "inH2O", 2.490889e2, 2e-7),
    ("density", "lb/ft3", 1.601846e1, 3e-7),
    ("density", "lb/in3", 2.767990e4, 2e-7),
    ("density", "g/cm3", 1.0e3, 0.0),
    ("volume", "ft3", 2.831685e-2, 2e-7),
    ("volume", "in3", 1.638706e-5, 3e-7),
    ("mass", "lb", 4.535924e-1, 1e-7),
    ("mass", "oz", 2.834952e-2, 2e-7),
    ("volume_flow", "ft3/min", 4.719474e-4, 1e-7),
    ("volume_flow", "ft3/s", 2.831685e-2, 2e-7),
    ("mass_flow", "lb/h", 1.259979e-4, 2e-7),
    ("mass_flow", "lb/s", 4.535924e-1, 1e-7),
    ("duration", "h", 3.6e3, 0.0),
    ("duration", "d", 8.64e4, 0.0),
]

# the fixed points of the scales: SI Brochure, 9th ed., section 2.3.1 (0 degC = 273.15 K) and NIST SP 811, B.10
TEMPERATURES = [
    ("degC", 0.0, 273.15),
    ("degC", 25.0, 298.15),
    ("degC", -273.15, 0.0),
    ("degF", 32.0, 273.15),
    ("degF", 212.0, 373.15),
    ("degF", 77.0, 298.15),
    ("degF", -40.0, 233.15),
    ("degR", 491.67, 273.15),
]


@pytest.mark.parametrize(("quantity", "name", "factor", "tolerance"), PRINTED)
def test_scale_is_the_printed_one(quantity, name, factor, tolerance):
    """One of the unit is the printed number of SI units."""
    assert pytest.approx(factor, rel=max(tolerance, 1e-15), abs=0.0) == unit(quantity, name).to_si(1.0)


@pytest.mark.parametrize(("name", "value", "kelvin"), TEMPERATURES)
def test_fixed_points_of_temperature_scales(name, value, kelvin):
    """A fixed point of a scale has its kelvin value to one unit in the last place, both ways."""
    assert pytest.approx(kelvin, rel=2.3e-16, abs=0.0) == unit("temperature", name).to_si(value)
    assert pytest.approx(value, abs=1.2e-13) == unit("temperature", name).from_si(kelvin)


def test_gauge_pressure_is_exact_where_decimals_allow():
    """40 barg at a standard atmosphere is 4101325 Pa and 760 Torr are 101325 Pa, to the last bit."""
    assert unit("pressure", "barg").to_si(40.0, 101325.0) == 4101325.0
    assert unit("pressure", "Torr").to_si(760.0) == 101325.0
    assert unit("pressure", "bar").to_si(40.0, 101325.0) == 4e6
    assert unit("pressure", "psig").to_si(0.0, 95000.0) == 95000.0


def test_names_tell_gauge_from_absolute():
    """Every name in g with a gauge flag has an absolute twin without the g; mercury columns are absolute."""
    names = QUANTITIES["pressure"]
    gauge = {n for n, u in names.items() if u.gauge}
    assert gauge == {n for n in names if n.endswith("g")} - {"mmHg", "inHg"}
    assert {n.removesuffix("g") for n in gauge} <= names.keys()
    assert not any(u.gauge for q, units in QUANTITIES.items() if q != "pressure" for u in units.values())


def test_contract_names_are_there():
    """The units that the contract names exist."""
    named = {
        "pressure": "Pa kPa MPa bar bara barg mbar atm psi psia psig kPag Torr mmHg inH2O",
        "temperature": "K degC degF degR",
        "density": "kg/m3 g/L lb/ft3",
        "molar_volume": "m3/mol L/mol cm3/mol",
        "molar_mass": "g/mol kg/mol",
        "volume_flow": "m3/s m3/h L/min ft3/min",
        "mass_flow": "kg/s kg/h lb/h",
        "amount_flow": "mol/s kmol/h",
    }
    missing = {q: set(words.split()) - QUANTITIES[q].keys() for q, words in named.items()}
    assert {q: set() for q in named} == missing


@pytest.mark.parametrize("u", EVERY_UNIT, ids=lambda u: f"{u.quantity}-{u.name}")
@given(value=st.floats(min_value=1e-6, max_value=1e9))
def test_there_and_back(u, value):
    """A value returns from SI within the rounding of the larger of value and offset."""
    si = u.to_si(value, 101325.0)
    lost = 4 * 2.3e-16 * max(abs(u.difference_to_si(value)), abs(u.offset), 101325.0 if u.gauge else 0.0)
    assert abs(u.difference_to_si(u.from_si(si, 101325.0)) - u.difference_to_si(value)) <= lost


@pytest.mark.parametrize("u", EVERY_UNIT, ids=lambda u: f"{u.quantity}-{u.name}")
def test_float_and_array_have_the_same_bits(u):
    """An element of an array is converted to the very bits of the float."""
    values = np.random.default_rng(20240229).uniform(-50.0, 5000.0, 500)
    assert [u.to_si(float(v), 98000.0) for v in values] == list(u.to_si(values, 98000.0))
    assert [u.from_si(float(v), 98000.0) for v in values] == list(u.from_si(values, 98000.0))
    assert [u.difference_to_si(float(v)) for v in values] == list(u.difference_to_si(values))
    assert [u.difference_from_si(float(v)) for v in values] == list(u.difference_from_si(values))


@given(value=st.floats(min_value=-1e6, max_value=1e6))
def test_scale_agrees_with_exact_arithmetic(value):
    """Pounds per square inch and degrees Fahrenheit are within two roundings of rational arithmetic."""
    psi = Fraction("0.45359237") * Fraction("9.80665") / Fraction("0.0254") ** 2
    assert pytest.approx(float(Fraction(value) * psi), rel=4.5e-16, abs=0.0) == unit("pressure", "psi").to_si(value)
    kelvin = (Fraction(value) + Fraction("459.67")) * Fraction(5, 9)
    bound = 4.5e-16 * max(abs(value), 460.0)
    assert abs(Fraction(unit("temperature", "degF").to_si(value)) - kelvin) <= bound


def test_a_difference_takes_the_scale_alone():
    """Ten degrees are ten kelvin, eighteen degrees Fahrenheit are ten, and a bar of gauge pressure is a bar."""
    assert unit("temperature", "degC").difference_to_si(10.0) == 10.0
    assert unit("temperature", "degF").difference_to_si(18.0) == 10.0
    assert unit("temperature", "degF").difference_from_si(10.0) == 18.0
    assert unit("pressure", "barg").difference_to_si(1.0) == 1e5


def test_default_map_is_si_but_for_molar_mass():
    """An empty choice gives the defaults of the contract for every quantity."""
    names = dict(unit_map(()).names)
    assert names.pop("molar_mass") == "g/mol"
    assert names == {q: u.name for q, u in SI_UNITS.items() if q != "molar_mass"}


def test_map_is_one_object_for_one_choice():
    """Maps of equal choice are equal, hash alike, and stay as they are."""
    one, other = unit_map((("pressure", "barg"),)), unit_map((("pressure", "barg"),))
    assert one is other
    assert hash(one) == hash(unit_map((("pressure", "barg"), ("temperature", "K"))))
    assert one == unit_map((("pressure", "barg"), ("temperature", "K")))
    assert one != unit_map(())
    assert len(one) == len(QUANTITIES) == len(list(one))
    with pytest.raises(TypeError):
        one.names["pressure"] = "Pa"


def test_derivatives_take_both_scales():
    """kg/m3/Pa to lb/ft3/psi: divided by the one scale, multiplied by the other (both printed in NIST SP 811)."""
    units = unit_map((("pressure", "psig"), ("density", "lb/ft3")))
    assert pytest.approx(6.894757e3 / 1.601846e1, rel=4e-7) == units.ratio_from_si("density", "pressure", 1.0)


def test_unknown_names_carry_what_is_known():
    """An unknown unit names its quantity and its nearest; an unknown quantity the table."""
    with pytest.raises(UnknownUnit) as caught:
        unit("pressure", "Barg")
    assert (caught.value.quantity, caught.value.name) == ("pressure", "Barg")
    assert caught.value.nearest[0] == "barg"
    with pytest.raises(UnknownQuantity) as unknown:
        unit_map((("preasure", "bar"),))
    assert unknown.value.quantity == "preasure"
    assert "pressure" in str(unknown.value)


@pytest.mark.parametrize("u", EVERY_UNIT, ids=lambda u: f"{u.quantity}-{u.name}")
def test_every_unit_says_where_it_comes_from(u):
    """No factor stands without its source."""
    assert len(u.source) > 4
