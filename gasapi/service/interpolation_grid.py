"""A small grid for bilinear interpolation of a smooth surface, its nodes where the curvature asks for them.

Between two nodes h apart a straight line misses f by at most h^2 f''/8 (de Boor, A Practical Guide to Splines, rev. ed.
(2001), ch. III, eq. 5, from memory), so that an axis does best with nodes spread as the square root of |f''/f|: then every
interval has the same relative error. The two axes share the tolerance, and the split with the fewest values is taken. All this
works on a smooth stand-in of the surface (splines through samples); whoever calls checks the result against the surface itself.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from typing import Final, NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import RectBivariateSpline

from gasapi.engine.elementary import Array

__all__ = ["MOST_VALUES", "Axes", "GridTooLarge", "Surface", "grids", "no_pause", "within"]

_FINE: Final = 201
_MOST_ON_AN_AXIS: Final = 1024
MOST_VALUES: Final = 16384
"""The largest table, 64 KiB of 32-bit numbers."""

_INSIDE: Final = 5
_TRIALS: Final = 9
_TRIMMED_BELOW: Final = 2048
_SHARES: Final = (0.97, 0.93, 0.85, 0.7, 0.5)

Block = NDArray[np.float64]
"""Numbers on a grid, shape (m, n)."""


class GridTooLarge(Exception):
    """No grid of a size that a controller could hold keeps the tolerance."""


class Axes(NamedTuple):
    """The nodes of a grid, both rising, their first and last the ends of the range."""

    x: Array
    y: Array

    @property
    def values(self) -> int:
        """How many values the grid has."""
        return self.x.size * self.y.size


class Surface:
    """A smooth stand-in for a positive function on a rectangle, known at samples.

    :param x: shape (m,), rising
    :param y: shape (n,), rising
    :param smooth: values of the function times ``scale``, shape (m, n): the scale takes out what is not smooth in it
    :param scale: of x (m, 1) and y (1, n), by which the function is ``smooth / scale``
    """

    def __init__(self, x: Array, y: Array, smooth: Block, scale: Callable[[Block, Block], Block]) -> None:
        self._spline = RectBivariateSpline(x, y, smooth, kx=min(5, x.size - 1), ky=min(5, y.size - 1), s=0.0)
        self._scale = scale
        self.x = (float(x[0]), float(x[-1]))
        self.y = (float(y[0]), float(y[-1]))

    def at(self, x: Array, y: Array) -> Block:
        """Return the function on a grid, shape (m, n)."""
        result: Block = self._spline(x, y) / self._scale(x[:, None], y[None, :])
        return result


class _Measure(NamedTuple):
    """An axis measured by curvature: the integral of sqrt(|f''/8f|) from its low end, at fine points of the axis."""

    points: Array
    integral: Array

    @property
    def total(self) -> float:
        return float(self.integral[-1])

    def nodes(self, count: int) -> Array:
        """Return nodes of equal measure."""
        found = np.interp(np.linspace(0.0, self.total, count), self.integral, self.points)
        found[0], found[-1] = self.points[0], self.points[-1]
        return found


def no_pause() -> None:
    """Go on."""


def grids(surface: Surface, tolerance: float, pause: Callable[[], None] = no_pause) -> Iterator[Axes]:
    """Yield grids, the smallest first that keeps the tolerance on the stand-in, and then ever finer ones.

    :param surface: the stand-in
    :param tolerance: the largest relative error
    :param pause: called now and then, to let other work have its turn
    :raises GridTooLarge: the next grid would have more than 16384 values, or several finer ones did not do
    """
    measures = _measures(surface)
    best = _search(surface, measures, tolerance, pause)
    yield best
    # where the stand-in falls short of the surface, as near a critical point, a little more is tried, and then no more
    for share in _SHARES:
        finer = _search(surface, measures, tolerance * share, pause)
        best = finer if finer.values > best.values else _densified(measures, best)
        yield best
    raise GridTooLarge


def _measures(surface: Surface) -> tuple[_Measure, _Measure]:
    # points denser at the low end, where a property that goes as the pressure or its inverse bends most
    graded = np.linspace(0.0, 1.0, _FINE) ** 2
    x = surface.x[0] + (surface.x[1] - surface.x[0]) * graded
    y = np.linspace(*surface.y, _FINE)
    f = surface.at(x, y)
    return _measure(x, f), _measure(y, f.T)


def _measure(points: Array, f: Block) -> _Measure:
    left, right = np.diff(points)[:-1, None], np.diff(points)[1:, None]
    second = 2.0 * (f[2:] * left - f[1:-1] * (left + right) + f[:-2] * right) / (left * right * (left + right))
    density = np.sqrt(np.max(np.abs(second / f[1:-1]), axis=1) / 8.0)
    density = np.concatenate([density[:1], density, density[-1:]])
    # a straight stretch still takes its part, so that nodes are never far apart for no reason
    density = np.maximum(density, 1e-3 * density.max() + 1e-12 / (points[-1] - points[0]))
    steps = 0.5 * (density[1:] + density[:-1]) * np.diff(points)
    return _Measure(points, np.concatenate([[0.0], np.cumsum(steps)]))


def _search(surface: Surface, measures: tuple[_Measure, _Measure], tolerance: float, pause: Callable[[], None]) -> Axes:
    """Return the smallest grid with equal measures whose error on the stand-in is within the tolerance."""
    # the estimate knows nothing of errors that cancel; the share of it that holds is found by halving
    low, high = 0.25, 16.0
    best = None
    for _ in range(_TRIALS):
        pause()
        share = (low * high) ** 0.5
        try:
            axes = _estimated(measures, tolerance * share)
        except GridTooLarge:
            low = share
            continue
        if error_of(surface, axes) <= tolerance:
            low, best = share, axes if best is None or axes.values < best.values else best
        else:
            high = share
    if best is None:
        best = _estimated(measures, tolerance * low)
        for _ in range(_TRIALS):
            pause()
            if error_of(surface, best) <= tolerance:
                break
            best = _densified(measures, best)
        else:
            raise GridTooLarge
    return _trimmed(surface, measures, best, tolerance, pause) if best.values <= _TRIMMED_BELOW else best


def _estimated(measures: tuple[_Measure, _Measure], tolerance: float) -> Axes:
    """Return the grid with the fewest values whose estimated error, the sum of both axes', is within a tolerance."""
    a, b = measures[0].total, measures[1].total
    best: tuple[int, int] | None = None
    least = int(np.ceil(a / tolerance**0.5)) or 1
    for m in range(least, 2 * least + 4):
        rest = tolerance - (a / m) ** 2
        if rest <= 0.0:
            continue
        n = max(1, int(np.ceil(b / rest**0.5)))
        if best is None or (m + 1) * (n + 1) < (best[0] + 1) * (best[1] + 1):
            best = m, n
    if best is None:
        best = least + 1, max(1, int(np.ceil(b / tolerance**0.5)))
    return _axes(measures, best[0] + 1, best[1] + 1)


