"""Chebyshev series: summation, differentiation and interpolation.

Summation is by Clenshaw's recurrence (Math. Tables Aids Comput. 9 (1955) 118), written once for floats and once for blocks
in which every row has its own coefficients; zeros in front of a series do not change its bits, so that series of unequal
length can share one block.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.elementary import Array

__all__ = ["Columns", "columns_of", "derivative", "interpolate", "nodes", "series_sum", "series_sum_block", "trimmed"]

Columns = tuple[Array, ...]
"""Coefficients of several series, highest order first: one array for each order, one element for each series."""


def series_sum(x: float, constant: float, rest: Sequence[float]) -> float:
    """Return c0 + c1 T1(x) + ... for one x.

    :param x: position, -1 to 1, [-]
    :param constant: c0
    :param rest: c1, c2, ... from the highest order down to the first
    """
    double = x + x
    b1 = 0.0
    b2 = 0.0
    for c in rest:
        b1, b2 = double * b1 - b2 + c, b1
    return x * b1 - b2 + constant


def series_sum_block(x: Array, columns: Columns, which: NDArray[np.intp]) -> Array:
    """Return the same sum for each row of a block.

    :param x: positions, shape (n,), [-]
    :param columns: all series, as ``columns_of`` arranges them
    :param which: the series of each row, shape (n,)
    """
    double = x + x
    b1 = np.zeros_like(x)
    b2 = np.zeros_like(x)
    for column in columns[:-1]:
        b1, b2 = double * b1 - b2 + column.take(which), b1
    return x * b1 - b2 + columns[-1].take(which)


def columns_of(series: Sequence[Sequence[float]]) -> Columns:
    """Arrange series (each c0, c1, ...) for ``series_sum_block``."""
    longest = max(len(coefficients) for coefficients in series)
    padded = [(*coefficients, *[0.0] * (longest - len(coefficients))) for coefficients in series]
    return tuple(np.array([row[order] for row in padded]) for order in reversed(range(longest)))


def derivative(coefficients: Sequence[float]) -> tuple[float, ...]:
    """Return the coefficients of the derivative in x."""
    d = [0.0] * (len(coefficients) + 1)
    for k in range(len(coefficients) - 1, 0, -1):
        d[k - 1] = d[k + 1] + 2.0 * k * coefficients[k]
    d[0] *= 0.5
    return tuple(d[: max(1, len(coefficients) - 1)])


def nodes(count: int) -> tuple[float, ...]:
    """Return the zeros of the Chebyshev polynomial of degree ``count``, falling from 1 to -1, [-]."""
    return tuple(math.cos(math.pi * (2 * k + 1) / (2 * count)) for k in range(count))


def interpolate(values: Sequence[float]) -> tuple[float, ...]:
    """Return the coefficients of the polynomial that takes these values at ``nodes(len(values))``."""
    n = len(values)
    coefficients = []
    for order in range(n):
        cosines: Callable[[int], float] = lambda k, m=order: math.cos(math.pi * m * (2 * k + 1) / (2 * n))  # type: ignore[misc]  # noqa: E731
        coefficients.append((1.0 if order == 0 else 2.0) / n * math.fsum(values[k] * cosines(k) for k in range(n)))
    return tuple(coefficients)


def trimmed(coefficients: Sequence[float], tolerance: float) -> tuple[float, ...]:
    """Drop the highest orders whose magnitudes together stay within a tolerance."""
    left = tolerance
    keep = len(coefficients)
    while keep > 1 and abs(coefficients[keep - 1]) <= left:
        left -= abs(coefficients[keep - 1])
        keep -= 1
    return tuple(coefficients[:keep])
