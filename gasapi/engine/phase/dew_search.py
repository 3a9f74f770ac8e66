"""Dew points of a mixture at given pressures, with every liquid that may form first.

From several first guesses of the liquid at each pressure (ideal after Wilson, the same without scarce heavy components, and
the components that condense first by themselves, nearly pure) the equations of ``IncipientPhase`` are solved, all in one block.
Each solution is a state on the verge of splitting, so that the highest one at a pressure is never above the true dew
temperature. A lean natural gas with carbon dioxide has two such lines, one where a liquid rich in carbon dioxide forms and one
of the bulk, and its dew line is the higher of them, with a kink where they cross.
"""

from __future__ import annotations

from typing import Final, NamedTuple, cast

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.phase.energy import Floats, MixtureEnergy
from gasapi.engine.phase.incipient import IncipientPhase, Points
from gasapi.engine.phase.spline import hermite
from gasapi.engine.protocol import Branch, Status

__all__ = [
    "DewPoints",
    "first_liquids",
    "follow_dew_line",
    "ideal_gas_trials",
    "is_one_line",
    "joined",
    "refine_dew_line",
    "search_dew_points",
    "solve_dew_points",
]

_COLDEST: Final = 20.0
_HOTTEST: Final = 2000.0
_STEPS: Final = 16
_PURE: Final = 0.98
_BY_THEMSELVES: Final = 3
_LIQUID_LIKE: Final = 0.35
_TYPICAL: Final = 0.75
_DISTINCT: Final = 0.05
"""Solutions whose logarithms of partial densities are all closer than this in both phases are near a critical point."""

_SAME_ROOT: Final = 1e-5
_FEW_STEPS: Final = 8
_SAME_LINE: Final = 0.003
_SMOOTH: Final = 0.01
_LEAP: Final = 0.6
"""How much the logarithm of a partial density may be off a straight line in ln p from one point of a line to the next."""

_SCARCE: Final = 0.02
_HEAVIER: Final = 1.5


class DewPoints(NamedTuple):
    """Dew points: ln p and T in K, shape (m,), with the ``unknown`` of ``IncipientPhase``, whose last is ln T, and its slope
    in ln p along the line, both (m, k + 2).
    """

    log_pressure: Floats
    temperature: Floats
    unknown: Floats
    slope: Floats

    @property
    def temperature_slope(self) -> Floats:
        """Return dT/d ln p, K, shape (m,)."""
        return self.temperature * self.slope[:, -1]

    def take(self, rows: NDArray[np.intp]) -> DewPoints:
        """Return some of the points."""
        return DewPoints(*(column[rows] for column in self))


def joined(*parts: DewPoints) -> DewPoints:
    """Return the points of several searches, one after the other."""
    return DewPoints(*(np.concatenate(columns) for columns in zip(*parts, strict=True)))


class _Guesses(NamedTuple):
    """States from which to set out: ln p and T, shape (m,), and mole fractions of the liquid, (m, n)."""

    log_pressure: Floats
    temperature: Floats
    fractions: Floats


def _wilson(energy: MixtureEnergy, temperature: Floats) -> Floats:
    """Return ln(K_i p) after Wilson (65th AIChE meeting (1969)), shape (m, n)."""
    growth = 5.373 * (1.0 + energy.acentric_factors)
    return np.log(energy.critical_pressures) + growth * (1.0 - energy.critical_temperatures / temperature[:, None])


def _ideal_liquids(energy: MixtureEnergy, fractions: Floats, log_pressure: Floats) -> _Guesses:
    """Return the dew points of an ideal liquid; a component with fraction 0 stays out of it."""
    low, high = np.full(log_pressure.size, _COLDEST), np.full(log_pressure.size, _HOTTEST)
    used = fractions > 0.0
    log_z = np.where(used, np.log(np.where(used, fractions, 1.0)), -np.inf)
    for _ in range(50):
        middle = 0.5 * (low + high)
        exponent = np.clip(log_z + log_pressure[:, None] - _wilson(energy, middle), -600.0, 600.0)
        condenses = np.exp(np.where(used, exponent, -600.0)).sum(axis=1) > 1.0
        low, high = np.where(condenses, middle, low), np.where(condenses, high, middle)
    # beyond its critical temperature no liquid of its kind is left
    exponent = log_z + log_pressure[:, None] - _wilson(energy, low)
    x = np.where(used, np.exp(np.clip(exponent, -600.0, 600.0)), 0.0)
    x /= x.sum(axis=1)[:, None]
    return _Guesses(log_pressure, np.minimum(low, 0.95 * (x @ energy.critical_temperatures)), x)


