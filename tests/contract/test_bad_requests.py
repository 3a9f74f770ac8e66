"""Bad requests: each with the status, the pointers and the words that a person needs; never a 500, a path or a traceback."""

# the table reads best with a request on a line
# ruff: noqa: E501

from __future__ import annotations

import json
from typing import Any, NamedTuple

import pytest

GOOD = {"gas": "nitrogen", "pressure": 4101325.0, "temperature": 298.15}
MIXTURE = {"methane": 0.92, "nitrogen": 0.08}
SOLVENT = {"molar_mass": 86.2, "critical_temperature": 507.6, "critical_pressure": 3025000, "acentric_factor": 0.301}
JSON = "application/json"
LARGEST = 16 * 1024


class Bad(NamedTuple):
    name: str
    status: int
    pointers: tuple[str, ...]
    words: str
    body: bytes | None = None
    method: str = "POST"
    path: str = "/v1/state"
    headers: tuple[tuple[str, str], ...] = ()
    content_type: str | None = JSON


def asked(name: str, pointers: str, words: str, *, without: str = "", **members: Any) -> Bad:
    """Return the good question with members changed or added; ``without`` names one to leave out."""
    question = {**GOOD, **members}
    question.pop(without, None)
    return Bad(name, 422, tuple(pointers.split()), words, json.dumps(question).encode())


def text(name: str, status: int, pointers: str, words: str, body: str | bytes, **more: Any) -> Bad:
    """Return a body as it stands."""
    return Bad(name, status, tuple(pointers.split()), words, body.encode() if isinstance(body, str) else body, **more)


def query(name: str, pointers: str, words: str, address: str, status: int = 422) -> Bad:
    """Return the query of a GET."""
    return Bad(name, status, tuple(pointers.split()), words, None, "GET", f"/v1/state?{address}", (), None)


def fetched(name: str, status: int, words: str, path: str, pointers: str = "", **more: Any) -> Bad:
    return Bad(name, status, tuple(pointers.split()), words, None, more.pop("method", "GET"), path, content_type=None, **more)


