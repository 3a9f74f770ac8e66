"""Chebyshev series against numpy.polynomial, and the same bits for floats and blocks."""

import numpy as np
import pytest
from numpy.polynomial import chebyshev as library

from gasapi.engine.phase.chebyshev import columns_of, derivative, interpolate, nodes, series_sum, series_sum_block, trimmed

_SERIES = ((0.3, -1.2, 0.04, 2e-3, -7e-5), (1.0,), (0.5, 0.25, -0.125), (1e-8, -3.0, 2.0, 1.0, 0.5, 0.25, -1e-12))


@pytest.mark.parametrize("coefficients", _SERIES)
def test_sum_is_the_series(coefficients: tuple[float, ...]) -> None:
    """A sum agrees with the general library to rounding."""
    for x in np.linspace(-1.0, 1.0, 21).tolist():
        expected = library.chebval(x, coefficients)
        assert pytest.approx(expected, rel=1e-14, abs=1e-14) == series_sum(x, coefficients[0], coefficients[:0:-1])


@pytest.mark.parametrize("coefficients", _SERIES)
def test_derivative_is_the_series_of_the_derivative(coefficients: tuple[float, ...]) -> None:
    """Coefficients of the derivative agree with the general library."""
    assert pytest.approx(list(library.chebder(coefficients)) or [0.0]) == list(derivative(coefficients))


def test_interpolation_meets_the_values() -> None:
    """The interpolating series of a smooth function is the general library's."""
    expected = library.chebinterpolate(lambda x: np.exp(2.0 * x) / (x + 3.0), 14)
    values = [float(np.exp(2.0 * x) / (x + 3.0)) for x in nodes(15)]
    assert pytest.approx(list(expected), abs=1e-15) == list(interpolate(values))


def test_a_block_of_unequal_series_has_the_bits_of_its_rows() -> None:
    """Series of unequal length share one block without a change of bits."""
    rng = np.random.default_rng(11)
    x = rng.uniform(-1.0, 1.0, 4000)
    which = rng.integers(0, len(_SERIES), x.size)
    block = series_sum_block(x, columns_of(_SERIES), which)
    rows = [series_sum(a, _SERIES[i][0], _SERIES[i][:0:-1]) for a, i in zip(x.tolist(), which.tolist(), strict=True)]
    assert rows == block.tolist()


def test_trimming_drops_what_is_within_the_tolerance() -> None:
    """Coefficients are dropped from the end while their sum stays within the tolerance, and the first is kept."""
    assert trimmed((1.0, 0.5, 6e-9, -3e-9), 1e-8) == (1.0, 0.5)
    assert trimmed((1.0, 0.5, 6e-9, -6e-9), 1e-8) == (1.0, 0.5, 6e-9)
    assert trimmed((0.0, 0.0, 0.0), 1e-8) == (0.0,)
