"""The saturation curve of any equation of state of a pure gas, solved and put into piecewise Chebyshev series.

At each temperature the two branches have equal pressure and equal Gibbs energy. Two ways to solve that:

*near* the critical point, Newton's method in the logarithms of both densities (after Akasaka, J. Thermal Sci. Technol. 3
(2008) 442), started from the leading terms of the expansion about the critical point and then along the curve;

*far* below it, where the pressure of a liquid is the small difference of large numbers, Newton's method in ln p. The Gibbs
energy of the liquid is then taken at a pressure high enough to be free of that cancellation and brought down to p by the
integral of v dp, whose integrand hardly varies.

The innermost piece uses that the liquid and the vapour density of an analytic equation are one function of
s = sqrt(1 - T/Tc), taken at s and at -s, through the critical density at s = 0: the fit interpolates across the critical
point and needs no solution next to it, where none can be had to more than a few digits.
"""

from __future__ import annotations

import math
from typing import Final, NamedTuple

from gasapi.engine.phase.chebyshev import interpolate, nodes, series_sum, trimmed
from gasapi.engine.phase.saturation import Saturation
from gasapi.engine.protocol import Branch, CriticalPoint, Fluid, Status
from gasapi.gases.records import FixedPoint, SaturationPiece, SaturationTable

__all__ = ["fit_saturation", "solve_saturation"]

_LOWEST_REDUCED_TEMPERATURE: Final = 0.3
_LOWEST_PRESSURE: Final = 1e-6
_INNERMOST: Final = (0.12, 0.06, 0.03, 0.015, 0.0075, 0.00375)
_CROSSING_NODES: Final = 21
_PIECE_NODES: Final = 16
# a piece that is narrower than this part of its distance from the critical point is not split further
_NARROWEST: Final = 0.1
# what the last coefficients of a fit may amount to: of ln p (T/Tc), and of the reduced densities
_PRESSURE_TOLERANCE: Final = 2e-11
_DENSITY_TOLERANCE: Final = 1e-9
_NEGLIGIBLE: Final = 1e-15
_MOST_STEPS: Final = 30
_FAR_BELOW: Final = 0.02
_REFERENCE_Z: Final = 0.03


class _Point(NamedTuple):
    """A solution at s: T/Tc ln(p/pc), rho_liq/rhoc and T/Tc ln(rho_vap/rhoc)."""

    s: float
    pressure: float
    liquid: float
    vapour: float


def solve_saturation(fluid: Fluid, temperature: float, guess: Saturation[float]) -> Saturation[float] | None:
    """Return pressure and densities at which both branches have equal pressure and Gibbs energy; None if there are none.

    Converged to rounding: about 1e-14 in p, and in the densities as far as their own conditioning allows.

    :param fluid: a pure gas
    :param temperature: K, below the critical temperature
    :param guess: values near the solution
    """
    rt = fluid.gas_constant * temperature
    if guess.pressure < _FAR_BELOW * guess.liquid_density * rt:
        return _solve_far(fluid, temperature, guess)
    return _solve_near(fluid, temperature, guess)


def _solve_near(fluid: Fluid, temperature: float, guess: Saturation[float]) -> Saturation[float] | None:
    rt = fluid.gas_constant * temperature
    liquid, vapour = guess.liquid_density, guess.vapour_density
    last = math.inf
    for _ in range(_MOST_STEPS):
        p_l, d_l, _ = fluid.pressure(temperature, liquid)
        p_v, d_v, _ = fluid.pressure(temperature, vapour)
        if not liquid > vapour > 0.0:
            return None
        if d_l <= 0.0 or d_v <= 0.0 or p_l <= 0.0:
            # between the spinodals, or a liquid under tension: move outward
            spread = 0.25 * (liquid - vapour)
            if d_l <= 0.0 or p_l <= 0.0:
                liquid += spread
            if d_v <= 0.0:
                vapour = max(vapour - spread, 0.5 * vapour)
            continue
        unequal = fluid.residual_gibbs(temperature, liquid) - fluid.residual_gibbs(temperature, vapour)
        unequal += math.log(p_l / p_v)
        gap = (p_l - p_v) / rt
        spread = liquid - vapour
        step_l = (vapour * unequal - gap) * rt / (d_l * spread)
        step_v = (liquid * unequal - gap) * rt / (d_v * spread)
        size = max(abs(step_l), abs(step_v))
        # rounding limits the densities near the critical point: steps then stop shrinking at a small size
        if size < 1e-13 or (size < 1e-5 and size >= 0.5 * last):
            return Saturation(p_v, liquid, vapour)
        last = size
        # a step may take neither density more than half of the way to the other
        most = 0.5 * math.log(liquid / vapour)
        scale = min(1.0, most / size)
        liquid *= math.exp(scale * step_l)
        vapour *= math.exp(scale * step_v)
    return None