def _axes(measures: tuple[_Measure, _Measure], m: int, n: int) -> Axes:
    if m > _MOST_ON_AN_AXIS or n > _MOST_ON_AN_AXIS or m * n > MOST_VALUES:
        raise GridTooLarge
    return Axes(measures[0].nodes(m), measures[1].nodes(n))


def _densified(measures: tuple[_Measure, _Measure], axes: Axes) -> Axes:
    return _axes(measures, axes.x.size + max(1, axes.x.size // 32), axes.y.size + max(1, axes.y.size // 32))


def _trimmed(
    surface: Surface, measures: tuple[_Measure, _Measure], axes: Axes, tolerance: float, pause: Callable[[], None]
) -> Axes:
    """Return the smallest grid near a given one that keeps the tolerance."""
    best = axes
    m0, n0 = axes.x.size, axes.y.size
    around = [(m, n) for m in range(max(2, m0 - 3), m0 + 4) for n in range(max(2, n0 - 3), n0 + 4) if m * n < m0 * n0]
    for m, n in sorted(around, key=lambda size: size[0] * size[1], reverse=True):
        if m * n < best.values:
            pause()
            tried = _axes(measures, m, n)
            if error_of(surface, tried) <= tolerance:
                best = tried
    return best


def error_of(surface: Surface, axes: Axes) -> float:
    """Return the largest relative error of a grid on the stand-in, looked for on points inside every cell."""
    inner = np.linspace(0.0, 1.0, _INSIDE)
    x, y = within(axes.x, inner), within(axes.y, inner)
    nodes = surface.at(axes.x, axes.y)
    along = _linear(axes.x, nodes, x)
    both = _linear(axes.y, along.T, y).T
    true = surface.at(x, y)
    return float(np.max(np.abs(both / true - 1.0)))


def within(axis: Array, inner: Array) -> Array:
    """Return points at the same places of every interval of an axis, rising, no point twice."""
    points = axis[:-1, None] + np.diff(axis)[:, None] * inner[None, :-1]
    return np.append(points.ravel(), axis[-1])


def _linear(axis: Array, values: Block, points: Array) -> Block:
    i = np.clip(np.searchsorted(axis, points, side="right") - 1, 0, axis.size - 2)
    u = ((points - axis[i]) / (axis[i + 1] - axis[i]))[:, None]
    result: Block = values[i] + u * (values[i + 1] - values[i])
    return result
