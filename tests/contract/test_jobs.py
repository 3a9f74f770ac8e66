"""The jobs around a density at the edge: members, units, refusals, and answers by the document. States are invented."""

from __future__ import annotations

import json
from typing import Any

import pytest

PLANT = {"pressure": "barg", "temperature": "degC"}
ENVELOPE = ["gas", "result", "units", "phase", "model", "quality", "cautions", "trace"]

FLOW = {
    "gas": "nitrogen",
    "pressure": 40,
    "temperature": 25,
    "units": PLANT,
    "flow": {"kind": "actual_volume", "value": 120, "unit": "m3/h"},
    "reference": "din-1343",
}
VESSEL = {"gas": "argon", "volume": 0.05, "pressure": 200, "temperature": 15, "units": PLANT, "reference": "iso-13443"}
DECAY = {
    "gas": "air",
    "volume": 0.5,
    "duration": 43200,
    "start": {"pressure": 6.0, "temperature": 21.0},
    "end": {"pressure": 5.91, "temperature": 18.5},
    "units": PLANT,
}
FRACTION = {"gases": ["hydrogen", "nitrogen"], "density": 0.6, "pressure": 4e5, "temperature": 313.15}
MASS = {"density": 1.145, "pressure": 101325, "temperature": 298.15}
COMPARISON = {"gas": "carbon dioxide", "pressure": 50e5, "temperature": 310}
TABLE = {
    "gas": "nitrogen",
    "pressure": [1, 60],
    "temperature": [-20, 80],
    "units": {"pressure": "bar", "temperature": "degC"},
    "tolerance": 0.01,
}
GOOD: dict[str, dict[str, Any]] = {
    "flow": FLOW,
    "vessel": VESSEL,
    "pressure-decay": DECAY,
    "fraction-from-density": FRACTION,
    "molar-mass": MASS,
    "comparison": COMPARISON,
    "lookup-table": TABLE,
}
MEMBERS = {
    "flow": ["actual_volume", "reference_volume", "mass", "amount"],
    "vessel": ["mass", "amount", "reference_volume"],
    "pressure-decay": [
        "lost_mass",
        "leak_rate",
        "lost_mass_expanded_uncertainty",
        "leak_rate_expanded_uncertainty",
        "resolved",
    ],
    "fraction-from-density": ["mole_fraction", "molar_mass", "explained"],
    "molar-mass": [
        "molar_mass",
        "molar_mass_ideal",
        "compressibility_factor",
        "molar_mass_expanded_uncertainty",
        "candidates",
    ],
    "comparison": ["models"],
    "lookup-table": ["property", "pressure", "temperature", "values", "max_relative_error"],
}


@pytest.fixture
def ask(client):
    def asked(job, **changes):
        question = {name: value for name, value in {**GOOD[job], **changes}.items() if value is not None}
        response = client.post(f"/v1/{job}", json=question)
        assert 200 == response.status_code, response.text
        return response.get_json()

    return asked


@pytest.fixture
def refuse(client):
    def refused(job, **changes):
        question = {name: value for name, value in {**GOOD[job], **changes}.items() if value is not None}
        response = client.post(f"/v1/{job}", json=question)
        assert (422, "application/problem+json") == (response.status_code, response.content_type), response.text
        return {fault["pointer"]: fault["detail"] for fault in response.get_json()["errors"]}

    return refused


@pytest.mark.parametrize("job", GOOD)
def test_answers_carry_what_a_state_carries(client, ask, job):
    """Gas, units, model, phase, quality, cautions and trace as a state has them, and the result of the job."""
    answer = ask(job)
    state = client.post("/v1/state", json={"gas": "nitrogen", "pressure": 1e5, "temperature": 300}).get_json()
    assert ENVELOPE == list(answer)
    for name in ("phase", "model", "quality", "trace"):
        assert list(state[name]) == list(answer[name])
    assert state["units"].keys() == answer["units"].keys()
    assert MEMBERS[job] == list(answer["result"])[: len(MEMBERS[job])]
    assert answer["cautions"]


