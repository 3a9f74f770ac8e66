"""A mixture's boundaries as smooth functions, each evaluated in a microsecond: dew and bubble line, water dew line."""

from __future__ import annotations

import math
from copy import copy
from enum import IntEnum
from itertools import pairwise
from typing import Final, NamedTuple, cast

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.elementary import Array, exp
from gasapi.engine.phase.boundary import HIGHEST, Boundary, NamedPoint, position_of
from gasapi.engine.phase.dew_search import DewPoints
from gasapi.engine.phase.energy import Floats
from gasapi.engine.phase.region import Region
from gasapi.engine.phase.spline import hermite, hermite_slope, monotone_slopes, spline_slopes
from gasapi.engine.phase.table import CubicTable

__all__ = ["DIRECT", "BelowBranch", "BoundaryCurve", "Curve", "DewBranch", "OddBoundary", "WaterCurve", "spline_table"]

DIRECT: Final = -1
"""In place of a region: the curve does not tell."""

_GAS: Final = int(Region.GAS)
_LIQUID: Final = int(Region.LIQUID)
_TWO_PHASE: Final = int(Region.TWO_PHASE)
_FEWEST: Final = 8
_KNOTS: Final = 160
_MOST_KNOTS: Final = 2000
_MET: Final = 1e4
"""By how many grains a table may miss its points: a millikelvin, or 1e-6 in ln p."""

_FINE: Final = 8
_STRETCH_KNOTS: Final = 96
_LEAST_INVERSE: Final = 1e-4
_HIGH: Final = math.log(2e7)
_KELVIN: Final = 1e-7
_LOG: Final = 1e-10


class OddBoundary(Exception):
    """A boundary that is not of the usual shape."""


def spline_table(x: Floats, y: Floats, grain: float) -> CubicTable:
    """Return a curve through points as a table on equal cells, its values at the knots rounded.

    :param x: abscissas, strictly rising, shape (n,)
    :param y: ordinates, shape (n,)
    :param grain: what the values and slopes at the knots are rounded to
    """
    return _retabled(x, y, spline_slopes(x, y), _KNOTS, grain)


def _retabled(x: Floats, y: Floats, slopes: Floats, cells: int, grain: float) -> CubicTable:
    """Return the piecewise cubic of values and slopes on equal cells, enough of them to meet the values."""
    while True:
        knots = np.linspace(x[0], x[-1], cells + 1)
        values = hermite(knots, x, y[:, None], slopes[:, None])[:, 0]
        gradients = hermite_slope(knots, x, y[:, None], slopes[:, None])[:, 0]
        table = CubicTable(float(x[0]), float(x[-1]), np.round(values / grain) * grain, np.round(gradients / grain) * grain)
        off = np.abs(cast(Floats, table(x)) - y)
        if cells > _MOST_KNOTS or bool((off <= _MET * grain).all()):
            return table
        cells *= 4


def _falling(values: Floats) -> int:
    """Return how many values from the first on fall strictly."""
    steps = np.diff(values) < 0.0
    return values.size if bool(steps.all()) else int(steps.argmin()) + 1


class _Stretch(NamedTuple):
    """A rising or falling part of a line: ln p as a function of T between two temperatures."""

    low: float
    high: float
    log_pressure: CubicTable


def _stretches(t: Floats, lp: Floats) -> tuple[_Stretch, ...]:
    """Return the rising and falling parts of a line given by many points."""
    steps = np.diff(t)
    turns = [0, *(np.flatnonzero(steps[1:] * steps[:-1] < 0.0) + 1).tolist(), t.size - 1]
    found = []
    for a, z in pairwise(turns):
        if z - a < 3 or not bool((steps[a:z] != 0.0).all()):
            continue
        ts, lps = t[a : z + 1], lp[a : z + 1]
        if ts[-1] < ts[0]:
            ts, lps = ts[::-1], lps[::-1]
        table = _retabled(ts, lps, monotone_slopes(ts, lps), _STRETCH_KNOTS, _LOG)
        found.append(_Stretch(float(ts[0]), float(ts[-1]), table))
    return tuple(found)


def _nearest_float(stretches: tuple[_Stretch, ...], t: float, p: float) -> float:
    """Return how far the pressure is from the nearest point of a line at this temperature, Pa, inf for none."""
    nearest = math.inf
    for stretch in stretches:
        if stretch.low <= t <= stretch.high:
            distance = p - exp(stretch.log_pressure(t))
            distance = distance if distance > 0.0 else -distance
            nearest = distance if distance < nearest else nearest
    return nearest


