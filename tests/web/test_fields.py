"""Fields: what each takes, what each refuses, and its description in step with its rule."""

from __future__ import annotations

import jsonschema
import pytest
from hypothesis import given
from hypothesis import strategies as st
from marshmallow import ValidationError

from gasapi.units import REFERENCE_CONDITIONS
from gasapi.web import fields

FIELDS = {
    "number": fields.Number(),
    "bounded number": fields.Number(above=0.0, most=10.0),
    "closed number": fields.Number(least=-1.0),
    "flag": fields.Flag(),
    "text": fields.Text(),
    "choice": fields.Choice(("json", "csv")),
    "gas": fields.Gas(),
    "substances": fields.Substances(),
    "units": fields.Units(),
    "uncertainties": fields.Uncertainties(("pressure", "temperature")),
    "reference": fields.Reference(),
}
SOLVENT = {"molar_mass": 86.2, "critical_temperature": 507.6, "critical_pressure": 3025000, "acentric_factor": 0.301}
WORDS = st.sampled_from(
    [
        "",
        "nitrogen",
        "methane",
        "json",
        "bar",
        "pressure",
        "din-1343",
        "mole",
        "mass",
        "%",
        "fractions",
        "basis",
        "fraction_unit",
        "temperature",
    ]
)
SCALARS = st.none() | st.booleans() | st.integers(-3, 12) | st.floats(-5, 20) | WORDS
LIKELY = st.sampled_from(
    [
        {"fractions": {"methane": 0.9, "nitrogen": 0.1}},
        {"fractions": {"methane": 1}, "basis": "mass", "fraction_unit": "ppm"},
        {"x": SOLVENT},
        {"pressure": "barg"},
        {"pressure": 1.5, "temperature": 2},
        {"temperature": 273.15, "pressure": 101325},
        "din-1343",
    ]
)
VALUES = LIKELY | st.recursive(
    SCALARS, lambda inner: st.lists(inner, max_size=2) | st.dictionaries(WORDS, inner, max_size=3), max_leaves=6
)


@pytest.mark.parametrize("name", FIELDS)
@given(value=VALUES)
def test_rule_and_description_judge_alike(name, value):
    """Whatever comes, a field takes it exactly if its JSON Schema does."""
    field = FIELDS[name]
    described = jsonschema.Draft202012Validator(field.json_schema()).is_valid(value)
    try:
        field.deserialize(value)
        taken = True
    except ValidationError:
        taken = False
    assert described == taken


@pytest.mark.parametrize("name", FIELDS)
def test_description_is_a_valid_schema(name):
    """Each field describes itself in JSON Schema 2020-12."""
    jsonschema.Draft202012Validator.check_schema(FIELDS[name].json_schema())


def test_numbers_become_floats():
    """An integer of a body is the float of its value."""
    value = fields.Number().deserialize(40)
    assert (value, type(value)) == (40.0, float)


def test_missing_members_have_their_default():
    """What is left out is None, or the default."""
    assert fields.Number().deserialize(fields.missing_value) is None
    assert fields.Text(default="auto").deserialize(fields.missing_value) == "auto"
    with pytest.raises(ValidationError, match="missing"):
        fields.Text(required=True).deserialize(fields.missing_value)


def test_fractions_are_of_one():
    """Percent and parts per million are divided out."""
    gas = fields.Gas().deserialize({"fractions": {"a": 90, "b": 10}, "fraction_unit": "%"})
    assert gas.fractions == (("a", 0.9), ("b", 0.1))
    gas = fields.Gas().deserialize({"fractions": {"a": 250000}, "fraction_unit": "ppm"})
    assert gas.fractions == (("a", 0.25),)


def test_reference_is_a_name_or_a_state():
    """A name gives the condition of the table, an object the one that it states."""
    assert fields.Reference().deserialize("iso-13443") is REFERENCE_CONDITIONS["iso-13443"]
    assert fields.Reference().deserialize({"temperature": 288.15, "pressure": 101325})[:2] == (288.15, 101325.0)


def test_nearest_names_are_offered():
    """A misspelt member is answered with what it may have meant."""
    assert "did you mean pressure" in fields.unknown_member("presure", ["gas", "pressure"])
    assert "known: gas, pressure" in fields.unknown_member("zzz", ["gas", "pressure"])
