"""``gasapi state``: the same answer as the service gives, as a block or as JSON, and exit codes that a script can use."""

from __future__ import annotations

import io
import json
import re
import sys

import pytest

from gasapi.app import create_app
from gasapi.cli import main
from gasapi.settings import Settings

PLANT = {"gas": "nitrogen", "pressure": 40, "temperature": 25, "units": {"pressure": "barg", "temperature": "degC"}}


@pytest.fixture
def run(capsys):
    """Return a function that runs the command and returns exit code, output and errors."""

    def ran(*arguments: str):
        code = main(list(arguments))
        return code, *capsys.readouterr()

    return ran


@pytest.fixture(scope="module")
def served():
    client = create_app(Settings()).test_client()
    return lambda question: client.post("/v1/state", json=question).data.decode()


@pytest.mark.parametrize(
    ("words", "question"),
    [
        ("nitrogen -p 40 barg -t 25 degC", PLANT),
        ("carbon dioxide -p 3e6 -t 300", {"gas": "carbon dioxide", "pressure": 3e6, "temperature": 300}),
        (
            "methane=92 nitrogen=8 --fraction-unit % --basis mass -p 60 bar -t 15 degC --unit density=lb/ft3 --model gerg-2008",
            {
                "gas": {"fractions": {"methane": 92, "nitrogen": 8}, "fraction_unit": "%", "basis": "mass"},
                "pressure": 60,
                "temperature": 15,
                "units": {"pressure": "bar", "temperature": "degC", "density": "lb/ft3"},
                "model": "gerg-2008",
            },
        ),
        (
            "nitrogen -p 1 barg -t 300 --ambient-pressure 95000",
            {**PLANT, "pressure": 1, "temperature": 300, "units": {"pressure": "barg"}, "ambient_pressure": 95000},
        ),
    ],
)
def test_json_is_the_answer_of_the_service(run, served, words, question):
    """The bytes that the service gives, without a server."""
    code, out, _ = run("state", *words.split(), "--json")
    assert (code, out) == (0, served(question) + "\n")


def test_a_question_in_a_file_is_answered(run, served, tmp_path):
    """The body that a client would post is taken from a file."""
    path = tmp_path / "question.json"
    path.write_text(json.dumps({**PLANT, "pressure": 41}))
    code, out, _ = run("state", "--question", str(path), "--json")
    assert (code, out) == (0, served({**PLANT, "pressure": 41}) + "\n")


def test_a_question_on_standard_input_is_answered(run, served, monkeypatch):
    """A dash reads the question from standard input."""
    stdin = io.TextIOWrapper(io.BytesIO(json.dumps({**PLANT, "pressure": 42}).encode()))
    monkeypatch.setattr(sys, "stdin", stdin)
    code, out, _ = run("state", "--question", "-", "--json")
    assert (code, out) == (0, served({**PLANT, "pressure": 42}) + "\n")


def test_block_tells_what_matters(run, served):
    """Density with its unit, equation, uncertainty, phase, quality and every caution stand in the block."""
    answer = json.loads(served(PLANT))
    code, out, _ = run("state", "nitrogen", "-p", "40", "barg", "-t", "25", "degC")
    assert code == 0
    assert re.search(rf"^density +{answer['result']['density']:.10g} kg/m3$", out, re.MULTILINE)
    assert re.search(r"^state +4101325 Pa absolute, 298.15 K$", out, re.MULTILINE)
    assert re.search(r"^quality +good \(ambient_pressure_assumed\)$", out, re.MULTILINE)
    for words in (answer["model"]["source"], answer["phase"]["region"], *answer["cautions"]):
        assert words in out


def test_a_bad_answer_has_an_exit_code_of_its_own(run):
    """Where no number can be given the code is 1, and the block says why."""
    code, out, _ = run("state", "nitrogen", "-p", "1e13", "-t", "300")
    assert code == 1
    assert re.search(r"^density +none$", out, re.MULTILINE)
    assert re.search(r"^quality +bad", out, re.MULTILINE)


@pytest.mark.parametrize(
    ("words", "said"),
    [
        ("nitrogenn -p 1 bar -t 300", "gas: no gas is called 'nitrogenn' here; nearest names: nitrogen"),
        ("nitrogen -t 300", "pressure: this member is missing"),
        ("-p 1 bar -t 300", "gas: this member is missing"),
        ("nitrogen -p x -t 300", 'pressure: "x" is a string'),
        ("nitrogen -p 1 Bar -t 300", "units/pressure: 'Bar' is no unit of pressure"),
        ("nitrogen -p 1 bar -t -300 degC", "temperature: -300.0 degC is"),
        ("methane=0.5 -p 1 bar -t 300", "gas/fractions: the fractions sum to 0.5"),
        ("methane=much -p 1 bar -t 300", "gas/fractions/methane"),
        ("nitrogen -p 1 bar -t 300 --model best", "model: no equation of state"),
        ("nitrogen -p NaN -t 300", 'pressure: "NaN" is a string'),
        ("nitrogen -p 1 bar -t 300 --unit density", "units/density"),
        ("--question /no/such/file", "No such file"),
    ],
)
def test_a_question_that_makes_no_sense_is_told_so(run, words, said):
    """The code is 2, the faults stand on standard error, each with its member, and there is no traceback."""
    code, out, err = run("state", *words.split())
    assert (code, out) == (2, "")
    assert said in err
    assert "Traceback" not in err


def test_a_site_file_is_heeded(run, tmp_path, monkeypatch):
    """The site's own gases and ambient pressure count here, too."""
    site = tmp_path / "site.toml"
    site.write_text(
        '[site]\nambient_pressure = 95000\n[gases.works-gas]\nname = "Works gas"\n'
        "fractions = { methane = 0.9, nitrogen = 0.1 }\n"
    )
    monkeypatch.setenv("GASAPI_SITE_FILE", str(site))
    code, out, _ = run("state", "works-gas", "-p", "1", "barg", "-t", "300", "--json")
    answer = json.loads(out)
    assert (code, answer["gas"]["id"], answer["state"]["pressure"]) == (0, "works-gas", 195000.0)