def ideal_gas_trials(energy: MixtureEnergy, fractions: Floats, temperature: Floats) -> Floats:
    """Return what evaporates first from a liquid of the feed, shape (m, n), if it is ideal."""
    exponent = _wilson(energy, temperature)
    y = fractions * np.exp(exponent - exponent.max(axis=1)[:, None])
    return cast(Floats, y / y.sum(axis=1)[:, None])


def _lean(energy: MixtureEnergy, fractions: Floats) -> Floats:
    """Return the fractions without scarce heavy components, which fall out by themselves."""
    mean = float((fractions * energy.critical_temperatures).sum())
    return np.where((fractions > _SCARCE) | (energy.critical_temperatures < _HEAVIER * mean), fractions, 0.0)


def first_liquids(
    energy: MixtureEnergy, fractions: Floats, log_pressure: Floats, alone_most: int = _BY_THEMSELVES
) -> list[_Guesses]:
    """Return the liquids that may form first, with where ideal ones would.

    :param energy: the equation of state
    :param fractions: mole fractions of the feed, shape (n,), all above 0, [-]
    :param log_pressure: ln p, shape (m,)
    :param alone_most: how many nearly pure ones are among them
    """
    n = fractions.size
    found = [_ideal_liquids(energy, fractions, log_pressure)]
    lean = _lean(energy, fractions)
    if 0 < int((lean > 0.0).sum()) < n:
        found.append(_ideal_liquids(energy, lean, log_pressure))
    growth = 5.373 * (1.0 + energy.acentric_factors)
    partial = log_pressure[:, None] + np.log(fractions / energy.critical_pressures)
    alone = energy.critical_temperatures / (1.0 - np.minimum(partial / growth, -0.02))
    order = np.argsort(-alone, axis=1, kind="stable")
    rows = np.arange(log_pressure.size)
    for place in range(min(alone_most, n)):
        chosen = order[:, place]
        x = np.broadcast_to((1.0 - _PURE) * fractions, (rows.size, n)).copy()
        x[rows, chosen] += _PURE
        found.append(_Guesses(log_pressure, alone[rows, chosen], x))
    return found


def search_dew_points(system: IncipientPhase, log_pressure: Floats, lowest_temperature: float) -> DewPoints:
    """Return all dew points found at some pressures, several for one pressure where several liquids may form.

    :param system: the equations of the feed, with all its components active
    :param log_pressure: ln p, shape (m,)
    :param lowest_temperature: K, where the equation ends
    """
    guesses = first_liquids(system.energy, system.fractions, log_pressure)
    return solve_dew_points(
        system,
        np.concatenate([g.log_pressure for g in guesses]),
        np.concatenate([g.temperature for g in guesses]),
        np.concatenate([g.fractions for g in guesses]),
        lowest_temperature,
    )


def solve_dew_points(
    system: IncipientPhase, log_pressure: Floats, temperature: Floats, liquid: Floats, lowest_temperature: float
) -> DewPoints:
    """Return the dew points to which first guesses lead; those that lead to none are left out.

    :param system: the equations of the feed, with all its components active
    :param log_pressure: ln p, shape (m,)
    :param temperature: K, shape (m,)
    :param liquid: mole fractions of the liquid, shape (m, n), [-]
    :param lowest_temperature: K, where the equation ends
    """
    energy, z = system.energy, system.fractions
    warm = temperature >= lowest_temperature
    log_pressure, temperature, liquid = log_pressure[warm], temperature[warm], liquid[warm]
    if temperature.size == 0:
        nothing = np.empty((0, system.size))
        return DewPoints(log_pressure, temperature, nothing, nothing)
    pressure = np.exp(log_pressure)
    feed = np.broadcast_to(z, liquid.shape)
    # where a liquid has several roots by the equation, the search has to start on the one that counts
    dense, status = energy.density(temperature, pressure, liquid, Branch.LIQUID)
    packed = energy.close_packing(liquid)
    dense = np.where((status == Status.CONVERGED) & (dense > _LIQUID_LIKE * packed), dense, _TYPICAL * packed)
    thin, status = energy.density(temperature, pressure, feed, Branch.GAS)
    thin = np.where(status == Status.CONVERGED, thin, pressure / (energy.gas_constant * temperature))
    k = system.active.size
    start = np.empty((temperature.size, k + 2))
    # one substitution, since the ideal solubility of a light gas may be off by orders of magnitude
    d = energy.derivatives(
        np.concatenate([temperature, temperature]), np.concatenate([thin[:, None] * z, dense[:, None] * liquid])
    )
    m = temperature.size
    kappa = np.clip(d.potential[:m] - d.potential[m:], -60.0, 60.0)
    total = (np.exp(kappa) * z).sum(axis=1) * thin
    start[:, :k] = kappa + np.log(dense / total)[:, None]
    start[:, k] = np.log(thin)
    start[:, k + 1] = np.log(temperature)
    return _genuine(system, system.solve(start, -1, log_pressure, _STEPS), log_pressure, lowest_temperature)


