"""Bilinear interpolation in 32-bit arithmetic, with the very operations and order of the Structured Text that is emitted."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

__all__ = ["Float32", "Grid", "interpolate"]

Float32 = NDArray[np.float32]
"""Numbers as a controller holds them."""


class Grid(NamedTuple):
    """A rectangular grid: axes of shape (m,) and (n,), rising, and a value for each pair, shape (m, n)."""

    pressure: Float32
    temperature: Float32
    values: Float32


def interpolate(grid: Grid, pressure: Float32, temperature: Float32) -> Float32:
    """Return interpolated values, shape (k,).

    :param grid: axes in the units of the points
    :param pressure: inside the axis, shape (k,)
    :param temperature: inside the axis, shape (k,)
    """
    i = _cell(grid.pressure, pressure)
    j = _cell(grid.temperature, temperature)
    u = (pressure - grid.pressure[i]) / (grid.pressure[i + 1] - grid.pressure[i])
    v = (temperature - grid.temperature[j]) / (grid.temperature[j + 1] - grid.temperature[j])
    low = grid.values[i, j] + v * (grid.values[i, j + 1] - grid.values[i, j])
    high = grid.values[i + 1, j] + v * (grid.values[i + 1, j + 1] - grid.values[i + 1, j])
    result: Float32 = low + u * (high - low)
    return result


def _cell(axis: Float32, points: Float32) -> NDArray[np.intp]:
    """Return the index of the last node that is not above a point, the one before the last node at most."""
    found: NDArray[np.intp] = np.clip(np.searchsorted(axis, points, side="right") - 1, 0, axis.size - 2)
    return found
