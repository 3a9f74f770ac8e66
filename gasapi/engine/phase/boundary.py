"""The phase boundary of a mixture, from dilute gas over cricondentherm, critical point and cricondenbar to the bubble line.

The boundary is followed in the density of the feed, which rises all along it, by a continuation with cubic predictor (after
Michelsen, Fluid Phase Equilibria 4 (1980) 1); with few long steps first, then all points of a fixed grid at once. The
critical point is stepped over: the trivial solution is near there, and temperature and pressure pass it smoothly.
"""

from __future__ import annotations

import math
from typing import Any, Final, NamedTuple

import numpy as np

from gasapi.engine.phase.energy import Floats
from gasapi.engine.phase.incipient import IncipientPhase, Points
from gasapi.engine.phase.spline import hermite, hermite_slope

__all__ = ["HIGHEST", "LOST", "Boundary", "NamedPoint", "position_of", "trace_boundary"]

_LOWEST_PRESSURE: Final = 1e3
LOST: Final = "the boundary could not be followed further"
HIGHEST: Final = "the highest pressure was reached"

_HIGHEST_PRESSURE: Final = 1e8
_ABOVE: Final = 0.2
"""How far above the cricondenbar, in ln p, a bubble line that rises again is followed."""

_WEIGHT: Final = 3.0
_FIRST_STEP: Final = 0.8
_LONGEST_STEP: Final = 1.6
_SHORTEST_STEP: Final = 0.02
_MOST_POINTS: Final = 120
_NODES: Final = 72
_TRIVIAL: Final = 0.02
_BLIND: Final = 0.15
_SAME: Final = 0.03


class NamedPoint(NamedTuple):
    """A point of the boundary: K, Pa, and the density of the feed, mol/m3."""

    temperature: float
    pressure: float
    density: float


class Boundary(NamedTuple):
    """The boundary at nodes of rising ``position`` sigma = s + w exp(s)/rho_w, s being the logarithm of the feed's density.

    ``log_temperature`` and ``log_pressure`` with their slopes in sigma, shape (m,); ``unknown`` as ``IncipientPhase`` has them,
    (m, k + 2). ``cricondentherm``, ``cricondenbar`` and ``critical`` are None where the traced part has none. ``complete`` says
    that the trace ended at its lowest pressure again, ``end`` why it ended.
    """

    system: IncipientPhase
    scale: float
    position: Floats
    log_temperature: Floats
    log_pressure: Floats
    temperature_slope: Floats
    pressure_slope: Floats
    unknown: Floats
    cricondentherm: NamedPoint | None
    cricondenbar: NamedPoint | None
    critical: NamedPoint | None
    complete: bool
    end: str
    reached: bool
    """Whether the dew line was followed down to its lowest pressure, or to the coldest liquid of the equation."""


class _Trace:
    """Points of a continuation, with the cubic that leads to the next."""

    def __init__(self, scale: float, feed_index: int) -> None:
        self.scale = scale
        self.k = feed_index
        self.position: list[float] = []
        self.unknown: list[Floats] = []
        self.slope: list[Floats] = []
        self.log_pressure: list[float] = []

    def sigma(self, s: float) -> float:
        return s + _WEIGHT * math.exp(s) / self.scale

    def add(self, points: Points) -> None:
        s = float(points.unknown[0, self.k])
        stretch = 1.0 + _WEIGHT * math.exp(s) / self.scale
        self.position.append(self.sigma(s))
        self.unknown.append(points.unknown[0])
        self.slope.append(points.slope[0] / stretch)
        self.log_pressure.append(float(points.log_pressure[0]))

    def take(self, other: _Trace, number: int) -> None:
        """Take over a point of another trace."""
        for mine, theirs in zip(self._columns(), other._columns(), strict=True):
            mine.append(theirs[number])

    def put_before(self, other: _Trace, count: int) -> None:
        """Put the last points of a trace that runs the other way before the first."""
        if count > 0:
            for mine, theirs in zip(self._columns(), other._columns(), strict=True):
                mine[:0] = theirs[: -count - 1 : -1]

    def _columns(self) -> tuple[list[Any], ...]:
        return self.position, self.unknown, self.slope, self.log_pressure

    def predict(self, position: float) -> Floats:
        """Extrapolate by the cubic through the last two points and their slopes."""
        if len(self.position) < 2:
            return self.unknown[-1] + (position - self.position[-1]) * self.slope[-1]
        last = slice(-1, -3, -1) if self.position[-2] > self.position[-1] else slice(-2, None)
        return hermite(
            np.array([position]),
            np.array(self.position[last]),
            np.stack(self.unknown[last]),
            np.stack(self.slope[last]),
        )[0]


