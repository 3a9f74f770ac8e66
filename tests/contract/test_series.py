"""``POST /v1/series`` in JSON: the rows of a history, against the single states with that equation named."""

from __future__ import annotations

import csv
import io
import json
import random

import numpy as np
import orjson
import pytest

PLANT = {"units": {"pressure": "barg", "temperature": "degC", "density": "g/L", "molar_volume": "L/mol"}}
GAS = {"fractions": {"methane": 92.0, "nitrogen": 5.0, "carbon-dioxide": 3.0}, "fraction_unit": "%", "basis": "mass"}
MEMBERS = ["gas", "result", "status_code", "phase", "counts", "reasons", "units", "model", "cautions", "trace"]


@pytest.fixture
def ask(client):
    """Return a function that posts a series and returns status and answer."""

    def asked(members, **headers):
        answer = client.post("/v1/series", data=orjson.dumps(members), content_type="application/json", headers=headers)
        return answer.status_code, answer.get_json()

    return asked


def faults(answer):
    return {fault["pointer"] for fault in answer["errors"]}


@pytest.mark.parametrize(
    ("gas", "model", "low", "high"),
    [
        ("nitrogen", "auto", 1.0, 200.0),
        ("propane", "auto", 1.0, 40.0),
        ("carbon-dioxide", "auto", 30.0, 90.0),
        (GAS, "auto", 1.0, 100.0),
        ("ammonia", "peng-robinson", 1.0, 20.0),
    ],
    ids=str,
)
def test_rows_have_the_bits_of_single_states(ask, client, gas, model, low, high):
    """Numbers, region and status in the caller's units, and the words of what is not good."""
    rng = random.Random(11)
    rows = 40
    pressure = [rng.uniform(low, high) for _ in range(rows)]
    temperature = [rng.uniform(-20.0, 60.0) for _ in range(rows)]
    status, answer = ask({"gas": gas, "pressure": pressure, "temperature": temperature, "model": model, **PLANT})
    assert status == 200
    assert list(answer) == MEMBERS
    named = answer["model"]["id"]
    for i in range(rows):
        single = client.post(
            "/v1/state",
            json={"gas": gas, "pressure": pressure[i], "temperature": temperature[i], "model": named, **PLANT},
        ).get_json()
        for member in ("density", "compressibility_factor", "molar_volume"):
            assert single["result"][member] == answer["result"][member][i]
        assert single["phase"]["region"] == answer["phase"]["region"][i]
        assert single["quality"]["status_code"] == answer["status_code"][i]
        told = [] if single["quality"]["level"] == "good" else single["quality"]["reasons"]
        assert told == answer["reasons"].get(str(i), [])
        assert single["gas"] == answer["gas"]
        assert single["units"] == answer["units"]
        assert single["cautions"] == answer["cautions"]
    assert rows == sum(answer["counts"].values())
    assert single["trace"] == answer["trace"]
    assert {"id", "name", "source", "validity", "inside_validity"} <= answer["model"].keys()


def test_the_same_question_has_the_same_bytes(ask):
    """Asked again, and asked in another order."""
    pressure = [1e5, 2e6, 5e6, 3e7]
    first = ask({"gas": "argon", "pressure": pressure, "temperature": 300.0})[1]
    again = ask({"gas": "argon", "pressure": pressure, "temperature": 300.0})[1]
    turned = ask({"gas": "argon", "pressure": pressure[::-1], "temperature": 300.0})[1]
    assert first == again
    assert first["result"]["density"] == turned["result"]["density"][::-1]


def test_missing_and_absurd_rows_are_bad_rows(ask):
    """null, zero and negative, beyond all range, and below absolute zero; the others are answered."""
    pressure = [40, None, 0, -5, 1e30, 40, 40, 40, 1e-90]
    temperature = [300, 300, 300, 300, 300, None, 0, -1e300, 300]
    status, answer = ask({"gas": "nitrogen", "pressure": pressure, "temperature": temperature, "units": {"pressure": "bar"}})
    assert status == 200
    assert {"good": 2, "uncertain": 0, "bad": 7} == answer["counts"]
    for i in range(1, 8):
        assert answer["result"]["density"][i] is None
        assert answer["result"]["compressibility_factor"][i] is None
        assert answer["result"]["molar_volume"][i] is None
        assert answer["status_code"][i] >= 2147483648
        assert ["input_bad"] == answer["reasons"][str(i)]
        assert answer["phase"]["region"][i] == "unknown"
    assert answer["result"]["density"][0] > 0.0
    assert {"0", "8"}.isdisjoint(answer["reasons"])


