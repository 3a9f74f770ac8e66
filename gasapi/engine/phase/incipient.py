"""Points at which a mixture is about to form a second phase: Newton's method in component densities.

The feed has the fractions z and the density rho; the incipient phase has the component densities rho z_i exp(kappa_i). For
active components i the fugacities are equal, kappa_i + g_i(incipient) = g_i(feed), and so are the pressures; one more equation
fixes a point. Unknown: kappa_1 ... kappa_k, s = ln rho, theta = ln T. All kappa vanish at the critical point and nowhere else
on the boundary. As ln K in Michelsen's continuation (Fluid Phase Equilibria 4 (1980) 1), they cross it without a break; a
component that is not active is held out of the incipient phase.
"""

from __future__ import annotations

import math
from contextlib import suppress
from typing import NamedTuple, cast

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.phase.energy import Floats, MixtureEnergy

__all__ = ["IncipientPhase", "Points"]

_STEPS = 30
_STEPS_ALONG = 10
"""Steps of a continuation that has to take shorter ones than more of these."""

_LONGEST = np.array([2.0, 0.7, 0.15])
"""Longest step in kappa, s and theta."""

_CLOSE = 1e-8
"""Newton converges quadratically: what is left after a step of this size is below rounding."""


_ROUGH = 3e-4
"""The same for points that only lead to others."""


class Points(NamedTuple):
    """Solved points: ``unknown`` (m, k + 2), ``log_pressure`` (m,), ``slope`` of the unknowns in s along the boundary,
    (m, k + 2), ``pressure_slope`` d ln p/d s (m,), ``steps`` that were taken, ``converged`` (m,).
    """

    unknown: Floats
    log_pressure: Floats
    slope: Floats
    pressure_slope: Floats
    steps: int
    converged: NDArray[np.bool_]


class _Equations(NamedTuple):
    residual: Floats
    jacobian: Floats
    log_pressure: Floats
    log_pressure_gradient: Floats


