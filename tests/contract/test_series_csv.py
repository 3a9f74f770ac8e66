"""``POST /v1/series`` in CSV: header names with units in brackets, rows answered one for one, broken ones marked."""

from __future__ import annotations

import csv
import io

import pytest

from gasapi.app import create_app
from gasapi.settings import Settings

HEADER = "timestamps,pressure [barg],temperature [degC],tag"


@pytest.fixture
def post(client):
    """Return a function that posts CSV text and returns the answer; in kind unless told otherwise."""

    def posted(text, query="gas=nitrogen&keep=tag", accept="text/csv", content_type="text/csv"):
        data = text if isinstance(text, bytes) else text.encode()
        return client.post(f"/v1/series?{query}", data=data, content_type=content_type, headers={"Accept": accept})

    return posted


def table(answer):
    assert answer.status_code == 200, answer.text
    return list(csv.reader(io.StringIO(answer.data.decode("utf-8", "surrogateescape"), newline="")))


def test_rows_are_answered_one_for_one(post, client):
    """With the bits of single states, the given fields as they came, and the line of a row that cannot be read."""
    body = (
        f"{HEADER}\r\n"
        "2026-01-01,40.0,25,PT-1\r\n"
        "2026-01-02,no reading,25,PT-2\r\n"
        "2026-01-03,,25,PT-3\r\n"
        "2026-01-04,1,2\r\n"
        '2026-01-05,"60",+2.6e1,"a ""b"", c\r\nd"\r\n'
        "2026-01-06,70,20,x,y\r\n"
        "2026-01-07, 80 ,21,\u00e4\r\n"
    )
    head, *rows = table(post(body))
    assert [*HEADER.split(","), "status_code", "density [kg/m3]", "compressibility_factor"] == head[:7]
    assert ["molar_volume [m3/mol]", "region", "reasons"] == head[7:]
    assert len(rows) == 7
    given = list(csv.reader(io.StringIO(body, newline="")))[1:]
    for i in (0, 1, 2, 4, 6):
        assert given[i] == rows[i][:4]
    assert ["2026-01-04", "1", "2", ""] == rows[3][:4]
    assert ["2026-01-06", "70", "20", "x"] == rows[5][:4]
    for i, (pressure, temperature) in {0: (40.0, 25), 4: (60, 26), 6: (80, 21)}.items():
        units = {"pressure": "barg", "temperature": "degC"}
        asked = {"gas": "nitrogen", "pressure": pressure, "temperature": temperature, "units": units, "model": "reference"}
        single = client.post("/v1/state", json=asked).get_json()
        assert list(single["result"].values()) == [float(x) for x in rows[i][5:8]]
        assert [str(single["quality"]["status_code"]), single["phase"]["region"]] == [rows[i][4], rows[i][8]]
    for i, line in {1: 3, 3: 5, 5: 8}.items():
        assert [*["2157641728", "", "", ""], "unknown", f"ambient_pressure_assumed input_bad line {line}"] == rows[i][4:]
    assert rows[2][9] == "ambient_pressure_assumed input_bad"


def test_json_may_be_asked_for(post):
    """The same rows; timestamps as they came, and the lines of unreadable rows."""
    body = f"{HEADER}\n1,40,25,a\n2,x,25,b\n"
    answer = post(body, accept="application/json").get_json()
    rows = table(post(body))[1:]
    assert ["1", "2"] == answer["timestamps"]
    assert {"1": 3} == answer["unreadable"]
    assert [float(rows[0][5]), None] == answer["result"]["density"]
    assert {"good": 1, "uncertain": 0, "bad": 1} == answer["counts"]
    assert ["ambient_pressure_assumed", "input_bad"] == answer["reasons"]["1"]


@pytest.mark.parametrize(
    "body",
    [
        f"{HEADER}\r\n1,40,25,a\r\n2,50,25,b\r\n",
        f"{HEADER}\n1,40,25,a\n2,50,25,b",
        f"\ufeff{HEADER}\r\n1,40,25,a\r\n2,50,25,b\r\n\r\n\r\n",
        " timestamps ,Pressure[ barg ], TEMPERATURE [degC] ,tag\n1,40,25,a\n2,50,25,b\n",
    ],
    ids=["CRLF", "LF, no end", "byte order mark, empty lines at the end", "spaces and case"],
)
def test_forms_of_the_same_table(post, body):
    """Give the same numbers."""
    rows = table(post(body))[1:]
    assert [row[5] for row in rows] == ["46.5432812299138", "57.88057721926695"]


def test_an_empty_line_between_rows_is_a_row(post):
    """So that lines of question and answer correspond."""
    rows = table(post(f"{HEADER}\n1,40,25,a\n\n2,40,25,b\n"))[1:]
    assert [row[4] == "0" for row in rows] == [True, False, True]
    assert rows[1][9].endswith("line 3")


