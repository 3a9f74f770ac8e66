"""One reduced fluid of Lee and Kesler: their modified Benedict-Webb-Rubin equation, its branches and its density roots.

With d = 1/V_r = rho R Tc/pc, t = 1/T_r and g = gamma d^2,

    F(d) = p_r/T_r = d Z,    Z = 1 + B d + C d^2 + D d^5 + E d^2 (beta + g) exp(-g)
    B = b1 - b2 t - b3 t^2 - b4 t^3,    C = c1 - c2 t + c3 t^3,    D = d1 + d2 t,    E = c4 t^3

(Lee and Kesler, AIChE J. 21 (1975) 510). Above its critical temperature (within 3e-7 of T_r = 1) F rises
everywhere. Below, the gas branch ends at the first zero of F' and the liquid branch begins at the last; between them F has
one loop, and below T_r = 0.53 more, which mean nothing. Both ends are smooth in s = sqrt(1 - T_r/T_rc) and are held as
polynomials, so that each root is sought in its own bracket only. ``REDUCED_TEMPERATURE_MIN`` is where these polynomials end.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Final, Generic, NamedTuple, cast

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.elementary import Array, Real, exp, log
from gasapi.engine.estimate import DensityEstimate
from gasapi.engine.protocol import Branch, Status

__all__ = [
    "REDUCED_TEMPERATURE_MAX",
    "REDUCED_TEMPERATURE_MIN",
    "BwrConstants",
    "Isotherm",
    "ReducedFluid",
    "ReducedRoot",
    "ReducedRoots",
    "select_rows",
    "terms",
]

REDUCED_TEMPERATURE_MIN: Final = 0.2
"""T_r below which no density is given; the authors stop at 0.3."""

REDUCED_TEMPERATURE_MAX: Final = 1e6
"""T_r above which no density is given; the authors stop at 4, and what is above is an ideal gas of hard cores."""

# F at this density exceeds a reduced pressure of 6e4 T_r
_DENSITY_MAX: Final = 40.0
# a lower p_r is taken as this one, at which a gas is as ideal as it can be
_PRESSURE_MIN: Final = 1e-250
_MAX_STEPS: Final = 80
_RESIDUAL: Final = 4.0e-16
_STEP: Final = 1e-9
_PIECES: Final = 24
_NODES: Final = 9


@dataclass(frozen=True, slots=True)
class BwrConstants:
    """Table 1 of the paper, one column; all [-]."""

    b1: float
    b2: float
    b3: float
    b4: float
    c1: float
    c2: float
    c3: float
    c4: float
    d1: float
    d2: float
    beta: float
    gamma: float
    acentric_factor: float


class ReducedRoot(NamedTuple):
    """The density d, [-], the slope F'(d) close to it, [-], and why the search stopped."""

    density: float
    slope: float
    status: Status


class ReducedRoots(NamedTuple):
    """The same for rows, all of shape (n,)."""

    density: Array
    slope: Array
    status: NDArray[np.int8]


class Isotherm(NamedTuple, Generic[Real]):
    """B, C, D and E at one reduced temperature, with beta and gamma, [-]."""

    b: Real
    c: Real
    d: Real
    e: Real
    beta: float
    gamma: float


def terms(isotherm: Isotherm[Real], density: Real) -> tuple[Real, Real, Real, Real]:
    """Return F, F', F''/2 and the sum of the absolute terms of F, [-]."""
    b, c, d, e, beta, gamma = isotherm
    x = density
    x2 = x * x
    g = gamma * x2
    x5 = d * (x2 * x2 * x)
    ex = e * x * exp(-g)
    decay = ex * x
    bx = b * x
    cx2 = c * x2
    q = 3.0 * beta + g * (5.0 - 2.0 * beta - 2.0 * g)
    tail = decay * (beta + g)
    f = x * (1.0 + bx + cx2 + x5 + tail)
    f1 = 1.0 + 2.0 * bx + 3.0 * cx2 + 6.0 * x5 + decay * q
    half = b + 3.0 * (c * x) + 15.0 * (d * (x2 * x2)) + ex * (q * (1.0 - g) + g * (5.0 - 2.0 * beta - 4.0 * g))
    size = x * (1.0 + abs(bx) + abs(cx2) + x5 + tail)
    return f, f1, half, size