def test_a_scalar_is_repeated(ask):
    """Of either column, of a status, or of both columns, which is one row."""
    _, answer = ask({"gas": "nitrogen", "pressure": [1e5, 2e5], "temperature": 300, "input_status": 1073741824})
    assert len(answer["result"]["density"]) == 2
    assert {"good": 0, "uncertain": 2, "bad": 0} == answer["counts"]
    _, answer = ask({"gas": "nitrogen", "pressure": 1e5, "temperature": 300})
    assert len(answer["status_code"]) == 1


def test_timestamps_come_back_untouched(ask):
    """Strings, numbers and null, whatever they mean."""
    times = ["2026-01-01T00:00:00Z", 1767225600, 0.5, None, ' "quoted", \u00e4\u4e2d']
    _, answer = ask({"gas": "nitrogen", "pressure": [1e5] * 5, "temperature": 300, "timestamps": times})
    assert times == answer["timestamps"]


@pytest.mark.parametrize(
    ("kind", "codes", "levels"),
    [
        ("opc-ua", [0, 1073741824, 2147483648, 4294967295, None], "good uncertain bad bad bad"),
        ("opc-classic", [192, 64, 0, 216, 68], "good uncertain bad good uncertain"),
    ],
)
def test_input_status_is_carried_through(ask, kind, codes, levels):
    """A bad reading makes a bad row, an uncertain one caps the row at uncertain."""
    question = {"gas": "nitrogen", "pressure": [1e5] * 5, "temperature": 300, "input_status": codes, "input_status_kind": kind}
    _, answer = ask(question)
    found = [("good", "uncertain", "bad")[min(code >> 30, 2)] for code in answer["status_code"]]
    assert levels.split() == found
    assert [level == "bad" for level in found] == [x is None for x in answer["result"]["density"]]


def test_one_equation_serves_the_whole_series(ask):
    """Rows outside its range are uncertain, so that no step appears where the range ends."""
    _, answer = ask({"gas": "nitrogen", "pressure": 1e5, "temperature": [300, 310, 1500]})
    assert answer["model"]["id"] == "reference"
    assert answer["model"]["inside_validity"] is False
    assert ["outside_validity"] == answer["reasons"]["2"]


def test_composition_by_the_row(ask, client):
    """Each row as its own composition asked alone; a bad fraction makes a bad row."""
    fractions = {"methane": [0.9, 0.8, 0.9, None, 0.9, 1.0], "nitrogen": [0.1, 0.2, 0.5, 0.1, 0.102, 0.0], "ethane": 0.0}
    question = {"gas": {"fractions": fractions}, "pressure": 5e6, "temperature": [300, 301, 302, 303, 304, 305]}
    status, answer = ask(question)
    assert status == 200
    assert answer["gas"]["id"] is None
    for i in (0, 1, 4, 5):
        gas = {"fractions": {"methane": fractions["methane"][i], "nitrogen": fractions["nitrogen"][i]}}
        asked = {"gas": gas, "pressure": 5e6, "temperature": 300 + i, "model": answer["model"]["id"]}
        single = client.post("/v1/state", json=asked).get_json()
        assert single["result"]["density"] == answer["result"]["density"][i]
        assert single["gas"]["molar_mass"] == answer["gas"]["molar_mass"][i]
        for id, x in single["gas"]["fractions"].items():
            assert x == answer["gas"]["fractions"][id][i]
    assert ["fractions_bad"] == answer["reasons"]["2"] == answer["reasons"]["3"]
    assert answer["gas"]["molar_mass"][2] is None
    assert ["fractions_scaled"] == answer["reasons"]["4"]