def _nearest_block(stretches: tuple[_Stretch, ...], t: Array, p: Array) -> Array:
    """Return the same for rows, shape (n,)."""
    nearest = np.full(t.size, math.inf)
    for stretch in stretches:
        rows = np.flatnonzero((t >= stretch.low) & (t <= stretch.high))
        if rows.size:
            distance = np.abs(p.take(rows) - exp(stretch.log_pressure(t.take(rows))))
            here = nearest.take(rows)
            nearest[rows] = np.where(distance < here, distance, here)
    return nearest


class BoundaryCurve:
    """Dew and bubble line of a mixture. Immutable.

    T(p) is one smooth function of w = -sqrt(ln p_max - ln p) on the dew side and +sqrt on the other; ln p(T) one of
    u = -+sqrt(T_max - T). Below its lowest pressure the dew line goes on straight in ln p against 1/T. A line whose temperature
    rises, falls and rises again, as that of a lean gas with traces of heavier ones does, is used as T(p) alone.

    :param b: the traced boundary
    :param shift: added to its ln p: the share of the pressure that the traced mixture has
    :param coldest: K; a line that begins below is taken to begin there because the equation ends
    :raises OddBoundary: for a boundary that turns more often than this
    """

    def __init__(self, b: Boundary, shift: float, coldest: float) -> None:
        lp, t = b.log_pressure + shift, np.exp(b.log_temperature)
        if lp.size < _FEWEST:
            raise OddBoundary
        top = _node(b, b.cricondenbar, lp)
        if _falling(lp[: top + 1][::-1]) != top + 1:
            raise OddBoundary
        self.closed = b.cricondenbar is not None
        fall = _falling(lp[top:]) if self.closed else 1
        used = lp[: top + fall]
        self.log_top = round(float(lp[top]), 10)
        w = np.sqrt(np.maximum(self.log_top - used, 0.0))
        w[: top + 1] *= -1.0
        w[top] = 0.0
        self.log_first = round(float(lp[0]), 10)
        self.log_last = round(float(used[-1]), 10) if fall > 1 else math.inf
        self.log_end = float(lp[-1])
        hot = _node(b, b.cricondentherm, t)
        if _falling(t[: hot + 1][::-1]) != hot + 1:
            raise OddBoundary
        fall_hot = _falling(t[hot:]) if b.cricondentherm is not None else 1
        self.hottest = round(float(t[hot]), 7)
        u = np.sqrt(np.maximum(self.hottest - t[: hot + fall_hot], 0.0))
        u[: hot + 1] *= -1.0
        u[hot] = 0.0
        self.coldest_first = float(t[0])
        self.coldest_top = float(t[hot + fall_hot - 1]) if fall_hot > 1 else math.inf
        # what lies below the coldest point of the far side: liquid under a bubble line that was followed to its end, two phases
        # under a line that rises without end, and else what a direct test says
        self._colder = DIRECT
        if b.end == HIGHEST or (not self.closed and not b.complete and self.log_end > _HIGH):
            self._colder = _TWO_PHASE
        elif b.complete and b.critical is not None:
            self._colder = _LIQUID
        self.inverse_first = 1.0 / self.coldest_first
        self.inverse_slope = -float(b.temperature_slope[0] / b.pressure_slope[0]) / self.coldest_first
        if not self.inverse_slope < 0.0:
            raise OddBoundary
        self.ends_with_equation = self.coldest_first < 1.06 * coldest
        # below its lowest pressure there may be no line, or another one
        self._silent_below = self.ends_with_equation
        # a line that was lost on the way down does not tell what happens below
        self._lost_below = not b.reached and not self.ends_with_equation
        self._wavy = self.closed and fall_hot > 1 and bool((t[hot + fall_hot :] > self.coldest_top).any())
        self._lines: tuple[_Stretch, ...] = ()
        try:
            self.by_pressure = spline_table(w, t[: top + fall], _KELVIN)
            if self._wavy:
                self._straighten(w, t)
            self.by_temperature = spline_table(u, lp[: hot + fall_hot], _LOG)
        except ValueError as error:
            raise OddBoundary from error

    def _straighten(self, w: Floats, t: Floats) -> None:
        """Prepare for a line whose T(p) is the only function."""
        if w[-1] <= 0.0:
            raise OddBoundary
        self.hottest = round(float(t.max()), 7)
        self._coldest_bubble = float(t[w.size - 1])
        fine = np.linspace(w[0], w[-1], _FINE * w.size + 1)
        self._lines = _stretches(cast(Floats, self.by_pressure(fine)), self.log_top - fine * fine)

    def continued_by_another(self) -> BoundaryCurve:
        """Return the curve that says nothing below its lowest pressure, since another one does."""
        other = copy(self)
        other._silent_below, other._lost_below = True, False
        return other

    def dew_temperature(self, log_pressure: Floats) -> Floats:
        """Return the dew temperature, K, shape (m,), -inf where there is none; for use on construction."""
        return _dew_temperature(self, log_pressure)

    def state_float(self, t: float, lp: float) -> tuple[int, float, float]:
        """Return the region (or DIRECT) with the dew and the bubble temperature at this pressure, K.

        NaN where there is none; the bubble temperature only where the state is not above the dew line.

        :param t: temperature, K
        :param lp: ln p
        """
        if lp > self.log_top:
            if not self.closed:
                return DIRECT, math.nan, math.nan
            return self._far_side_float(t, lp), math.nan, math.nan
        if lp < self.log_first:
            if self._silent_below:
                return _GAS, math.nan, math.nan
            rest = self.inverse_first + self.inverse_slope * (lp - self.log_first)
            up = 1.0 / (rest if rest > _LEAST_INVERSE else _LEAST_INVERSE)
            if t > up:
                return (DIRECT if self._lost_below and t <= self.coldest_first else _GAS), up, math.nan
            return (DIRECT if self._lost_below else _TWO_PHASE), up, math.nan
        w = math.sqrt(self.log_top - lp)
        up = self.by_pressure(-w)
        if t > up:
            return _GAS, up, math.nan
        if self._wavy:
            if lp < self.log_last:
                return (_TWO_PHASE if t >= self._coldest_bubble else DIRECT), up, math.nan
            low = self.by_pressure(w)
            return (_TWO_PHASE if t >= low else _LIQUID), up, low
        state = self._far_side_float(t, lp)
        low = self.by_pressure(w) if lp >= self.log_last else math.nan
        if state == _TWO_PHASE:
            # a bubble line that comes back at lower temperatures has its first end elsewhere
            return state, up, low if t >= low else math.nan
        # beyond the far side below the cricondenbar
        return (_LIQUID if state == _GAS else state), up, low

    def _far_side_float(self, t: float, lp: float) -> int:
        """Return two-phase below the line of the far side, gas (or whatever one phase is called there) above it."""
        if t >= self.hottest or self._wavy:
            return _GAS
        if t >= self.coldest_top:
            return _TWO_PHASE if lp < self.by_temperature(math.sqrt(self.hottest - t)) else _GAS
        if self._colder == _TWO_PHASE and lp > self.log_end:
            return DIRECT
        return _GAS if self._colder == _LIQUID else self._colder

    def state_block(self, t: Array, lp: Array) -> tuple[NDArray[np.int8], Array, Array]:
        """Return the same for rows, each of shape (n,)."""
        w = np.sqrt(np.maximum(self.log_top - lp, 0.0))
        up = self.by_pressure(-w)
        low = np.full(t.size, np.nan)
        before = lp < self.log_first
        if before.any():
            if self._silent_below:
                up = np.where(before, np.nan, up)
            else:
                rest = self.inverse_first + self.inverse_slope * (lp - self.log_first)
                up = np.where(before, 1.0 / np.where(rest > _LEAST_INVERSE, rest, _LEAST_INVERSE), up)
        above = lp > self.log_top
        state = np.full(t.size, _GAS, dtype=np.int8)
        if above.any():
            up = np.where(above, np.nan, up)
            if not self.closed:
                state[above] = DIRECT
        if self._lost_below:
            state[before & (t <= self.coldest_first)] = DIRECT
        else:
            state[before & (t <= up)] = _TWO_PHASE
        rows = np.flatnonzero(~before & ((above & self.closed) | (t <= up)))
        if self._wavy:
            rows = rows[~above.take(rows)]
            here, lp_here = t.take(rows), lp.take(rows)
            bubble = np.where(lp_here < self.log_last, math.nan, self.by_pressure(w.take(rows)))
            state[rows] = np.where(here >= bubble, _TWO_PHASE, _LIQUID)
            beyond = np.flatnonzero(lp_here < self.log_last)
            state[rows[beyond]] = np.where(here.take(beyond) >= self._coldest_bubble, _TWO_PHASE, DIRECT)
            low[rows] = bubble
        elif rows.size:
            here, lp_here, within = t.take(rows), lp.take(rows), ~above.take(rows)
            far = self._far_side_block(here, lp_here)
            known = np.flatnonzero(within & (lp_here >= self.log_last))
            bubble = np.full(rows.size, np.nan)
            bubble[known] = self.by_pressure(w.take(rows[known]))
            split = far == _TWO_PHASE
            bubble[split & ~(here >= bubble)] = math.nan
            far[within & (far == _GAS)] = _LIQUID
            state[rows] = far
            low[rows] = bubble
        return state, up, low

    def _far_side_block(self, t: Array, lp: Array) -> NDArray[np.int8]:
        cool = t < self.hottest
        u = np.sqrt(np.where(cool, self.hottest - t, 0.0))
        state = np.where(cool & (lp < self.by_temperature(u)), np.int8(_TWO_PHASE), np.int8(_GAS))
        cold = cool & ~(t >= self.coldest_top)
        if cold.any():
            state[cold] = _GAS if self._colder == _LIQUID else self._colder
            if self._colder == _TWO_PHASE:
                state[cold & (lp > self.log_end)] = DIRECT
        return state

    def distance_float(self, t: float, p: float) -> tuple[float, bool]:
        """Return how far the pressure is from the nearer line at this temperature, and whether it is between two lines.

        Pa; inf where there is no line.

        :param t: temperature, K
        :param p: pressure, Pa
        """
        if self._wavy:
            return _nearest_float(self._lines, t, p), False
        if not t < self.hottest:
            return math.inf, False
        u = math.sqrt(self.hottest - t)
        if t >= self.coldest_first:
            lower = exp(self.by_temperature(-u))
        elif self._silent_below:
            return math.inf, False
        else:
            lower = exp((1.0 / t - self.inverse_first) / self.inverse_slope + self.log_first)
        upper = exp(self.by_temperature(u)) if t >= self.coldest_top else math.inf
        down, up = p - lower, upper - p
        inside = down > 0.0 and up > 0.0
        down = down if down > 0.0 else -down
        up = up if up > 0.0 else -up
        return (down if down < up else up), inside

    def distance_block(self, t: Array, p: Array) -> tuple[Array, NDArray[np.bool_]]:
        """Return the same for rows, each of shape (n,)."""
        if self._wavy:
            return _nearest_block(self._lines, t, p), np.zeros(t.size, dtype=bool)
        distance = np.full(t.size, math.inf)
        inside = np.zeros(t.size, dtype=bool)
        crossed = t < self.hottest
        if self._silent_below:
            crossed &= t >= self.coldest_first
        rows = np.flatnonzero(crossed)
        if rows.size == 0:
            return distance, inside
        t, p = t.take(rows), p.take(rows)
        u = np.sqrt(self.hottest - t)
        argument = self.by_temperature(-u)
        cold = t < self.coldest_first
        if cold.any():
            argument = np.where(cold, (1.0 / t - self.inverse_first) / self.inverse_slope + self.log_first, argument)
        down = p - exp(argument)
        reached = t >= self.coldest_top
        up = np.where(reached, exp(self.by_temperature(np.where(reached, u, 0.0))), math.inf) - p
        inside[rows] = (down > 0.0) & (up > 0.0)
        down, up = np.abs(down), np.abs(up)
        distance[rows] = np.where(down < up, down, up)
        return distance, inside


