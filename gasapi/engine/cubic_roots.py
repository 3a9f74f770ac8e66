"""The density roots of a two-parameter cubic equation of state, one branch at a time.

With packing eta = b rho, reduced pressure B = b p/(R T) and attraction theta = a/(b R T) every equation

    p = R T/(v - b) - a/((v + delta1 b)(v + delta2 b))

is the same curve B = eta/(1 - eta) - theta eta^2/((1 + delta1 eta)(1 + delta2 eta)), and a cubic in Z = B/eta as well as in
z = v/b = 1/eta. With u = delta1 + delta2, w = delta1 delta2, e2 = 1 + (1 - u) B, e1 = theta - u + (w - u) B,
e0 = theta + w + w B:

    H(Z) = Z^3 - e2 Z^2 + B e1 Z - B^2 e0 = 0          L(z) = B z^3 - e2 z^2 + e1 z - e0 = 0,    H(B z) = B^2 L(z)

**Which root.** The isotherm depends on theta alone. Its slope is zero where theta = S(eta), and S has one minimum, theta_c at
eta_c, which only the form of the equation fixes. So for theta <= theta_c the isotherm rises all the way and both
branches have the one root with eta < 1; for theta > theta_c one turning point lies on either side of eta_c. It crosses B
upward at the smallest root in eta, so this lies on the gas branch if eta < eta_c, and else there is no gas root; in the
same way the largest root in eta is a liquid if eta > eta_c. No turning point has to be computed, for mixtures neither.

**How.** H < 0 at Z = B, and Z <= 1 + B, because attraction only lowers the pressure. To the right of its inflection H bends
upward, to the left downward, so an iteration from the outer end reaches the first root without meeting the others: in Z
from above for the gas, which ends at 1 for p = 0; in z from close packing for the liquid, which keeps its digits however
low the pressure is. The steps are Halley's, held to half the distance from the turning point (or inflection) behind the root
(after U. K. Deiters, AIChE J. 48 (2002) 882, doi 10.1002/aic.690480421, with the guards and the choice of variable our own).
Only the four operations and the square root are used, in the same order for floats and blocks.
"""

from __future__ import annotations

import math
from typing import Final, NamedTuple

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.elementary import Array
from gasapi.engine.protocol import Branch, Status

__all__ = ["CubicRoots", "Packing", "PackingBlock"]

_MAX_STEPS: Final = 60
# a residual at this fraction of the sum of its terms is rounding
_RESIDUAL: Final = 2.3e-16
# Halley's error is at most (step / distance to the turning point)^3 times that distance
_STEP: Final = 1e-6
# so near theta_c the turning points differ in pressure by less than its rounding, so that there is one branch
_CRITICAL_MARGIN: Final = 1.0 + 1e-14
# beyond it the cubes overflow; NaN fails the same test
_LARGEST: Final = 1e100
_THIRD: Final = 1.0 / 3.0


class Packing(NamedTuple):
    """The packing fraction b rho, [-], and why the search stopped."""

    packing: float
    status: Status


class PackingBlock(NamedTuple):
    """Packing fractions, [-], and status, both of shape (n,)."""

    packing: Array
    status: NDArray[np.int8]