def test_composition_by_the_row_in_other_units(ask, client):
    """Per cent by mass, as for a single state."""
    gas = {"fractions": {"methane": [92.0, 90.0], "nitrogen": [8.0, 10.0]}, "fraction_unit": "%", "basis": "mass"}
    _, answer = ask({"gas": gas, "pressure": 5e6, "temperature": 300})
    for i in range(2):
        one = {**gas, "fractions": {name: column[i] for name, column in gas["fractions"].items()}}
        asked = {"gas": one, "pressure": 5e6, "temperature": 300, "model": answer["model"]["id"]}
        assert client.post("/v1/state", json=asked).get_json()["result"]["density"] == answer["result"]["density"][i]


def test_a_hundred_thousand_rows(ask):
    """In one request; the sum of the counts and the ends of the columns are right."""
    rng = np.random.default_rng(2)
    pressure, temperature = rng.uniform(1e5, 1e7, 100_000), rng.uniform(280.0, 320.0, 100_000)
    question = {"gas": "nitrogen", "pressure": pressure.tolist(), "temperature": temperature.tolist()}
    status, answer = ask(question)
    assert status == 200
    assert answer["counts"]["good"] == 100_000
    few = ask({**question, "pressure": question["pressure"][-3:], "temperature": question["temperature"][-3:]})[1]
    assert few["result"]["density"] == answer["result"]["density"][-3:]


@pytest.mark.parametrize(
    ("members", "pointers"),
    [
        ({"pressure": []}, {"/pressure"}),
        ({"pressure": [1e5, "2e5"]}, {"/pressure/1"}),
        ({"pressure": [True, 1e5]}, {"/pressure/0"}),
        ({"pressure": [[1e5]]}, {"/pressure/0"}),
        ({"pressure": "1e5"}, {"/pressure"}),
        ({"pressure": True}, {"/pressure"}),
        ({"pressure": None}, {"/pressure"}),
        ({"temperature": [300, 301, 302]}, {"/temperature"}),
        ({"timestamps": ["a"]}, {"/timestamps"}),
        ({"timestamps": [{}, "b"]}, {"/timestamps/0"}),
        ({"timestamps": "a"}, {"/timestamps"}),
        ({"input_status": [0, 0.5]}, {"/input_status/1"}),
        ({"input_status": [-1, 4294967296]}, {"/input_status/0", "/input_status/1"}),
        ({"input_status": [0, False]}, {"/input_status/1"}),
        ({"input_status_kind": "opc"}, {"/input_status_kind"}),
        ({"gas": "nitrogem", "pressure": ["x", 1]}, {"/gas", "/pressure/0"}),
        ({"gas": {"fractions": {"methane": [0.5, 0.5, 0.5], "nitrogen": 0.5}}}, {"/gas/fractions/methane"}),
        (
            {"gas": {"fractions": {"methane": ["0.5", 0.5], "nitrogen": True}}},
            {"/gas/fractions/methane/0", "/gas/fractions/nitrogen"},
        ),
        ({"gas": {"fractions": {"methane": [], "nitrogen": 0.5}}}, {"/gas/fractions/methane"}),
        ({"gas": {"fractions": {"methane": [0.5, 0.5], "unobtainium": 0.5}}}, {"/gas/fractions/unobtainium"}),
        ({"gas": {"fractions": {"methane": [1, 1]}, "basis": "volume"}}, {"/gas/basis"}),
        ({"gas": {"fractions": {"methane": [1, 0.5], "ammonia": [0, 0.5]}}, "model": "gerg-2008"}, {"/model"}),
        ({"model": "reference", "gas": GAS}, {"/model"}),
        ({"model": "nonsense"}, {"/model"}),
        ({"units": {"pressure": "bars"}}, {"/units/pressure"}),
        ({"preasure": [1]}, {"/preasure"}),
    ],
    ids=str,
)
def test_what_makes_no_sense_is_refused(ask, members, pointers):
    """With a pointer at every fault."""
    status, answer = ask({"gas": "nitrogen", "pressure": [1e5, 2e5], "temperature": 300, **members})
    assert status == 422
    assert pointers == faults(answer)