@pytest.mark.parametrize("job", GOOD)
def test_the_same_question_has_the_same_answer(client, job):
    """Byte for byte."""
    first, second = (client.post(f"/v1/{job}", json=GOOD[job]).data for _ in range(2))
    assert first == second


@pytest.mark.parametrize("job", GOOD)
def test_requests_are_judged_as_everywhere(client, job):
    """400, 405, 406, 415 and 422 as for a state, a member given twice and an unknown one included."""
    path = f"/v1/{job}"
    good = json.dumps(GOOD[job]).encode()
    assert 400 == client.post(path, data=b"{", content_type="application/json").status_code
    assert 405 == client.get(path).status_code
    assert 406 == client.post(path, json=GOOD[job], headers={"Accept": "image/png"}).status_code
    assert 415 == client.post(path, data=good, content_type="text/plain").status_code
    assert 422 == client.post(path + "?gas=nitrogen", json=GOOD[job]).status_code
    twice = good[:-1] + b', "temperature": 300}'
    once = good if b'"temperature"' in good else None
    if once is not None:
        assert 422 == client.post(path, data=twice, content_type="application/json").status_code
    problem = client.post(path, json={**GOOD[job], "presure": 1}).get_json()
    assert ["/presure"] == [fault["pointer"] for fault in problem["errors"]]


@pytest.mark.parametrize("job", GOOD)
@pytest.mark.parametrize("value", ["40", True, None, [], {}, float("nan")])
def test_numbers_are_numbers(client, job, value):
    """A pressure as text, a boolean, null, an array, an object or NaN is 422 and points at it."""
    question = dict(GOOD[job])
    if job == "pressure-decay":
        question["start"] = {"pressure": value, "temperature": 20}
    elif job == "lookup-table":
        question["pressure"] = [1, value]
    else:
        question["pressure"] = value
    response = client.post(f"/v1/{job}", data=json.dumps(question), content_type="application/json")
    assert 422 == response.status_code
    assert any("pressure" in fault["pointer"] for fault in response.get_json()["errors"])


def test_flow_in_units_of_the_answer_and_not_of_the_question(ask):
    """Without a unit in units the answer is in SI, though the question was in m3/h."""
    result = ask("flow")["result"]
    assert 120.0 / 3600.0 == pytest.approx(result["actual_volume"], rel=1e-14)
    units = {**PLANT, "volume_flow": "m3/h", "mass_flow": "kg/h", "amount_flow": "kmol/h"}
    answer = ask("flow", units=units)
    assert 120.0 == pytest.approx(answer["result"]["actual_volume"], rel=1e-14)
    assert result["mass"] * 3600.0 == pytest.approx(answer["result"]["mass"], rel=1e-14)
    assert "kg/h" == answer["units"]["mass_flow"]


def test_flow_without_a_unit_is_in_that_of_units(ask):
    """And in SI without that."""
    flow = {"kind": "mass", "value": 3600}
    assert 3600.0 == ask("flow", flow=flow)["result"]["mass"]
    assert 3600.0 == pytest.approx(ask("flow", flow=flow, units={**PLANT, "mass_flow": "kg/h"})["result"]["mass"], rel=1e-15)


def test_meter_members_come_with_a_meter_only(ask):
    """The correction factor, by density and by design state."""
    assert "correction_factor" not in ask("flow")["result"]
    density = {"principle": "volumetric", "design_density": 40.0}
    state = {"principle": "differential_pressure", "design": {"pressure": 40, "temperature": 25}}
    assert ask("flow", meter=density)["result"]["correction_factor"] == pytest.approx(46.5433 / 40.0, rel=1e-5)
    assert 1.0 == ask("flow", meter=state)["result"]["correction_factor"]


def test_reference_condition_by_name_or_by_numbers(ask):
    """The two forms say the same."""
    numbers = {"temperature": 273.15, "pressure": 101325}
    assert ask("flow")["result"] == ask("flow", reference=numbers)["result"]
    assert None is ask("flow", reference=None)["result"]["reference_volume"]


