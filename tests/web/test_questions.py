"""Requests into questions: SI values, assumed ambients, and all faults at once."""

from __future__ import annotations

import pytest
from marshmallow import Schema

from gasapi.gases.catalogue import Catalogue
from gasapi.service.questions import GasSpec, InputUncertainty
from gasapi.web.problems import Problem
from gasapi.web.questions import STANDARD_ATMOSPHERE, StateReader
from gasapi.web.schemas import StateSchema

MEMBERS = {"gas": "nitrogen", "pressure": 40, "temperature": 77}


@pytest.fixture(scope="module")
def reader():
    return StateReader(Catalogue.load())


def test_values_reach_the_service_in_si(reader):
    """Pressure, temperature, fractions, substances and uncertainties are converted; the units are kept for the answer."""
    asked = reader.of_members(
        {
            **MEMBERS,
            "gas": {"fractions": {"x": 92, "nitrogen": 8}, "fraction_unit": "%", "basis": "mass"},
            "units": {"pressure": "barg", "temperature": "degF"},
            "input_uncertainty": {"pressure": 0.05},
            "substances": {
                "x": {"molar_mass": 86.2, "critical_temperature": 507.6, "critical_pressure": 3025000, "acentric_factor": 0.301}
            },
            "dew_point_margin": 2,
            "accept_two_phase": True,
        }
    )
    question = asked.question
    assert (question.pressure, question.ambient_pressure) == (4101325.0, STANDARD_ATMOSPHERE)
    assert pytest.approx(298.15, rel=1e-15) == question.temperature
    assert question.gas[:3] == (None, (("x", 0.92), ("nitrogen", 0.08)), "mass")
    assert pytest.approx(0.0862, rel=1e-15) == question.gas.substances[0].molar_mass
    assert question.input_uncertainty == InputUncertainty(5000.0, 0.0)
    assert (question.dew_point_margin, question.accept_two_phase) == (2.0, True)
    assert asked.units.temperature.name == "degF"
    assert {question: 1}[question] == 1


def test_integers_and_floats_ask_the_same(reader):
    """40 and 40.0 are one question."""
    assert reader.of_members(MEMBERS) == reader.of_members({**MEMBERS, "pressure": 40.0, "temperature": 77.0})
    assert type(reader.of_members(MEMBERS).question.pressure) is float


@pytest.mark.parametrize(
    ("members", "site", "pressure", "assumed"),
    [
        ({}, None, 40.0, None),
        ({"units": {"pressure": "barg"}}, None, 4101325.0, 101325.0),
        ({"units": {"pressure": "barg"}}, 95000.0, 4095000.0, None),
        ({"units": {"pressure": "barg"}, "ambient_pressure": 90000}, 95000.0, 4090000.0, None),
        ({"units": {"pressure": "bara"}}, None, 4000000.0, None),
    ],
)
def test_ambient_is_that_of_the_question_then_of_the_site_then_assumed(members, site, pressure, assumed):
    """Only what was neither given nor known is said to be assumed."""
    question = StateReader(Catalogue.load(), site).of_members({**MEMBERS, **members}).question
    assert (pressure, assumed) == (question.pressure, question.ambient_pressure)


def test_all_faults_are_told_at_once(reader):
    """Structure, physics and names are judged together."""
    with pytest.raises(Problem) as caught:
        reader.of_members(
            {"gas": "nitrogenn", "pressure": -1, "temperature": "x", "model": "y", "units": {"density": "z"}, "q": 1}
        )
    pointers = {fault.pointer for fault in caught.value.faults}
    assert {"/gas", "/temperature", "/model", "/units/density", "/q"} <= pointers


def test_a_fault_of_a_query_hides_what_follows_from_it(reader):
    """A pressure that is no number is not missing as well."""
    with pytest.raises(Problem) as caught:
        reader.of_query("gas=nitrogen&pressure=x&temperature=300")
    assert ["/pressure"] == [fault.pointer for fault in caught.value.faults]


@pytest.mark.parametrize(
    "data",
    [
        MEMBERS,
        {**MEMBERS, "units": {"pressure": "barg"}, "model": "reference", "accept_two_phase": False},
        {**MEMBERS, "gas": {"fractions": {"a": 1}}, "ambient_pressure": 1e5, "accuracy": 1e-6},
    ],
)
def test_the_one_pass_and_marshmallow_read_alike(data):
    """The quick way gives the members that marshmallow's own gives."""
    assert Schema.load(StateSchema(), data) == StateSchema().load(data)


def test_the_gas_is_kept_as_it_was_named(reader):
    """Names are looked up by the service, not here."""
    assert reader.of_members({**MEMBERS, "gas": " N2 "}).question.gas == GasSpec(" N2 ")