def test_thousands_of_faults_make_a_short_answer(client):
    """The first ones are named."""
    body = json.dumps({"gas": "nitrogen", "pressure": ["x"] * 50_000, "temperature": 300})
    answer = client.post("/v1/series", data=body, content_type="application/json")
    assert answer.status_code == 422
    assert len(answer.data) <= 16384


@pytest.mark.parametrize("number", ["NaN", "Infinity", "1e400", "-1e999", "1" + "0" * 400])
def test_numbers_that_are_none_are_refused(client, number):
    """As JSON has it."""
    body = f'{{"gas":"nitrogen","pressure":[1e5,{number}],"temperature":300}}'
    assert client.post("/v1/series", data=body, content_type="application/json").status_code in (400, 422)


def test_csv_may_be_asked_for(client):
    """The columns that were given, then those of the answer with their units."""
    question = {"gas": "nitrogen", "pressure": [40, None], "temperature": [25, 26], "timestamps": ["a,b", None], **PLANT}
    answer = client.post("/v1/series", json=question, headers={"Accept": "text/csv"})
    assert answer.mimetype == "text/csv"
    rows = list(csv.reader(io.StringIO(answer.text)))
    assert rows[0] == [
        "timestamps",
        "pressure [barg]",
        "temperature [degC]",
        "status_code",
        "density [g/L]",
        "compressibility_factor",
        "molar_volume [L/mol]",
        "region",
        "reasons",
    ]
    as_json = client.post("/v1/series", json=question).get_json()
    assert rows[1][:4] == ["a,b", "40.0", "25.0", "0"]
    assert [float(x) for x in rows[1][4:7]] == [column[0] for column in as_json["result"].values()]
    assert rows[2][3:] == ["2157641728", "", "", "", "unknown", "ambient_pressure_assumed input_bad"]


def test_other_ways_to_ask(client):
    """Parameters beside a JSON body, another method, another body, another answer."""
    question = {"gas": "nitrogen", "pressure": [1e5], "temperature": 300}
    assert client.post("/v1/series?gas=argon", json=question).status_code == 422
    assert client.get("/v1/series").status_code == 405
    assert client.post("/v1/series", data=b"x", content_type="text/plain").status_code == 415
    assert client.post("/v1/series", json=question, headers={"Accept": "image/png"}).status_code == 406
    assert client.post("/v1/series", data=b"{", content_type="application/json").status_code == 400


@pytest.mark.parametrize("gas", ["nitrogen", {"fractions": {"methane": 0.9, "ethane": 0.1}}], ids=str)
def test_a_certified_table_on_request(ask, client, gas):
    """Within the error that is allowed and stated; a row is still the single state that allows the same; others are exact."""
    rng = np.random.default_rng(6)
    pressure, temperature = rng.uniform(1e5, 1.5e7, 200).tolist(), rng.uniform(200.0, 400.0, 200).tolist()
    question = {"gas": gas, "pressure": pressure, "temperature": temperature}
    exact, table = ask(question)[1], ask({**question, "accuracy": 1e-6})[1]
    assert "certificate" not in exact
    assert table["certificate"]["accuracy"] == 1e-6
    assert table["certificate"]["table_rows"] > 100
    assert table["certificate"]["largest_error"] <= 5e-7
    pairs = zip(exact["result"]["density"], table["result"]["density"], strict=True)
    errors = [abs(a / b - 1.0) for a, b in pairs if a is not None]
    assert 0.0 < max(errors) <= 1e-6
    for i in range(0, 200, 10):
        asked = {"gas": gas, "pressure": pressure[i], "temperature": temperature[i], "model": table["model"]["id"]}
        single = client.post("/v1/state", json={**asked, "accuracy": 1e-6}).get_json()
        assert single["result"]["density"] == table["result"]["density"][i]
        assert client.post("/v1/state", json=asked).get_json()["result"]["density"] == exact["result"]["density"][i]
