"""Ten thousand questions: the same bits alone, from the memo, in a series, shuffled, and in another process."""

from __future__ import annotations

import hashlib
import os
import subprocess
import sys

import numpy as np
import pytest

from gasapi.service.questions import GasSpec, StateQuestion
from gasapi.service.series import Columns, Series, SeriesQuestion, Survey
from gasapi.service.state import answer_state

ROWS = 1250
GASES = {
    "nitrogen": "reference",
    "carbon-dioxide": "reference",
    "propane": "reference",
    "air": "reference",
    "hydrogen": "gerg-2008",
    "ammonia": "lee-kesler",
    "natural gas": "gerg-2008",
    "mixture": "peng-robinson",
}
FRACTIONS = {
    "natural gas": (("methane", 0.85), ("nitrogen", 0.03), ("carbon-dioxide", 0.02), ("ethane", 0.07), ("propane", 0.03)),
    "mixture": (("methane", 0.6), ("hydrogen", 0.4)),
}
ANOTHER = """
from test_same_bits import GASES, digest, in_series
from gasapi.gases.catalogue import Catalogue
from gasapi.service.context import Context
context = Context(Catalogue.load())
print(*(digest(in_series(context, name)) for name in reversed(GASES)))
"""


def states(name):
    rng = np.random.default_rng(sorted(GASES).index(name))
    return rng.uniform(220.0, 420.0, ROWS), 10.0 ** rng.uniform(4.5, 7.3, ROWS)


def spec(name):
    return GasSpec(None, FRACTIONS[name]) if name in FRACTIONS else GasSpec(name)


def in_series(context, name, order=None):
    temperature, pressure = states(name)
    order = np.arange(ROWS) if order is None else order
    columns = Columns(temperature[order], pressure[order])
    question = SeriesQuestion(spec(name), GASES[name])
    survey = Survey(question)
    survey.add(columns)
    return Series(context, question, survey).answer(columns)


def digest(rows):
    return hashlib.sha256(b"".join(column.tobytes() for column in rows[:5])).hexdigest()


def numbers(answer):
    found = (answer.density, answer.compressibility_factor, answer.molar_volume)
    return [np.nan if x is None else x for x in found]


@pytest.mark.parametrize("name", GASES)
def test_alone_cached_in_a_series_and_shuffled(context, name):
    """No difference in any of 1250 questions of each gas."""
    temperature, pressure = states(name)
    asked = [StateQuestion(spec(name), p, t, GASES[name]) for t, p in zip(temperature.tolist(), pressure.tolist(), strict=True)]
    alone = np.array([numbers(answer_state(context, question).answer) for question in asked])
    cached = np.array([numbers(answer_state(context, question).answer) for question in asked])
    assert np.array_equal(alone, cached, equal_nan=True)
    rows = in_series(context, name)
    assert np.array_equal(alone, np.array(rows[:3]).T, equal_nan=True)
    order = np.random.default_rng(9).permutation(ROWS)
    shuffled = in_series(context, name, order)
    assert np.array_equal(alone[order], np.array(shuffled[:3]).T, equal_nan=True)
    assert np.isfinite(alone[:, 0]).sum() > ROWS // 3


def test_in_another_process(context):
    """That asks in another order."""
    path = os.pathsep.join([os.path.dirname(__file__), *(p for p in sys.path if p)])
    run = subprocess.run(
        [sys.executable, "-c", ANOTHER], env={**os.environ, "PYTHONPATH": path}, capture_output=True, text=True, check=True
    )
    assert run.stdout.split() == [digest(in_series(context, name)) for name in reversed(GASES)]
