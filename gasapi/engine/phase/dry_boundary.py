"""The phase boundary of a mixture without liquid water, as curves: found, followed and checked.

Dew points at fixed pressures show which liquids form first (``dew_search``). The line of the highest of them is traced through
its critical point to the bubble line (``boundary``); where another liquid forms at higher temperatures, its line is followed in
pressure until it is no longer the higher one. The dew line of the gas is the highest of all. Last, states just outside of it
are looked through for a second phase (``screening``); what is found there leads to a further line or, where it does not, the
curves are given up. Everything depends on the composition alone.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Final, NamedTuple

import numpy as np

from gasapi.engine.phase.boundary import LOST, Boundary, trace_boundary
from gasapi.engine.phase.curves import BelowBranch, BoundaryCurve, Curve, DewBranch, OddBoundary
from gasapi.engine.phase.dew_search import (
    DewPoints,
    follow_dew_line,
    is_one_line,
    joined,
    refine_dew_line,
    search_dew_points,
    solve_dew_points,
)
from gasapi.engine.phase.energy import Floats, MixtureEnergy
from gasapi.engine.phase.incipient import IncipientPhase
from gasapi.engine.phase.region import Region
from gasapi.engine.phase.screening import screen

__all__ = ["NO_DEW_POINT", "Doubt", "DryBoundary", "dry_boundary"]

NO_DEW_POINT: Final = "no dew point in the range of the equation"

_NODES: Final = np.linspace(math.log(1e3), math.log(6e7), 13)
_START: Final = math.log(2e5)
"""Traces start here or above: at lower pressures a second liquid may be near."""

_ABOVE: Final = 0.02
"""K by which a dew point has to be above the curves to belong to a line of its own."""

_SAME_LINE: Final = 0.1
_STEP: Final = 0.35
_NEARLY_COLD: Final = 1.06
_SHORTER: Final = 0.3
_SHORTEST_STEP: Final = 0.005
_FAR: Final = 1.7
_FEWEST: Final = 3
_BRANCHES: Final = 5
_ROUNDS: Final = 3
_OUTSIDE: Final = 0.1
_FAR_OUTSIDE: Final = 6.0
_EXTRAPOLATED: Final = 3.0
_STARTS: Final = 3
_MOST_DOUBTS: Final = 6
_RISES: Final = (10.0, 30.0, 80.0)
_CERTAIN: Final = (0.98, 0.94, 0.88, 0.8, 0.7)
_COLD_STATES: Final = 8
_COLD_ALONE: Final = 6
_MARGIN: Final = 1.03
_COLD_LOG_PRESSURE: Final = math.log(3e7)


_TWO_PHASE: Final = int(Region.TWO_PHASE)


class Doubt(NamedTuple):
    """A range of ln p, and the temperature, K, below which single phases are left to the direct test there."""

    low: float
    high: float
    temperature: float


class DryBoundary(NamedTuple):
    """``curves``, none where the boundary is not known; the traced ``boundary`` of the upper one and why its trace ended;
    ``doubts`` are where single phases are not to be believed. So are dense ones below the temperature, K, that ``cold`` finds;
    it is at most ``coldest_sure``.
    """

    curves: tuple[Curve, ...]
    boundary: Boundary | None
    end: str
    doubts: tuple[Doubt, ...] = ()
    coldest_sure: float = -math.inf
    cold: Callable[[], float] = lambda: -math.inf


def dry_boundary(energy: MixtureEnergy, fractions: Floats, shift: float, lowest_temperature: float) -> DryBoundary:
    """Return the boundary of a mixture.

    :param energy: the equation of state
    :param fractions: mole fractions, shape (n,), all above 0, [-]
    :param shift: what is added to ln p: the share of the pressure that the mixture has
    :param lowest_temperature: K, where the equation ends
    """
    return _Search(energy, fractions, shift, lowest_temperature).run()


def _highest(points: DewPoints) -> DewPoints:
    """Return the highest point at each pressure, at rising pressures."""
    order = np.lexsort((points.temperature, points.log_pressure))
    last = np.append(np.diff(points.log_pressure[order]) > 0.0, True)
    return points.take(order[last])


class _Search:
    """One boundary in the making; ln p is that of the mixture itself throughout."""

    def __init__(self, energy: MixtureEnergy, fractions: Floats, shift: float, lowest_temperature: float) -> None:
        self._energy, self._z, self._shift, self._lowest = energy, fractions, shift, lowest_temperature
        self._system = IncipientPhase(energy, fractions, np.ones(fractions.size, dtype=bool))
        self._boundary: Boundary | None = None
        self._main: BoundaryCurve | None = None
        self._branches: list[Curve] = []
        self._end = NO_DEW_POINT
        self._points = DewPoints(np.empty(0), np.empty(0), np.empty((0, 0)), np.empty((0, 0)))

    def run(self) -> DryBoundary:
        """Return the boundary."""
        points = search_dew_points(self._system, _NODES, self._lowest)
        if points.temperature.size == 0:
            return DryBoundary((), None, NO_DEW_POINT)
        self._trace(_highest(points))
        doubts: tuple[Doubt, ...] | None = None
        for _ in range(_ROUNDS):
            if not self._add_branches(points):
                break
            log_p, temperature, more = self._overlooked()
            doubts = self._doubts(log_p, temperature) if log_p.size else ()
            if log_p.size == 0 or not bool((more.temperature > self._dew(more.log_pressure) + _ABOVE).any()):
                break
            points = joined(points, more)
        self._points = points
        if doubts is None:
            return DryBoundary((), self._boundary, self._end)
        curves, main = self._finished(), self._main
        if main is None or not main.closed:
            return DryBoundary(curves, self._boundary, self._end, doubts)
        # most gases are never asked for as cold liquids
        return DryBoundary(curves, self._boundary, self._end, doubts, float(main.by_pressure(0.0)), lambda: self._cold(main))

    def _curves(self) -> list[Curve]:
        return ([] if self._main is None else [self._main]) + self._branches

    def _dew(self, log_pressure: Floats) -> Floats:
        """Return the dew temperature by the curves so far, -inf for none."""
        dew = np.full(log_pressure.size, -np.inf)
        for curve in self._curves():
            dew = np.maximum(dew, curve.dew_temperature(log_pressure + self._shift))
        return dew

    def _trace(self, highest: DewPoints) -> None:
        """Trace the line of the highest pressures, from a moderate pressure on it or else from its upper end."""
        last = highest.temperature.size - 1
        starts: dict[int, None] = {}
        # a point at the highest pressures may be one of a lesser line, where that of the higher one was not found
        for end in (last, last - 1, last - 2):
            first = end
            while first > 0 and highest.log_pressure[first - 1] >= _START and is_one_line(highest, first - 1, first):
                first -= 1
            starts[max(first, 0)] = None
            starts[max(end, 0)] = None
        for start in list(starts)[:_STARTS]:
            boundary, self._end = trace_boundary(self._system, highest.unknown[start], self._lowest)
            if boundary is None:
                continue
            try:
                curve = BoundaryCurve(boundary, self._shift, self._lowest)
            except OddBoundary:
                continue
            if bool((_ceiling(curve, highest.log_pressure + self._shift) > highest.temperature - _SAME_LINE)[start:].all()):
                self._boundary, self._main = boundary, curve
                return

    def _add_branches(self, points: DewPoints) -> bool:
        """Add branches until no dew point is above the curves; tell whether that was reached."""
        for _ in range(_BRANCHES):
            dew = self._dew(points.log_pressure)
            if self._main is not None:
                dew = np.maximum(dew, _ceiling(self._main, points.log_pressure + self._shift))
            above = np.flatnonzero(points.temperature > dew + _ABOVE)
            if above.size == 0:
                return True
            high = above[points.log_pressure[above] == points.log_pressure[above].max()]
            try:
                self._branches.append(self._branch(points, int(high[points.temperature[high].argmax()])))
            except OddBoundary:
                return False
        return False

    def _branch(self, points: DewPoints, start: int) -> Curve:
        """Return the line through a point: through others that were found, in the middle between them, and beyond them."""
        chain = [start]
        order = np.argsort(points.log_pressure, kind="stable")
        for sign in (-1, 1):
            for row in order[::sign].tolist():
                ahead = sign * (points.log_pressure[row] - points.log_pressure[chain[-1]])
                if 0.0 < ahead < _FAR and is_one_line(points, chain[-1], row):
                    chain.append(row)
            chain.reverse()
        line = points.take(np.array(chain))
        if len(chain) > 1:
            line = refine_dew_line(self._system, refine_dew_line(self._system, line, self._lowest), self._lowest)
        downward, sunk = self._followed(line.take(np.arange(line.temperature.size - 1, -1, -1)), -1.0)
        line, crossed = self._followed(downward.take(np.arange(downward.temperature.size - 1, -1, -1)), 1.0)
        below = BelowBranch.STRAIGHT
        if sunk:
            below = BelowBranch.SILENT
        elif float(line.log_pressure[0]) > float(_NODES[0]) + _STEP and not self._is_cold(line):
            below = BelowBranch.LOST
        if not crossed or line.temperature.size < _FEWEST:
            line = _lengthened(line)
        last = self._main is None and not crossed
        return DewBranch(line, self._shift, below, self._certain(line), last, self._lowest)

    def _followed(self, line: DewPoints, sign: float) -> tuple[DewPoints, bool]:
        """Return a line and its points beyond the last one, and whether another line is the higher one at the end."""
        end = float(_NODES[-1]) + _STEP if sign > 0.0 else float(_NODES[0]) - _STEP
        step = _STEP
        while step > _SHORTEST_STEP:
            last = line.take(np.array([-1]))
            if float(last.temperature[0]) < float(self._dew(last.log_pressure)[0]):
                return line, True
            log_p = float(last.log_pressure[0]) + sign * step
            if sign * (log_p - end) > 0.0:
                break
            found = follow_dew_line(self._system, line, log_p, self._lowest)
            if found is None:
                step *= _SHORTER
            else:
                line = joined(line, found)
        return line, False

    def _is_cold(self, line: DewPoints) -> bool:
        """Return whether the liquid of the first point is about as cold as the equation can take it."""
        partial = self._system.incipient_densities(line.unknown[:1])
        coldest = float(self._energy.lowest_temperature(partial / partial.sum(axis=1)[:, None])[0])
        return float(line.temperature[0]) < _NEARLY_COLD * coldest

    def _certain(self, points: DewPoints) -> float:
        """Return down to which part of the dew temperature two phases are proven at each point."""
        certain = 1.0
        m = points.temperature.size
        rows = np.unique(np.linspace(0, m - 1, 4).round().astype(int))
        parts = np.array(_CERTAIN)
        t = (points.temperature[rows, None] * parts).ravel()
        p = np.exp(np.repeat(points.log_pressure[rows], parts.size))
        proven = (screen(self._energy, self._z, t, p).unstable | (t < self._lowest)).reshape(rows.size, parts.size).all(axis=0)
        for part, good in zip(_CERTAIN, proven.tolist(), strict=True):
            if not good:
                break
            certain = part
        return certain

    def _overlooked(self) -> tuple[Floats, Floats, DewPoints]:
        """Look for a second phase outside the curves: ln p and T of where there is one, and dew points that follow from it."""
        nodes = 0.5 * (_NODES[1:] + _NODES[:-1])
        dew = self._dew(nodes)
        nodes, dew = nodes[np.isfinite(dew)], dew[np.isfinite(dew)]
        first = min(c.log_first for c in self._curves()) - self._shift
        log_p = [nodes, nodes[::3]]
        t = [dew + np.where(nodes < first, _EXTRAPOLATED, _OUTSIDE), dew[::3] + _FAR_OUTSIDE]
        for branch in (b for b in self._branches if b.closed):
            # just beyond a branch, where others have to be the higher ones
            end = branch.log_top - self._shift
            top = float(branch.dew_temperature(np.array([branch.log_top]))[0])
            log_p.append(np.array([end + 0.02, end + 0.15]))
            t.append(np.array([top - 0.3, top - 0.3]))
        main = self._main
        if main is not None and main.closed:
            top = main.log_top - self._shift
            log_p.append(np.array([top + 0.05, top + 0.05, top + 0.4]))
            t.append(np.array([1.001, 1.04, 1.02]) * float(main.by_pressure(0.0)))
        at, temperature = np.concatenate(log_p), np.concatenate(t)
        outside = temperature > self._dew(at)
        at, temperature = at[outside], temperature[outside]
        found = screen(self._energy, self._z, temperature, np.exp(at))
        rows = np.flatnonzero(found.unstable)
        at, temperature = at[rows], temperature[rows]
        return at, temperature, solve_dew_points(self._system, at, temperature, found.fractions[rows], self._lowest)

    def _doubts(self, log_pressure: Floats, temperature: Floats) -> tuple[Doubt, ...] | None:
        """Return ranges around states with a second phase that no line explains; None where they are too wide."""
        doubts: list[Doubt] = []
        wide = float(_NODES[1] - _NODES[0])
        for log_p, t in zip(log_pressure.tolist(), temperature.tolist(), strict=True):
            if len(doubts) == _MOST_DOUBTS:
                return None
            around = log_p + np.array([-wide, 0.0, wide])
            dew = self._dew(around) + _OUTSIDE
            for rise in _RISES:
                if not screen(self._energy, self._z, np.maximum(dew, t + rise), np.exp(around)).unstable.any():
                    doubts.append(Doubt(log_p - wide + self._shift, log_p + wide + self._shift, t + rise))
                    break
            else:
                return None
        return tuple(doubts)

    def _finished(self) -> tuple[Curve, ...]:
        """Return all curves; the upper one leaves lower pressures to the branches that cover them."""
        main = self._main
        if main is None:
            return tuple(self._branches)
        covered = main.log_first
        for branch in sorted(self._branches, key=lambda b: -b.log_top):
            if branch.log_top >= covered and branch.log_first < covered:
                covered = branch.log_first
        return (main.continued_by_another() if covered < main.log_first else main, *self._branches)

    def _cold(self, main: BoundaryCurve) -> float:
        """Return below which temperature the dense side splits once more, -inf where it was not found to."""
        top = main.log_top - self._shift
        ladder = np.linspace(float(main.by_pressure(0.0)), self._lowest, _COLD_STATES + 1)
        pressures = np.array([top + 0.05, max(top + 0.5, _COLD_LOG_PRESSURE)])
        found = screen(self._energy, self._z, np.tile(ladder[1:], 2), np.exp(np.repeat(pressures, _COLD_STATES)), _COLD_ALONE)
        split = found.unstable.reshape(2, _COLD_STATES).any(axis=0)
        # up to the next state above the warmest that splits
        cold = float(ladder[int(split.argmax())]) if split.any() else -math.inf
        for log_p, t in zip((self._points.log_pressure + self._shift).tolist(), self._points.temperature.tolist(), strict=True):
            if log_p > main.log_top and main.state_float(t - _ABOVE, log_p)[0] != _TWO_PHASE:
                cold = max(cold, _NEARLY_COLD * t)
        if self._end == LOST and self._boundary is not None:
            # a bubble line is often lost where a second liquid begins
            cold = max(cold, _NEARLY_COLD * math.exp(self._boundary.log_temperature[-1]))
        return min(_MARGIN * cold, float(ladder[0]))


def _ceiling(curve: BoundaryCurve, log_pressure: Floats) -> Floats:
    """Return the dew temperature, and that of the cricondenbar above it: what is colder there is on the dense side."""
    top = float(curve.by_pressure(0.0)) if curve.closed else -math.inf
    return np.where(log_pressure > curve.log_top, top, curve.dew_temperature(log_pressure))


def _lengthened(line: DewPoints) -> DewPoints:
    """Return a line with two more points, straight on: it turns back there, or was lost."""
    last = line.take(np.array([-1, -1]))
    further = np.array([0.5, 1.0]) * _SHORTEST_STEP
    temperature = last.temperature + further * last.temperature_slope
    return joined(line, last._replace(log_pressure=last.log_pressure + further, temperature=temperature))
