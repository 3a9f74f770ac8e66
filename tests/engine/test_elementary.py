"""The elementary functions against 40-digit arithmetic, and floats against blocks."""

from __future__ import annotations

import math
from decimal import Decimal, getcontext

import numpy as np
import pytest

from gasapi.engine import elementary

getcontext().prec = 40


def units_in_the_last_place(found: float, exact: Decimal) -> float:
    return float(abs(Decimal(found) - exact) / Decimal(math.ulp(float(exact))))


@pytest.mark.parametrize("seed", [1, 2])
def test_exponential_is_right_to_a_unit_in_the_last_place(seed):
    """Over the whole range of exponents, by decimal arithmetic."""
    rng = np.random.default_rng(seed)
    for x in np.concatenate([rng.uniform(-700, 700, 300), rng.uniform(-1, 1, 300), rng.uniform(-40, 0, 300)]).tolist():
        assert units_in_the_last_place(elementary.exp(x), Decimal(x).exp()) < 1.2


def test_logarithm_is_right_to_a_unit_in_the_last_place():
    """From 1e-300 to 1e300 and close to 1, by decimal arithmetic; near 1 the error is relative too."""
    rng = np.random.default_rng(3)
    values = np.concatenate(
        [10.0 ** rng.uniform(-300, 300, 300), rng.uniform(0.5, 2.0, 500), 1.0 + rng.uniform(-1e-6, 1e-6, 200)]
    )
    for x in values.tolist():
        assert units_in_the_last_place(elementary.log(x), Decimal(x).ln()) < 2.5
    assert elementary.log(1.0) == 0.0


@pytest.mark.parametrize("function", [elementary.exp, elementary.log, elementary.sqrt])
def test_a_float_and_an_element_have_the_same_bits(function):
    """100,000 numbers alone, in one block and in blocks of odd sizes."""
    rng = np.random.default_rng(4)
    x = rng.uniform(-60.0, 60.0, 100_000) if function is elementary.exp else np.exp(rng.uniform(-60.0, 60.0, 100_000))
    block = function(x)
    assert [function(v) for v in x.tolist()] == block.tolist()
    pieces = np.concatenate([function(x[i : i + 777]) for i in range(0, x.size, 777)])
    assert np.array_equal(pieces, block)


def test_arguments_beyond_the_range_are_held():
    """No result is 0 or infinite, and NaN is held alike on floats and in blocks."""
    for x in (-1e9, -708.0, 709.0, 1e9, math.nan, -math.inf, math.inf):
        alone = elementary.exp(x)
        assert 0.0 < alone < math.inf
        assert elementary.exp(np.array([x]))[0] == alone


def test_power_is_that_of_python_within_its_stated_error():
    """exp(y log x): the error grows as y log x."""
    rng = np.random.default_rng(5)
    for x, y in zip(rng.uniform(0.3, 3.0, 300).tolist(), rng.uniform(-6, 6, 300).tolist(), strict=True):
        assert elementary.power(x, y) == pytest.approx(x**y, rel=4e-16 * (2.0 + abs(y * math.log(x))))


def test_bounds():
    """The larger and the smaller of a number and a bound."""
    x = np.array([-1.0, 0.5, 3.0])
    assert elementary.maximum(x, 0.0).tolist() == [0.0, 0.5, 3.0]
    assert elementary.minimum(x, 1.0).tolist() == [-1.0, 0.5, 1.0]
    assert [elementary.maximum(v, 0.0) for v in x.tolist()] == [0.0, 0.5, 3.0]
    assert [elementary.minimum(v, 1.0) for v in x.tolist()] == [-1.0, 0.5, 1.0]