TABLE = [
    # not JSON
    text("empty body", 400, "", "not JSON", ""),
    text("half a body", 400, "", "not JSON", '{"gas": "nitrogen", "pressure": 1'),
    text("plain words", 400, "", "not JSON", "nitrogen at 40 bar"),
    text("single quotes", 400, "", "not JSON", "{'gas': 'nitrogen'}"),
    text("trailing comma", 400, "", "not JSON", '{"gas": "nitrogen",}'),
    text("comment", 400, "", "not JSON", '{"gas": "nitrogen" /* inert */}'),
    text("leading zero", 400, "", "not JSON", '{"gas": "nitrogen", "pressure": 0400, "temperature": 300}'),
    text("leading plus", 400, "", "not JSON", '{"gas": "nitrogen", "pressure": +4, "temperature": 300}'),
    text("hexadecimal", 400, "", "not JSON", '{"gas": "nitrogen", "pressure": 0x10, "temperature": 300}'),
    text("two documents", 400, "", "not JSON", '{"gas": "nitrogen"} {"gas": "argon"}'),
    text("byte order mark", 400, "", "not JSON", b"\xef\xbb\xbf" + json.dumps(GOOD).encode()),
    text("UTF-16", 400, "", "not JSON", json.dumps(GOOD).encode("utf-16")),
    text("broken UTF-8", 400, "", "not JSON", b'{"gas": "nitro\xffgen", "pressure": 1, "temperature": 300}'),
    text("lone surrogate", 400, "", "not JSON", '{"gas": "\\ud800", "pressure": 1, "temperature": 300}'),
    text("deep arrays", 400, "", "not JSON", "[" * 100_000),
    text("deep objects", 400, "", "not JSON", '{"a":' * 50_000 + "1" + "}" * 50_000),
    # JSON, but no question
    text("null", 422, "", "not an object", "null"),
    text("array", 422, "", "not an object", "[]"),
    text("number", 422, "", "not an object", "4"),
    text("string", 422, "", "not an object", '"nitrogen"'),
    text("nothing in it", 422, "/gas /pressure /temperature", "missing", "{}"),
    text("levels within the parser's depth", 422, "/gas", "an array", '{"gas":' + "[" * 900 + "]" * 900 + ',"pressure":1,"temperature":300}'),
    # numbers that JSON or a double cannot hold
    text("NaN", 422, "/pressure", "NaN", '{"gas": "nitrogen", "pressure": NaN, "temperature": 300}'),
    text("Infinity", 422, "/temperature", "Infinity", '{"gas": "nitrogen", "pressure": 1e5, "temperature": Infinity}'),
    text("minus Infinity", 422, "/pressure", "-Infinity", '{"gas": "nitrogen", "pressure": -Infinity, "temperature": 300}'),
    text("beyond a double", 422, "/pressure", "range of a double", '{"gas": "nitrogen", "pressure": 1e999, "temperature": 300}'),
    text(
        "five thousand digits",
        422,
        "/pressure",
        "range of a double",
        '{"gas": "nitrogen", "pressure": ' + "9" * 5000 + ', "temperature": 300}',
    ),
    text("beyond a double once converted", 422, "/pressure", "range of a double", json.dumps({**GOOD, "pressure": 1e305, "units": {"pressure": "bar"}})),
    # members given twice
    text("member twice", 422, "/pressure", "given twice", '{"gas": "nitrogen", "pressure": 1e5, "temperature": 300, "pressure": 2e5}'),
    text("unit twice", 422, "/units/pressure", "given twice", '{"gas": "nitrogen", "pressure": 1, "temperature": 300, "units": {"pressure": "bar", "pressure": "psi"}}'),
    text(
        "fraction twice",
        422,
        "/gas/fractions/methane",
        "given twice",
        '{"gas": {"fractions": {"methane": 0.5, "methane": 0.5}}, "pressure": 1e5, "temperature": 300}',
    ),
    text("twice by an escape", 422, "/pressure", "given twice", '{"gas": "nitrogen", "pressure": 1e5, "temperature": 300, "\\u0070ressure": 2e5}'),
    # types
    asked("pressure as text", "/pressure", "string", pressure="4101325"),
    asked("pressure as boolean", "/pressure", "true is not a number", pressure=True),
    asked("pressure as null", "/pressure", "null", pressure=None),
    asked("pressure as array", "/pressure", "an array", pressure=[1e5]),
    asked("pressure as object", "/pressure", "an object", pressure={"value": 1e5}),
    asked("temperature as text with unit", "/temperature", "string", temperature="25 degC"),
    asked("temperature as false", "/temperature", "false is not a number", temperature=False),
    asked("gas as number", "/gas", "name of a gas", gas=7),
    asked("gas as array", "/gas", "name of a gas", gas=["nitrogen"]),
    asked("gas as null", "/gas", "null", gas=None),
    asked("gas without a letter", "/gas", "name of a gas", gas="   "),
    asked("gas of 100000 letters", "/gas", "name of a gas", gas="n" * 100_000),
    asked("model as number", "/model", "a name", model=3),
    asked("two-phase as text", "/accept_two_phase", "true or false", accept_two_phase="yes"),
    asked("two-phase as number", "/accept_two_phase", "true or false", accept_two_phase=1),
    # missing and unknown members
    asked("no gas", "/gas", "missing", without="gas"),
    asked("no pressure", "/pressure", "missing", without="pressure"),
    asked("no temperature", "/temperature", "missing", without="temperature"),
    asked("misspelt member", "/presure", "did you mean pressure", presure=1),
    asked("member in capitals", "/Pressure", "no such member", Pressure=1),
    asked("foreign member", "/flow", "no such member", flow=1),
    asked("several faults at once", "/model /temperature /pressures", "", model=7, temperature="x", pressures=1),
    # states that cannot be
    asked("zero pressure", "/pressure", "above 0 Pa", pressure=0),
    asked("minus zero", "/pressure", "above 0 Pa", pressure=-0.0),
    asked("negative absolute pressure", "/pressure", "above 0 Pa", pressure=-5),
    asked("below full vacuum", "/pressure", "-18675 Pa at an ambient of 101325 Pa", pressure=-1.2, units={"pressure": "barg"}),
    asked("full vacuum", "/pressure", "above 0 Pa", pressure=-101325, units={"pressure": "Pag"}),
    asked("absolute zero", "/temperature", "above 0 K", temperature=0),
    asked("below absolute zero", "/temperature", "above 0 K", temperature=-300, units={"temperature": "degC"}),
    asked("negative kelvin", "/temperature", "above 0 K", temperature=-1),
    asked("ambient of zero", "/ambient_pressure", "above 0", ambient_pressure=0),
    asked("ambient as text", "/ambient_pressure", "string", ambient_pressure="101325"),
    asked("ambient of a diver", "/ambient_pressure", "or less", ambient_pressure=1e9),
    # units
    asked("unknown unit", "/units/pressure", "nearest: bar", units={"pressure": "Bar"}),
    asked("unit of another quantity", "/units/pressure", "no unit of pressure", units={"pressure": "degC"}),
    asked("degree sign", "/units/temperature", "no unit of temperature", units={"temperature": "°C"}),
    asked("unknown quantity", "/units/presure", "did you mean pressure", units={"presure": "bar"}),
    asked("unit as number", "/units/density", "not the name of a unit", units={"density": 1}),
    asked("units as text", "/units", "an object of units", units="SI"),
    asked("units as array", "/units", "an object of units", units=["bar"]),
    # gases and fractions
    asked("unknown gas", "/gas", "nearest names: nitrogen", gas="nitrogenn"),
    asked("gas of a formula that several share", "/gas", "may mean", gas="C4H10"),
    asked("no fractions", "/gas/fractions", "missing", gas={}),
    asked("empty fractions", "/gas/fractions", "no fraction", gas={"fractions": {}}),
    asked("fractions as array", "/gas/fractions", "an array", gas={"fractions": [0.9, 0.1]}),
    asked("fraction as text", "/gas/fractions/methane", "not a fraction", gas={"fractions": {"methane": "1"}}),
    asked("fraction as boolean", "/gas/fractions/methane", "not a fraction", gas={"fractions": {"methane": True}}),
    asked("fraction as null", "/gas/fractions/methane", "not a fraction", gas={"fractions": {"methane": None}}),
    asked("negative fraction", "/gas/fractions/nitrogen", "not a fraction", gas={"fractions": {"methane": 1.1, "nitrogen": -0.1}}),
    asked("fractions sum to 0.9", "/gas/fractions", "sum to 0.9", gas={"fractions": {"methane": 0.9}}),
    asked("fractions sum to 1.03", "/gas/fractions", "sum to 1.03", gas={"fractions": {"methane": 1.0, "nitrogen": 0.03}}),
    asked("percent taken for fractions", "/gas/fractions", "sum to 100", gas={"fractions": {"methane": 92, "nitrogen": 8}}),
    asked("all fractions zero", "/gas/fractions", "sum to 0", gas={"fractions": {"methane": 0}}),
    asked("unknown component", "/gas/fractions/methan3", "nearest names", gas={"fractions": {"methan3": 1}}),
    asked("component with a slash", "/gas/fractions/a~1b~0c", "no gas is called", gas={"fractions": {"a/b~c": 1}}),
    asked("unknown basis", "/gas/basis", "mole, mass", gas={"fractions": MIXTURE, "basis": "volume"}),
    asked("unknown fraction unit", "/gas/fraction_unit", "ppm", gas={"fractions": MIXTURE, "fraction_unit": "percent"}),
    asked("misspelt part of a gas", "/gas/fraction", "did you mean fractions", gas={"fraction": MIXTURE, "fractions": MIXTURE}),
    # equations
    asked("unknown model", "/model", "known: ideal-gas", model="redlich"),
    asked("model in capitals", "/model", "no equation", model="GERG-2008"),
    asked("model that lacks the gas", "/model", "cannot serve", gas="cyanogen", model="gerg-2008"),
    asked("equation of one gas for a mixture", "/model", "cannot serve", gas={"fractions": MIXTURE}, model="reference"),
    # substances of the question
    asked("substances as array", "/substances", "an object", substances=[SOLVENT]),
    asked("substance without constants", "/substances/x/molar_mass /substances/x/acentric_factor", "missing", substances={"x": {}}),
    asked("substance with a typing error", "/substances/x/omega", "no such member", substances={"x": {**SOLVENT, "omega": 0.3}}),
    asked("substance of no mass", "/substances/x/molar_mass", "above 0", substances={"x": {**SOLVENT, "molar_mass": 0}}),
    asked("pressure of a substance as text", "/substances/x/critical_pressure", "string", substances={"x": {**SOLVENT, "critical_pressure": "30 bar"}}),
    asked("substance twice but for case", "/substances/X", "twice", gas="x", substances={"x": SOLVENT, "X": SOLVENT}),
    asked("substance that no published equation knows", "/model", "cannot serve", gas="x", substances={"x": SOLVENT}, model="gerg-2008"),
    # the rest of the members
    asked("uncertainty as number", "/input_uncertainty", "an object", input_uncertainty=5),
    asked("negative uncertainty", "/input_uncertainty/pressure", "0 or more", input_uncertainty={"pressure": -1}),
    asked("uncertainty of another quantity", "/input_uncertainty/density", "no such member", input_uncertainty={"density": 1}),
    asked("negative margin", "/dew_point_margin", "0 or more", dew_point_margin=-1),
    asked("accuracy of zero", "/accuracy", "or more", accuracy=0),
    asked("accuracy above any use", "/accuracy", "or less", accuracy=2),
    # queries
    query("no parameter", "/gas /pressure /temperature", "missing", ""),
    query("parameter twice", "/pressure", "given twice", "gas=nitrogen&pressure=1e5&pressure=2e5&temperature=300"),
    query("unknown parameter", "/presure", "did you mean pressure", "gas=nitrogen&presure=1e5&temperature=300"),
    query("number with a comma", "/pressure", "not a number", "gas=nitrogen&pressure=1,5&temperature=300"),
    query("number with a plus sign", "/pressure", "not a number", "gas=nitrogen&pressure=%2B5&temperature=300"),
    query("exponent whose plus became a space", "/pressure", "%2B", "gas=nitrogen&pressure=1e+5&temperature=300"),
    query("number with a point but no digit", "/pressure", "not a number", "gas=nitrogen&pressure=5.&temperature=300"),
    query("number as a word", "/temperature", "not a number", "gas=nitrogen&pressure=1e5&temperature=NaN"),
    query("hexadecimal number", "/pressure", "not a number", "gas=nitrogen&pressure=0x10&temperature=300"),
    query("digits of another script", "/pressure", "not a number", "gas=nitrogen&pressure=%D9%A4%D9%A0&temperature=300"),
    query("number beyond a double", "/pressure", "range of a double", "gas=nitrogen&pressure=1e999&temperature=300"),
    query("empty number", "/pressure", "not a number", "gas=nitrogen&pressure=&temperature=300"),
    query("empty gas", "/gas", "name of a gas", "gas=&pressure=1e5&temperature=300"),
    query("unknown unit in a query", "/pressure_unit", "nearest: bar", "gas=nitrogen&pressure=1&temperature=300&pressure_unit=Bar"),
    query("unit of no quantity", "/force_unit", "no such member", "gas=nitrogen&pressure=1&temperature=300&force_unit=N"),
    query("gas and fractions in a query", "/fraction.methane", "not both", "gas=nitrogen&fraction.methane=1&pressure=1e5&temperature=300"),
    query("basis without fractions", "/gas", "missing", "basis=mass&pressure=1e5&temperature=300"),
    query("fraction as a word", "/fraction.methane", "not a number", "fraction.methane=all&pressure=1e5&temperature=300"),
    query("unknown component in a query", "/fraction.methan3", "nearest", "fraction.methan3=1&pressure=1e5&temperature=300"),
    query("fractions that sum to a half", "/gas", "sum to 0.5", "fraction.methane=0.5&pressure=1e5&temperature=300"),
    query("flag in capitals", "/accept_two_phase", "true or false", "gas=nitrogen&pressure=1e5&temperature=300&accept_two_phase=TRUE"),
    query("negative pressure in a query", "/pressure", "above 0 Pa", "gas=nitrogen&pressure=-1&temperature=300"),
    query("broken escapes of UTF-8", "", "percent-encoded", "gas=%FF%FE&pressure=1e5&temperature=300", 400),
    query("more parameters than any question has", "", "at most", "&".join(f"a{i}=1" for i in range(3000)), 400),
    # methods, addresses, forms
    fetched("unknown address", 404, "nothing is found", "/v1/density"),
    fetched("slash at the end", 404, "nothing is found", "/v1/state/"),
    fetched("two slashes", 404, "nothing is found", "/v1//state"),
    fetched("NUL in the address", 404, "nothing is found", "/v1/%00"),
    fetched("climbing address", 404, "nothing is found", "/v1/../../etc/passwd"),
    fetched("gas that nobody knows", 404, "nearest names: xenon", "/v1/gases/xenonn"),
    fetched("search twice", 422, "given twice", "/v1/gases?search=a&search=b", "/search"),
    fetched("search too long", 422, "at most", "/v1/gases?search=" + "a" * 300, "/search"),
    fetched("parameter where none is taken", 422, "no parameter", "/v1/units?quantity=pressure", "/quantity"),
    fetched("DELETE of a state", 405, "DELETE is not allowed", "/v1/state", method="DELETE"),
    fetched("PUT of a state", 405, "PUT is not allowed", "/v1/state", method="PUT"),
    fetched("POST to the units", 405, "POST is not allowed", "/v1/units", method="POST"),
    fetched("unheard-of method", 405, "BREW is not allowed", "/v1/state", method="BREW"),
    fetched("answer as a picture", 406, "application/json", "/v1/gases", headers=(("Accept", "image/png"),)),
    Bad("state as XML", 406, (), "text/csv", json.dumps(GOOD).encode(), headers=(("Accept", "application/xml"),)),
    Bad("CSV with a header line", 406, (), "header=absent", json.dumps(GOOD).encode(), headers=(("Accept", "text/csv; header=present"),)),
    Bad("JSON refused", 406, (), "application/json", json.dumps(GOOD).encode(), headers=(("Accept", "application/json;q=0, text/html"),)),
    Bad("no media type", 415, (), "no Content-Type", json.dumps(GOOD).encode(), content_type=None),
    Bad("form", 415, (), "application/x-www-form-urlencoded", b"gas=nitrogen", content_type="application/x-www-form-urlencoded"),
    Bad("text", 415, (), "text/plain", json.dumps(GOOD).encode(), content_type="text/plain"),
    Bad("another character set", 415, (), "UTF-8", json.dumps(GOOD).encode(), content_type="application/json; charset=latin-1"),
    Bad("broken media type", 415, (), "application/json", json.dumps(GOOD).encode(), content_type="json"),
    Bad("compressed", 415, (), "compressed", b"\x1f\x8b", headers=(("Content-Encoding", "gzip"),)),
    Bad("posted question with parameters", 422, ("/pressure",), "in the body", json.dumps(GOOD).encode(), path="/v1/state?pressure=1"),
]  # fmt: skip