@pytest.mark.parametrize(
    ("changes", "pointer", "words"),
    [
        ({"flow": {"kind": "mass", "value": 1, "unit": "m3/h"}}, "/flow/unit", "no unit of mass flow"),
        ({"flow": {"kind": "speed", "value": 1}}, "/flow/kind", "is not one of"),
        ({"flow": {"kind": "mass"}}, "/flow/value", "missing"),
        ({"flow": 12}, "/flow", "is not an object such as"),
        ({"flow": {"kind": "reference_volume", "value": 1}, "reference": None}, "/reference", "needs the reference condition"),
        ({"reference": "din"}, "/reference", "known: din-1343"),
        ({"reference": {"temperature": 0, "pressure": 1}}, "/reference/temperature", "above 0"),
        ({"meter": {"principle": "volumetric"}}, "/meter/design_density", "give either"),
        ({"meter": {"principle": "magic", "design_density": 1}}, "/meter/principle", "is not one of"),
        ({"meter": {"principle": "volumetric", "design_density": 0}}, "/meter/design_density", "above 0"),
        (
            {"meter": {"principle": "volumetric", "design": {"pressure": -3, "temperature": 20}}},
            "/meter/design/pressure",
            "above 0 Pa",
        ),
        ({"gas": "nitrogne"}, "/gas", "nearest names: nitrogen"),
        ({"model": "gerg-2008", "gas": "silane"}, "/model", "cannot serve"),
        ({"pressure": -2}, "/pressure", "above 0 Pa"),
    ],
)
def test_flow_refusals(refuse, changes, pointer, words):
    """Each with its pointer and the words that help."""
    faults = refuse("flow", **changes)
    assert words in faults[pointer]


@pytest.mark.parametrize("volume", [0, -1])
def test_a_vessel_without_volume_is_refused(refuse, volume):
    """With the sentence that a technician needs."""
    assert "inner (water) volume" in refuse("vessel", volume=volume)["/volume"]
    assert "inner (water) volume" in refuse("pressure-decay", volume=volume)["/volume"]


def test_vessel_with_later_state_and_draw_off(ask):
    """Used and usable content and the duration appear with what asks for them."""
    units = {**PLANT, "volume": "L", "duration": "h"}
    plain = ask("vessel", volume=50, units=units)["result"]
    assert ["mass", "amount", "reference_volume"] == list(plain)
    draw_off = {"kind": "reference_volume", "value": 12, "unit": "L/min", "minimum_pressure": 20}
    result = ask("vessel", volume=50, units=units, draw_off=draw_off, later={"pressure": 120, "temperature": 12})["result"]
    assert plain["mass"] == result["mass"]
    assert result["usable_reference_volume"] / 12.0 / 60.0 == pytest.approx(result["duration"], rel=1e-12)
    assert 0.0 < result["used_mass"] < result["usable_mass"] < result["mass"]


@pytest.mark.parametrize(
    ("changes", "pointer"),
    [
        ({"draw_off": {"kind": "mass", "value": 1, "minimum_pressure": 200}}, "/draw_off/minimum_pressure"),
        ({"draw_off": {"kind": "mass", "value": 0, "minimum_pressure": 20}}, "/draw_off/value"),
        ({"draw_off": {"kind": "actual_volume", "value": 1, "minimum_pressure": 20}}, "/draw_off/kind"),
        ({"draw_off": {"kind": "reference_volume", "value": 1, "minimum_pressure": 20}, "reference": None}, "/reference"),
        ({"later": {"pressure": 100}}, "/later/temperature"),
        ({"later": {"pressure": 100, "temperature": -300}}, "/later/temperature"),
    ],
)
def test_vessel_refusals(refuse, changes, pointer):
    """Each points at its member."""
    assert pointer in refuse("vessel", **changes)