def _solve_far(fluid: Fluid, temperature: float, guess: Saturation[float]) -> Saturation[float] | None:
    rt = fluid.gas_constant * temperature
    high = _REFERENCE_Z * guess.liquid_density * rt
    reference = fluid.density(temperature, high, Branch.LIQUID)
    if reference.status != Status.CONVERGED:
        return None
    gibbs = fluid.residual_gibbs(temperature, reference.density) + math.log(high)
    v_high, bend_high = _volume(fluid, temperature, reference.density)
    p = guess.pressure
    for _ in range(_MOST_STEPS):
        liquid = fluid.density(temperature, p, Branch.LIQUID)
        vapour = fluid.density(temperature, p, Branch.GAS)
        if liquid.status != Status.CONVERGED or vapour.status != Status.CONVERGED:
            return None
        v_low, bend_low = _volume(fluid, temperature, liquid.density)
        # Hermite's rule for the integral of v dp between p and the reference pressure
        h = high - p
        work = h * (0.5 * (v_low + v_high) + h * (bend_low - bend_high) / 12.0) / rt
        unequal = fluid.residual_gibbs(temperature, vapour.density) + math.log(p) - (gibbs - work)
        step = unequal / (p / (vapour.density * rt) - p * v_low / rt)
        p *= math.exp(-max(-1.0, min(1.0, step)))
        if abs(step) < 1e-9:
            # what is left of a Newton step is below rounding; the densities follow
            liquid = fluid.density(temperature, p, Branch.LIQUID)
            vapour = fluid.density(temperature, p, Branch.GAS)
            if liquid.status != Status.CONVERGED or vapour.status != Status.CONVERGED:
                return None
            return Saturation(p, liquid.density, vapour.density)
    return None


def _volume(fluid: Fluid, temperature: float, density: float) -> tuple[float, float]:
    """Return the molar volume, m3/mol, and its pressure derivative."""
    stiffness = fluid.pressure(temperature, density).density_derivative
    return 1.0 / density, -1.0 / (density * density * stiffness)


def _gap(fluid: Fluid, critical: CriticalPoint, s: float) -> float:
    """Return (rho_liq - rho_vap)/(2 rhoc) near the critical point, from the slopes of the isotherms around it.

    With p = pc + ... + p_Tr t r + p_rrr r^3 / 6 both densities lie at r^2 = -6 p_Tr t / p_rrr, to leading order.
    """
    tc, _, rhoc = critical
    theta = s * s
    falling = fluid.pressure(tc * (1.0 - theta), rhoc).density_derivative
    gap = 3.0 * s
    for _ in range(3):
        above = fluid.pressure(tc, rhoc * (1.0 + gap)).density_derivative
        below = fluid.pressure(tc, rhoc * (1.0 - gap)).density_derivative
        curved = 0.5 * (above + below) / (gap * gap)
        if falling >= 0.0 or curved <= 0.0:
            return gap
        gap = min(0.5, math.sqrt(-3.0 * falling / curved))
    return gap


class _Tracer:
    """Follows the curve from the critical point down, each solution started from those before it."""

    def __init__(self, fluid: Fluid, critical: CriticalPoint) -> None:
        self.fluid = fluid
        self.critical = critical
        # along the critical isochore, d ln p / d ln T is that of the saturation curve at the critical point
        t, p, d = critical
        self.rise = fluid.pressure(t, d).temperature_derivative * t / p
        self.first = _Point(0.0, 0.0, 1.0, 0.0)
        self.done: list[_Point] = []

    def temperature(self, s: float) -> float:
        return self.critical.temperature * (1.0 - s * s)

    def _guess(self, s: float) -> Saturation[float]:
        _, pc, rhoc = self.critical
        reduced = 1.0 - s * s
        if not self.done:
            gap = _gap(self.fluid, self.critical, s)
            return Saturation(pc * math.exp(-self.rise * s * s / reduced), rhoc * (1.0 + gap), rhoc * (1.0 - gap))
        near = [self.first, *self.done][-4:]
        pressure, liquid, vapour = (
            _extrapolate([point.s for point in near], [point[k] for point in near], s) for k in (1, 2, 3)
        )
        return Saturation(pc * math.exp(pressure / reduced), rhoc * liquid, rhoc * math.exp(vapour / reduced))

    def solve(self, s: float) -> _Point | None:
        """Return the solution at s, which must be beyond all those before it."""
        temperature = self.temperature(s)
        found = solve_saturation(self.fluid, temperature, self._guess(s))
        if found is None:
            return None
        _, pc, rhoc = self.critical
        reduced = temperature / self.critical.temperature
        point = _Point(
            s,
            reduced * math.log(found.pressure / pc),
            found.liquid_density / rhoc,
            reduced * math.log(found.vapour_density / rhoc),
        )
        self.done.append(point)
        return point


def _extrapolate(x: list[float], y: list[float], at: float) -> float:
    """Neville's scheme through all points."""
    values = list(y)
    for order in range(1, len(x)):
        for i in range(len(x) - order):
            j = i + order
            values[i] = ((at - x[j]) * values[i] - (at - x[i]) * values[i + 1]) / (x[i] - x[j])
    return values[0]