def _node(b: Boundary, point: NamedPoint | None, values: Floats) -> int:
    """Return the number of the node at a named point, or that of the highest value where there is no such point."""
    if point is None:
        return int(values.argmax())
    # a hair below it finds the node itself
    return int(np.searchsorted(b.position, position_of(b, point) - 1e-9))


class WaterCurve:
    """The water dew line over a range of pressure, or any other line T(p). Immutable.

    :param log_pressure: ln p, rising, shape (n,)
    :param temperature: K, shape (n,)
    :param slope: dT/d ln p, shape (n,), that of a spline where None
    """

    def __init__(self, log_pressure: Floats, temperature: Floats, slope: Floats | None = None) -> None:
        self.low, self.high = float(log_pressure[0]), float(log_pressure[-1])
        slopes = spline_slopes(log_pressure, temperature) if slope is None else slope
        self.by_pressure = _retabled(log_pressure, temperature, slopes, _KNOTS, _KELVIN)
        fine = np.linspace(self.low, self.high, _FINE * (log_pressure.size - 1) + 1)
        t = cast(Floats, self.by_pressure(fine))
        self._stretches = _stretches(t, fine)
        first = self.by_pressure(self.low)
        self._inverse_first = 1.0 / first
        self._inverse_slope = -(self.by_pressure(self.low + 0.01) - first) / (0.01 * first * first)

    def temperature_float(self, lp: float) -> float:
        """Return the dew temperature, K, below the lowest pressure by a straight line in ln p against 1/T."""
        if lp < self.low:
            rest = self._inverse_first + self._inverse_slope * (lp - self.low)
            return 1.0 / (rest if rest > _LEAST_INVERSE else _LEAST_INVERSE)
        return self.by_pressure(lp)

    def temperature_block(self, lp: Array) -> Array:
        """Return the same for rows, shape (n,)."""
        result = self.by_pressure(lp)
        before = lp < self.low
        if before.any():
            rest = self._inverse_first + self._inverse_slope * (lp - self.low)
            result = np.where(before, 1.0 / np.where(rest > _LEAST_INVERSE, rest, _LEAST_INVERSE), result)
        return result

    def distance_float(self, t: float, p: float) -> float:
        """Return how far the pressure is from the nearest point of the line at this temperature, Pa, inf for none."""
        return _nearest_float(self._stretches, t, p)

    def distance_block(self, t: Array, p: Array) -> Array:
        """Return the same for rows, shape (n,)."""
        return _nearest_block(self._stretches, t, p)