def test_a_drifting_barometer_is_no_leak(ask):
    """Gauge readings with their own ambient pressures: the same absolute state loses nothing."""
    start = {"pressure": 6.0, "temperature": 20, "ambient_pressure": 101300}
    end = {"pressure": 6.008, "temperature": 20, "ambient_pressure": 100500}
    assert 0.0 == pytest.approx(ask("pressure-decay", start=start, end=end)["result"]["lost_mass"], abs=1e-12)
    apparent = ask("pressure-decay", start=start, end={**end, "ambient_pressure": 101300})["result"]["lost_mass"]
    assert apparent < -1e-3


def test_a_warmer_end_is_answered_with_a_warning(ask):
    """It is no fault of the request."""
    answer = ask("pressure-decay", end={"pressure": 5.91, "temperature": 25})
    assert answer["result"]["lost_mass"] > 0.0
    assert "end_warmer_than_start" in [warning["code"] for warning in answer["phase"]["warnings"]]


def test_decay_uncertainty_is_null_without_readings_uncertainty(ask):
    """And the rest of the units follow the question's map."""
    result = ask("pressure-decay")["result"]
    assert [None] * 3 == [result[n] for n in MEMBERS["pressure-decay"][2:]]
    units = {**PLANT, "mass": "g", "mass_flow": "g/h", "duration": "h"}
    stated = ask("pressure-decay", duration=12, units=units, input_uncertainty={"pressure": 0.003, "temperature": 0.15})[
        "result"
    ]
    assert 1000.0 * result["lost_mass"] == pytest.approx(stated["lost_mass"], rel=1e-13)
    assert stated["lost_mass"] / 12.0 == pytest.approx(stated["leak_rate"], rel=1e-12)
    assert stated["resolved"] is (stated["lost_mass"] > stated["lost_mass_expanded_uncertainty"])
    assert 10.0 * stated["throughput_pa_m3_per_s"] == stated["throughput_mbar_l_per_s"]


def test_leak_limits_in_both_kinds_of_units(ask, refuse):
    """A throughput or a mass flow."""
    given = {"input_uncertainty": {"pressure": 0.003, "temperature": 0.15}}
    one = ask("pressure-decay", leak_limit={"value": 1, "unit": "mbar L/s"}, **given)["result"]["duration_to_resolve"]
    other = ask("pressure-decay", leak_limit={"value": 0.1, "unit": "Pa m3/s"}, **given)["result"]["duration_to_resolve"]
    assert one == pytest.approx(other, rel=1e-14)
    assert 0.0 < ask("pressure-decay", leak_limit={"value": 1, "unit": "g/h"}, **given)["result"]["duration_to_resolve"]
    assert "known: Pa m3/s" in refuse("pressure-decay", leak_limit={"value": 1, "unit": "L/s"})["/leak_limit/unit"]


@pytest.mark.parametrize(
    ("changes", "pointer"),
    [
        ({"duration": 0}, "/duration"),
        ({"start": {"pressure": 6}}, "/start/temperature"),
        ({"end": {"pressure": -6, "temperature": 20}}, "/end/pressure"),
        ({"end": None}, "/end"),
        ({"input_uncertainty": {"pressure": -1}}, "/input_uncertainty/pressure"),
        ({"correlation": {"pressure": 1.5}}, "/correlation/pressure"),
    ],
)
def test_decay_refusals(refuse, changes, pointer):
    """Each points at its member."""
    assert pointer in refuse("pressure-decay", **changes)


def test_fraction_leads_back_through_the_service(client, ask):
    """A state of the mixture gives the density, the density gives the fraction."""
    gas = {"fractions": {"hydrogen": 0.7, "nitrogen": 0.3}}
    state = client.post("/v1/state", json={"gas": gas, "pressure": 4e5, "temperature": 313.15}).get_json()
    answer = ask("fraction-from-density", density=state["result"]["density"])
    assert 0.7 == pytest.approx(answer["result"]["mole_fraction"], abs=1e-10)
    assert state["gas"]["molar_mass"] == pytest.approx(answer["result"]["molar_mass"], rel=1e-9)
    assert state["phase"]["region"] == answer["phase"]["region"]