def select_rows(isotherm: Isotherm[Array], mask: NDArray[np.bool_]) -> Isotherm[Array]:
    """Return the coefficients of some rows of a block."""
    b, c, d, e, beta, gamma = isotherm
    return Isotherm(b[mask], c[mask], d[mask], e[mask], beta, gamma)


class ReducedFluid:
    """The equation with one set of constants. Immutable once built.

    :param constants: a column of the paper's table
    """

    __slots__ = (
        "_critical_temperature",
        "_ends",
        "_ends_arrays",
        "_estimate",
        "_scale",
        "constants",
        "critical_density",
    )

    critical_density: float
    """d where F' and F'' vanish, [-]."""

    def __init__(self, constants: BwrConstants) -> None:
        self.constants = constants
        self._estimate = DensityEstimate(1.0, 1.0, 1.0, constants.acentric_factor)
        self._critical_temperature, self.critical_density = self._critical_point()
        self._scale = _PIECES / self._position(REDUCED_TEMPERATURE_MIN)
        gas, liquid = self._branch_end(-1.0), self._branch_end(1.0)
        self._ends = (gas, liquid)
        self._ends_arrays = tuple(np.array(end).T.copy() for end in self._ends)

    def isotherm(self, temperature: Real) -> Isotherm[Real]:
        """Return the coefficients at a reduced temperature.

        :param temperature: T_r, a float or an array of shape (n,), [-]
        """
        k = self.constants
        t = 1.0 / temperature
        t3 = t * t * t
        return Isotherm(
            k.b1 - k.b2 * t - k.b3 * (t * t) - k.b4 * t3,
            k.c1 - k.c2 * t + k.c3 * t3,
            k.d1 + k.d2 * t,
            k.c4 * t3,
            k.beta,
            k.gamma,
        )

    def compressibility_slope(self, temperature: Real, density: Real) -> Real:
        """Return T_r (dZ/dT_r) at fixed density, [-]."""
        k = self.constants
        t = 1.0 / temperature
        t3 = t * t * t
        x = density
        x2 = x * x
        g = k.gamma * x2
        b = k.b2 * t + 2.0 * k.b3 * (t * t) + 3.0 * k.b4 * t3
        c = k.c2 * t - 3.0 * k.c3 * t3
        return b * x + c * x2 - k.d2 * t * (x2 * x2 * x) - 3.0 * k.c4 * t3 * x2 * (k.beta + g) * exp(-g)

    def log_fugacity_coefficient(self, temperature: Real, density: Real) -> Real:
        """Return ln(phi), [-]."""
        b, c, d, e, beta, gamma = self.isotherm(temperature)
        x = density
        x2 = x * x
        g = gamma * x2
        x5 = d * (x2 * x2 * x)
        decay = exp(-g)
        z_minus_1 = b * x + c * x2 + x5 + e * x2 * (beta + g) * decay
        energy = b * x + 0.5 * (c * x2) + 0.2 * x5 + e / (2.0 * gamma) * (beta + 1.0 - (beta + 1.0 + g) * decay)
        return energy + z_minus_1 - log(1.0 + z_minus_1)

    def branch_end(self, temperature: float, branch: Branch) -> float | None:
        """Return the density at which a branch ends, [-]; None where the isotherm rises everywhere.

        :param temperature: T_r, at least ``REDUCED_TEMPERATURE_MIN``, [-]
        :param branch: which end
        """
        ratio = 1.0 - temperature / self._critical_temperature
        if not ratio > 0.0:
            return None
        place = math.sqrt(ratio) * self._scale
        number = int(place)
        number = number if number < _PIECES - 1 else _PIECES - 1
        x = place - number
        result = 0.0
        for coefficient in self._ends[branch][number]:
            result = result * x + coefficient
        return result

    def has_loop(self, temperature: Array) -> NDArray[np.bool_]:
        """Return for rows whether the isotherm falls somewhere, so that its branches end."""
        return cast("NDArray[np.bool_]", 1.0 - temperature / self._critical_temperature > 0.0)

    def branch_ends(self, temperature: Array, branch: Branch) -> Array:
        """Return the same for rows that are below the critical temperature."""
        place = np.sqrt(1.0 - temperature / self._critical_temperature) * self._scale
        number = np.minimum(place.astype(np.int64), _PIECES - 1)
        x = place - number
        result = np.zeros_like(x)
        for column in self._ends_arrays[branch]:
            result = result * x + column.take(number)
        return result

    def _position(self, temperature: float) -> float:
        return math.sqrt(1.0 - temperature / self._critical_temperature)

    def _critical_point(self) -> tuple[float, float]:
        """Return T_r and d at which F' = F'' = 0, by Newton's method with differences in T_r."""
        temperature, density = 1.0, 3.7
        for _ in range(60):
            _, f1, f2, _ = terms(self.isotherm(temperature), density)
            up, down = self.isotherm(temperature + 1e-5), self.isotherm(temperature - 1e-5)
            f1_t = (terms(up, density)[1] - terms(down, density)[1]) / 2e-5
            f2_t = (terms(up, density)[2] - terms(down, density)[2]) / 2e-5
            f2_d = (terms(up, density + 1e-4)[2] - terms(up, density - 1e-4)[2]) / 2e-4
            determinant = f1_t * f2_d - 2.0 * f2 * f2_t
            temperature -= (f1 * f2_d - 2.0 * f2 * f2) / determinant
            density -= (f1_t * f2 - f2_t * f1) / determinant
        return temperature, density

    def _branch_end(self, side: float) -> list[tuple[float, ...]]:
        """Fit the end of a branch piece by piece, from the critical point to the coldest isotherm.

        Each piece is the polynomial through its Chebyshev nodes, highest power first, in the fraction of the piece passed.
        """
        nodes = [0.5 - 0.5 * math.cos((2 * k + 1) * math.pi / (2 * _NODES)) for k in range(_NODES)]
        inverse = np.linalg.inv(np.vander(nodes))
        pieces = []
        previous = (0.0, self.critical_density)
        # d_c (1 + 1.5 s) on the liquid side and d_c (1 - 1.5 s) on the gas side is near the curve at first
        slope = side * 1.5 * self.critical_density
        for piece in range(_PIECES):
            values = []
            for node in nodes:
                s = (piece + node) / self._scale
                isotherm = self.isotherm(self._critical_temperature * (1.0 - s * s))
                x = previous[1] + slope * (s - previous[0])
                for _ in range(40):
                    _, f1, f2, _ = terms(isotherm, x)
                    step = f1 / (2.0 * f2)
                    x -= step
                    if abs(step) <= 1e-14 * x:
                        break
                slope = (x - previous[1]) / (s - previous[0])
                previous = (s, x)
                values.append(x)
            pieces.append(tuple(sum(float(w) * v for w, v in zip(row, values, strict=True)) for row in inverse))
        return pieces

    def root(self, temperature: float, pressure: float, branch: Branch) -> ReducedRoot:
        """Return the density root of a branch.

        :param temperature: T_r, at least ``REDUCED_TEMPERATURE_MIN``, [-]
        :param pressure: p_r, positive, [-]
        :param branch: which end of the isotherm
        """
        end = self.branch_end(temperature, branch)
        pressure = _PRESSURE_MIN if pressure < _PRESSURE_MIN else pressure
        target = pressure / temperature
        low, high = 0.0, _DENSITY_MAX
        if end is None:
            limit = high
            x = self._estimate.gas(temperature, pressure)
        elif branch == Branch.GAS:
            limit = high = end
            x = self._estimate.gas(temperature, pressure)
        else:
            limit = low = end
            x = self._estimate.liquid(temperature, pressure)
        return _solve(self.isotherm(temperature), target, x, low, high, limit)

    def roots(self, temperature: Array, pressure: Array, branch: Branch) -> ReducedRoots:
        """Return the same for rows.

        :param temperature: T_r, at least ``REDUCED_TEMPERATURE_MIN``, shape (n,), [-]
        :param pressure: p_r, positive, shape (n,), [-]
        :param branch: one branch for all rows
        """
        below = self.has_loop(temperature)
        pressure = np.maximum(pressure, _PRESSURE_MIN)
        low = np.zeros_like(temperature)
        high = np.full_like(temperature, _DENSITY_MAX)
        limit = high.copy()
        if branch == Branch.GAS or not below.any():
            x = self._estimate.gas(temperature, pressure)
        else:
            x = np.where(below, self._estimate.liquid(temperature, pressure), self._estimate.gas(temperature, pressure))
        rows = np.flatnonzero(below)
        if rows.size:
            limit[rows] = self.branch_ends(temperature[rows], branch)
            side = high if branch == Branch.GAS else low
            side[rows] = limit[rows]
        # a step from where F is flat divides by zero and is replaced
        with np.errstate(all="ignore"):
            return _solve_block(self.isotherm(temperature), pressure / temperature, x, low, high, limit)


