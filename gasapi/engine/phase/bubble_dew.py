"""The bubble and dew lines of a pseudo-pure fluid (air), from the published ancillary equations.

A mixture treated as one fluid has two saturation lines instead of one. With theta = 1 - T/Tj:

    bubble and dew pressure   p = pj exp((Tj/T) sum n theta^e)
    dew density               rho = rhoj exp(sum n theta^e)
    bubble density            rho = rhoj (1 + sum n theta^e + n_log ln(T/Tj))

The lines meet at Tj, the highest temperature at which two phases exist (maxcondentherm), slightly above the critical
temperature. Between the two the upper line is a second dew line; it is called bubble line here all the same.
"""

from __future__ import annotations

import math
from typing import Final, cast

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.elementary import Array, Real, exp, log, maximum, sqrt
from gasapi.engine.phase.inverse import InverseStart
from gasapi.gases.records import BubbleDewCurve

__all__ = ["BubbleDewLines"]

_NAN: Final = math.nan
_KNOTS: Final = 64
# the start value is good to 1e-5 and Newton squares the error; one more for the bend next to Tj
_NEWTON_STEPS: Final = 3
_TINY: Final = 1e-150


class _Sum:
    """sum n theta^e as a function of s = sqrt(theta): a polynomial where all exponents are halves, else powers."""

    __slots__ = ("_descending", "_powers")

    def __init__(self, terms: tuple[tuple[float, float], ...]) -> None:
        orders = [2.0 * e for _, e in terms]
        self._descending: tuple[float, ...] = ()
        self._powers: tuple[tuple[float, float], ...] = ()
        if all(order.is_integer() and order >= 0.0 for order in orders):
            dense = [0.0] * (int(max(orders)) + 1)
            for (n, _), order in zip(terms, orders, strict=True):
                dense[int(order)] += n
            self._descending = tuple(reversed(dense))
        else:
            self._powers = tuple((n, order) for (n, _), order in zip(terms, orders, strict=True))

    def value(self, s: Real) -> Real:
        """Return the sum.

        :param s: sqrt(1 - T/Tj), [-]
        """
        total = 0.0 * s
        if self._descending:
            for c in self._descending:
                total = total * s + c
            return total
        logarithm = log(maximum(s, _TINY))
        for n, order in self._powers:
            total = total + n * exp(order * logarithm)
        return total

    def slope(self, s: Real) -> tuple[Real, Real]:
        """Return the sum and its derivative in s.

        :param s: sqrt(1 - T/Tj), above zero, [-]
        """
        total = 0.0 * s
        slope = 0.0 * s
        if self._descending:
            for c in self._descending:
                slope = slope * s + total
                total = total * s + c
            return total, slope
        logarithm = log(maximum(s, _TINY))
        for n, order in self._powers:
            term = n * exp(order * logarithm)
            total = total + term
            slope = slope + order * term / s
        return total, slope


class _PressureLine:
    """One of the two pressures, and its inverse on the part that rises with temperature."""

    __slots__ = ("_lowest", "_pj", "_start", "_sum", "_tj", "highest", "s_high", "s_low")

    def __init__(self, terms: tuple[tuple[float, float], ...], tj: float, pj: float, coldest: float, hottest: float) -> None:
        self._sum = _Sum(terms)
        self._tj, self._pj = tj, pj
        self.s_low = math.sqrt(max(0.0, 1.0 - hottest / tj))
        self.s_high = math.sqrt(1.0 - coldest / tj)
        y, s, slope = [], [], []
        for k in range(_KNOTS, -1, -1):
            place = self.s_low + (self.s_high - self.s_low) * (k / _KNOTS) ** 2
            value, rate = self.log_slope(place)
            y.append(value)
            s.append(place)
            slope.append(1.0 / rate)
        self._start = InverseStart(y, s, slope)
        self._lowest, self.highest = y[0], y[-1]

    def log_slope(self, s: Real) -> tuple[Real, Real]:
        """Return ln(p/pj) and its derivative in s."""
        total, slope = self._sum.slope(s)
        reduced = 1.0 - s * s
        value = total / reduced
        return value, (slope + 2.0 * s * value) / reduced

    def pressure(self, s: Real) -> Real:
        return self._pj * exp(self._sum.value(s) / (1.0 - s * s))

    def temperature(self, pressure: Real) -> Real:
        low, high = self.s_low, self.s_high
        if type(pressure) is float:
            if not pressure > 0.0:
                return _NAN
            y = log(pressure / self._pj)
            if not self._lowest <= y <= self.highest:
                return _NAN
            s = self._start(y)
            for _ in range(_NEWTON_STEPS):
                s = s if s > low else low
                s = s if s < high else high
                value, rate = self.log_slope(s)
                s -= (value - y) / rate
            s = s if s > low else low
            s = s if s < high else high
            return self._tj * (1.0 - s * s)
        block = cast(Array, pressure)
        positive = block > 0.0
        y_block = log(np.where(positive, block, self._pj) / self._pj)
        inside = positive & (y_block >= self._lowest) & (y_block <= self.highest)
        y_block = np.where(inside, y_block, self.highest)
        place = self._start(y_block)
        for _ in range(_NEWTON_STEPS):
            place = np.minimum(np.maximum(place, low), high)
            values, rates = self.log_slope(place)
            place = place - (values - y_block) / rates
        place = np.minimum(np.maximum(place, low), high)
        return cast(Real, np.where(inside, self._tj * (1.0 - place * place), _NAN))