@pytest.mark.parametrize("text", ["nan", "inf", "-inf", "1_0", "\u0664\u0660", "0x10", "1,5", "--1", "1e", "true", "4 0"])
def test_what_is_no_number_is_a_bad_row(post, text):
    """Words that a parser may take for numbers, digits of other scripts, groups of digits, a decimal comma."""
    rows = table(post(f"{HEADER}\n1,{text},25,a\n2,40,25,b\n"))[1:]
    assert [row[4] == "0" for row in rows] == [False, True]
    assert rows[0][9].endswith("input_bad line 2")


def test_a_stray_quote_spoils_its_own_row(post):
    """Even where nothing closes it, in a body of many blocks."""
    lines = [f"{i},40,25,{chr(34) if i == 5 else ''}t" for i in range(60_000)]
    rows = table(post("\n".join([HEADER, *lines, ""])))[1:]
    assert len(rows) == 60_000
    assert [i for i, row in enumerate(rows) if row[4] != "0"] == [5]
    assert rows[5][9].endswith("line 7")


def test_broken_rows_are_marked_and_no_other(post):
    """One in a hundred of 30,000, each broken in another way; the rest has the numbers of a clean file."""
    broken = ["2,40", "2,x,25,t", "2,40,25,t,u", "", '2,40,25,"t" u', "2,40,?,t"]
    clean = [f"{i},{40 + i % 7},25,t" for i in range(30_000)]
    spoilt = [broken[i // 100 % 6] if i % 100 == 50 else line for i, line in enumerate(clean)]
    whole, part = (table(post("\r\n".join([HEADER, *lines, ""])))[1:] for lines in (clean, spoilt))
    assert len(whole) == len(part)
    for i, (expected, row) in enumerate(zip(whole, part, strict=True)):
        if i % 100 == 50:
            assert row[9].endswith(f"input_bad line {i + 2}")
        else:
            assert expected == row


def test_bytes_that_are_no_text_are_kept(post):
    """A tag in another character set comes back as it came."""
    answer = post(f"{HEADER}\n1,40,25,".encode() + b"\xe4\xff\n")
    assert b"1,40,25,\xe4\xff,0,46.5432812299138" in answer.data


def test_members_of_the_question_are_parameters(post, client):
    """Units, equation, fractions, and a temperature for all rows."""
    query = "fraction.methane=92&fraction.nitrogen=8&fraction_unit=%25&basis=mass&temperature=15&temperature_unit=degC"
    head, row = table(post("pressure [psig]\n500\n", query + "&model=gerg-2008&density_unit=lb/ft3"))
    asked = {
        "gas": {"fractions": {"methane": 92, "nitrogen": 8}, "fraction_unit": "%", "basis": "mass"},
        "pressure": 500,
        "temperature": 15,
        "units": {"pressure": "psig", "temperature": "degC", "density": "lb/ft3"},
        "model": "gerg-2008",
    }
    assert head[2] == "density [lb/ft3]"
    assert client.post("/v1/state", json=asked).get_json()["result"]["density"] == float(row[2])


def test_a_chromatograph_column_set(post, client):
    """Fractions by the row, each column in its own unit; a bad fraction makes a bad row."""
    body = (
        "pressure,temperature,fraction.methane [%],fraction.N2 [ppm],fraction.ethane\n"
        "5e6,300,90,50000,0.05\n"
        "5e6,300,95,50000,0\n"
        "5e6,300,95,250000,0\n"
        "5e6,300,-1,50000,0.05\n"
        "5e6,300,,50000,0.05\n"
        "5e6,300,x,50000,0.05\n"
    )
    _, *rows = table(post(body, ""))
    for i, fractions in enumerate(({"methane": 0.9, "nitrogen": 0.05, "ethane": 0.05}, {"methane": 0.95, "nitrogen": 0.05})):
        asked = {"gas": {"fractions": fractions}, "pressure": 5e6, "temperature": 300, "model": "gerg-2008"}
        assert client.post("/v1/state", json=asked).get_json()["result"]["density"] == float(rows[i][6])
    for i in (2, 3, 4):
        assert rows[i][10] == "fractions_bad"
    assert rows[5][10] == "input_bad fractions_bad line 7"


def test_input_status_by_the_row(post):
    """Its kind in brackets, or as a parameter; a code that is none makes a bad row."""
    body = "pressure,temperature,input_status{}\n1e5,300,192\n1e5,300,64\n1e5,300,0\n1e5,300,-7\n1e5,300,\n"
    for text, query in ((body.format(" [opc-classic]"), ""), (body.format(""), "&input_status_kind=opc-classic")):
        rows = table(post(text, "gas=nitrogen" + query))[1:]
        assert [int(row[3]) >> 30 for row in rows] == [0, 1, 2, 2, 2]


@pytest.mark.parametrize(
    ("body", "query", "pointer"),
    [
        ("", "gas=nitrogen", ""),
        ("\n", "gas=nitrogen", ""),
        ("pressure,temperature\n", "gas=nitrogen", ""),
        ("pressure,temperature", "gas=nitrogen", ""),
        ("1e5,300\n2e5,300\n", "gas=nitrogen", ""),
        ("pressure,temperature,tag\n1e5,300,x\n", "gas=nitrogen", ""),
        ("pressure,temperature,pressure\n1e5,300,1e5\n", "gas=nitrogen", ""),
        ("pressure,pressure [bar],temperature\n1e5,1,300\n", "gas=nitrogen", ""),
        ("pressure [bars],temperature\n1e5,300\n", "gas=nitrogen", ""),
        ("pressure [bar],temperature\n1e5,300\n", "gas=nitrogen&pressure_unit=psi", "/pressure_unit"),
        ("pressure\n1e5\n", "gas=nitrogen", ""),
        ("pressure,temperature\n1e5,300\n", "gas=nitrogen&temperature=300", "/temperature"),
        ("pressure,temperature\n1e5,300\n", "", "/gas"),
        ("pressure,temperature\n1e5,300\n", "gas=nitrogem", "/gas"),
        ("pressure,temperature\n1e5,300\n", "gas=nitrogen&keep=tag", "/keep"),
        ("pressure,temperature\n1e5,300\n", "gas=nitrogen&colour=red", "/colour"),
        ("pressure,temperature\n1e5,300\n", "gas=nitrogen&model=gerg", "/model"),
        ("pressure,temperature\n1e5,300\n", "gas=nitrogen&ambient_pressure=-1", "/ambient_pressure"),
        ("pressure,temperature,fraction.methane\n1e5,300,1\n", "gas=nitrogen", "/gas"),
        ("pressure,temperature,fraction.unobtainium\n1e5,300,1\n", "", "/fraction.unobtainium"),
        ("pressure,temperature,fraction.methane [mol]\n1e5,300,1\n", "", ""),
        ('pressure,"temperature\n1e5,300\n', "gas=nitrogen", ""),
    ],
)
def test_what_makes_no_sense_is_refused(post, body, query, pointer):
    """Before any row is answered."""
    answer = post(body, query)
    assert answer.status_code == 422
    assert pointer in {fault["pointer"] for fault in answer.get_json()["errors"]}


def test_a_row_that_is_all_broken_is_answered(post):
    """Nothing but broken rows is no failed request."""
    rows = table(post(f"{HEADER}\n,,,\nx,y,z,a\nq\n"))[1:]
    assert len(rows) == 3
    assert all(int(row[4]) >= 2147483648 for row in rows)


def test_header_absent(post):
    """Refused in a question, given in an answer where asked for."""
    body = f"{HEADER}\n1,40,25,a\n"
    assert post(body, content_type="text/csv; header=absent").status_code == 422
    rows = table(post(body, accept="text/csv; header=absent"))
    assert [row[0] for row in rows] == ["1"]


def test_character_sets_and_codings(post, client):
    """UTF-8 as it stands, nothing else."""
    body = f"{HEADER}\n1,40,25,a\n"
    assert post(body, content_type="text/csv; charset=utf-8").status_code == 200
    assert post(body, content_type="text/csv; charset=utf-16").status_code == 415
    answer = client.post("/v1/series?gas=nitrogen", data=b"x", content_type="text/csv", headers={"Content-Encoding": "gzip"})
    assert answer.status_code == 415


def test_the_limit_of_a_body():
    """By announced length, with a setting of its own."""
    client = create_app(Settings(csv_limit=1000)).test_client()
    body = "pressure,temperature\n" + "1e5,300\n" * 200
    answer = client.post("/v1/series?gas=nitrogen", data=body, content_type="text/csv")
    assert answer.status_code == 413
    assert client.post("/v1/series?gas=nitrogen", data=body[:900], content_type="text/csv").status_code == 200
    assert client.post("/v1/series", data=b"{" + b" " * 1200 + b"}", content_type="application/json").status_code == 422


def test_more_than_is_held_in_memory(post):
    """A body of 20 MB goes through a temporary file and comes back whole."""
    rows = 120_000
    body = f"{HEADER}\n" + "".join(f"{i},40,25,{'t' * 150}\n" for i in range(rows))
    answer = post(body)
    assert answer.data.count(b"\r\n") == rows + 1
    assert answer.data.count(b",0,46.5432812299138,") == rows


def test_a_full_disk_is_told(post, monkeypatch):
    """As something to wait for, not as a fault of the question."""

    class Full(io.BytesIO):
        def write(self, data):
            raise OSError(28, "No space left on device")

    monkeypatch.setattr("gasapi.web.csv_body.tempfile.SpooledTemporaryFile", lambda max_size: Full())
    answer = post(f"{HEADER}\n1,40,25,a\n")
    assert answer.status_code == 503
    assert answer.headers["Retry-After"] == "5"
