"""Structured Text: taken by an independent grammar, run in 32-bit arithmetic, and safe whatever comes in."""

from __future__ import annotations

import math
import re
import sys
from pathlib import Path

import numpy as np
import pytest

from gasapi.service.bilinear import interpolate
from gasapi.service.lookup_table import answer_lookup_table
from gasapi.service.structured_text import BlockText, block_name, function_block, real

sys.path.insert(0, str(Path(__file__).resolve().parents[1] / "support"))
sys.path.insert(0, str(Path(__file__).resolve().parent))

from structured_text import FunctionBlock
from test_lookup_table import errors_at, table_question

TEXT = BlockText(
    name="density_nitrogen",
    property="density",
    gas="nitrogen",
    units=("bar", "degC", "kg/m3"),
    date="2026-12-01",
    model="Reference equation",
    source="R. Span, é, Ł, *) 中",
    quality="good",
    version="0.0",
    data="sha256:0",
    uncertainty=0.0002,
    cautions=("Asphyxiant (*displaces oxygen*).",),
)


@pytest.fixture(scope="module")
def made(context):
    question = table_question("nitrogen", (1.0, 60.0), (-20.0, 80.0), 1e-2)
    answer = answer_lookup_table(context, question)
    return question, answer, function_block(answer.table, TEXT)


@pytest.fixture(scope="module")
def block(made):
    return FunctionBlock(made[2])


def test_an_independent_grammar_takes_it(block):
    """Name, inputs and outputs as the contract has them."""
    assert "density_nitrogen" == block.name
    assert ["pressure", "temperature"] == block.inputs
    assert ["density", "status"] == block.outputs
    assert {"REAL", "INT"} == set(block.types.values())


def test_its_arithmetic_has_the_bits_that_were_checked(made, block):
    """5,000 random points, run statement by statement, against the interpolation whose error was searched."""
    question, answer, _ = made
    chance = np.random.default_rng(3)
    p = chance.uniform(*question.pressure, 5000).astype(np.float32)
    t = chance.uniform(*question.temperature, 5000).astype(np.float32)
    expected = interpolate(answer.table.grid, p, t)
    for a, b, value in zip(p, t, expected, strict=True):
        assert {"density": value, "status": 0} == block(a, b)


def test_its_error_against_the_service(context, made, block):
    """At nodes, at midpoints and at the ends the density is that of the service within the tolerance."""
    question, answer, _ = made
    assert errors_at(context, question, answer, 20_000).max() <= 1e-2
    model = context.models(context.gas(question.state.gas)).prepared("reference")
    for p, t in ((1.0, -20.0), (60.0, 80.0), (60.0, -20.0), (1.0, 80.0), (30.5, 21.25), (7.7, 66.6)):
        density = model.fluid.solve(t + 273.15, p * 1e5, 0).root.density * model.fluid.molar_mass
        assert density == pytest.approx(float(block(p, t)["density"]), rel=1e-2)


@pytest.mark.parametrize(
    ("pressure", "temperature", "held"),
    [
        (0.0, 20.0, (1.0, 20.0)),
        (-1e30, 20.0, (1.0, 20.0)),
        (61.0, 20.0, (60.0, 20.0)),
        (30.0, -21.0, (30.0, -20.0)),
        (30.0, 1e30, (30.0, 80.0)),
        (math.inf, -math.inf, (60.0, -20.0)),
        (-math.inf, math.inf, (1.0, 80.0)),
    ],
)
def test_inputs_outside_are_held_at_the_ends(block, pressure, temperature, held):
    """And status says so; no index leaves its array (the interpreter would raise)."""
    assert {"density": block(*held)["density"], "status": 1} == block(pressure, temperature)


@pytest.mark.parametrize(
    ("pressure", "temperature"), [(math.nan, 20.0), (30.0, math.nan), (math.nan, math.nan), (math.nan, 1e9), (1e9, math.nan)]
)
def test_no_number_is_bad_and_never_a_plausible_density(block, pressure, temperature):
    """Status 2 and 0.0."""
    assert {"density": np.float32(0.0), "status": 2} == block(pressure, temperature)


def test_status_is_made_anew_in_every_cycle(block):
    """A bad input once does not make the next answer bad."""
    assert [2, 0] == [block(math.nan, 20.0)["status"], block(30.0, 20.0)["status"]]


def test_text_is_ascii_and_the_comment_cannot_end_early(made):
    """Whatever stands in a source or a caution."""
    text = made[2]
    assert text.isascii()
    assert re.fullmatch(r"[\n -~]*", text)
    header = text[text.index("(*") : text.index("VAR_INPUT")]
    assert 1 == header.count("(*") == header.count("*)")
    assert "R. Span, e, L" in header


def test_header_says_what_it_must(made):
    """Name, date, model, source, error and caution."""
    _, answer, text = made
    flat = re.sub(r"\s+", " ", text)
    for words in ("density_nitrogen", "2026-12-01", "Reference equation", "Source: R. Span", "Caution: Asphyxiant", "bytes"):
        assert words in flat
    assert f"at most {100.0 * answer.table.max_relative_error:.4g} %" in flat
    assert max(map(len, text.splitlines())) <= 100


@pytest.mark.parametrize(
    ("value", "text"),
    [(1.0, "1.0"), (-20.0, "-20.0"), (0.1, "0.1"), (1e10, "1.0E10"), (1.5e-7, "1.5E-7"), (0.0, "0.0"), (123456.7, "123456.7")],
)
def test_real_literals_have_a_point(value, text):
    """A REAL literal of the standard has digits on both sides of its point, with an exponent or without."""
    assert text == real(np.float32(value))


def test_real_literals_read_back_to_the_same_bits():
    """Over the whole range of 32-bit numbers."""
    numbers = np.random.default_rng(5).integers(0, 2**31 - 2**23, 5000, dtype=np.int64).astype(np.uint32).view(np.float32)
    for number in numbers[np.isfinite(numbers)]:
        assert re.fullmatch(r"-?[0-9]+\.[0-9]+(E-?[0-9]+)?", real(number))
        assert number == np.float32(real(number))


@pytest.mark.parametrize(
    ("gas", "name"),
    [
        ("carbon-dioxide", "density_carbon_dioxide"),
        ("1-1-1-trifluoroethane-and-more-of-it", "density_1_1_1_trifluoroethane_an"),
        ("é mixture__", "density_e_mixture"),
    ],
)
def test_names_are_identifiers(gas, name):
    """Letters, digits and single underscores."""
    assert name == block_name("density", gas)
    assert re.fullmatch(r"[A-Za-z](_?[A-Za-z0-9])*", name)
