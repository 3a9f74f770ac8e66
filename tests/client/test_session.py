"""The client against a running service, and against servers that misbehave."""

from __future__ import annotations

import csv
import math
import threading
from contextlib import contextmanager
from datetime import UTC, datetime
from http.server import BaseHTTPRequestHandler, ThreadingHTTPServer
from types import SimpleNamespace

import numpy as np
import pytest
from werkzeug.serving import WSGIRequestHandler, make_server

from gasapi.app import create_app
from gasapi.client import (
    AccessRefused,
    AnswerUnreadable,
    Client,
    ClientError,
    NotFound,
    QuestionRefused,
    QuestionTooLarge,
    ServiceFailed,
    ServiceOverloaded,
    ServiceProblem,
    ServiceUnreachable,
)
from gasapi.errors import GasapiError
from gasapi.settings import Settings

UNITS = {"pressure": "barg", "temperature": "degC"}


@contextmanager
def running(server):
    thread = threading.Thread(target=server.serve_forever, daemon=True)
    thread.start()
    try:
        yield f"http://127.0.0.1:{server.server_port}"
    finally:
        server.shutdown()
        thread.join()
        server.server_close()


class _Quiet(WSGIRequestHandler):
    def log(self, *arguments):
        pass


@pytest.fixture(scope="module")
def app():
    return create_app(Settings(json_limit=2_000_000))


@pytest.fixture(scope="module")
def address(app):
    with running(make_server("127.0.0.1", 0, app, threaded=True, request_handler=_Quiet)) as found:
        yield found


@pytest.fixture
def client(address):
    with Client(address) as found:
        yield found


@contextmanager
def answering(*answers):
    """Run a server that gives these answers (status, headers, body) in turn, the last one again and again."""
    seen = []

    class Handler(BaseHTTPRequestHandler):
        protocol_version = "HTTP/1.1"

        def do_POST(self):
            self.rfile.read(int(self.headers.get("Content-Length", 0)))
            status, headers, body = answers[min(len(seen), len(answers) - 1)]
            seen.append({**self.headers, "port": self.client_address[1]})
            self.send_response(status)
            for name, value in {"Content-Length": str(len(body)), **headers}.items():
                self.send_header(name, value)
            self.end_headers()
            self.wfile.write(body)

        def do_GET(self):
            self.do_POST()

        def log_message(self, *arguments):
            pass

    with running(ThreadingHTTPServer(("127.0.0.1", 0), Handler)) as address:
        yield address, seen


def problem(status):
    body = b'{"type":"about:blank","title":"No","status":%d,"detail":"no","instance":"/v1/state"}' % status
    return status, {"Content-Type": "application/problem+json"}, body


def test_a_state(client, app):
    """Is the service's own answer."""
    found = client.state("nitrogen", 40.0, 25.0, units=UNITS)
    asked = {"gas": "nitrogen", "pressure": 40.0, "temperature": 25.0, "units": UNITS}
    assert app.test_client().post("/v1/state", json=asked).get_json()["result"] == found["result"]


def test_states_keep_their_order_and_refusals_their_place(client):
    """More than one call takes."""
    questions = [{"gas": "nitrogen", "pressure": 1e5 + i, "temperature": 300.0} for i in range(1005)]
    questions[1002]["gas"] = "nitrogem"
    found = client.states(questions)
    assert len(found) == 1005
    assert isinstance(found[1002], QuestionRefused)
    assert found[1002].faults[0].pointer == "/gas"
    assert found[1004]["state"]["pressure"] == 1e5 + 1004


@pytest.mark.parametrize("rows", [7, 100, 1000])
def test_a_long_series_is_that_of_one_call(address, rows):
    """In parts of any size, bad rows, input status and timestamps included."""
    rng = np.random.default_rng(1)
    n = 100
    pressure, temperature = rng.uniform(1.0, 60.0, n), rng.uniform(0.0, 40.0, n)
    pressure[13] = math.nan
    status = np.zeros(n, dtype=np.int64)
    status[50] = 0x80000000
    members = {"units": UNITS, "timestamps": [datetime(2026, 1, 1, tzinfo=UTC)] * n, "input_status": status}
    with Client(address) as whole, Client(address, rows=rows) as parts:
        expected = whole.series("nitrogen", pressure, temperature, **members)
        found = parts.series("nitrogen", pressure.tolist(), tuple(temperature), **members)
    for member in expected.keys() - {"trace"}:
        assert expected[member] == found[member]
    assert found["timestamps"][0] == "2026-01-01T00:00:00+00:00"
    assert found["counts"]["bad"] == 2
    assert found["result"]["density"][13] is None


def test_one_equation_for_all_parts(address):
    """Though the first part alone would have chosen another."""
    temperature = [1500.0, 1600.0, *[300.0 + i for i in range(28)]]
    with Client(address) as whole, Client(address, rows=2) as parts:
        expected = whole.series("nitrogen", 1e5, temperature)
        found = parts.series("nitrogen", 1e5, temperature)
    assert expected["model"] == found["model"]
    assert expected["reasons"] == found["reasons"]


def test_composition_by_the_row(address):
    """In parts as in one call."""
    gas = {"fractions": {"methane": np.array([0.9, 0.8, 1.0, np.nan]), "nitrogen": [0.1, 0.2, 0.0, 0.1], "ethane": 0.0}}
    with Client(address) as whole, Client(address, rows=3) as parts:
        expected = whole.series(gas, 5e6, 300.0)
        found = parts.series(gas, 5e6, 300.0)
    assert expected["result"] == found["result"]
    assert expected["gas"] == found["gas"]


