"""The README tells the truth: its session, re-run, prints what it shows, and CI runs its test command."""

from __future__ import annotations

from pathlib import Path

import pytest
from readme_session import README, run, service, shown, without_hash

TOP = Path(__file__).parents[1]


@pytest.fixture(scope="module")
def address():
    with service() as found:
        yield found


def test_the_session_prints_what_the_readme_shows(address):
    """Every curl line of the README, in order, against a fresh service."""
    session = shown(README.read_text(encoding="utf-8"))
    assert len(session) >= 4
    for command, answer in session:
        assert without_hash(run(command, address)) == without_hash(answer), command


def test_ci_runs_the_test_command_of_the_readme():
    """A newcomer and CI run the same line."""
    line = next(x.strip() for x in README.read_text(encoding="utf-8").splitlines() if x.strip().endswith("/pytest"))
    assert line in [x.strip() for x in (TOP / ".ci" / "run").read_text(encoding="utf-8").splitlines()]