def _solve(isotherm: Isotherm[float], target: float, x: float, low: float, high: float, limit: float) -> ReducedRoot:
    """Solve F(x) = target on (low, high), where F rises; ``limit`` is the end that has yet to be tried."""
    x = x if x < high else high
    x = x if x > low else low
    upper = limit == high
    tried = False
    slope = 1.0
    for _ in range(_MAX_STEPS):
        value, slope, half, size = terms(isotherm, x)
        f = value - target
        if abs(f) <= _RESIDUAL * (size + target):
            return ReducedRoot(x, slope, Status.CONVERGED)
        if x == limit:
            if (f < 0.0) == upper:
                return ReducedRoot(x, slope, Status.NO_ROOT)
            tried = True
            # F' = 0 here, so that the parabola shows the way
            leap = math.sqrt(abs(f / half))
            new = x - leap if upper else x + leap
        else:
            newton = f / slope if slope > 0.0 else f
            factor = 1.0 - newton * half / slope if slope > 0.0 else 1.0
            new = x - newton / (factor if factor > 0.25 else 0.25)
        if f < 0.0:
            low = x
        else:
            high = x
        clamped = False
        if not low < new < high:
            clamped = not tried and (not new < high) == upper
            new = limit if clamped else 0.5 * (low + high)
        step = abs(new - x)
        x = new
        if step <= _STEP * x and not clamped:
            return ReducedRoot(x, slope, Status.CONVERGED)
    return ReducedRoot(x, slope, Status.NOT_CONVERGED)


