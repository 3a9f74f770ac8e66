"""The jobs from the command line: the same numbers as the service, units beside their values, and exit codes."""

from __future__ import annotations

import json

import pytest

from gasapi.app import create_app
from gasapi.cli import main
from gasapi.settings import Settings

PLANT = {"pressure": "barg", "temperature": "degC"}

# the command line, the call, and the question that it stands for
COMMANDS = (
    (
        "flow nitrogen -p 40 barg -t 25 degC --flow 120 m3/h --reference din-1343 --meter volumetric --design-density 40",
        "flow",
        {
            "gas": "nitrogen",
            "pressure": 40,
            "temperature": 25,
            "units": PLANT,
            "flow": {"kind": "actual_volume", "value": 120, "unit": "m3/h"},
            "reference": "din-1343",
            "meter": {"principle": "volumetric", "design_density": 40},
        },
    ),
    (
        "vessel methane=0.9 nitrogen=0.1 --volume 50 L -p 200 barg -t 15 degC --later 100 -5 --reference iso-13443"
        " --draw-off 2 kg/h --draw-off-kind mass --minimum-pressure 5",
        "vessel",
        {
            "gas": {"fractions": {"methane": 0.9, "nitrogen": 0.1}},
            "volume": 50,
            "pressure": 200,
            "temperature": 15,
            "units": {**PLANT, "volume": "L"},
            "later": {"pressure": 100, "temperature": -5},
            "reference": "iso-13443",
            "draw_off": {"kind": "mass", "value": 2, "unit": "kg/h", "minimum_pressure": 5},
        },
    ),
    (
        "pressure-decay air --volume 500 L --duration 12 h --start 6.00 21.0 --start-ambient 101300 --end 5.91 18.5"
        " --unit pressure=barg --unit temperature=degC --uncertainty pressure=0.003 --uncertainty temperature=0.15"
        " --leak-limit 0.02 mbar L/s",
        "pressure-decay",
        {
            "gas": "air",
            "volume": 500,
            "duration": 12,
            "start": {"pressure": 6.0, "temperature": 21.0, "ambient_pressure": 101300},
            "end": {"pressure": 5.91, "temperature": 18.5},
            "units": {**PLANT, "volume": "L", "duration": "h"},
            "input_uncertainty": {"pressure": 0.003, "temperature": 0.15},
            "leak_limit": {"value": 0.02, "unit": "mbar L/s"},
        },
    ),
    (
        "fraction-from-density hydrogen nitrogen --density 0.45 -p 4 bar -t 40 degC",
        "fraction-from-density",
        {
            "gases": ["hydrogen", "nitrogen"],
            "density": 0.45,
            "pressure": 4,
            "temperature": 40,
            "units": {"pressure": "bar", "temperature": "degC"},
        },
    ),
    (
        "molar-mass --mass 1.152 g --volume 1 L -p 101325 -t 23 degC --like nitrogen",
        "molar-mass",
        {
            "mass": 1.152,
            "volume": 1,
            "pressure": 101325,
            "temperature": 23,
            "units": {"mass": "g", "volume": "L", "temperature": "degC"},
            "like": "nitrogen",
        },
    ),
    (
        "comparison carbon dioxide -p 50 bar -t 40 degC",
        "comparison",
        {"gas": "carbon dioxide", "pressure": 50, "temperature": 40, "units": {"pressure": "bar", "temperature": "degC"}},
    ),
    (
        "phase-boundary methane=0.9 ethane=0.1 --unit pressure=barg --ambient-pressure 100000",
        "phase-boundary",
        {
            "gas": {"fractions": {"methane": 0.9, "ethane": 0.1}},
            "units": {"pressure": "barg"},
            "ambient_pressure": 100000,
        },
    ),
    (
        "lookup-table nitrogen -p 1 60 bar -t -20 80 degC --tolerance 0.01",
        "lookup-table",
        {
            "gas": "nitrogen",
            "pressure": [1, 60],
            "temperature": [-20, 80],
            "units": {"pressure": "bar", "temperature": "degC"},
            "tolerance": 0.01,
        },
    ),
)


@pytest.fixture(scope="module")
def client():
    return create_app(Settings()).test_client()


@pytest.mark.parametrize(("line", "call", "question"), COMMANDS)
def test_a_command_answers_as_the_service_does(client, capsys, line, call, question):
    """To the last bit, trace and all."""
    assert 0 == main([*line.split(), "--json"])
    assert client.post(f"/v1/{call}", json=question).get_json() == json.loads(capsys.readouterr().out)


@pytest.mark.parametrize(("line", "call", "question"), COMMANDS)
def test_a_question_from_a_file_is_the_same(tmp_path, capsys, line, call, question):
    """The file holds the body of the request."""
    file = tmp_path / "question.json"
    file.write_text(json.dumps(question))
    assert 0 == main([call, "--question", str(file)])
    from_file = capsys.readouterr().out
    assert 0 == main(line.split())
    assert from_file == capsys.readouterr().out


def test_values_stand_beside_their_units(capsys):
    """And warnings and cautions below them."""
    main(["flow", "nitrogen", "-p", "40", "barg", "-t", "25", "degC", "--flow", "120", "m3/h", "--unit", "mass_flow=kg/h"])
    lines = dict(line.split("  ", 1) for line in capsys.readouterr().out.splitlines())
    assert "5585.19" == lines["mass"].strip()[:7]
    assert lines["mass"].endswith("kg/h")
    assert "good (ambient_pressure_assumed)" == lines["quality"].strip()
    assert "none" == lines["reference volume"].strip()


def test_toxic_candidates_stand_out(capsys):
    """In capitals, and in the first caution."""
    assert 0 == main(["molar-mass", "--density", "1.145", "-p", "101325", "-t", "298.15"])
    out = capsys.readouterr().out
    assert any("carbon-monoxide" in line and line.endswith("TOXIC") for line in out.splitlines())
    assert "never a proof of identity" in out


@pytest.mark.parametrize(("form", "start"), [("st", "FUNCTION_BLOCK N2"), ("csv", "density [kg/m3] by pressure")])
def test_tables_are_written_as_text(capsys, form, start):
    """Ready to be sent into a file."""
    line = f"lookup-table nitrogen -p 1 60 bar -t -20 80 degC --tolerance 0.01 --format {form} --name N2"
    assert 0 == main(line.split())
    assert capsys.readouterr().out.startswith(start)


def test_exit_codes(capsys):
    """1 for a bad answer, 2 for a bad question, with the member and the words that help."""
    assert 1 == main(["vessel", "nitrogen", "--volume", "1", "-p", "1e12", "-t", "300"])
    capsys.readouterr()
    assert 2 == main(["vessel", "nitrogen", "--volume", "0", "-p", "1e5", "-t", "300"])
    assert "gasapi vessel: volume: 0.0 is no volume that can hold gas" in capsys.readouterr().err
    assert 2 == main(["lookup-table", "nitrogen", "-p", "60", "1", "bar", "-t", "0", "10", "degC", "--tolerance", "0.01"])
    assert "low end first" in capsys.readouterr().err
    assert 2 == main(["flow", "--question", "no-such-file.json"])