def test_fraction_that_nothing_explains(ask):
    """explained is false, the numbers are null, and a sentence says what to check."""
    answer = ask("fraction-from-density", density=50)
    assert {"mole_fraction": None, "molar_mass": None, "explained": False} == answer["result"]
    assert "reading_not_explained" in [warning["code"] for warning in answer["phase"]["warnings"]]


@pytest.mark.parametrize(
    ("changes", "pointer"),
    [
        ({"gases": ["hydrogen"]}, "/gases"),
        ({"gases": ["hydrogen", 3]}, "/gases/1"),
        ({"gases": ["hydrogen", "nitrogne"]}, "/gases/1"),
        ({"gases": ["nitrogen", "N2"]}, "/gases"),
        ({"density": 0}, "/density"),
        ({"density": None}, "/density"),
        ({"gas": "nitrogen"}, "/gas"),
        ({"model": "reference"}, "/model"),
        ({"model": "magic"}, "/model"),
    ],
)
def test_fraction_refusals(refuse, changes, pointer):
    """Each points at its member."""
    assert pointer in refuse("fraction-from-density", **changes)


def test_molar_mass_by_density_and_by_weighing(ask):
    """d = m / V."""
    by_density = ask("molar-mass")["result"]
    units = {"mass": "g", "volume": "L"}
    weighed = ask("molar-mass", density=None, mass=1.145, volume=1, units=units)["result"]
    assert by_density["molar_mass"] == pytest.approx(weighed["molar_mass"], rel=1e-13)
    assert [c["id"] for c in by_density["candidates"]] == [c["id"] for c in weighed["candidates"]]


def test_molar_mass_warns_before_it_names(ask):
    """Toxic candidates are flagged and told first; the gas is null where none was named."""
    answer = ask("molar-mass")
    assert None is answer["gas"]
    toxic = [c["id"] for c in answer["result"]["candidates"] if c["toxic"]]
    assert "carbon-monoxide" in toxic
    assert "never a proof of identity" in answer["cautions"][0]
    assert "Carbon monoxide" in answer["cautions"][0]
    assert "uncertain" == answer["quality"]["level"]
    like = ask("molar-mass", like="nitrogen")
    assert ("nitrogen", "good") == (like["gas"]["id"], like["quality"]["level"])
    assert like["result"]["compressibility_factor"] != 1.0


@pytest.mark.parametrize(
    ("changes", "pointer"),
    [
        ({"density": None}, "/density"),
        ({"mass": 1}, "/density"),
        ({"density": None, "mass": 1}, "/density"),
        ({"density": None, "mass": 1, "volume": 0}, "/volume"),
        ({"like": "nitrogne"}, "/like"),
        ({"like": {"fractions": {"nitrogne": 1}}}, "/like/fractions/nitrogne"),
        ({"like": {"fractions": {"nitrogen": 0.5}}}, "/like/fractions"),
        ({"input_uncertainty": {"mass": 1}}, "/input_uncertainty/mass"),
        ({"gas": "nitrogen"}, "/gas"),
    ],
)
def test_molar_mass_refusals(refuse, changes, pointer):
    """Each points at its member."""
    assert pointer in refuse("molar-mass", **changes)


def test_comparison_members(ask):
    """Every model that can serve, each with the members of the contract; the selected one differs by nothing."""
    answer = ask("comparison")
    models = {m["id"]: m for m in answer["result"]["models"]}
    assert {"ideal-gas", "reference", "peng-robinson", "gerg-2008", "lee-kesler"} <= models.keys()
    members = ["id", "density", "compressibility_factor", "relative_difference", "relative_uncertainty", "inside_validity"]
    for model in models.values():
        assert members == list(model)
    assert 0.0 == models[answer["model"]["id"]]["relative_difference"]
    assert 1.0 == pytest.approx(models["ideal-gas"]["compressibility_factor"], rel=1e-14)