class BubbleDewLines:
    """Bubble and dew pressures and densities by temperature, and bubble and dew temperatures by pressure.

    Arguments outside the range of a line (or not a number) give NaN. Immutable, and safe to share between threads.

    :param curve: the ancillary equations
    """

    __slots__ = (
        "_bubble",
        "_bubble_density",
        "_bubble_log",
        "_dew",
        "_dew_density",
        "_rhoj",
        "_tj",
        "temperature_max",
        "temperature_min",
    )

    temperature_min: float
    """K, where both lines begin."""

    temperature_max: float
    """K, where they meet."""

    def __init__(self, curve: BubbleDewCurve) -> None:
        point = curve.reducing
        if point.pressure is None or point.density is None:
            raise ValueError("bubble and dew lines need the pressure and the density of the point where they meet")
        self.temperature_min = curve.temperature_min
        self.temperature_max = self._tj = point.temperature
        self._rhoj = point.density
        # above the critical temperature the bubble pressure falls again towards the point where the lines meet
        self._bubble = _PressureLine(
            curve.bubble_pressure, self._tj, point.pressure, curve.temperature_min, curve.temperature_max
        )
        self._dew = _PressureLine(curve.dew_pressure, self._tj, point.pressure, curve.temperature_min, self._tj)
        self._bubble_density = _Sum(curve.bubble_density)
        self._bubble_log = curve.bubble_density_log
        self._dew_density = _Sum(curve.dew_density)

    def _inside(self, temperature: Array) -> tuple[NDArray[np.bool_], Array]:
        inside = (temperature >= self.temperature_min) & (temperature <= self._tj)
        return inside, np.where(inside, temperature, self._tj)

    def bubble_pressure(self, temperature: Real) -> Real:
        """Return the pressure above which all is liquid, Pa.

        :param temperature: K, a float or an array of shape (n,)
        """
        return self._pressure(self._bubble, temperature)

    def dew_pressure(self, temperature: Real) -> Real:
        """Return the pressure below which all is gas, Pa.

        :param temperature: K, a float or an array of shape (n,)
        """
        return self._pressure(self._dew, temperature)

    def _pressure(self, line: _PressureLine, temperature: Real) -> Real:
        if type(temperature) is float:
            if not self.temperature_min <= temperature <= self._tj:
                return _NAN
            return line.pressure(sqrt(1.0 - temperature / self._tj))
        inside, held = self._inside(cast(Array, temperature))
        return cast(Real, np.where(inside, line.pressure(np.sqrt(1.0 - held / self._tj)), _NAN))

    def bubble_density(self, temperature: Real) -> Real:
        """Return the density of the liquid on the bubble line, mol/m3.

        :param temperature: K, a float or an array of shape (n,)
        """
        if type(temperature) is float:
            if not self.temperature_min <= temperature <= self._tj:
                return _NAN
            ratio = temperature / self._tj
            return self._rhoj * (1.0 + self._bubble_density.value(sqrt(1.0 - ratio)) + self._bubble_log * log(ratio))
        inside, held = self._inside(cast(Array, temperature))
        ratios = held / self._tj
        rho = self._rhoj * (1.0 + self._bubble_density.value(np.sqrt(1.0 - ratios)) + self._bubble_log * log(ratios))
        return cast(Real, np.where(inside, rho, _NAN))

    def dew_density(self, temperature: Real) -> Real:
        """Return the density of the gas on the dew line, mol/m3.

        :param temperature: K, a float or an array of shape (n,)
        """
        if type(temperature) is float:
            if not self.temperature_min <= temperature <= self._tj:
                return _NAN
            return self._rhoj * exp(self._dew_density.value(sqrt(1.0 - temperature / self._tj)))
        inside, held = self._inside(cast(Array, temperature))
        return cast(Real, np.where(inside, self._rhoj * exp(self._dew_density.value(np.sqrt(1.0 - held / self._tj))), _NAN))

    def bubble_temperature(self, pressure: Real) -> Real:
        """Return the temperature below which all is liquid, K, up to the critical temperature.

        :param pressure: Pa, a float or an array of shape (n,)
        """
        return self._bubble.temperature(pressure)

    def dew_temperature(self, pressure: Real) -> Real:
        """Return the temperature above which all is gas, K, up to the temperature at which the lines meet.

        :param pressure: Pa, a float or an array of shape (n,)
        """
        return self._dew.temperature(pressure)