def position_of(b: Boundary, point: NamedPoint) -> float:
    """Return the position of a named point."""
    s = math.log(point.density)
    return s + _WEIGHT * math.exp(s) / b.scale


def feed_log_density(position: Floats, scale: float) -> Floats:
    """Return s for given sigma = s + w exp(s)/scale, by Newton's method in exp(s)."""
    s = np.minimum(position, np.log(scale * np.maximum(position - math.log(scale) + 1.0, 1.0)))
    for _ in range(12):
        grown = _WEIGHT * np.exp(s) / scale
        s = s - (s + grown - position) / (1.0 + grown)
    return s


def _follow(system: IncipientPhase, first: Points, scale: float, lowest_temperature: float) -> tuple[_Trace, bool, str, bool]:
    k = system.active.size
    trace = _Trace(scale, k)
    trace.add(first)
    reached = _follow_down(system, trace, lowest_temperature)
    start_log_p = trace.log_pressure[0]
    highest, fallen = start_log_p, False
    step = _FIRST_STEP
    packed = float(system.energy.close_packing(system.fractions[None])[0])
    feed_cold = float(system.energy.lowest_temperature(system.fractions[None])[0])
    coldest = math.log(max(lowest_temperature, feed_cold))
    while len(trace.position) < _MOST_POINTS:
        position = trace.position[-1] + step
        predicted = trace.predict(position)
        s = float(feed_log_density(np.array([position]), scale)[0])
        kappa = float(np.abs(predicted[:k]).max())
        if kappa < _BLIND and step > 2.0 * _SHORTEST_STEP:
            # beside the critical point: aim beyond it
            nearer = float(np.abs(trace.unknown[-1][:k]).max())
            if nearer > 1.2 * _BLIND or len(trace.position) < 3:
                for factor in (1.15, 1.3, 1.5, 0.8, 0.6):
                    other = trace.predict(trace.position[-1] + step * factor)
                    if float(np.abs(other[:k]).max()) >= _BLIND:
                        position = trace.position[-1] + step * factor
                        predicted = other
                        s = float(feed_log_density(np.array([position]), scale)[0])
                        break
        predicted[k] = s
        points = system.step_along(predicted, s)
        moved = np.abs(points.unknown[0] - predicted)
        good = (
            bool(points.converged[0])
            and float(np.abs(points.unknown[0, :k]).max()) > _TRIVIAL
            and float(moved[k + 1]) < 0.08
            and float(moved.max()) < 1.5
            and points.steps <= 9
        )
        if not good:
            step *= 0.5
            if step < _SHORTEST_STEP:
                return trace, False, LOST, reached
            continue
        trace.add(points)
        log_p = trace.log_pressure[-1]
        if log_p < start_log_p:
            return trace, True, "back at the lowest pressure", reached
        fallen = fallen or trace.log_pressure[-2] < highest - 0.02
        if fallen and log_p > highest + _ABOVE:
            return trace, False, HIGHEST, reached
        highest = max(highest, log_p)
        if points.unknown[0, k + 1] < coldest:
            return trace, False, "the lowest temperature was reached", reached
        if log_p > math.log(_HIGHEST_PRESSURE):
            return trace, False, HIGHEST, reached
        if math.exp(s) > 0.97 * packed:
            return trace, False, "close packing was reached", reached
        worst = float(moved.max())
        if worst < 0.05:
            step *= 1.7
        elif worst < 0.2:
            step *= 1.25
        elif worst > 0.5:
            step *= 0.6
        step = min(step, _LONGEST_STEP)
    return trace, False, "too many points", reached