def test_the_table_is_long_and_names_are_unique():
    """At least 80 bad requests, each by a name of its own."""
    assert len({bad.name for bad in TABLE}) == len(TABLE) >= 80


@pytest.mark.parametrize("bad", TABLE, ids=lambda bad: bad.name.replace(" ", "-"))
def test_bad_request(client, bad):
    """The answer is a problem (RFC 9457) that points at each fault and says what would be right."""
    answer = client.open(bad.path, method=bad.method, data=bad.body, content_type=bad.content_type, headers=dict(bad.headers))
    assert bad.status == answer.status_code, answer.text
    assert answer.headers["Content-Type"] == "application/problem+json"
    assert len(answer.data) <= LARGEST
    problem = answer.get_json()
    assert list(problem)[:5] == ["type", "title", "status", "detail", "instance"]
    assert problem["status"] == bad.status
    found = [error["pointer"] for error in problem.get("errors", [])]
    assert set(bad.pointers) <= set(found), found
    said = problem["detail"] + " ".join(error["detail"] for error in problem.get("errors", []))
    assert bad.words in said
    assert "Traceback" not in answer.text
    assert ".py" not in answer.text


def test_method_that_is_not_allowed_names_those_that_are(client):
    """405 carries Allow (RFC 9110, section 15.5.6)."""
    allow = client.delete("/v1/state").headers["Allow"]
    assert set(allow.split(", ")) == {"GET", "HEAD", "OPTIONS", "POST"}