def test_comparison_is_asked_as_a_state(client, ask):
    """With all of its members."""
    more = {"input_uncertainty": {"pressure": 100}, "dew_point_margin": 2, "accept_two_phase": True, "accuracy": 1e-6}
    state = client.post("/v1/state", json={**COMPARISON, "model": "reference"}).get_json()
    selected = next(m for m in ask("comparison", **more)["result"]["models"] if m["id"] == "reference")
    assert state["result"]["density"] == selected["density"]


def test_table_as_json(ask):
    """Axes from end to end, a row for each pressure, the error within the tolerance."""
    result = ask("lookup-table", temperature=[-20.1, 80], tolerance=0.001)["result"]
    assert (1.0, 60.0) == (result["pressure"][0], result["pressure"][-1])
    assert (-20.1, 80.0) == (result["temperature"][0], result["temperature"][-1])
    for axis in (result["pressure"], result["temperature"]):
        assert sorted(set(axis)) == axis
    assert [len(result["temperature"])] * len(result["pressure"]) == [len(row) for row in result["values"]]
    assert 0.0 < result["max_relative_error"] <= 0.001
    assert result["bytes"] < 2000


def test_table_as_csv_is_the_table_as_json(client, ask):
    """First row and column are the axes."""
    result = ask("lookup-table")["result"]
    response = client.post("/v1/lookup-table", json={**TABLE, "format": "csv"})
    assert "text/csv; header=present" == response.content_type
    rows = [line.split(",") for line in response.text.split("\r\n")]
    assert [""] == rows.pop()
    assert result["temperature"] == [float(x) for x in rows[0][1:]]
    assert result["pressure"] == [float(row[0]) for row in rows[1:]]
    assert result["values"] == [[float(x) for x in row[1:]] for row in rows[1:]]


def test_table_as_structured_text(client):
    """A function block in ASCII, named as asked, dated today."""
    response = client.post("/v1/lookup-table", json={**TABLE, "format": "st", "name": "N2_line_3"})
    assert "text/plain; charset=us-ascii" == response.content_type
    assert response.text.startswith("FUNCTION_BLOCK N2_line_3\n")
    assert response.text.isascii()
    assert "    density : REAL; (* kg/m3 *)" in response.text


@pytest.mark.parametrize("of", ["compressibility_factor", "molar_volume"])
def test_output_is_named_after_the_property(client, of):
    """The two others as well."""
    text = client.post("/v1/lookup-table", json={**TABLE, "pressure": [10, 20], "format": "st", "property": of}).text
    assert f"    {of} : REAL;" in text
    assert f"    {of} := low + u * (high - low);" in text


@pytest.mark.parametrize(
    ("changes", "pointer", "words"),
    [
        ({"pressure": [60, 1]}, "/pressure", "low end first"),
        ({"temperature": [20, 20]}, "/temperature", "low end first"),
        ({"pressure": [1]}, "/pressure", "two numbers"),
        ({"pressure": [0, 10]}, "/pressure/0", "above 0 Pa"),
        ({"temperature": [-300, 10]}, "/temperature/0", "above 0 K"),
        ({"tolerance": 1e-7}, "/tolerance", "32-bit"),
        ({"tolerance": None}, "/tolerance", "missing"),
        ({"property": "viscosity"}, "/property", "is not one of"),
        ({"format": "xml"}, "/format", "is not one of"),
        ({"name": "1st"}, "/name", "IEC 61131-3"),
        ({"name": "END_VAR"}, "/name", "keyword"),
        ({"name": "density"}, "/name", "keyword"),
        ({"gas": "carbon dioxide"}, "/pressure", "two phases at"),
        ({"pressure": [1, 1.000001]}, "/pressure", "32-bit arithmetic cannot divide"),
    ],
)
def test_table_refusals(refuse, changes, pointer, words):
    """Each points at its member and says what would be right."""
    assert words in refuse("lookup-table", **changes)[pointer]