def _follow_down(system: IncipientPhase, trace: _Trace, lowest_temperature: float) -> bool:
    """Lead a trace that could not start at the lowest pressure down to it, as far as the equation goes; tell whether it did."""
    k = system.active.size
    step = _FIRST_STEP
    reached = True
    down = _Trace(trace.scale, k)
    down.take(trace, 0)
    while down.log_pressure[-1] > math.log(_LOWEST_PRESSURE) + 0.05 and len(down.position) < _MOST_POINTS:
        position = down.position[-1] - step
        s = float(feed_log_density(np.array([position]), trace.scale)[0])
        predicted = down.predict(position)
        predicted[k] = s
        points = system.step_along(predicted, s)
        moved = np.abs(points.unknown[0] - predicted)
        if not points.converged[0] or float(moved[k + 1]) > 0.05 or float(moved.max()) > 1.5:
            step *= 0.5
            if step < _SHORTEST_STEP:
                reached = False
                break
            continue
        liquid = system.incipient_densities(points.unknown)
        cold = float(system.energy.lowest_temperature(liquid / liquid.sum(axis=1)[:, None])[0])
        if math.exp(points.unknown[0, k + 1]) < max(lowest_temperature, cold):
            break
        down.add(points)
        step = min(1.5 * step, _LONGEST_STEP) if float(moved.max()) < 0.2 else step
    trace.put_before(down, len(down.position) - 1)
    return reached


def trace_boundary(system: IncipientPhase, start: Floats, lowest_temperature: float) -> tuple[Boundary | None, str]:
    """Trace the boundary of a mixture, both ways from one of its dew points.

    :param system: the equations of the feed, with all its components active
    :param start: the unknowns of a dew point, shape (k + 2,)
    :param lowest_temperature: K, where the equation ends
    :returns: the boundary, or None and why there is none
    """
    energy, k = system.energy, system.active.size
    first = system.step_along(start, float(start[k]))
    if not first.converged[0]:
        return None, "the first dew point could not be solved"
    scale = float(energy.close_packing(system.fractions[None])[0]) / 3.6
    trace, complete, end, reached = _follow(system, first, scale, lowest_temperature)
    if len(trace.position) < 4:
        return None, end
    return _on_grid(system, trace, scale, complete, end)._replace(reached=reached), end


