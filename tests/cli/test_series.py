"""``gasapi series``: a CSV file row for row as the service answers it, and exit codes that a script can use."""

from __future__ import annotations

import io
import sys

import pytest

from gasapi.app import create_app
from gasapi.cli import main
from gasapi.cli.series import _clock, _Progress
from gasapi.settings import Settings

GOOD = "timestamps,pressure [barg],temperature [degC],tag\n1,40,25,a\n2,41,26,b\n"
BROKEN = GOOD + "3,x,25,c\n"


@pytest.fixture
def run(capsys, tmp_path, monkeypatch):
    """Return a function that writes a file, runs the command on it and returns exit code, answer and errors."""
    monkeypatch.chdir(tmp_path)

    def ran(text, *arguments):
        (tmp_path / "in.csv").write_bytes(text.encode())
        code = main(["series", "in.csv", "-o", "out.csv", *arguments])
        out = tmp_path / "out.csv"
        assert not (tmp_path / "out.csv.part").exists()
        return code, out.read_bytes() if out.exists() else None, capsys.readouterr().err

    return ran


def served(text, query):
    client = create_app(Settings()).test_client()
    return client.post(f"/v1/series?{query}", data=text, content_type="text/csv", headers={"Accept": "text/csv"}).data


@pytest.mark.parametrize(
    ("text", "words", "query"),
    [
        (GOOD, "--gas nitrogen --keep tag", "gas=nitrogen&keep=tag"),
        (GOOD, "--gas nitrogen --keep-all --unit density=g/L", "gas=nitrogen&keep=tag&density_unit=g/L"),
        (
            GOOD,
            "--gas methane=92 nitrogen=8 --fraction-unit % --basis mass --keep-all --model gerg-2008 --ambient-pressure 1e5",
            "fraction.methane=92&fraction.nitrogen=8&fraction_unit=%25&basis=mass&keep=tag&model=gerg-2008&ambient_pressure=1e5",
        ),
        ("pressure\n1e5\n", "--gas nitrogen --temperature 300", "gas=nitrogen&temperature=300"),
        (
            "pressure,temperature,input_status\n1e5,300,192\n",
            "--gas nitrogen --input-status-kind opc-classic",
            "gas=nitrogen&input_status_kind=opc-classic",
        ),
        (
            "pressure,temperature,fraction.methane,fraction.ethane\n1e5,300,50,50\n",
            "--fraction-unit %",
            "fraction_unit=%25",
        ),
    ],
)
def test_the_answer_is_that_of_the_service(run, text, words, query):
    """Byte for byte; exit code 0 where every row has its number."""
    code, answer, errors = run(text, *words.split())
    assert served(text, query) == answer
    assert code == 0
    assert " rows: " in errors


def test_bad_rows_are_told_by_the_exit_code(run):
    """All rows are answered, and the count is said."""
    code, answer, errors = run(BROKEN, "--gas", "nitrogen", "--keep-all")
    assert code == 1
    assert answer.count(b"\r\n") == 4
    assert "3 rows: 2 good, 0 uncertain, 1 bad" in errors


@pytest.mark.parametrize(
    ("text", "words", "said"),
    [
        (GOOD, "--gas nitrogem --keep-all", "gas: no gas is called"),
        (GOOD, "--gas nitrogen", "tag"),
        (GOOD, "--keep-all", "gas: this member is missing"),
        ("", "--gas nitrogen", "header"),
        (GOOD, "--gas nitrogen --keep-all --unit pressure=bara", "pressure_unit: the header says"),
        (GOOD, "--gas nitrogen --keep-all --model gerg", "model: no equation"),
        (GOOD, "--gas nitrogen --keep-all --ambient-pressure high", "ambient_pressure"),
    ],
)
def test_what_makes_no_sense_leaves_no_file(run, text, words, said):
    """Exit code 2, and the words of the service."""
    code, answer, errors = run(text, *words.split())
    assert code == 2
    assert answer is None
    assert said in errors


def test_a_missing_file(capsys):
    """Exit code 2."""
    assert main(["series", "no-such-file.csv", "--gas", "nitrogen"]) == 2
    assert "no-such-file.csv" in capsys.readouterr().err


def test_pipes(capfdbinary, monkeypatch):
    """Standard input and output."""
    monkeypatch.setattr(sys, "stdin", io.TextIOWrapper(io.BytesIO(GOOD.encode())))
    assert main(["series", "-", "--gas", "nitrogen", "--keep", "tag", "--quiet"]) == 0
    out, err = capfdbinary.readouterr()
    assert served(GOOD, "gas=nitrogen&keep=tag") == out
    assert b"" == err


def test_progress_names_rows_speed_and_time_left(monkeypatch):
    """On a terminal."""
    now = [0.0]
    monkeypatch.setattr("gasapi.cli.series.time.monotonic", lambda: now[0])
    stream = io.StringIO()
    progress = _Progress(1000, stream)
    now[0] = 2.0
    progress.show("answering", 5000, 250)
    text = stream.getvalue()
    assert "[######..................]" in text
    assert "5,000 rows" in text
    assert "2,500 rows/s" in text
    assert "0:06 left" in text
    progress.end()


@pytest.mark.parametrize(("seconds", "text"), [(0.4, "0:00"), (75, "1:15"), (3601, "1:00:01")])
def test_clock(seconds, text):
    """Minutes and seconds, and hours where there are any."""
    assert text == _clock(seconds)