class IncipientPhase:
    """The equations of one feed with one set of active components. Immutable.

    :param energy: the equation of state
    :param fractions: mole fractions of the feed, shape (n,), all above 0, [-]
    :param active: which components the incipient phase may hold, shape (n,)
    """

    def __init__(self, energy: MixtureEnergy, fractions: Floats, active: NDArray[np.bool_]) -> None:
        self.energy = energy
        self.fractions = fractions
        self.active = np.flatnonzero(active)
        self.size = self.active.size + 2
        self._log_r = float(np.log(energy.gas_constant))
        self._longest = np.concatenate([np.full(self.active.size, _LONGEST[0]), _LONGEST[1:]])

    def incipient_densities(self, unknown: Floats) -> Floats:
        """Return the component densities of the incipient phase, mol/m3, shape (m, n)."""
        k = self.active.size
        densities = np.zeros((unknown.shape[0], self.fractions.size))
        densities[:, self.active] = np.exp(unknown[:, :k] + unknown[:, k : k + 1]) * self.fractions[self.active]
        return densities

    def _equations(self, unknown: Floats) -> _Equations:
        m, k = unknown.shape[0], self.active.size
        temperature = np.exp(unknown[:, k + 1])
        rho = np.exp(unknown[:, k])
        incipient = self.incipient_densities(unknown)
        # both phases in one call
        d = self.energy.derivatives(
            np.concatenate([temperature, temperature]),
            np.concatenate([rho[:, None] * self.fractions, incipient]),
        )
        z_feed, z = d.compressibility[:m], d.compressibility[m:]
        total = incipient.sum(axis=1)
        x = incipient / total[:, None]
        a = self.active
        weighted = d.hessian[m:] * x[:, None, :]
        feed_sum = (d.hessian[:m] * self.fractions).sum(axis=2)
        own_sum = weighted.sum(axis=2)
        # P_j = d(rho Z)/d rho_j = 1 + sum_i x_i rho H_ij, of which the sums over j are needed too
        ratio = total / rho
        push = x + own_sum * x
        stiffness = push.sum(axis=1)
        feed_stiffness = 1.0 + (feed_sum * self.fractions).sum(axis=1)

        residual = np.empty((m, self.size))
        residual[:, :k] = unknown[:, :k] + (d.potential[m:] - d.potential[:m])[:, a]
        residual[:, k] = ratio * z - z_feed
        jacobian = np.zeros((m, self.size, self.size))
        jacobian[:, :k, :k] = weighted[:, a[:, None], a]
        index = np.arange(k)
        jacobian[:, index, index] += 1.0
        jacobian[:, :k, k] = (own_sum - feed_sum)[:, a]
        jacobian[:, :k, k + 1] = (d.potential_slope[m:] - d.potential_slope[:m])[:, a]
        jacobian[:, k, :k] = ratio[:, None] * push[:, a]
        jacobian[:, k, k] = ratio * stiffness - feed_stiffness - residual[:, k]
        jacobian[:, k, k + 1] = ratio * d.compressibility_slope[m:] - d.compressibility_slope[:m]
        gradient = np.zeros((m, self.size))
        safe = np.maximum(z_feed, 1e-12)
        gradient[:, k] = feed_stiffness / safe
        gradient[:, k + 1] = 1.0 + d.compressibility_slope[:m] / safe
        log_pressure = self._log_r + unknown[:, k] + unknown[:, k + 1] + np.log(safe)
        return _Equations(residual, jacobian, log_pressure, gradient)

    def solve(self, start: Floats, spec: int, value: Floats, most_steps: int = _STEPS) -> Points:
        """Solve points, each with one quantity given.

        :param start: unknowns to start from, shape (m, k + 2)
        :param spec: number of the unknown that is given, or -1 for ln p
        :param value: its values, shape (m,)
        :param most_steps: after how many steps a row counts as not converged
        :returns: points; a row that did not converge says so
        """
        x = start.copy()
        m = x.shape[0]
        last = self.size - 1
        converged = np.zeros(m, dtype=bool)
        lost = np.zeros(m, dtype=bool)
        count = 0
        rows = np.arange(m)
        with np.errstate(all="ignore"):
            for count in range(1, most_steps + 1):  # noqa: B007
                here = x[rows]
                e = self._equations(here)
                self._close(e, here, spec, value[rows])
                step = _solved(e.jacobian, e.residual[:, :, None])[:, :, 0]
                size = np.abs(step)
                lost[rows] = ~np.isfinite(size).all(axis=1)
                excess = (size / self._longest).max(axis=1)
                damp = np.where(excess > 1.0, 1.0 / excess, 1.0)
                usable = ~lost[rows]
                x[rows[usable]] = (here - damp[:, None] * step)[usable]
                converged[rows] = usable & (size.max(axis=1) < _CLOSE)
                rows = np.flatnonzero(~(converged | lost))
                if rows.size == 0:
                    break
            e = self._equations(x)
            e.jacobian[:, last, :] = 0.0
            e.jacobian[:, last, last - 1] = 1.0
            unit = np.zeros((m, self.size, 1))
            unit[:, last] = 1.0
            slope = _solved(e.jacobian, unit)[:, :, 0]
        pressure_slope = (e.log_pressure_gradient * slope).sum(axis=1)
        return Points(x, e.log_pressure, slope, pressure_slope, count, converged)

    def step_along(self, start: Floats, log_density: float) -> Points:
        """Solve one point at a given density of the feed, well enough to step on from it: to about 1e-7.

        :param start: unknowns to start from, shape (k + 2,)
        :param log_density: s
        """
        x = start[None].copy()
        spec = self.active.size
        last = self.size - 1
        right = np.zeros((1, self.size, 2))
        value = np.array([log_density])
        count, converged = 0, False
        with np.errstate(all="ignore"):
            for count in range(1, _STEPS_ALONG + 1):  # noqa: B007
                e = self._equations(x)
                self._close(e, x, spec, value)
                right[:, :, 0] = e.residual
                right[:, last, 1] = 1.0
                both = _solved(e.jacobian, right)
                step = both[:, :, 0]
                size = float(np.abs(step).max())
                if not math.isfinite(size):
                    break
                excess = float((np.abs(step) / self._longest).max())
                damp = 1.0 / excess if excess > 1.0 else 1.0
                x = x - damp * step
                if size < _ROUGH:
                    converged = True
                    break
        slope = both[:, :, 1]
        log_pressure = e.log_pressure - (e.log_pressure_gradient * step).sum(axis=1)
        pressure_slope = (e.log_pressure_gradient * slope).sum(axis=1)
        return Points(x, log_pressure, slope, pressure_slope, count, np.array([converged]))

    def _close(self, e: _Equations, x: Floats, spec: int, value: Floats) -> None:
        """Put the equation of what is given into the last row."""
        last = self.size - 1
        if spec >= 0:
            e.residual[:, last] = x[:, spec] - value
            e.jacobian[:, last, spec] = 1.0
        else:
            e.residual[:, last] = e.log_pressure - value
            e.jacobian[:, last, :] = e.log_pressure_gradient


def _solved(matrix: Floats, right: Floats) -> Floats:
    """Solve rows of linear systems; a singular or infinite one gives NaN for its row only."""
    try:
        return cast(Floats, np.linalg.solve(matrix, right))
    except np.linalg.LinAlgError:
        result = np.full(right.shape, np.nan)
        for row in range(matrix.shape[0]):
            with suppress(np.linalg.LinAlgError):
                result[row] = np.linalg.solve(matrix[row], right[row])
        return result
