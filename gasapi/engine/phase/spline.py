"""Cubics through points: slopes at the knots, and the curve with its derivative between them. Ordinary NumPy, for construction.

Own code since scipy.interpolate takes half a second to import, which every start of the service would pay.
"""

from __future__ import annotations

from typing import cast

import numpy as np

from gasapi.engine.phase.energy import Floats

__all__ = ["hermite", "hermite_slope", "monotone_slopes", "spline_slopes"]


def spline_slopes(x: Floats, y: Floats) -> Floats:
    """Return the slopes of the cubic spline with continuous curvature whose end pairs of cells are one cubic each.

    De Boor, A Practical Guide to Splines (1978), ch. IV, the "not-a-knot" end condition.

    :param x: abscissas, strictly rising, shape (n,), n >= 4
    :param y: ordinates, shape (n,)
    :raises ValueError: for abscissas that do not rise
    """
    h = _steps(x, y)
    chord = np.diff(y) / h
    n = x.size
    matrix = np.zeros((n, n))
    right = np.empty(n)
    inner = np.arange(1, n - 1)
    matrix[inner, inner - 1] = h[1:]
    matrix[inner, inner] = 2.0 * (h[:-1] + h[1:])
    matrix[inner, inner + 1] = h[:-1]
    right[1:-1] = 3.0 * (h[1:] * chord[:-1] + h[:-1] * chord[1:])
    for row, near, far, other in ((0, 0, 1, 1), (n - 1, n - 2, n - 3, n - 2)):
        both = h[near] + h[far]
        matrix[row, row] = h[far]
        matrix[row, other] = both
        right[row] = ((h[near] + 2.0 * both) * h[far] * chord[near] + h[near] * h[near] * chord[far]) / both
    return cast(Floats, np.linalg.solve(matrix, right))


def monotone_slopes(x: Floats, y: Floats) -> Floats:
    """Return slopes with which the cubics rise or fall where the points do.

    Fritsch and Butland, SIAM J. Sci. Stat. Comput. 5 (1984) 300, inside; the one-sided three-point formula at the ends.

    :param x: abscissas, strictly rising, shape (n,), n >= 3
    :param y: ordinates, shape (n,)
    :raises ValueError: for abscissas that do not rise
    """
    h = _steps(x, y)
    chord = np.diff(y) / h
    slopes = np.zeros(x.size)
    before, after = chord[:-1], chord[1:]
    rows = np.flatnonzero(before * after > 0.0)
    first, second = 2.0 * h[1:] + h[:-1], h[1:] + 2.0 * h[:-1]
    slopes[rows + 1] = ((first + second)[rows]) / (first[rows] / before[rows] + second[rows] / after[rows])
    for row, near, far in ((0, 0, 1), (x.size - 1, x.size - 2, x.size - 3)):
        end = ((2.0 * h[near] + h[far]) * chord[near] - h[near] * chord[far]) / (h[near] + h[far])
        if end * chord[near] <= 0.0:
            end = 0.0
        elif chord[near] * chord[far] <= 0.0 and abs(end) > 3.0 * abs(chord[near]):
            end = 3.0 * chord[near]
        slopes[row] = end
    return slopes


def _steps(x: Floats, y: Floats) -> Floats:
    h: Floats = np.diff(x)
    if not (bool((h > 0.0).all()) and bool(np.isfinite(y).all())):
        raise ValueError("the abscissas of a curve have to rise, and its ordinates to be finite")
    return h


def hermite(at: Floats, x: Floats, y: Floats, slope: Floats) -> Floats:
    """Return the piecewise cubic through values (m, j) and slopes (m, j) at knots x (m,), at points (r,)."""
    cell = np.clip(np.searchsorted(x, at, side="right") - 1, 0, x.size - 2)
    h = (x[cell + 1] - x[cell])[:, None]
    t = (at - x[cell])[:, None]
    chord = (y[cell + 1] - y[cell]) / h
    c = (3.0 * chord - 2.0 * slope[cell] - slope[cell + 1]) / h
    d = (slope[cell] + slope[cell + 1] - 2.0 * chord) / (h * h)
    result: Floats = y[cell] + t * (slope[cell] + t * (c + t * d))
    return result


def hermite_slope(at: Floats, x: Floats, y: Floats, slope: Floats) -> Floats:
    """Return the slopes of the piecewise cubic of ``hermite``."""
    cell = np.clip(np.searchsorted(x, at, side="right") - 1, 0, x.size - 2)
    h = (x[cell + 1] - x[cell])[:, None]
    t = (at - x[cell])[:, None] / h
    chord = (y[cell + 1] - y[cell]) / h
    a, b = slope[cell], slope[cell + 1]
    result: Floats = a + t * (6.0 * chord - 4.0 * a - 2.0 * b + t * 3.0 * (a + b - 2.0 * chord))
    return result