def _on_grid(system: IncipientPhase, trace: _Trace, scale: float, complete: bool, end: str) -> Boundary:
    k = system.active.size
    knots = np.array(trace.position)
    position = np.linspace(knots[0], knots[-1], _NODES)
    start = hermite(position, knots, np.stack(trace.unknown), np.stack(trace.slope))
    start[:, k] = feed_log_density(position, scale)
    seen = np.abs(start[:, :k]).max(axis=1) >= _BLIND
    position, start = position[seen], start[seen]
    points = system.solve(start, k, start[:, k])
    good = points.converged & (np.abs(points.unknown[:, k + 1] - start[:, k + 1]) < 0.03)
    good &= np.abs(points.unknown[:, :k]).max(axis=1) > _TRIVIAL
    # a far side on which the feed comes under tension is cut off
    good &= points.log_pressure > trace.log_pressure[0] - 1.0
    stretch = 1.0 + _WEIGHT * np.exp(start[:, k]) / scale
    temperature_slope = points.slope[:, k + 1] / stretch
    pressure_slope = points.pressure_slope / stretch
    slope = points.slope / stretch[:, None]
    arrays = (position, points.unknown, slope, points.log_pressure, temperature_slope, pressure_slope)
    position, unknown, slope, log_pressure, temperature_slope, pressure_slope = (a[good] for a in arrays)
    log_temperature = unknown[:, k + 1]
    # the extremes become nodes themselves, solved where the cubics have them
    therm = _turning(position, log_temperature, temperature_slope)
    bar = _turning(position, log_pressure, pressure_slope)
    if therm is not None and bar is not None and abs(therm - bar) < _SAME:
        # a single component, or nearly so: one node serves both
        therm = bar
    extremes = np.array(sorted({e for e in (therm, bar) if e is not None}))
    if extremes.size:
        start = hermite(extremes, position, unknown, slope)
        start[:, k] = feed_log_density(extremes, scale)
        points = system.solve(start, k, start[:, k])
        exact = points.converged & (np.abs(points.unknown[:, k + 1] - start[:, k + 1]) < 1e-3)
        exact &= np.abs(points.unknown[:, :k]).max(axis=1) > 1e-3
        stretch = (1.0 + _WEIGHT * np.exp(start[:, k]) / scale)[:, None]
        columns = np.concatenate([unknown, log_pressure[:, None]], axis=1)
        grid = columns
        slopes = np.concatenate([slope, pressure_slope[:, None]], axis=1)
        between = hermite(extremes, position, columns, slopes)
        solved = np.concatenate([points.unknown, points.log_pressure[:, None]], axis=1)
        solved_slopes = np.concatenate([points.slope, points.pressure_slope[:, None]], axis=1) / stretch
        at = np.searchsorted(position, extremes)
        columns = np.insert(columns, at, np.where(exact[:, None], solved, between), axis=0)
        fallback = hermite_slope(extremes, position, grid, slopes)
        slopes = np.insert(slopes, at, np.where(exact[:, None], solved_slopes, fallback), axis=0)
        position = np.insert(position, at, extremes)
        unknown, log_pressure = columns[:, :-1], columns[:, -1]
        slope, pressure_slope = slopes[:, :-1], slopes[:, -1]
        log_temperature, temperature_slope = unknown[:, k + 1], slope[:, k + 1]

    def point(at: float) -> NamedPoint:
        both = hermite(
            np.array([at]),
            position,
            np.stack([log_temperature, log_pressure], axis=1),
            np.stack([temperature_slope, pressure_slope], axis=1),
        )[0]
        return NamedPoint(math.exp(both[0]), math.exp(both[1]), math.exp(float(feed_log_density(np.array([at]), scale)[0])))

    heavy = int(np.abs(unknown[0, :k]).argmax())
    critical = _crossing(position, unknown[:, heavy], slope[:, heavy])
    return Boundary(
        system,
        scale,
        position,
        log_temperature,
        log_pressure,
        temperature_slope,
        pressure_slope,
        unknown,
        None if therm is None else point(therm),
        None if bar is None else point(bar),
        None if critical is None else point(critical),
        complete,
        end,
        True,
    )


def _turning(x: Floats, y: Floats, slope: Floats) -> float | None:
    """Return where the piecewise cubic first turns from rising to falling."""
    for i in range(x.size - 1):
        if slope[i] > 0.0 >= slope[i + 1]:
            h = x[i + 1] - x[i]
            chord = (y[i + 1] - y[i]) / h
            a, b = slope[i], slope[i + 1]
            # slope along the cell, t in [0, 1]: a + t (6 chord - 4 a - 2 b) + t^2 3 (a + b - 2 chord)
            q1, q2 = 6.0 * chord - 4.0 * a - 2.0 * b, 3.0 * (a + b - 2.0 * chord)
            low, high = 0.0, 1.0
            for _ in range(50):
                t = 0.5 * (low + high)
                if a + t * (q1 + t * q2) > 0.0:
                    low = t
                else:
                    high = t
            return float(x[i] + h * low)
    return None


def _crossing(x: Floats, y: Floats, slope: Floats) -> float | None:
    """Return where the piecewise cubic first changes its sign."""
    for i in range(x.size - 1):
        if y[i] * y[i + 1] <= 0.0:
            low, high = float(x[i]), float(x[i + 1])
            for _ in range(50):
                middle = 0.5 * (low + high)
                value = float(hermite(np.array([middle]), x[i : i + 2], y[i : i + 2, None], slope[i : i + 2, None])[0, 0])
                if value * y[i] > 0.0:
                    low = middle
                else:
                    high = middle
            return low
    return None