def test_a_refused_range_names_a_state_that_is_two_phase(client, refuse):
    """In the units of the question; beside it the service finds liquid and gas."""
    detail = refuse("lookup-table", gas="carbon dioxide")["/pressure"]
    place = detail.partition(" at ")[2]
    pressure, temperature = float(place.split(" bar")[0]), float(place.partition("and ")[2].split(" degC")[0])
    regions = [
        client.post(
            "/v1/state",
            json={"gas": "carbon dioxide", "pressure": pressure, "temperature": temperature + d, "units": TABLE["units"]},
        ).get_json()["phase"]["region"]
        for d in (-0.01, 0.01)
    ]
    assert ["liquid", "gas"] == regions


@pytest.mark.parametrize(("pressure", "temperature"), [(1e-300, 10175.8), (101325, 1e300), (1e300, 300), (1e-300, 1e-300)])
@pytest.mark.parametrize("job", [*(job for job in GOOD if job != "lookup-table"), "pressure-decay"])
def test_absurd_states_are_never_a_failure(client, job, pressure, temperature):
    """Bad, or refused, or answered where the ideal limit still holds; never a 500."""
    state = {"pressure": pressure, "temperature": temperature}
    question = {**GOOD[job], "units": {}, **({"start": state, "end": state} if job == "pressure-decay" else state)}
    assert client.post(f"/v1/{job}", json=question).status_code in (200, 422)
    table = {**TABLE, "units": {}, "pressure": [pressure, 2.0 * pressure], "temperature": [temperature, 2.0 * temperature]}
    assert client.post("/v1/lookup-table", json=table).status_code in (200, 422)


@pytest.mark.parametrize("job", ["flow", "vessel", "pressure-decay", "comparison", "molar-mass", "fraction-from-density"])
def test_a_bad_state_has_null_results(ask, job):
    """Far beyond every equation: null numbers and level bad, status 200."""
    changes: dict[str, Any] = {"pressure": 1e12, "units": {}}
    if job == "pressure-decay":
        changes = {"start": {"pressure": 1e12, "temperature": 300}, "units": {}}
    if job == "molar-mass":
        changes |= {"like": "nitrogen"}
    changes.setdefault("temperature", None if job == "pressure-decay" else 300)
    answer = ask(job, **changes)
    assert "bad" == answer["quality"]["level"]
    if job != "comparison":
        assert {None} == set(answer["result"].values())


def test_substances_of_the_question(ask):
    """A solvent that the catalogue lacks, in a flow and in a blend."""
    solvent = {
        "my-solvent": {"molar_mass": 86.2, "critical_temperature": 507.6, "critical_pressure": 3025000, "acentric_factor": 0.3}
    }
    flow = ask("flow", gas="my-solvent", substances=solvent, pressure=0.2, temperature=120)
    assert ("my-solvent", 86.2) == (flow["gas"]["id"], pytest.approx(flow["gas"]["molar_mass"]))
    blend = ask("fraction-from-density", gases=["my-solvent", "nitrogen"], substances=solvent, density=5, temperature=400)
    assert 0.0 < blend["result"]["mole_fraction"] < 1.0


def test_assumed_ambient_pressure_is_told(ask):
    """A gauge reading without it says so, with it not."""
    assert "ambient_pressure_assumed" in ask("flow")["quality"]["reasons"]
    assert "ambient_pressure_assumed" not in ask("flow", ambient_pressure=101325)["quality"]["reasons"]
    assert "ambient_pressure_assumed" in ask("lookup-table", units={**TABLE["units"], "pressure": "barg"})["quality"]["reasons"]


def test_numbers_stay_where_things_exist(refuse):
    """What would leave the range of a double on the way is told, and never becomes a null without a reason."""
    assert "/flow/value" in refuse("flow", flow={"kind": "mass", "value": 1e308, "unit": "t/h"})
    assert "/flow/value" in refuse("flow", flow={"kind": "amount", "value": -1e300})
    assert "/volume" in refuse("vessel", volume=1e300)
    assert "/volume" in refuse("pressure-decay", volume=1e-300)
    assert "/duration" in refuse("pressure-decay", duration=1e-300)
    assert "/density" in refuse("molar-mass", density=1e300)
    assert "/input_uncertainty/density" in refuse("molar-mass", input_uncertainty={"density": 1e300})
    assert "/input_uncertainty/pressure" in refuse("flow", input_uncertainty={"pressure": 1e300})
    assert "/leak_limit/value" in refuse("pressure-decay", leak_limit={"value": 1e-300, "unit": "kg/s"})
    assert "/meter/design_density" in refuse("flow", meter={"principle": "volumetric", "design_density": 1e-300})