class CubicRoots:
    """The roots of one form of cubic equation. Immutable.

    :param delta1: see the module, [-]
    :param delta2: see the module, [-]
    :param critical_packing: eta_c, [-]
    :param critical_attraction: theta_c, [-]
    """

    __slots__ = ("_critical_attraction", "_critical_packing", "_u", "_w")

    def __init__(self, delta1: float, delta2: float, critical_packing: float, critical_attraction: float) -> None:
        self._u = delta1 + delta2
        self._w = delta1 * delta2
        self._critical_packing = critical_packing
        self._critical_attraction = critical_attraction * _CRITICAL_MARGIN

    def packing(self, theta: float, b: float, branch: Branch) -> Packing:
        """Return the root of a branch; without one the packing is that of the other branch and the status says so.

        :param theta: a/(b R T), [-]
        :param b: b p/(R T), not negative, [-]
        :param branch: which end of the isotherm
        """
        if not theta + b <= _LARGEST:
            return Packing(math.nan, Status.NOT_CONVERGED)
        u = self._u
        w = self._w
        one_sided = theta <= self._critical_attraction
        from_gas = one_sided or branch == Branch.GAS
        e2 = 1.0 + (1.0 - u) * b
        e1 = theta - u + (w - u) * b
        e0 = theta + w + w * b
        c1 = b * e1
        c0 = b * b * e0
        inflection = e2 * _THIRD
        spread = inflection * inflection - c1 * _THIRD
        spread = math.sqrt(spread) if spread > 0.0 else 0.0
        z_min = inflection + spread
        if inflection <= b:
            outer = True
        else:
            middle = ((inflection - e2) * inflection + c1) * inflection - c0
            if from_gas:
                outer = middle <= 0.0 or (spread > 0.0 and ((z_min - e2) * z_min + c1) * z_min - c0 <= 0.0)
            elif middle >= 0.0:
                outer = False
            else:
                z_max = e1 / (3.0 * z_min)
                outer = not (spread > 0.0 and z_max > 1.0 and ((b * z_max - e2) * z_max + e1) * z_max - e0 >= 0.0)

        if outer:
            eta, done = _from_above(e2, c1, c0, b, inflection, spread)
        else:
            ceiling = e1 / (3.0 * z_min) if spread > 0.0 else inflection / b
            eta, done = _from_below(e2, e1, e0, b, ceiling)
        if not done:
            return Packing(eta, Status.NOT_CONVERGED)
        if not one_sided and (eta > self._critical_packing) == from_gas:
            return Packing(eta, Status.NO_ROOT)
        return Packing(eta, Status.CONVERGED)

    def packing_block(self, theta: Array, b: Array, branch: Branch) -> PackingBlock:
        """Return the same for rows.

        :param theta: a/(b R T), shape (n,), [-]
        :param b: b p/(R T), shape (n,), [-]
        :param branch: one branch for all rows
        """
        with np.errstate(all="ignore"):
            return self._packing_block(theta, b, branch)

    def _packing_block(self, theta: Array, b: Array, branch: Branch) -> PackingBlock:
        u = self._u
        w = self._w
        one_sided = theta <= self._critical_attraction
        e2 = 1.0 + (1.0 - u) * b
        e1 = theta - u + (w - u) * b
        e0 = theta + w + w * b
        c1 = b * e1
        c0 = b * b * e0
        inflection = e2 * _THIRD
        spread = inflection * inflection - c1 * _THIRD
        spread = np.where(spread > 0.0, np.sqrt(np.maximum(spread, 0.0)), 0.0)
        z_min = inflection + spread
        z_max = e1 / (3.0 * z_min)
        middle = ((inflection - e2) * inflection + c1) * inflection - c0
        two_turns = spread > 0.0
        gas_outer = (middle <= 0.0) | (two_turns & (((z_min - e2) * z_min + c1) * z_min - c0 <= 0.0))
        if branch == Branch.GAS:
            from_gas = np.ones(theta.shape, dtype=np.bool_)
            outer = gas_outer
        else:
            from_gas = one_sided
            inner = two_turns & (z_max > 1.0) & (((b * z_max - e2) * z_max + e1) * z_max - e0 >= 0.0)
            outer = np.where(from_gas, gas_outer, ~((middle >= 0.0) | inner))
        outer |= inflection <= b

        eta = np.empty_like(theta)
        done = np.empty(theta.shape, dtype=np.bool_)
        rows = np.flatnonzero(outer)
        if rows.size:
            eta[rows], done[rows] = _from_above_block(e2[rows], c1[rows], c0[rows], b[rows], inflection[rows], spread[rows])
        if rows.size < theta.size:
            rows = np.flatnonzero(~outer)
            ceiling = np.where(two_turns, z_max, inflection / b)
            eta[rows], done[rows] = _from_below_block(e2[rows], e1[rows], e0[rows], b[rows], ceiling[rows])

        status = np.where(~one_sided & ((eta > self._critical_packing) == from_gas), Status.NO_ROOT, Status.CONVERGED)
        sensible = theta + b <= _LARGEST
        status = np.where(done & sensible, status, Status.NOT_CONVERGED)
        return PackingBlock(np.where(sensible, eta, math.nan), status.astype(np.int8))