def _solve_block(isotherm: Isotherm[Array], target: Array, x: Array, low: Array, high: Array, limit: Array) -> ReducedRoots:
    """Do the same for rows; those that are done leave."""
    x = np.maximum(np.minimum(x, high), low)
    upper = limit == high
    tried = np.zeros(x.shape, dtype=np.bool_)
    result, result_slope = x.copy(), np.ones_like(x)
    status = np.full(x.shape, Status.NOT_CONVERGED, dtype=np.int8)
    rows = np.arange(x.size)
    for _ in range(_MAX_STEPS):
        value, slope, half, size = terms(isotherm, x)
        f = value - target
        small = np.abs(f) <= _RESIDUAL * (size + target)
        negative = f < 0.0
        at_limit = x == limit
        none = at_limit & (negative == upper) & ~small
        tried |= at_limit
        rising = slope > 0.0
        newton = np.where(rising, f / slope, f)
        factor = np.where(rising, 1.0 - newton * half / slope, 1.0)
        new = x - newton / np.maximum(factor, 0.25)
        if at_limit.any():
            leap = np.sqrt(np.abs(f / half))
            new = np.where(at_limit, np.where(upper, x - leap, x + leap), new)
        low = np.where(negative, x, low)
        high = np.where(negative, high, x)
        below = new < high
        outside = ~(below & (low < new))
        clamped = outside & ~tried & (~below == upper)
        new = np.where(outside, np.where(clamped, limit, 0.5 * (low + high)), new)
        near = (np.abs(new - x) <= _STEP * new) & ~clamped
        stopped = small | none
        x = np.where(stopped, x, new)
        done = stopped | near
        if done.any():
            places = rows[done]
            result[places] = x[done]
            result_slope[places] = slope[done]
            status[places] = np.where(none[done], Status.NO_ROOT, Status.CONVERGED)
            left = ~done
            rows = rows[left]
            if not rows.size:
                break
            x, target, low, high, limit = x[left], target[left], low[left], high[left], limit[left]
            upper, tried, isotherm = upper[left], tried[left], select_rows(isotherm, left)
    else:
        result[rows] = x
        result_slope[rows] = slope[~done]
    return ReducedRoots(result, result_slope, cast("NDArray[np.int8]", status))