def test_problem_type_leads_to_its_description(client):
    """The type is a reference into the OpenAPI document, where the kind of problem is described."""
    problem = client.post("/v1/state", data=b"{", content_type=JSON).get_json()
    address, _, at = problem["type"].partition("#")
    node = client.get(address).get_json()
    for step in at.strip("/").split("/"):
        node = node[step]
    assert node["description"] == problem["title"]


@pytest.mark.parametrize("count", [1, 100, 20_000])
def test_any_number_of_faults_fits_the_largest_body(client, count):
    """The first faults are named, and the detail tells how many there are."""
    question = {**GOOD, **{f"member-{i}/" + "x" * 500: 1 for i in range(count)}}
    answer = client.post("/v1/state", json=question)
    assert answer.status_code == 422
    assert 100 < len(answer.data) <= LARGEST
    if count > 100:
        assert str(count) in answer.get_json()["detail"]


def test_a_bad_request_leaves_no_trace_in_the_next_answer(client):
    """The same good question is answered alike before and after the whole table."""
    before = client.post("/v1/state", json={**GOOD, "pressure": 1234567.0}).get_json()
    for bad in TABLE:
        client.open(bad.path, method=bad.method, data=bad.body, content_type=bad.content_type, headers=dict(bad.headers))
    after = client.post("/v1/state", json={**GOOD, "pressure": 1234567.0}).get_json()
    before["trace"].pop("cached"), after["trace"].pop("cached")
    assert before == after