def test_columns_of_a_data_frame(client):
    """Whatever hands over numbers with ``to_numpy`` and a mark for missing ones; times by ``isoformat``."""

    class Column(list):
        def to_numpy(self, dtype, na_value):
            return np.array([na_value if x is None else x for x in self], dtype=dtype)

    times = [SimpleNamespace(isoformat=lambda: "2026-01-01"), np.datetime64("2026-01-02")]
    found = client.series("nitrogen", Column([1e5, None]), Column([300, 300]), timestamps=times)
    assert [True, False] == [x is not None for x in found["result"]["density"]]
    assert ["2026-01-01", "2026-01-02"] == found["timestamps"]


@pytest.mark.parametrize(
    ("pressure", "temperature"), [([1e5, 2e5], [300.0]), (["1e5"], [300.0]), ([True], [300.0]), ([1e5, "x"], 300.0)]
)
def test_columns_that_are_none(client, pressure, temperature):
    """Are told before anything is sent."""
    with pytest.raises(ValueError, match="column"):
        client.series("nitrogen", pressure, temperature)


def test_a_file(client, tmp_path):
    """Is answered row for row."""
    source, target = tmp_path / "in.csv", tmp_path / "out.csv"
    source.write_text("pressure [barg],temperature [degC],tag\n40,25,a\nx,25,b\n")
    client.series_file(source, target, keep=["tag"], gas="nitrogen")
    with target.open(newline="") as file:
        rows = list(csv.reader(file))
    assert rows[1][2:5] == ["a", "0", "46.5432812299138"]
    assert rows[2][-1].endswith("line 3")


def test_other_questions_and_catalogue(client):
    """Any path of the service."""
    found = client.ask("/v1/vessel", {"gas": "nitrogen", "volume": 1.0, "pressure": 1e6, "temperature": 300.0})
    assert found["result"]["mass"] > 0.0
    assert client.fetch("/v1/gases", search="neon")["gases"][0]["id"] == "neon"


@pytest.mark.parametrize(
    ("call", "kind"),
    [
        (lambda c: c.state("nitrogem", 1e5, 300.0), QuestionRefused),
        (lambda c: c.fetch("/v1/gases/nitrogem"), NotFound),
        (lambda c: c.ask("/v1/series", {"gas": "x" * 3_000_000}), QuestionTooLarge),
        (lambda c: c.ask("/v1/livez", {}), NotFound),
    ],
)
def test_problems_are_exceptions(client, call, kind):
    """One class for each thing that a caller would do about it."""
    with pytest.raises(kind) as caught:
        call(client)
    assert isinstance(caught.value, ServiceProblem)
    assert isinstance(caught.value, ClientError)
    assert isinstance(caught.value, GasapiError)
    assert str(caught.value.status) in str(caught.value)


def test_tokens(tmp_path):
    """Sent with every call; without one access is refused."""
    (tmp_path / "tokens").write_text("a-token-of-some-length\n")
    app = create_app(Settings(token_file=tmp_path / "tokens"))
    with running(make_server("127.0.0.1", 0, app, request_handler=_Quiet)) as address:
        with Client(address, token="a-token-of-some-length") as client:
            assert client.fetch("/v1/models")
        with Client(address) as client, pytest.raises(AccessRefused):
            client.fetch("/v1/models")


def test_an_overloaded_service_is_asked_again(app):
    """With pauses, until it answers or the retries run out."""
    good = (200, {"Content-Type": "application/json"}, b'{"ok": true}')
    with answering(problem(503), problem(503), good) as (address, seen), Client(address, pause=0.01) as client:
        assert {"ok": True} == client.ask("/v1/state", {})
        assert len(seen) == 3
    with answering(problem(503)) as (address, seen), Client(address, pause=0.01, retries=2) as client:
        with pytest.raises(ServiceOverloaded):
            client.ask("/v1/state", {})
        assert len(seen) == 3


def test_a_refusal_is_not_asked_again():
    """Nor is a failure of the service, which would come again."""
    for status, kind in ((422, QuestionRefused), (500, ServiceFailed)):
        with answering(problem(status)) as (address, seen), Client(address, pause=0.01) as client:
            with pytest.raises(kind):
                client.ask("/v1/state", {})
            assert len(seen) == 1


@pytest.mark.parametrize("answer", [(200, {}, b"<html>"), (404, {}, b"<html>"), (200, {}, b"[1]"), (422, {}, b'{"a": 1}')])
def test_something_else_at_the_address(answer):
    """Is told apart from an answer."""
    with answering(answer) as (address, _), Client(address, retries=0) as client, pytest.raises(AnswerUnreadable):
        client.ask("/v1/state", {})


def test_nobody_at_the_address():
    """After all retries."""
    with Client("http://127.0.0.1:9", retries=1, pause=0.01) as client, pytest.raises(ServiceUnreachable, match="no answer"):
        client.ask("/v1/state", {})


def test_connections_are_kept():
    """Two calls come over one connection."""
    with answering((200, {}, b"{}")) as (address, seen), Client(address) as client:
        client.fetch("/v1/models")
        client.ask("/v1/state", {})
    assert len(seen) == 2
    assert len({headers["port"] for headers in seen}) == 1