def _genuine(system: IncipientPhase, points: Points, log_pressure: Floats, lowest_temperature: float) -> DewPoints:
    """Keep the points that are two phases, each on the root that is reached from outside along a rising isotherm."""
    energy, k = system.energy, system.active.size
    with np.errstate(all="ignore"):
        temperature = np.exp(points.unknown[:, k + 1])
        good = points.converged & (np.abs(points.unknown[:, :k]).max(axis=1) > _DISTINCT) & (temperature >= lowest_temperature)
    rows = np.flatnonzero(good)
    if rows.size:
        t, p = temperature[rows], np.exp(log_pressure[rows])
        partial = system.incipient_densities(points.unknown[rows])
        dense = partial.sum(axis=1)
        x = partial / dense[:, None]
        thin = np.exp(points.unknown[rows, k])
        root, status = energy.density(t, p, x, Branch.LIQUID)
        feed_root, feed_status = energy.density(t, p, np.broadcast_to(system.fractions, x.shape), Branch.GAS)
        keep = (dense > thin) & (t >= energy.lowest_temperature(x))
        keep &= (status == Status.CONVERGED) & (np.abs(root / dense - 1.0) < _SAME_ROOT)
        keep &= (feed_status == Status.CONVERGED) & (np.abs(feed_root / thin - 1.0) < _SAME_ROOT)
        rows = rows[keep]
    slope = points.slope[rows] / points.pressure_slope[rows, None]
    return DewPoints(log_pressure[rows], temperature[rows], points.unknown[rows], slope)


def refine_dew_line(system: IncipientPhase, points: DewPoints, lowest_temperature: float) -> DewPoints:
    """Return a line with the points in the middle between those given, as far as they are solved.

    :param system: the equations of the feed
    :param points: points of one line at rising pressures
    :param lowest_temperature: K, where the equation ends
    """
    middle = 0.5 * (points.log_pressure[1:] + points.log_pressure[:-1])
    start = hermite(middle, points.log_pressure, points.unknown, points.slope)
    found = _genuine(system, system.solve(start, -1, middle, _FEW_STEPS), middle, lowest_temperature)
    expected = np.exp(hermite(found.log_pressure, points.log_pressure, points.unknown, points.slope)[:, -1])
    near = np.flatnonzero(np.abs(found.temperature / expected - 1.0) < _SAME_LINE)
    both = joined(points, found.take(near))
    return both.take(np.argsort(both.log_pressure, kind="stable"))


def follow_dew_line(
    system: IncipientPhase, line: DewPoints, log_pressure: float, lowest_temperature: float
) -> DewPoints | None:
    """Return the next dew point along a line, or None where there is none.

    :param system: the equations of the feed
    :param line: the points so far, of which the last one or two lead on
    :param log_pressure: ln p of the point
    :param lowest_temperature: K, where the equation ends
    """
    at = np.array([log_pressure])
    if line.log_pressure.size > 1:
        last = line.take(np.array([-1, -2] if line.log_pressure[-1] < line.log_pressure[-2] else [-2, -1]))
        start = hermite(at, last.log_pressure, last.unknown, last.slope)
    else:
        start = line.unknown[-1:] + (log_pressure - line.log_pressure[-1]) * line.slope[-1:]
    found = _genuine(system, system.solve(start, -1, at, _FEW_STEPS), at, lowest_temperature)
    return found if found.temperature.size and _is_next(line, found, log_pressure) else None


def _is_next(line: DewPoints, found: DewPoints, log_pressure: float) -> bool:
    h = log_pressure - line.log_pressure[-1]
    leap = found.unknown[0] - line.unknown[-1] - 0.5 * h * (found.slope[0] + line.slope[-1])
    return bool(np.abs(leap).max() < _LEAP)


def is_one_line(points: DewPoints, first: int, second: int) -> bool:
    """Return whether two points seem to lie on one line, by their slopes."""
    h = points.log_pressure[second] - points.log_pressure[first]
    leap = points.unknown[second] - points.unknown[first] - 0.5 * h * (points.slope[first] + points.slope[second])
    return bool(abs(leap[-1]) < _SMOOTH and np.abs(leap).max() < _LEAP)
