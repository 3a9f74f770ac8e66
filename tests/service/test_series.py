"""Rows of a series against the single states with the same equation named: the same bits, reasons and regions."""

from __future__ import annotations

import math
from itertools import pairwise

import numpy as np
import pytest

from gasapi.engine.phase.region import REGION_NAMES
from gasapi.errors import ModelCannotServe, UnknownGas
from gasapi.service.quality import Reason, quality_of
from gasapi.service.questions import GasSpec, StateQuestion
from gasapi.service.series import Columns, RowComposition, Series, SeriesQuestion, Survey, input_flags
from gasapi.service.state import solve_state

NATURAL_GAS = {
    "methane": 0.78,
    "nitrogen": 0.02,
    "carbon-dioxide": 0.06,
    "ethane": 0.082,
    "propane": 0.03,
    "isobutane": 0.0075,
    "n-butane": 0.011,
    "isopentane": 0.0025,
    "n-pentane": 0.003,
    "n-hexane": 0.0025,
    "n-heptane": 0.0015,
}
HUMID = {"methane": 0.95, "carbon-dioxide": 0.04, "water": 0.01}
GASES = [
    ("nitrogen", "reference"),
    ("carbon-dioxide", "reference"),
    ("water", "reference"),
    ("helium", "reference"),
    ("air", "reference"),
    ("methane", "gerg-2008"),
    ("propane", "ideal-gas"),
    ("propane", "van-der-waals"),
    ("propane", "virial"),
    ("ammonia", "soave-redlich-kwong"),
    ("ammonia", "peng-robinson"),
    ("ammonia", "lee-kesler"),
    (NATURAL_GAS, "gerg-2008"),
    (HUMID, "gerg-2008"),
    ({"hydrogen": 0.4, "nitrogen": 0.6}, "peng-robinson"),
    ({"ethane": 0.5, "propane": 0.5}, "soave-redlich-kwong"),
    ({"ethane": 0.5, "n-butane": 0.5}, "lee-kesler"),
]


def spec_of(gas):
    return GasSpec(gas) if isinstance(gas, str) else GasSpec(None, tuple(gas.items()))


def series(context, question, columns, blocks=None):
    """The answers to all rows and the summary; ``blocks`` are the numbers of rows that are handed over at a time."""
    size = columns.temperature.size
    cuts = np.cumsum([0, *(blocks or [size])])
    survey = Survey(question)
    for a, b in pairwise(cuts):
        survey.add(columns.rows(a, b))
    found = Series(context, question, survey)
    parts = [found.answer(columns.rows(a, b)) for a, b in pairwise(cuts)]
    joined = [None if column[0] is None else np.concatenate(column) for column in zip(*parts, strict=True)]
    return type(parts[0])(*joined), found.summary()


def states(context, gas, model, rows=60, seed=7):
    """Random states of a gas, near its critical point, on and about its saturation line, far out and not at all possible."""
    rng = np.random.default_rng(seed)
    models = context.models(context.gas(spec_of(gas)))
    substances = models.gas.substances
    tc = sum(x * s.critical_temperature for x, s in zip(models.mole_fractions, substances, strict=True))
    pc = sum(x * s.critical_pressure for x, s in zip(models.mole_fractions, substances, strict=True))
    t = [tc * rng.uniform(0.6, 2.5, rows), tc * (1.0 + rng.uniform(-2e-3, 2e-3, rows)), tc * rng.uniform(0.62, 0.99, rows)]
    p = [pc * 10.0 ** rng.uniform(-3.0, 1.3, rows), pc * (1.0 + rng.uniform(-2e-2, 2e-2, rows))]
    curve = getattr(getattr(models.prepared(model).phase, "verdict", None), "curve", None)
    saturated = pc * np.exp(5.4 * (1.0 - tc / t[2])) if curve is None else np.array([curve.pressure(float(x)) for x in t[2]])
    p.append(saturated * (1.0 + rng.choice([0.0, 1e-10, -1e-10, 1e-6, -1e-6, 1e-2, -1e-2], rows)))
    t.append(np.array([math.nan, 300.0, 0.0, -5.0, 1e7, 300.0, 300.0, 0.2 * tc, 30.0 * tc, 300.0, math.inf]))
    p.append(np.array([1e5, math.nan, 1e5, 1e5, 1e5, 0.0, -1e5, 1e4, 1e5, 1e12, 1e5]))
    return np.concatenate(t), np.concatenate(p)


def alone(context, question):
    """A state as the members that a series has."""
    if not (question.pressure > 0.0 and 0.0 < question.temperature < math.inf):
        return None
    answer = solve_state(context, question)
    return (
        answer.density,
        answer.compressibility_factor,
        answer.molar_volume,
        answer.phase.region,
        answer.quality,
    )


def row(rows, i):
    numbers = [float(column[i]) for column in rows[:3]]
    return (
        *(None if math.isnan(x) else x for x in numbers),
        REGION_NAMES[rows.region[i]],
        quality_of(int(rows.flags[i])),
    )


