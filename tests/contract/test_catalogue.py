"""The catalogue through a client."""

from __future__ import annotations

import pytest

from gasapi.web import answer_schemas


@pytest.mark.parametrize(
    ("path", "schema"),
    [
        ("/v1/gases", answer_schemas.GasListSchema),
        ("/v1/gases?search=cyanogen", answer_schemas.GasListSchema),
        ("/v1/gases/nitrogen", answer_schemas.GasEntrySchema),
        ("/v1/gases/compressed-air", answer_schemas.GasEntrySchema),
        ("/v1/models", answer_schemas.ModelListSchema),
        ("/v1/units", answer_schemas.UnitTableSchema),
        ("/v1/reference-conditions", answer_schemas.ReferenceConditionListSchema),
        ("/livez", answer_schemas.HealthSchema),
        ("/readyz", answer_schemas.HealthSchema),
    ],
)
def test_answer_conforms_to_its_schema(client, path, schema):
    """Members and types are those of the OpenAPI document."""
    answer = client.get(path)
    assert (answer.status_code, answer.headers["Content-Type"]) == (200, "application/json")
    assert {} == schema().validate(answer.get_json())


def test_every_gas_of_the_list_has_an_entry(client):
    """All gases are listed, and the entry of each conforms, names an equation, and has its constants with sources."""
    gases = client.get("/v1/gases").get_json()["gases"]
    assert len(gases) >= 350
    schema = answer_schemas.GasEntrySchema()
    for gas in gases:
        entry = client.get(f"/v1/gases/{gas['id']}").get_json()
        assert {} == schema.validate(entry), gas["id"]
        assert entry["models"]
        assert entry["molar_mass"]["unit"] == "g/mol"
        assert entry["molar_mass"]["source"]


def test_cyanogen(client):
    """Cyanogen, 460-19-5, has 52 g/mol (IUPAC atomic weights: 2 * 12.011 + 2 * 14.007) and is toxic."""
    entry = client.get("/v1/gases/460-19-5").get_json()
    assert entry["id"] == "cyanogen"
    assert pytest.approx(52.036, abs=2e-3) == entry["molar_mass"]["value"]
    assert "toxic" in entry["hazard_tags"]


def test_van_der_waals_constants_are_in_si(client):
    """Nitrogen: 1.370 L2 bar/mol2 and 0.0387 L/mol (CRC Handbook of Chemistry and Physics, van der Waals constants)."""
    entry = client.get("/v1/gases/nitrogen").get_json()
    assert pytest.approx(0.1370, rel=0.01) == entry["van_der_waals_a"]["value"]
    assert pytest.approx(3.87e-5, rel=0.01) == entry["van_der_waals_b"]["value"]
    assert (entry["van_der_waals_a"]["unit"], entry["van_der_waals_b"]["unit"]) == ("Pa m6/mol2", "m3/mol")


def test_search_finds_by_part_of_a_name(client):
    """A part of a synonym, a formula or a CAS number finds the gas."""
    for text in ("mmoni", "NH3", "7664-41-7"):
        found = client.get("/v1/gases", query_string={"search": text}).get_json()["gases"]
        assert "ammonia" in [gas["id"] for gas in found]


def test_models_are_those_of_the_contract(client):
    """Eight equations, each with its source."""
    models = client.get("/v1/models").get_json()["models"]
    assert {m["id"] for m in models} == {
        "ideal-gas",
        "van-der-waals",
        "virial",
        "soave-redlich-kwong",
        "peng-robinson",
        "lee-kesler",
        "reference",
        "gerg-2008",
    }
    assert all(m["source"] for m in models)


def test_unit_table_tells_the_factors_that_are_used(client):
    """760 Torr by the table are an atmosphere."""
    pressure = client.get("/v1/units").get_json()["quantities"]["pressure"]
    assert pressure["default"] == pressure["si"] == "Pa"
    assert pytest.approx(101325.0, rel=1e-15) == 760 * pressure["units"]["Torr"]["scale"]
    assert pressure["units"]["barg"]["gauge"] is True


def test_metrics_count_requests_and_the_memo(app):
    """The counters are in the text format of Prometheus, by route and status, and never by what a caller typed."""
    client = app.test_client()
    client.get("/v1/gases/helium")
    client.get("/no-such-place")
    for _ in range(2):
        client.get("/v1/state?gas=helium&pressure=123456&temperature=300")
    answer = client.get("/metrics")
    assert answer.headers["Content-Type"].startswith("text/plain")
    lines = answer.text.splitlines()
    assert any(line.startswith('gasapi_requests_total{method="GET",route="/v1/gases/<name>",status="200"}') for line in lines)
    assert any(line.startswith('gasapi_requests_total{method="GET",route="none",status="404"}') for line in lines)
    assert any(line.startswith('gasapi_memo_total{outcome="hit"}') for line in lines)
    assert any(line.startswith("gasapi_request_seconds_bucket") for line in lines)
    assert "no-such-place" not in answer.text
    assert "helium" not in answer.text