def _sum(coefficients: tuple[float, ...], x: float) -> float:
    return series_sum(x, coefficients[0], coefficients[:0:-1])


def _tail(coefficients: tuple[float, ...]) -> float:
    return max(abs(c) for c in coefficients[-2:])


def _piece(
    low: float, high: float, pressure: tuple[float, ...], liquid: tuple[float, ...], vapour: tuple[float, ...]
) -> SaturationPiece:
    return SaturationPiece(
        low, high, trimmed(pressure, _NEGLIGIBLE), trimmed(liquid, _NEGLIGIBLE), trimmed(vapour, _NEGLIGIBLE)
    )


def _innermost(tracer: _Tracer, high: float) -> tuple[SaturationPiece, bool] | None:
    """Fit from the critical point to s = high, across both branches; also whether the fit is good enough."""
    places = nodes(_CROSSING_NODES)
    half = _CROSSING_NODES // 2
    points = []
    for x in reversed(places[:half]):
        point = tracer.solve(high * x)
        if point is None:
            return None
        points.append(point)
    # places fall from 1 to -1: liquid first, then the critical point, then vapour
    density = [point.liquid for point in reversed(points)] + [1.0]
    density += [math.exp(point.vapour / (1.0 - point.s * point.s)) for point in points]
    pressure = [point.pressure for point in reversed(points)] + [0.0] + [point.pressure for point in points]
    both = interpolate(density)
    even = interpolate(pressure)
    good = _tail(even) < _PRESSURE_TOLERANCE and _tail(both) < _DENSITY_TOLERANCE
    inner = [0.5 * (x + 1.0) for x in nodes(_PIECE_NODES)]
    vapour = [(1.0 - (high * x) ** 2) * math.log(_sum(both, -x)) for x in inner]
    piece = _piece(
        0.0,
        high,
        interpolate([_sum(even, x) for x in inner]),
        interpolate([_sum(both, x) for x in inner]),
        interpolate(vapour),
    )
    return piece, good


def _outer(tracer: _Tracer, low: float, high: float) -> tuple[SaturationPiece, bool] | None:
    middle, half = 0.5 * (low + high), 0.5 * (high - low)
    points = []
    for x in reversed(nodes(_PIECE_NODES)):
        point = tracer.solve(middle + half * x)
        if point is None:
            return None
        points.append(point)
    points.reverse()
    pressure, liquid, vapour = (interpolate([point[k] for point in points]) for k in (1, 2, 3))
    good = _tail(pressure) < _PRESSURE_TOLERANCE and max(_tail(liquid), _tail(vapour)) < _DENSITY_TOLERANCE
    return _piece(low, high, pressure, liquid, vapour), good


def fit_saturation(fluid: Fluid, temperature_min: float | None = None) -> SaturationTable:
    """Return the saturation curve of a pure fluid by its own equation, from the critical point down.

    The curve ends at ``temperature_min`` or, before it, with the piece in which the saturation pressure falls below 1e-6 Pa
    or before which the equation loses one of its branches; the table says where. Deterministic: the same fluid gives the
    same numbers.

    :param fluid: a pure gas with a critical point, whose ``density`` tells the branches apart
    :param temperature_min: where to end, K; 0.3 of the critical temperature where left out
    :raises ValueError: the fluid has no critical point
    :raises ArithmeticError: not even the part next to the critical point could be solved
    """
    critical = fluid.critical
    if critical is None:
        raise ValueError(f"{fluid.model} has no critical point here, and so no saturation curve")
    tc = critical.temperature
    lowest = temperature_min if temperature_min is not None else _LOWEST_REDUCED_TEMPERATURE * tc
    s_max = math.sqrt(1.0 - lowest / tc)
    pieces: list[SaturationPiece] = []
    tracer = _Tracer(fluid, critical)
    for width in _INNERMOST:
        tracer.done.clear()
        fitted = _innermost(tracer, min(width, s_max))
        if fitted is None:
            continue
        piece, good = fitted
        if good or width == _INNERMOST[-1]:
            pieces.append(piece)
            break
    if not pieces:
        raise ArithmeticError(f"{fluid.model} has no saturation curve that could be followed from its critical point")
    while pieces[-1].high < s_max:
        low = pieces[-1].high
        high = min(2.0 * low, s_max)
        known = len(tracer.done)
        while True:
            del tracer.done[known:]
            outer = _outer(tracer, low, high)
            narrow = high - low < _NARROWEST * high
            if outer is not None and (outer[1] or narrow):
                break
            if narrow:
                break
            high = 0.5 * (low + high)
        if outer is None:
            break
        pieces.append(outer[0])
        reduced = 1.0 - high * high
        if critical.pressure * math.exp(tracer.done[-1].pressure / reduced) < _LOWEST_PRESSURE:
            break
    reached = pieces[-1].high
    end = lowest if reached >= s_max else tc * (1.0 - reached * reached)
    return SaturationTable(FixedPoint(tc, critical.pressure, critical.density), end, tuple(pieces))