class BelowBranch(IntEnum):
    """What is known below the lowest pressure of a branch."""

    STRAIGHT = 0
    """It goes on straight in ln p against 1/T."""

    SILENT = 1
    """Another line is the higher one, or the equation has ended."""

    LOST = 2
    """It could not be followed further."""


class DewBranch:
    """Part of a dew line, in the range of pressure where one liquid forms before others. Immutable.

    Beyond its ends it says nothing: other curves do. What lies far below it is left to the direct test.

    :param points: the points of the branch, at rising pressures
    :param shift: added to their ln p
    :param below: what is known below its lowest pressure
    :param certain: the part of the dew temperature down to which two phases were proven
    :param last: whether no other curve follows above, and nothing is known there
    :param coldest: K, where the equation ends
    :raises OddBoundary: for points that make no curve
    """

    def __init__(self, points: DewPoints, shift: float, below: BelowBranch, certain: float, last: bool, coldest: float) -> None:
        try:
            self.line = WaterCurve(points.log_pressure + shift, points.temperature, points.temperature_slope)
        except ValueError as error:
            raise OddBoundary from error
        self.closed = not last
        self.log_first, self.log_top = self.line.low, self.line.high
        self.ends_with_equation = float(points.temperature[0]) < 1.06 * coldest
        self.hottest = float(points.temperature.max())
        self._first = float(self.line.by_pressure(self.line.low))
        self._certain = certain
        self._silent = below == BelowBranch.SILENT or self.ends_with_equation
        self._lost = below == BelowBranch.LOST and not self._silent

    def dew_temperature(self, log_pressure: Floats) -> Floats:
        """Return the dew temperature, K, shape (m,), -inf where there is none; for use on construction."""
        return _dew_temperature(self, log_pressure)

    def state_float(self, t: float, lp: float) -> tuple[int, float, float]:
        """Return the region (or DIRECT) with the dew temperature, K; see ``BoundaryCurve``."""
        if lp > self.log_top:
            return (_GAS if self.closed else DIRECT), math.nan, math.nan
        if lp < self.log_first:
            if self._silent:
                return _GAS, math.nan, math.nan
            if self._lost:
                return (DIRECT if t <= self._first else _GAS), math.nan, math.nan
        up = self.line.temperature_float(lp)
        if t > up:
            return _GAS, up, math.nan
        return (_TWO_PHASE if t >= self._certain * up else DIRECT), up, math.nan

    def state_block(self, t: Array, lp: Array) -> tuple[NDArray[np.int8], Array, Array]:
        """Return the same for rows, each of shape (n,)."""
        up = self.line.temperature_block(lp)
        state = np.where(t > up, np.int8(_GAS), np.where(t >= self._certain * up, np.int8(_TWO_PHASE), np.int8(DIRECT)))
        outside = lp > self.log_top
        state[outside] = _GAS if self.closed else DIRECT
        before = lp < self.log_first
        if self._silent or self._lost:
            state[before] = _GAS
            if self._lost:
                state[before & (t <= self._first)] = DIRECT
            outside |= before
        return state, np.where(outside, math.nan, up), np.full(t.size, math.nan)

    def distance_float(self, t: float, p: float) -> tuple[float, bool]:
        """Return how far the pressure is from the line at this temperature, Pa, inf for none; see ``BoundaryCurve``."""
        return self.line.distance_float(t, p), False

    def distance_block(self, t: Array, p: Array) -> tuple[Array, NDArray[np.bool_]]:
        """Return the same for rows, each of shape (n,)."""
        return self.line.distance_block(t, p), np.zeros(t.size, dtype=bool)


Curve = BoundaryCurve | DewBranch


def _dew_temperature(curve: Curve, log_pressure: Floats) -> Floats:
    _, up, _ = curve.state_block(np.zeros_like(log_pressure), log_pressure)
    return np.where(np.isnan(up), -np.inf, up)
