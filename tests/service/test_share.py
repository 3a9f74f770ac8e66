"""Very many compositions shared among processes: the same rows, and the same again where a process fails."""

from __future__ import annotations

import numpy as np
import pytest

from gasapi.service import series as module
from gasapi.service import share
from gasapi.service.series import Columns, RowComposition, Series, SeriesQuestion, Survey
from gasapi.service.share import Share

NAMES = ("methane", "nitrogen", "hydrogen")


@pytest.fixture
def columns():
    rng = np.random.default_rng(1)
    x = np.array([[0.9, 0.1, 0.0], [0.5, 0.3, 0.2], [0.9, 0.2, 0.0], [1.0, 0.0, 0.0], [0.0, 0.0, 1.0]])
    at = rng.integers(0, len(x), 60)
    return Columns(rng.uniform(280.0, 320.0, 60), rng.uniform(1e5, 1e7, 60), rng.choice([0, 1 << 12], 60), x[at])


def answer(context, columns, **options):
    question = SeriesQuestion(RowComposition(NAMES), accuracy=1e-6)
    survey = Survey(question)
    survey.add(columns)
    found = Series(context, question, survey, **options)
    return found.answer(columns), found.summary()


@pytest.mark.parametrize("fails", [False, True])
def test_shares_have_the_bits_of_the_whole(context, columns, monkeypatch, fails):
    """Rows, counts, largest uncertainty and certificate."""
    monkeypatch.setattr(module, "_SHARED_FROM", 2)
    monkeypatch.setattr(module, "cores", lambda: 2)
    used = []

    class Seen(Share):
        def result(self):
            found = super().result()
            used.append(found is not None)
            return None if fails else found

    monkeypatch.setattr(module, "Share", Seen)
    expected, whole = answer(context, columns, shares=False)
    assert used == []
    found, joined = answer(context, columns)
    assert used == [True]
    for column, again in zip(expected, found, strict=True):
        assert np.array_equal(column, again, equal_nan=column.dtype.kind == "f")
    assert whole == joined


@pytest.mark.parametrize("command", ["/bin/false", "/no/such/command"])
def test_a_process_that_cannot_start_is_no_failure(context, columns, monkeypatch, command):
    """Its share is answered here."""
    monkeypatch.setattr(module, "_SHARED_FROM", 2)
    monkeypatch.setattr(module, "cores", lambda: 3)
    monkeypatch.setattr(share.sys, "executable", command)
    expected, _ = answer(context, columns, shares=False)
    found, _ = answer(context, columns)
    assert np.array_equal(expected.density, found.density, equal_nan=True)


def test_cores_are_few():
    """At least one, and no more than four."""
    assert 1 <= share.cores() <= 4
