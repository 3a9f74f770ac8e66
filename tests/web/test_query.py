"""The query form: parameters into members."""

from __future__ import annotations

import re

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gasapi.web.problems import Problem
from gasapi.web.query import parameter_pairs
from gasapi.web.questions import StateReader

FORM = StateReader.query


def test_parameters_become_the_members_of_a_body():
    """Units, fractions, uncertainties and substances are put where a body has them."""
    query = (
        "fraction.methane=0.9&fraction.n.a.m.e=0.1&basis=mass&fraction_unit=%25&pressure=40&pressure_unit=barg"
        "&molar_mass_unit=kg/mol&accept_two_phase=false&input_uncertainty.pressure=0.1&model=auto"
        "&substances.my.solvent.molar_mass=86.2"
    )
    read = FORM.read(query)
    assert read.faults == {}
    assert read.members == {
        "gas": {"fractions": {"methane": 0.9, "n.a.m.e": 0.1}, "basis": "mass", "fraction_unit": "%"},
        "pressure": 40.0,
        "units": {"pressure": "barg", "molar_mass": "kg/mol"},
        "accept_two_phase": False,
        "input_uncertainty": {"pressure": 0.1},
        "model": "auto",
        "substances": {"my.solvent": {"molar_mass": 86.2}},
    }


@given(number=st.floats(allow_nan=False, allow_infinity=False))
def test_a_number_comes_through_to_the_bit(number):
    """What repr writes is read back to the same bits."""
    text = repr(number).replace("+", "%2B")
    assert FORM.read(f"pressure={text}").members["pressure"] == number


@given(text=st.text(alphabet="0123456789.eE+-xinfaN_ ", min_size=1, max_size=8))
def test_only_the_grammar_of_json_makes_a_number(text):
    """Python would read more than JSON allows: 1_000, .5, 5., inf, blanks."""
    query = "pressure=" + text.replace("+", "%2B").replace(" ", "%20")
    read = FORM.read(query)
    if re.fullmatch(r"-?(?:0|[1-9]\d*)(?:\.\d+)?(?:[eE][+-]?\d+)?", text) and abs(float(text)) < float("inf"):
        assert read.members == {"pressure": float(text)}
    else:
        assert [("pressure",)] == list(read.faults)


@pytest.mark.parametrize(
    ("path", "name"),
    [
        (("gas",), "gas"),
        (("gas", "fractions"), "gas"),
        (("gas", "fractions", "methane"), "fraction.methane"),
        (("gas", "basis"), "basis"),
        (("units", "pressure"), "pressure_unit"),
        (("input_uncertainty", "temperature"), "input_uncertainty.temperature"),
        (("substances", "x", "molar_mass"), "substances.x.molar_mass"),
        (("pressure",), "pressure"),
        (("no", "such"), "no"),
    ],
)
def test_faults_are_named_by_their_parameter(path, name):
    """A path in the body leads back to the parameter that stands for it."""
    assert name == FORM.parameter_of(path)


def test_every_fault_of_a_query_is_told():
    """Unknown names come with the faults of the others."""
    with pytest.raises(Problem) as caught:
        FORM.read("pressure=x&presure=1&temperature=y")
    assert {"/presure", "/pressure", "/temperature"} == {f.pointer for f in caught.value.faults}


def test_blanks_and_plus_signs_are_decoded():
    """A plus sign is a blank, as forms write it."""
    assert parameter_pairs("gas=carbon+dioxide&x=a%20b%2Bc") == {"gas": "carbon dioxide", "x": "a b+c"}