@pytest.mark.parametrize(("gas", "model"), GASES, ids=str)
def test_a_row_has_the_bits_of_the_single_state(context, gas, model):
    """Numbers, region and quality, in blocks of every size and in another order."""
    # a mixture without a traced boundary is tested for stability state by state
    t, p = states(context, gas, model, 15 if isinstance(gas, dict) else 60)
    question = SeriesQuestion(spec_of(gas), model)
    rows, _ = series(context, question, Columns(t, p))
    blocks = [1, 2, 0, 23, 7]
    pieces, _ = series(context, question, Columns(t, p), [*blocks, t.size - sum(blocks)])
    order = np.random.default_rng(3).permutation(t.size)
    shuffled, _ = series(context, question, Columns(t[order], p[order]))
    for i in range(t.size):
        expected = alone(context, StateQuestion(spec_of(gas), float(p[i]), float(t[i]), model))
        if expected is None:
            assert quality_of(int(rows.flags[i])).reasons[-1] == "input_bad"
            assert row(rows, i)[:4] == (None, None, None, "unknown")
        else:
            assert expected == row(rows, i)
    for other, at in ((pieces, np.arange(t.size)), (shuffled, np.argsort(order))):
        for column, again in zip(rows[:5], other[:5], strict=True):
            assert np.array_equal(column, again[at], equal_nan=column.dtype.kind == "f")


def test_an_assumed_ambient_pressure_is_told_in_every_row(context):
    """And lowers the level where it matters, as in a single state."""
    p = np.array([2e5, 5e6])
    t = np.array([300.0, 300.0])
    question = SeriesQuestion(GasSpec("nitrogen"), "auto", ambient_pressure=101325.0)
    rows, summary = series(context, question, Columns(t, p))
    for i in range(2):
        asked = StateQuestion(GasSpec("nitrogen"), float(p[i]), float(t[i]), "reference", 101325.0)
        assert alone(context, asked) == row(rows, i)
    assert dict(summary.counts) == {"good": 1, "uncertain": 1, "bad": 0}


def test_accepted_two_phase_rows_have_the_numbers_of_the_single_state(context):
    """A mixture between its bubble and its dew point."""
    gas = {"methane": 0.7, "propane": 0.3}
    t, p = np.array([240.0, 240.0, 320.0]), np.array([2e6, 2.5e6, 2e6])
    question = SeriesQuestion(spec_of(gas), "gerg-2008", accept_two_phase=True)
    rows, _ = series(context, question, Columns(t, p))
    assert [REGION_NAMES[r] for r in rows.region] == ["two-phase", "two-phase", "gas"]
    for i in range(3):
        asked = StateQuestion(spec_of(gas), float(p[i]), float(t[i]), "gerg-2008", accept_two_phase=True)
        assert alone(context, asked) == row(rows, i)


def test_composition_by_the_row(context):
    """Every row has the bits of its own composition asked alone, whatever stands about it; bad ones are bad rows."""
    names = ("methane", "N2", "air")
    x = np.array(
        [
            [0.9, 0.1, 0.0],
            [0.5, 0.3, 0.2],
            [1.0, 0.0, 0.0],
            [0.9, 0.1, 0.0],
            [0.9, 0.111, 0.0],
            [0.9, 0.2, 0.0],
            [1.1, -0.1, 0.0],
            [math.nan, 0.5, 0.5],
            [0.0, 0.0, 0.0],
            [-0.0, 0.5, 0.5],
        ]
    )
    n = len(x)
    t, p = np.linspace(280.0, 320.0, n), np.linspace(1e6, 9e6, n)
    question = SeriesQuestion(RowComposition(names))
    rows, summary = series(context, question, Columns(t, p, None, x), [3, 0, n - 3])
    assert summary.model.id == "gerg-2008"
    bad = [5, 6, 7, 8]
    for i in range(n):
        if i in bad:
            assert quality_of(int(rows.flags[i])).reasons == ("fractions_bad",)
            assert row(rows, i)[:4] == (None, None, None, "unknown")
            assert math.isnan(rows.molar_mass[i])
            continue
        spec = GasSpec(None, tuple(zip(names, x[i].tolist(), strict=True)))
        asked = StateQuestion(spec, float(p[i]), float(t[i]), "gerg-2008")
        assert alone(context, asked) == row(rows, i)
        answer = solve_state(context, asked)
        assert answer.gas.molar_mass == rows.molar_mass[i]
        shares = dict(zip(summary.gas.components, rows.fractions[i].tolist(), strict=True))
        assert dict(answer.gas.fractions) == {id: share for id, share in shares.items() if share}
    assert "fractions_scaled" in quality_of(int(rows.flags[4])).reasons
    assert dict(summary.counts)["bad"] == len(bad)


def test_one_equation_serves_all_compositions(context):
    """A component that GERG-2008 lacks decides for all rows, and an equation that cannot serve them all is refused."""
    question = SeriesQuestion(RowComposition(("nitrogen", "ammonia")))
    columns = Columns(np.full(2, 350.0), np.full(2, 1e6), None, np.array([[1.0, 0.0], [0.5, 0.5]]))
    _, summary = series(context, question, columns)
    assert summary.model.id not in ("reference", "gerg-2008")
    with pytest.raises(ModelCannotServe):
        series(context, question._replace(model="gerg-2008"), columns)