def test_phase_boundary_members_and_units(client):
    """Arrays of one length, named points, gauge pressures with their ambient, and the envelope of every job."""
    units = {"pressure": "barg", "temperature": "degC"}
    question = {"gas": "propane", "units": units, "ambient_pressure": 100000}
    answer = client.post("/v1/phase-boundary", json=question).get_json()
    plain = client.post("/v1/phase-boundary", json={"gas": "propane"}).get_json()
    assert ENVELOPE == list(answer)
    result = answer["result"]
    assert len(result["temperature"]) == len(result["pressure"]) > 50
    for p, gauge in zip(plain["result"]["pressure"], result["pressure"], strict=True):
        assert (p - 100000.0) / 1e5 == pytest.approx(gauge, abs=1e-12)
    critical, si = result["points"]["critical"], plain["result"]["points"]["critical"]
    assert si["temperature"] - 273.15 == pytest.approx(critical["temperature"], abs=1e-9)
    # the normal boiling point of propane is -42.1 degC in handbooks (from memory)
    at = min(range(len(result["pressure"])), key=lambda i: abs(plain["result"]["pressure"][i] - 101325.0))
    assert -42.1 == pytest.approx(result["temperature"][at], abs=3.0)


def test_phase_boundary_of_a_mixture(client):
    """Named points and the water dew line of a wet gas."""
    gas = {"fractions": {"methane": 0.949, "ethane": 0.05, "water": 0.001}}
    result = client.post("/v1/phase-boundary", json={"gas": gas}).get_json()["result"]
    assert {"cricondentherm", "cricondenbar"} <= result["points"].keys()
    assert len(result["water_dew"]["temperature"]) == len(result["water_dew"]["pressure"]) > 0


def test_phase_boundary_refusals(client):
    """A state is no member of it."""
    response = client.post("/v1/phase-boundary", json={"gas": "propane", "pressure": 1e5})
    assert 422 == response.status_code
    assert ["/pressure"] == [fault["pointer"] for fault in response.get_json()["errors"]]
    assert 422 == client.post("/v1/phase-boundary", json={}).status_code


def test_two_phases_that_are_accepted_have_numbers_and_no_uncertainty(client):
    """A mixture inside its boundary, asked with accept_two_phase: uncertain, never a failure of the service."""
    gas = {"fractions": {"methane": 0.85, "ethane": 0.08, "n-butane": 0.07}}
    inside = {"pressure": 50e5, "temperature": 270.0}
    common = {"gas": gas, "accept_two_phase": True}
    state = client.post("/v1/state", json={**common, **inside}).get_json()
    assert "two-phase" == state["phase"]["region"]
    uncertain = {"input_uncertainty": {"pressure": 100, "temperature": 0.1}}
    vessel = client.post("/v1/vessel", json={**common, **inside, "volume": 2, **uncertain}).get_json()
    assert 2.0 * state["result"]["density"] == pytest.approx(vessel["result"]["mass"], rel=1e-12)
    assert "uncertain" == vessel["quality"]["level"]
    decay = {**common, "volume": 1, "duration": 60, "start": inside, "end": {**inside, "pressure": 49e5}, **uncertain}
    answer = client.post("/v1/pressure-decay", json=decay).get_json()
    assert answer["result"]["lost_mass"] is not None
    assert None is answer["result"]["resolved"]
    like = {"density": 40, **inside, "like": gas, "accept_two_phase": True}
    assert "bad" == client.post("/v1/molar-mass", json=like).get_json()["quality"]["level"]
