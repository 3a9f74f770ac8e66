"""``gasapi verify`` and ``gasapi state --replay``."""

from __future__ import annotations

import json

import pytest

from gasapi.cli import main
from gasapi.verification import checks
from gasapi.verification.checks import check_values


@pytest.fixture
def few_values(monkeypatch):
    """Check values, two of each group."""
    values = check_values()
    for group in values:
        group["points"] = group["points"][:2]
    monkeypatch.setattr(checks, "check_values", lambda: values)
    return values


def test_report_can_be_signed_off(few_values, capsys, tmp_path):
    """The report names program, data, machine and source, counts what passed, and has room for signatures."""
    file = tmp_path / "report.txt"
    assert 0 == main(["verify", "--output", str(file)])
    report = capsys.readouterr().out
    assert report == file.read_text(encoding="utf-8")
    for words in ("gasapi ", "sha256:", "NumPy", "recalled from memory", "PASSED: 10 of 10 values", "signature  "):
        assert words in report


def test_failures_are_listed_and_told_by_the_exit_code(few_values, capsys):
    """A value that is not repeated is shown with what was expected and found."""
    few_values[0]["points"][0]["pressure_Pa"] = 1.0
    assert 1 == main(["verify"])
    report = capsys.readouterr().out
    assert "FAILED: 9 of 10 values" in report
    assert "FAILED  acetone at 510 K" in report
    assert 1 == main(["verify", "--json"])
    assert not json.loads(capsys.readouterr().out)["passed"]


QUESTIONS = {
    "pure": ["nitrogen", "-p", "40", "barg", "-t", "25", "degC"],
    "mixture": ["methane=0.91", "nitrogen=0.0533", "ethane=0.0367", "-p", "60", "bar", "-t", "12.3", "degC"],
    "thirds": ["methane=0.333333", "nitrogen=0.333333", "argon=0.333333", "-p", "3e6", "-t", "300"],
    "mass": ["methane=70.1", "propane=29.9", "--basis", "mass", "--fraction-unit", "%", "-p", "1e6", "-t", "350"],
    "generalised": ["1-butanol", "-p", "1e5", "-t", "420", "--unit", "density=lb/ft3"],
    "two-phase": ["propane", "-p", "12", "bar", "-t", "20", "degC"],
}


@pytest.mark.parametrize("name", QUESTIONS)
def test_an_answer_on_file_has_the_same_bits_again(name, capsys, tmp_path):
    """Whatever was asked, and in whatever units: the answer alone is enough to ask again, bad answers included."""
    main(["state", *QUESTIONS[name], "--json"])
    file = tmp_path / "answer.json"
    file.write_text(capsys.readouterr().out, encoding="utf-8")
    assert 0 == main(["state", "--replay", str(file)]), capsys.readouterr().out
    assert capsys.readouterr().out.startswith("same bits")


def test_an_altered_answer_is_found_out(capsys, tmp_path):
    """The last bit of the density, and a level made better than it was, are both told."""
    main(["state", *QUESTIONS["pure"], "--json"])
    answer = json.loads(capsys.readouterr().out)
    density = answer["result"]["density"]
    answer["result"]["density"] = density * (1.0 + 2.0**-52)
    answer["quality"]["level"] = "bad"
    answer["trace"]["data"] = "sha256:0"
    file = tmp_path / "answer.json"
    file.write_text(json.dumps(answer), encoding="utf-8")
    assert 1 == main(["state", "--replay", str(file)])
    lines = capsys.readouterr().out.splitlines()
    assert "other data" in lines[0]
    assert any(line.startswith("result.density: ") and repr(density) in line for line in lines)
    assert any(line.startswith("quality.level: 'bad' on file, 'good' here") for line in lines)


@pytest.mark.parametrize("text", ["", "[]", "{}", '{"gas": "nitrogen", "pressure": 1}', "{" * 3000])
def test_what_is_no_answer_is_refused(text, capsys, tmp_path):
    """Exit code 2 and a sentence, not a traceback."""
    file = tmp_path / "answer.json"
    file.write_text(text, encoding="utf-8")
    assert 2 == main(["state", "--replay", str(file)])
    assert capsys.readouterr().err.startswith("gasapi state: ")
