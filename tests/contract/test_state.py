"""``/v1/state`` through a client: members, order, units, forms, and the same bits however it is asked."""

from __future__ import annotations

import io
import json

import pytest
from CoolProp.CoolProp import PropsSI

from gasapi.app import create_app
from gasapi.settings import Settings
from gasapi.web.answer_schemas import StateAnswerSchema

NITROGEN = {"gas": "nitrogen", "pressure": 4101325.0, "temperature": 298.15}
PLANT = {"gas": "nitrogen", "pressure": 40, "temperature": 25, "units": {"pressure": "barg", "temperature": "degC"}}
MIXTURE = {
    "gas": {"fractions": {"methane": 0.92, "nitrogen": 0.05, "carbon-dioxide": 0.03}},
    "pressure": 3e6,
    "temperature": 300.0,
}
PROPANE = {"gas": "propane", "pressure": 9.2e5, "temperature": 300.0}
SOLVENT = {"molar_mass": 86.2, "critical_temperature": 507.6, "critical_pressure": 3025000, "acentric_factor": 0.301}
OWN = {"gas": "my-solvent", "pressure": 1000, "temperature": 400, "substances": {"my-solvent": SOLVENT}}
LIQUID_LINE = {"gas": "propane", "pressure": 5e6, "temperature": 250}
QUESTIONS = [NITROGEN, PLANT, MIXTURE, PROPANE, OWN, LIQUID_LINE, {**PLANT, "input_uncertainty": {"pressure": 0.1}}]
MEMBERS = ["gas", "state", "result", "units", "phase", "model", "sensitivity", "quality", "cautions", "trace"]
LINE = {"Accept": "text/csv; header=absent"}


@pytest.fixture
def ask(client):
    """Return a function that posts a question and returns the answer."""

    def asked(question, **members):
        answer = client.post("/v1/state", json={**question, **members})
        assert answer.status_code == 200, answer.text
        return answer.get_json()

    return asked


def without_trace(answer):
    return {name: value for name, value in answer.items() if name != "trace"}


@pytest.mark.parametrize("question", QUESTIONS, ids=range(len(QUESTIONS)))
def test_answer_conforms_to_its_schema(ask, question):
    """All members are there, of their types, in the order of the contract, and no others."""
    answer = ask(question)
    assert {} == StateAnswerSchema().validate(answer)
    assert list(answer) == MEMBERS


def test_answer_without_a_number_conforms_too(ask):
    """A state beyond all limits is answered 200, with nulls, a bad quality and a reason."""
    answer = ask(NITROGEN, pressure=1e12)
    assert {} == StateAnswerSchema().validate(answer)
    assert answer["quality"]["level"] == "bad"
    assert answer["quality"]["reasons"]
    assert set(answer["result"].values()) == {None}
    assert set(answer["sensitivity"].values()) == {None}


def test_density_of_nitrogen_is_that_of_an_independent_library(ask):
    """Nitrogen at 300 K and 10 MPa, against CoolProp's own form of the same publication."""
    expected = PropsSI("Dmass", "T", 300.0, "P", 1e7, "Nitrogen")
    assert pytest.approx(expected, rel=1e-8) == ask(NITROGEN, pressure=1e7, temperature=300.0)["result"]["density"]


def test_gauge_pressure_is_taken_at_a_standard_atmosphere_and_said_so(ask):
    """40 barg is 4101325 Pa, and the ambient counts as assumed."""
    answer = ask(PLANT)
    assert answer["state"] == {"pressure": 4101325.0, "temperature": 298.15}
    assert "ambient_pressure_assumed" in answer["quality"]["reasons"]
    assert answer["quality"]["level"] == "good"


def test_given_ambient_is_not_assumed(ask):
    """With its ambient stated, a gauge reading is as good as an absolute one."""
    answer = ask(PLANT, ambient_pressure=95000)
    assert answer["state"]["pressure"] == 4095000.0
    assert "ambient_pressure_assumed" not in answer["quality"]["reasons"]


def test_ambient_of_the_site_is_not_assumed(tmp_path):
    """A site file states the ambient pressure once for all gauge readings."""
    site = tmp_path / "site.toml"
    site.write_text("[site]\nambient_pressure = 95000\n")
    client = create_app(Settings(site_file=site)).test_client()
    answer = client.post("/v1/state", json=PLANT).get_json()
    assert answer["state"]["pressure"] == 4095000.0
    assert "ambient_pressure_assumed" not in answer["quality"]["reasons"]


def test_assumed_ambient_lowers_the_level_where_it_is_much_of_the_pressure(ask):
    """At 1 barg half of the absolute pressure is an assumption."""
    assert ask(PLANT, pressure=1)["quality"]["level"] == "uncertain"


def test_every_answer_echoes_the_whole_map_of_units(ask):
    """Units that were not asked are their defaults."""
    units = ask(PLANT)["units"]
    assert (units["pressure"], units["temperature"], units["density"], units["molar_mass"]) == (
        "barg",
        "degC",
        "kg/m3",
        "g/mol",
    )
    assert {"volume", "mass", "amount", "duration", "volume_flow", "mass_flow", "amount_flow"} <= units.keys()


