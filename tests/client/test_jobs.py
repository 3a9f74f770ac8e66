"""The client's calls of the jobs: each asks what the service takes, and gives what it answers."""

from __future__ import annotations

import threading

import pytest
from werkzeug.serving import WSGIRequestHandler, make_server

from gasapi.app import create_app
from gasapi.client import Client, QuestionRefused
from gasapi.settings import Settings

UNITS = {"pressure": "bar", "temperature": "degC"}


class Quiet(WSGIRequestHandler):
    def log_request(self, *args):
        pass


@pytest.fixture(scope="module")
def client():
    server = make_server("127.0.0.1", 0, create_app(Settings()), threaded=True, request_handler=Quiet)
    thread = threading.Thread(target=server.serve_forever, daemon=True)
    thread.start()
    with Client(f"http://127.0.0.1:{server.server_port}") as client:
        yield client
    server.shutdown()
    thread.join(10)
    server.server_close()


def test_flow(client):
    """In any measure."""
    flow = {"kind": "actual_volume", "value": 120, "unit": "m3/h"}
    answer = client.flow("nitrogen", 41, 25, flow, units=UNITS, reference="din-1343")
    assert answer["result"]["reference_volume"] > answer["result"]["actual_volume"]


def test_vessel(client):
    """With what was used."""
    answer = client.vessel("argon", 0.05, 200, 15, units=UNITS, later={"pressure": 100, "temperature": 15})
    assert 0.0 < answer["result"]["used_mass"] < answer["result"]["mass"]


def test_pressure_decay(client):
    """A fall in pressure at one temperature is a loss."""
    answer = client.pressure_decay(
        "air", 0.5, 3600, {"pressure": 7, "temperature": 20}, {"pressure": 6.9, "temperature": 20}, units=UNITS
    )
    assert 0.0 < answer["result"]["lost_mass"]


def test_fraction_from_density(client):
    """Between 0 and 1."""
    answer = client.fraction_from_density("hydrogen", "nitrogen", 0.6, 4, 40, units=UNITS)
    assert 0.0 < answer["result"]["mole_fraction"] < 1.0


def test_molar_mass(client):
    """With the toxic candidate that nobody asked for."""
    answer = client.molar_mass(101325, 298.15, density=1.145, like="nitrogen")
    assert "carbon-monoxide" in [candidate["id"] for candidate in answer["result"]["candidates"] if candidate["toxic"]]


def test_comparison(client):
    """By every equation."""
    answer = client.comparison("nitrogen", 41, 25, units=UNITS)
    assert "ideal-gas" in [model["id"] for model in answer["result"]["models"]]


def test_phase_boundary(client):
    """With its named points."""
    assert "critical" in client.phase_boundary("propane", units=UNITS)["result"]["points"]


def test_lookup_table_in_all_forms(client):
    """As members, as CSV and as Structured Text."""
    question = ("nitrogen", (1, 60), (-20, 80), 0.01)
    table = client.lookup_table(*question, units=UNITS)["result"]
    rows = client.lookup_table_text(*question, "csv", units=UNITS).splitlines()
    assert len(table["pressure"]) == len(rows) - 1
    assert client.lookup_table_text(*question, "st", units=UNITS, name="N2").startswith("FUNCTION_BLOCK N2\n")


def test_refusals_are_exceptions(client):
    """With the words of the service, in the text forms as well."""
    with pytest.raises(QuestionRefused, match="inner"):
        client.vessel("argon", 0, 1e5, 300)
    with pytest.raises(QuestionRefused, match="two phases"):
        client.lookup_table_text("carbon dioxide", (1, 60), (-20, 80), 0.01, "st", units=UNITS)
