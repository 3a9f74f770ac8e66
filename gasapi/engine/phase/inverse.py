"""A start value for the inverse of a monotone function, from piecewise cubic Hermite interpolation.

The polishing steps belong to the caller, who knows the function.
"""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Sequence
from typing import cast

import numpy as np

from gasapi.engine.elementary import Array, Real

__all__ = ["InverseStart"]


class InverseStart:
    """Gives x near the solution of y(x) = y, for y between the first and the last knot and held there beyond.

    :param y: function values at the knots, strictly rising
    :param x: arguments at the knots
    :param slope: dx/dy at the knots
    """

    __slots__ = ("_array", "_inner", "_inner_array", "_knots")

    def __init__(self, y: Sequence[float], x: Sequence[float], slope: Sequence[float]) -> None:
        knots = []
        for i in range(len(y) - 1):
            h = y[i + 1] - y[i]
            chord = (x[i + 1] - x[i]) / h
            c = (3.0 * chord - 2.0 * slope[i] - slope[i + 1]) / h
            d = (slope[i] + slope[i + 1] - 2.0 * chord) / (h * h)
            knots.append((y[i], x[i], slope[i], c, d))
        self._knots = knots
        self._inner = list(y[1:-1])
        self._inner_array = np.array(self._inner)
        self._array = np.array(knots).T.copy()

    def __call__(self, y: Real) -> Real:
        """Return the start value.

        :param y: function value, a float or an array of shape (n,)
        """
        if type(y) is float:
            y0, a, b, c, d = self._knots[bisect_right(self._inner, y)]
            t = y - y0
            return a + t * (b + t * (c + t * d))
        rows = np.searchsorted(self._inner_array, y, side="right")
        y0s, a_s, bs, cs, ds = (column.take(rows) for column in self._array)
        step = cast(Array, y) - y0s
        return cast(Real, a_s + step * (bs + step * (cs + step * ds)))