def test_names_of_columns_are_looked_up(context):
    """Even where every row is bad."""
    columns = Columns(np.full(1, 300.0), np.full(1, 1e5), None, np.full((1, 1), math.nan))
    with pytest.raises(UnknownGas):
        series(context, SeriesQuestion(RowComposition(("unobtainium",))), columns)


def test_one_equation_serves_the_whole_series(context):
    """It is the one that holds the most rows, and rows outside its range are uncertain."""
    t, p = np.array([300.0, 300.0, 1200.0]), np.array([1e5, 2e5, 1e5])
    rows, summary = series(context, SeriesQuestion(GasSpec("nitrogen")), Columns(t, p))
    assert summary.model.id == "reference"
    assert not summary.model.inside_validity
    assert "outside_validity" in quality_of(int(rows.flags[2])).reasons
    assert dict(summary.counts) == {"good": 2, "uncertain": 1, "bad": 0}


def test_a_stated_uncertainty_is_the_largest_of_the_rows(context):
    """Rows asked alone, one of them near the critical point."""
    t, p = np.array([300.0, 305.0, 700.0]), np.array([1e5, 7.55e6, 1e8])
    _, summary = series(context, SeriesQuestion(GasSpec("carbon-dioxide"), "reference"), Columns(t, p))
    each = [
        solve_state(context, StateQuestion(GasSpec("carbon-dioxide"), float(b), float(a), "reference")).model
        for a, b in zip(t, p, strict=True)
    ]
    largest = max(each, key=lambda model: model.relative_uncertainty)
    assert summary.model.relative_uncertainty == pytest.approx(largest.relative_uncertainty, rel=1e-12)
    assert summary.model.uncertainty_basis == largest.uncertainty_basis


def test_no_usable_row_is_answered_too(context):
    """Every row bad, none counted as anything else."""
    nothing = np.full(3, math.nan)
    rows, summary = series(context, SeriesQuestion(GasSpec("nitrogen")), Columns(nothing, nothing))
    assert dict(summary.counts) == {"good": 0, "uncertain": 0, "bad": 3}
    assert summary.model.relative_uncertainty is None
    assert np.isnan(rows.density).all()


def test_a_long_series_is_surveyed_in_part_alike_in_any_blocks(context):
    """What decides on a generalised equation does not depend on how the rows come in."""
    rng = np.random.default_rng(1)
    n = (1 << 21) + 77
    t, p = rng.uniform(300.0, 500.0, n), rng.uniform(1e4, 1e7, n)
    whole, parts = (Survey(SeriesQuestion(GasSpec("ammonia"))) for _ in range(2))
    whole.add(Columns(t, p))
    for i in range(0, n, 100_003):
        parts.add(Columns(t[i : i + 100_003], p[i : i + 100_003]))
    kept = [np.concatenate(s._temperature) for s in (whole, parts)]
    assert kept[0].size <= 1 << 20
    assert np.array_equal(kept[0], kept[1])


@pytest.mark.parametrize(
    ("kind", "code", "expected"),
    [
        ("opc-ua", 0.0, 0),
        ("opc-ua", float(0x00A50000), 0),
        ("opc-ua", float(0x40000000), Reason.INPUT_UNCERTAIN),
        ("opc-ua", float(0x408F0000), Reason.INPUT_UNCERTAIN),
        ("opc-ua", float(0x80000000), Reason.INPUT_BAD),
        ("opc-ua", float(0x808A0000), Reason.INPUT_BAD),
        ("opc-ua", float(0xFFFFFFFF), Reason.INPUT_BAD),
        ("opc-ua", math.nan, Reason.INPUT_BAD),
        ("opc-classic", 192.0, 0),
        ("opc-classic", 216.0, 0),
        ("opc-classic", 64.0, Reason.INPUT_UNCERTAIN),
        ("opc-classic", 80.0, Reason.INPUT_UNCERTAIN),
        ("opc-classic", 0.0, Reason.INPUT_BAD),
        ("opc-classic", 24.0, Reason.INPUT_BAD),
        ("opc-classic", 128.0, Reason.INPUT_BAD),
    ],
)
def test_input_status(kind, code, expected):
    """OPC UA part 4, severity bits of a status code; OPC Data Access 3.0, quality bits (192 good, 64 uncertain, 0 bad)."""
    assert input_flags(np.array([code]), kind).tolist() == [int(expected)]


def test_input_status_ranks_with_the_rest(context):
    """A bad input makes a bad row; an uncertain one caps a good row at uncertain and leaves its number."""
    t, p = np.full(3, 300.0), np.full(3, 1e5)
    flags = input_flags(np.array([0.0, float(0x40000000), float(0x80000000)]), "opc-ua")
    rows, _ = series(context, SeriesQuestion(GasSpec("nitrogen")), Columns(t, p, flags))
    assert [quality_of(int(f)).level for f in rows.flags] == ["good", "uncertain", "bad"]
    assert rows.density[0] == rows.density[1]
    assert math.isnan(rows.density[2])
    assert REGION_NAMES[rows.region[2]] == "unknown"