def test_output_units_are_applied_to_every_number(ask):
    """Density, molar volume, molar mass, dew point, margins and derivatives follow their units; margins by the scale alone."""
    si = ask(PROPANE)
    units = {"pressure": "bar", "temperature": "degF", "density": "lb/ft3", "molar_volume": "L/mol", "molar_mass": "kg/mol"}
    us = ask(PROPANE, pressure=9.2, temperature=80.33, units=units)
    assert us["state"] == pytest.approx(si["state"], rel=1e-12)
    pound = 0.45359237 / 0.3048**3  # international pound and foot, exact
    expected = {
        ("result", "density"): 1 / pound,
        ("result", "molar_volume"): 1000.0,
        ("gas", "molar_mass"): 1e-3,
        ("phase", "margin_temperature"): 1.8,
        ("phase", "margin_pressure"): 1e-5,
        ("sensitivity", "density_pressure"): 1e5 / pound,
        ("sensitivity", "density_temperature"): 1 / 1.8 / pound,
    }
    for (part, name), factor in expected.items():
        assert pytest.approx(si[part][name] * factor, rel=1e-9) == us[part][name], name
    assert pytest.approx(si["phase"]["dew_point_temperature"] * 1.8 - 459.67, abs=1e-9) == us["phase"]["dew_point_temperature"]


def test_uncertainty_of_the_inputs_is_a_difference(ask):
    """An uncertainty in barg and degF takes the scale alone, and adds a member to the result."""
    si = ask(NITROGEN, input_uncertainty={"pressure": 5000.0, "temperature": 0.5})
    us = ask(
        NITROGEN,
        pressure=40,
        temperature=77,
        units={"pressure": "barg", "temperature": "degF"},
        input_uncertainty={"pressure": 0.05, "temperature": 0.9},
    )
    assert list(si["result"])[3:] == ["density_expanded_uncertainty"]
    assert pytest.approx(si["result"]["density_expanded_uncertainty"], rel=1e-9) == us["result"]["density_expanded_uncertainty"]
    assert "density_expanded_uncertainty" not in ask(NITROGEN)["result"]
    assert ask(NITROGEN, pressure=1e12, input_uncertainty={})["result"]["density_expanded_uncertainty"] is None


@pytest.mark.parametrize(
    ("query", "question"),
    [
        ("gas=nitrogen&pressure=40&temperature=25&pressure_unit=barg&temperature_unit=degC", PLANT),
        ("fraction.methane=0.92&fraction.nitrogen=0.05&fraction.carbon-dioxide=0.03&pressure=3e6&temperature=300", MIXTURE),
        (
            "fraction.methane=92&fraction.nitrogen=8&fraction_unit=%25&basis=mass&pressure=3000000&temperature=300.0",
            {**MIXTURE, "gas": {"fractions": {"methane": 92, "nitrogen": 8}, "fraction_unit": "%", "basis": "mass"}},
        ),
        (
            "gas=nitrogen&pressure=4101325.0&temperature=298.15&model=peng-robinson&density_unit=lb/ft3&ambient_pressure=90000",
            {**NITROGEN, "model": "peng-robinson", "units": {"density": "lb/ft3"}, "ambient_pressure": 90000},
        ),
        (
            "gas=my-solvent&pressure=1000&temperature=400&substances.my-solvent.molar_mass=86.2"
            "&substances.my-solvent.critical_temperature=507.6&substances.my-solvent.critical_pressure=3025000"
            "&substances.my-solvent.acentric_factor=0.301",
            OWN,
        ),
        (
            "gas=propane&pressure=9.2e5&temperature=300&dew_point_margin=1.5&accept_two_phase=true"
            "&input_uncertainty.pressure=500&input_uncertainty.temperature=0.1",
            {
                **PROPANE,
                "dew_point_margin": 1.5,
                "accept_two_phase": True,
                "input_uncertainty": {"pressure": 500, "temperature": 0.1},
            },
        ),
    ],
)
def test_query_and_body_ask_the_same(client, ask, query, question):
    """Either form of a question has the same answer to the bit."""
    assert without_trace(ask(question)) == without_trace(client.get(f"/v1/state?{query}").get_json())


@pytest.mark.parametrize("question", [PLANT, MIXTURE, {**NITROGEN, "pressure": 1e12}], ids=["plant", "mixture", "bad"])
def test_line_has_the_numbers_of_the_answer(client, ask, question):
    """One CRLF line of status code, density, Z, molar volume and region; empty where null (RFC 4180)."""
    answer = ask(question)
    line = client.post("/v1/state", json=question, headers=LINE)
    assert line.headers["Content-Type"] == "text/csv; header=absent"
    result = answer["result"]
    numbers = [result[name] for name in ("density", "compressibility_factor", "molar_volume")]
    fields = [answer["quality"]["status_code"], *("" if n is None else repr(n) for n in numbers), answer["phase"]["region"]]
    assert ",".join(map(str, fields)) + "\r\n" == line.data.decode("ascii")