def _from_above(e2: float, c1: float, c0: float, b: float, inflection: float, spread: float) -> tuple[float, bool]:
    """Return eta of the largest root of H, and whether it converged."""
    floor = inflection + spread
    top = 1.0 + b
    z = floor + spread if spread > 0.0 else top
    z = z if z < top else top
    a2 = abs(e2)
    a1 = abs(c1)
    a0 = abs(c0)
    for _ in range(_MAX_STEPS):
        f = ((z - e2) * z + c1) * z - c0
        if abs(f) <= _RESIDUAL * (((z + a2) * z + a1) * z + a0):
            return b / z, True
        slope = (3.0 * z - 2.0 * e2) * z + c1
        new = z - f * slope / (slope * slope - f * (3.0 * z - e2))
        half = 0.5 * (z + floor)
        new = new if new > half else half
        new = new if new < top else top
        step = abs(new - z)
        z = new
        if step <= _STEP * (z - floor):
            return b / z, True
    return b / z, False


def _from_above_block(
    e2: Array, c1: Array, c0: Array, b: Array, inflection: Array, spread: Array
) -> tuple[Array, NDArray[np.bool_]]:
    floor = inflection + spread
    top = 1.0 + b
    z = np.minimum(np.where(spread > 0.0, floor + spread, top), top)
    result = z.copy()
    finished = np.zeros(z.shape, dtype=np.bool_)
    rows = np.arange(z.size)
    for _ in range(_MAX_STEPS):
        f = ((z - e2) * z + c1) * z - c0
        small = np.abs(f) <= _RESIDUAL * (((z + np.abs(e2)) * z + np.abs(c1)) * z + np.abs(c0))
        slope = (3.0 * z - 2.0 * e2) * z + c1
        new = z - f * slope / (slope * slope - f * (3.0 * z - e2))
        new = np.minimum(np.maximum(new, 0.5 * (z + floor)), top)
        new = np.where(small, z, new)
        done = small | (np.abs(new - z) <= _STEP * (new - floor))
        z = new
        if done.any():
            result[rows[done]] = z[done]
            finished[rows[done]] = True
            left = ~done
            rows = rows[left]
            if not rows.size:
                break
            z, e2, c1, c0, floor, top = z[left], e2[left], c1[left], c0[left], floor[left], top[left]
    else:
        result[rows] = z
    return b / result, finished


def _from_below(e2: float, e1: float, e0: float, b: float, ceiling: float) -> tuple[float, bool]:
    """Return eta of the smallest root of L above z = 1, and whether it converged."""
    z = 1.0
    a2 = abs(e2)
    a1 = abs(e1)
    a0 = abs(e0)
    for _ in range(_MAX_STEPS):
        f = ((b * z - e2) * z + e1) * z - e0
        if abs(f) <= _RESIDUAL * (((b * z + a2) * z + a1) * z + a0):
            return 1.0 / z, True
        slope = (3.0 * b * z - 2.0 * e2) * z + e1
        new = z - f * slope / (slope * slope - f * (3.0 * b * z - e2))
        half = 0.5 * (z + ceiling)
        new = new if new < half else half
        new = new if new > 1.0 else 1.0
        step = abs(new - z)
        z = new
        if step <= _STEP * (ceiling - z):
            return 1.0 / z, True
    return 1.0 / z, False


def _from_below_block(e2: Array, e1: Array, e0: Array, b: Array, ceiling: Array) -> tuple[Array, NDArray[np.bool_]]:
    z = np.ones_like(e2)
    result = z.copy()
    finished = np.zeros(z.shape, dtype=np.bool_)
    rows = np.arange(z.size)
    for _ in range(_MAX_STEPS):
        f = ((b * z - e2) * z + e1) * z - e0
        small = np.abs(f) <= _RESIDUAL * (((b * z + np.abs(e2)) * z + np.abs(e1)) * z + np.abs(e0))
        slope = (3.0 * b * z - 2.0 * e2) * z + e1
        new = z - f * slope / (slope * slope - f * (3.0 * b * z - e2))
        new = np.maximum(np.minimum(new, 0.5 * (z + ceiling)), 1.0)
        new = np.where(small, z, new)
        done = small | (np.abs(new - z) <= _STEP * (ceiling - new))
        z = new
        if done.any():
            result[rows[done]] = z[done]
            finished[rows[done]] = True
            left = ~done
            rows = rows[left]
            if not rows.size:
                break
            z, e2, e1, e0, b, ceiling = z[left], e2[left], e1[left], e0[left], b[left], ceiling[left]
    else:
        result[rows] = z
    return 1.0 / result, finished
