"""The sublimation line of a pure substance: where vapour and solid are in equilibrium, below the triple point.

ln(p/p_t) = (T_t/T) sum a f^b, with f = 1 - T/T_t (the form of the equation papers) or f = T/T_t (IAPWS R14-08).
"""

from __future__ import annotations

import math
from typing import Final, cast

import numpy as np

from gasapi.engine.elementary import Array, Real, exp, log
from gasapi.engine.phase.inverse import InverseStart
from gasapi.gases.records import SublimationCurve

__all__ = ["SublimationLine"]

_NAN: Final = math.nan
_KNOTS: Final = 48
# the start value is good to 1e-5 and Newton squares the error
_NEWTON_STEPS: Final = 2
# keeps the logarithm of 1 - T/T_t finite at the triple point, where every term vanishes
_TINY: Final = 1e-300


class SublimationLine:
    """Sublimation pressure by temperature, and sublimation temperature by pressure.

    The line runs from ``temperature_min`` to the triple point, both included; an argument outside (or not a number) gives
    NaN. Immutable, and safe to share between threads.

    :param curve: the coefficients
    """

    __slots__ = (
        "_pt",
        "_rise",
        "_start",
        "_terms",
        "_tt",
        "pressure_min",
        "temperature_max",
        "temperature_min",
        "triple_pressure",
    )

    temperature_min: float
    """K"""

    temperature_max: float
    """K, the triple point."""

    triple_pressure: float
    """Pa, as the curve has it."""

    pressure_min: float
    """Pa, at ``temperature_min``."""

    def __init__(self, curve: SublimationCurve) -> None:
        if curve.triple.pressure is None:
            raise ValueError("a sublimation line needs the pressure of its triple point")
        self.temperature_min = curve.temperature_min
        self.temperature_max = self._tt = curve.triple.temperature
        self.triple_pressure = self._pt = curve.triple.pressure
        self._rise = -1.0 if curve.argument == "complement" else 1.0
        self._terms = tuple((a, b, b - 1.0) for a, b in curve.terms)
        y, u, slope = [], [], []
        hottest, coldest = 1.0, self._tt / self.temperature_min
        for k in range(_KNOTS + 1):
            ratio = coldest + (hottest - coldest) * k / _KNOTS
            temperature = self._tt / ratio
            value, rate = self._log_pressure(temperature)
            y.append(value)
            u.append(ratio)
            slope.append(-ratio / (temperature * rate))
        self._start = InverseStart(y, u, slope)
        self.pressure_min = self.pressure(self.temperature_min)

    def _log_pressure(self, temperature: Real) -> tuple[Real, Real]:
        """Return ln(p/p_t) and its temperature derivative, 1/K."""
        ratio = temperature / self._tt
        f = self._positive(1.0 - ratio if self._rise < 0.0 else ratio)
        logarithm = log(f)
        total = 0.0 * temperature
        slope = 0.0 * temperature
        for a, b, less in self._terms:
            q = a * exp(less * logarithm)
            total = total + q * f
            slope = slope + q * b
        u = self._tt / temperature
        value = u * total
        return value, u * (slope * (self._rise / self._tt) - total / temperature)

    @staticmethod
    def _positive(f: Real) -> Real:
        if type(f) is float:
            return f if f > _TINY else _TINY
        return cast(Real, np.maximum(f, _TINY))

    def pressure(self, temperature: Real) -> Real:
        """Return the sublimation pressure, Pa; NaN off the line.

        :param temperature: K, a float or an array of shape (n,)
        """
        if type(temperature) is float:
            if not self.temperature_min <= temperature <= self._tt:
                return _NAN
            return self._pt * exp(self._log_pressure(temperature)[0])
        block = cast(Array, temperature)
        inside = (block >= self.temperature_min) & (block <= self._tt)
        value, _ = self._log_pressure(np.where(inside, block, self._tt))
        return cast(Real, np.where(inside, self._pt * exp(value), _NAN))

    def slope(self, temperature: Real) -> Real:
        """Return dp/dT along the line, Pa/K; NaN off the line.

        :param temperature: K, a float or an array of shape (n,)
        """
        if type(temperature) is float:
            if not self.temperature_min <= temperature <= self._tt:
                return _NAN
            value, rate = self._log_pressure(temperature)
            return self._pt * exp(value) * rate
        block = cast(Array, temperature)
        inside = (block >= self.temperature_min) & (block <= self._tt)
        values, rates = self._log_pressure(np.where(inside, block, self._tt))
        return cast(Real, np.where(inside, self._pt * exp(values) * rates, _NAN))

    def temperature(self, pressure: Real) -> Real:
        """Return the temperature at which solid and vapour are in equilibrium, K, converged to rounding.

        NaN above the triple pressure and below ``pressure_min``.

        :param pressure: Pa, a float or an array of shape (n,)
        """
        low, high = self.temperature_min, self._tt
        if type(pressure) is float:
            if not self.pressure_min <= pressure <= self._pt:
                return _NAN
            y = log(pressure / self._pt)
            t = high / self._start(y)
            for _ in range(_NEWTON_STEPS):
                t = t if t > low else low
                t = t if t < high else high
                value, rate = self._log_pressure(t)
                t -= (value - y) / rate
            t = t if t > low else low
            return t if t < high else high
        block = cast(Array, pressure)
        inside = (block >= self.pressure_min) & (block <= self._pt)
        y_block = log(np.where(inside, block, self._pt) / self._pt)
        ts = high / self._start(y_block)
        for _ in range(_NEWTON_STEPS):
            ts = np.minimum(np.maximum(ts, low), high)
            values, rates = self._log_pressure(ts)
            ts = ts - (values - y_block) / rates
        return cast(Real, np.where(inside, np.minimum(np.maximum(ts, low), high), _NAN))