@pytest.mark.parametrize(
    ("accept", "form"),
    [
        (None, "application/json"),
        ("*/*", "application/json"),
        ("application/*", "application/json"),
        ("text/csv", "text/csv; header=absent"),
        ("text/*;q=0.4, application/json;q=0.3", "text/csv; header=absent"),
        ("text/csv; header=absent; q=0.2, application/json", "application/json"),
        ("application/json;q=0, */*", "text/csv; header=absent"),
        ("TEXT/CSV; HEADER=ABSENT", "text/csv; header=absent"),
    ],
)
def test_the_caller_chooses_the_form(client, accept, form):
    """Accept is heeded with its qualities and wildcards (RFC 9110, section 12.5.1)."""
    headers = {} if accept is None else {"Accept": accept}
    answer = client.post("/v1/state", json=NITROGEN, headers=headers)
    assert (answer.status_code, answer.headers["Content-Type"]) == (200, form)
    assert answer.headers["Vary"] == "Accept"


def test_a_remembered_answer_differs_in_its_trace_alone(app):
    """Asked again, the bytes are the same but for trace.cached."""
    client = create_app(Settings()).test_client()
    first, second, third = (client.post("/v1/state", json=PLANT).data for _ in range(3))
    assert b'"cached":false' in first
    assert first.replace(b'"cached":false', b'"cached":true') == second == third


def test_the_same_question_in_other_units_is_known_as_solved(app):
    """The solve is held by the question in SI; the answer says so and has the numbers of a fresh one."""
    client = create_app(Settings()).test_client()
    fresh = client.post("/v1/state", json=NITROGEN).get_json()
    again = client.post("/v1/state", json={**NITROGEN, "pressure": 41.01325, "units": {"pressure": "bar"}}).get_json()
    assert (fresh["trace"]["cached"], again["trace"]["cached"]) == (False, True)
    assert fresh["result"] == again["result"]


def test_without_a_memo_the_bytes_are_the_same():
    """Workers with and without a memo, and with and without a history, give the same bytes."""
    one = create_app(Settings(memo_entries=0, memo_bytes=0)).test_client()
    other = create_app(Settings()).test_client()
    for question in reversed(QUESTIONS):
        other.post("/v1/state", json=question)
    for question in QUESTIONS:
        answers = [
            client.post("/v1/state", json=question).data.replace(b'"cached":true', b'"cached":false') for client in (one, other)
        ]
        assert answers[0] == answers[1]


def test_the_edge_and_the_route_of_flask_answer_alike(app):
    """The direct way around Flask gives the bytes and headers that Flask's own route gives."""
    for question in QUESTIONS:
        direct = app.test_client().post("/v1/state", json=question)
        with app.test_request_context("/v1/state", method="POST", json=question):
            routed = app.full_dispatch_request()
        of_the_edge = {"X-Content-Type-Options", "X-Request-ID"}
        headers = [item for item in direct.headers.to_wsgi_list() if item[0] not in of_the_edge]
        assert headers == routed.headers.to_wsgi_list()
        assert without_trace(direct.get_json()) == without_trace(routed.get_json())


@pytest.mark.parametrize("name", ["nitrogen", "NITROGEN", " Nitrogen ", "N2", "7727-37-9"])
def test_a_gas_goes_by_all_its_names(ask, name):
    """Id, name, formula and CAS number mean the same gas, in any case."""
    assert ask(NITROGEN)["result"] == ask(NITROGEN, gas=name)["result"]


def test_numbers_read_back_to_the_same_bits(client):
    """Every number is written in the shortest form that reads back to itself."""
    text = client.post("/v1/state", json=MIXTURE).data.decode()
    numbers: list[str] = []
    json.loads(text, parse_float=numbers.append)
    assert len(numbers) > 10
    assert all(len(repr(float(number))) >= len(number.replace("e", "e+0")) - 3 for number in numbers)
    assert [float(number) for number in numbers] == [float(repr(float(number))) for number in numbers]


def test_head_and_options(client):
    """HEAD has the headers of GET and no body; OPTIONS names the methods."""
    address = "/v1/state?gas=nitrogen&pressure=1e5&temperature=300"
    head, get = client.head(address), client.get(address)
    assert (head.status_code, head.data) == (200, b"")
    assert head.headers["Content-Type"] == get.headers["Content-Type"]
    assert {"GET", "HEAD", "OPTIONS", "POST"} == set(client.options("/v1/state").headers["Allow"].split(", "))


def test_limit_of_a_body_is_a_setting():
    """A body above the limit is refused by its announced length, and in chunks once it has passed the limit."""
    client = create_app(Settings(json_limit=1000)).test_client()
    assert client.post("/v1/state", json={**NITROGEN, "gas": "n" * 900}).status_code == 422
    large = client.post("/v1/state", json={**NITROGEN, "gas": "n" * 1000})
    assert (large.status_code, large.get_json()["status"]) == (413, 413)
    body = json.dumps({**NITROGEN, "gas": "n" * 1000}).encode()
    chunked = client.post(
        "/v1/state",
        input_stream=io.BytesIO(body),
        headers={"Transfer-Encoding": "chunked"},
        content_type="application/json",
        environ_overrides={"wsgi.input_terminated": True},
    )
    assert chunked.status_code == 413
