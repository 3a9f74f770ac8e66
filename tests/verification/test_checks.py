"""The check values that come with the program, and what is made of them."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from gasapi.app import create_context
from gasapi.settings import Settings
from gasapi.verification import checks
from gasapi.verification.checks import check_values, run_checks

PUBLISHED = Path(__file__).resolve().parents[1] / "engine" / "published"


def of_the_tests(name):
    return json.loads((PUBLISHED / name).read_text(encoding="utf-8"))


def test_values_are_those_of_the_tests():
    """What ships is what the tests of the engine check, with its sources; nothing was left out or altered on the way."""
    groups = {group["id"]: group for group in check_values()}
    reference = of_the_tests("reference_check_points.json")
    gerg = of_the_tests("gerg_2008_check_points.json")
    assert groups["reference-published"]["points"] == [p for p in reference["published"] if "pressure_Pa" in p]
    assert groups["reference-states"]["points"] == reference["states"]
    assert groups["gerg-2008"]["points"] == gerg["points"]
    assert groups["gerg-2008"]["source"] == gerg["note"]
    assert groups["reference-published"]["source"] == reference["published_note"]


@pytest.mark.slow
def test_every_value_is_repeated_and_passes():
    """Each value is looked at, and each state found back alone and in a series."""
    groups = {group.id: group for group in run_checks(create_context(Settings()))}
    counts = {group["id"]: len(group["points"]) for group in check_values()}
    assert {id: len(groups[id].checks) for id in counts} == counts
    assert len(groups["states-found-back"].checks) == 2 * counts["reference-states"]
    assert [] == [check for group in groups.values() for check in group.checks if not check.passed]


def test_a_wrong_value_does_not_pass(monkeypatch):
    """A digit that is off in the sixth place of a printed pressure, or the tenth of a computed one, is a failure."""
    values = check_values()
    for group in values:
        group["points"] = group["points"][:1]
    values[0]["points"][0]["pressure_Pa"] *= 1.00001
    values[1]["points"][0]["pressure_Pa"] *= 1.000000001
    values[2]["points"][0]["density_mol_per_m3"] *= 1.000000001
    monkeypatch.setattr(checks, "check_values", lambda: values)
    groups = list(run_checks(create_context(Settings())))
    assert [False, False, False] == [group.checks[0].passed for group in groups[:3]]
