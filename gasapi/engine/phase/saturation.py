"""The saturation curve of a pure gas as a function that costs microseconds.

The curve of one equation of state (equal pressure and equal Gibbs energy of its two branches) is held as piecewise
Chebyshev series in s = sqrt(1 - T/Tc), in which both densities are smooth up to the critical point:

    p_sat = pc exp((Tc/T) S_p(s)),   rho_liq = rhoc S_l(s),   rho_vap = rhoc exp((Tc/T) S_v(s))
"""

from __future__ import annotations

import math
from bisect import bisect_right
from typing import Final, Generic, NamedTuple, cast

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.elementary import Array, Real, exp, log
from gasapi.engine.phase.chebyshev import columns_of, derivative, series_sum, series_sum_block
from gasapi.engine.phase.inverse import InverseStart
from gasapi.engine.protocol import CriticalPoint
from gasapi.gases.records import SaturationTable

__all__ = ["Saturation", "SaturationCurve"]

# the slope next to Tc is taken at this fraction of the innermost piece: S'(s)/s tends to a limit there, of which a
# fitted series only keeps the digits that the division by s leaves
_SLOPE_FLOOR: Final = 0.05
_KNOT_SPACING: Final = 0.02
# two steps take the start value, good to 1e-5, to rounding: Newton squares the error
_NEWTON_STEPS: Final = 2
_NAN: Final = math.nan


class Saturation(NamedTuple, Generic[Real]):
    """Pressure, Pa, and the densities of the saturated liquid and vapour, mol/m3, at one temperature."""

    pressure: Real
    liquid_density: Real
    vapour_density: Real


class _Piece(NamedTuple):
    """One piece: x = scale s + shift, and each series as its constant and its rest from the highest order down."""

    scale: float
    shift: float
    pressure: float
    pressure_rest: tuple[float, ...]
    liquid: float
    liquid_rest: tuple[float, ...]
    vapour: float
    vapour_rest: tuple[float, ...]
    slope: float
    slope_rest: tuple[float, ...]


def _split(coefficients: tuple[float, ...]) -> tuple[float, tuple[float, ...]]:
    return coefficients[0], coefficients[:0:-1]


class SaturationCurve:
    """Saturation pressure and densities of a pure gas by temperature, and saturation temperature by pressure.

    The curve runs from ``temperature_min`` to the critical temperature, both included, and nothing is extrapolated: an
    argument outside (or not a number) gives NaN. Immutable, and safe to share between threads.

    :param table: the series
    """

    __slots__ = (
        "_bounds",
        "_bounds_array",
        "_columns_liquid",
        "_columns_pressure",
        "_columns_slope",
        "_columns_vapour",
        "_floor",
        "_log_pressure_min",
        "_pc",
        "_pieces",
        "_rhoc",
        "_scale",
        "_shift",
        "_start",
        "_tc",
        "_tmin",
        "critical",
        "pressure_min",
        "temperature_min",
    )

    critical: CriticalPoint
    """Where the curve ends: K, Pa, mol/m3."""

    temperature_min: float
    """K"""

    pressure_min: float
    """Pa, the saturation pressure at ``temperature_min``."""

    def __init__(self, table: SaturationTable) -> None:
        point = table.critical
        if point.pressure is None or point.density is None:
            raise ValueError("a saturation curve needs the pressure and the density of its critical point")
        self.critical = CriticalPoint(point.temperature, point.pressure, point.density)
        self._tc, self._pc, self._rhoc = self.critical
        self.temperature_min = self._tmin = table.temperature_min
        pieces = []
        slopes = []
        for piece in table.pieces:
            width = piece.high - piece.low
            slope = derivative(piece.log_pressure)
            slopes.append(slope)
            pieces.append(
                _Piece(
                    2.0 / width,
                    -(piece.low + piece.high) / width,
                    *_split(piece.log_pressure),
                    *_split(piece.liquid_density),
                    *_split(piece.log_vapour_density),
                    *_split(slope),
                )
            )
        self._pieces = tuple(pieces)
        self._bounds = [piece.high for piece in table.pieces[:-1]]
        self._bounds_array = np.array(self._bounds)
        self._scale = np.array([piece.scale for piece in pieces])
        self._shift = np.array([piece.shift for piece in pieces])
        self._columns_pressure = columns_of([piece.log_pressure for piece in table.pieces])
        self._columns_liquid = columns_of([piece.liquid_density for piece in table.pieces])
        self._columns_vapour = columns_of([piece.log_vapour_density for piece in table.pieces])
        self._columns_slope = columns_of(slopes)
        self._floor = _SLOPE_FLOOR * table.pieces[0].high
        self._start, self._log_pressure_min = self._inverse_start(table)
        self.pressure_min = self.pressure(self._tmin)

    def _inverse_start(self, table: SaturationTable) -> tuple[InverseStart, float]:
        """Tabulate Tc/T over ln(p/pc), which is nearly a straight line, from the cold end to the critical point."""
        s_max = math.sqrt(1.0 - self._tmin / self._tc)
        knots = [0.0]
        for piece in table.pieces:
            high = min(piece.high, s_max)
            count = max(1, math.ceil((high - piece.low) / _KNOT_SPACING))
            knots += [piece.low + (high - piece.low) * k / count for k in range(1, count + 1)]
        y, u, slope = [], [], []
        for s in reversed(knots):
            reduced = 1.0 - s * s
            temperature = self._tc * reduced if s < s_max else self._tmin
            value, rate = self._log_pressure(temperature)
            y.append(value)
            u.append(self._tc / temperature)
            slope.append(-self._tc / (temperature * temperature * rate))
        y[-1], u[-1] = 0.0, 1.0
        return InverseStart(y, u, slope), y[0]

    def _log_pressure(self, temperature: float) -> tuple[float, float]:
        """Return ln(p/pc) and its temperature derivative, 1/K."""
        tc = self._tc
        theta = 1.0 - temperature / tc
        s = math.sqrt(theta) if theta > 0.0 else 0.0
        held = s if s > self._floor else self._floor
        piece = self._pieces[bisect_right(self._bounds, s)]
        scale = piece.scale
        shift = piece.shift
        value = series_sum(s * scale + shift, piece.pressure, piece.pressure_rest)
        value = value if value < 0.0 else 0.0
        slope = series_sum(held * scale + shift, piece.slope, piece.slope_rest)
        u = tc / temperature
        return u * value, -u * (value / temperature + slope * scale / (2.0 * tc * held))

    def _log_pressure_block(self, temperature: Array) -> tuple[Array, Array]:
        tc = self._tc
        s = np.sqrt(np.maximum(1.0 - temperature / tc, 0.0))
        held = np.maximum(s, self._floor)
        which = np.searchsorted(self._bounds_array, s, side="right")
        scale = self._scale.take(which)
        shift = self._shift.take(which)
        value = np.minimum(series_sum_block(s * scale + shift, self._columns_pressure, which), 0.0)
        slope = series_sum_block(held * scale + shift, self._columns_slope, which)
        u = tc / temperature
        return u * value, -u * (value / temperature + slope * scale / (2.0 * tc * held))

    def _inside(self, temperature: Array) -> tuple[NDArray[np.bool_], Array]:
        inside = (temperature >= self._tmin) & (temperature <= self._tc)
        return inside, np.where(inside, temperature, self._tc)

    def _position_block(self, temperature: Array) -> tuple[Array, NDArray[np.intp]]:
        """Return x within its piece and the number of the piece."""
        s = np.sqrt(1.0 - temperature / self._tc)
        which = np.searchsorted(self._bounds_array, s, side="right")
        return s * self._scale.take(which) + self._shift.take(which), which

    # a fitted series may cross the critical values by its last digits next to Tc: it is held at them
    def _pressure_block(self, x: Array, which: NDArray[np.intp], ratio: Array) -> Array:
        return self._pc * exp(ratio * np.minimum(series_sum_block(x, self._columns_pressure, which), 0.0))

    def _liquid_block(self, x: Array, which: NDArray[np.intp]) -> Array:
        return self._rhoc * np.maximum(series_sum_block(x, self._columns_liquid, which), 1.0)

    def _vapour_block(self, x: Array, which: NDArray[np.intp], ratio: Array) -> Array:
        return self._rhoc * exp(ratio * np.minimum(series_sum_block(x, self._columns_vapour, which), 0.0))

    def pressure(self, temperature: Real) -> Real:
        """Return the saturation pressure, Pa; NaN off the curve.

        :param temperature: K, a float or an array of shape (n,)
        """
        if type(temperature) is float:
            tc = self._tc
            if not self._tmin <= temperature <= tc:
                return _NAN
            s = math.sqrt(1.0 - temperature / tc)
            piece = self._pieces[bisect_right(self._bounds, s)]
            value = series_sum(s * piece.scale + piece.shift, piece.pressure, piece.pressure_rest)
            return self._pc * exp(tc / temperature * (value if value < 0.0 else 0.0))
        inside, held = self._inside(cast(Array, temperature))
        x, which = self._position_block(held)
        return cast(Real, np.where(inside, self._pressure_block(x, which, self._tc / held), _NAN))

    def liquid_density(self, temperature: Real) -> Real:
        """Return the density of the saturated liquid, mol/m3; NaN off the curve.

        :param temperature: K, a float or an array of shape (n,)
        """
        if type(temperature) is float:
            if not self._tmin <= temperature <= self._tc:
                return _NAN
            s = math.sqrt(1.0 - temperature / self._tc)
            piece = self._pieces[bisect_right(self._bounds, s)]
            value = series_sum(s * piece.scale + piece.shift, piece.liquid, piece.liquid_rest)
            return self._rhoc * (value if value > 1.0 else 1.0)
        inside, held = self._inside(cast(Array, temperature))
        x, which = self._position_block(held)
        return cast(Real, np.where(inside, self._liquid_block(x, which), _NAN))

    def vapour_density(self, temperature: Real) -> Real:
        """Return the density of the saturated vapour, mol/m3; NaN off the curve.

        :param temperature: K, a float or an array of shape (n,)
        """
        if type(temperature) is float:
            tc = self._tc
            if not self._tmin <= temperature <= tc:
                return _NAN
            s = math.sqrt(1.0 - temperature / tc)
            piece = self._pieces[bisect_right(self._bounds, s)]
            value = series_sum(s * piece.scale + piece.shift, piece.vapour, piece.vapour_rest)
            return self._rhoc * exp(tc / temperature * (value if value < 0.0 else 0.0))
        inside, held = self._inside(cast(Array, temperature))
        x, which = self._position_block(held)
        return cast(Real, np.where(inside, self._vapour_block(x, which, self._tc / held), _NAN))

    def saturation(self, temperature: Real) -> Saturation[Real]:
        """Return pressure and both densities at once; NaN off the curve.

        :param temperature: K, a float or an array of shape (n,)
        """
        if type(temperature) is float:
            tc = self._tc
            if not self._tmin <= temperature <= tc:
                return Saturation(_NAN, _NAN, _NAN)
            s = math.sqrt(1.0 - temperature / tc)
            piece = self._pieces[bisect_right(self._bounds, s)]
            scale, shift, pressure, pressure_rest, liquid, liquid_rest, vapour, vapour_rest, _, _ = piece
            x = s * scale + shift
            u = tc / temperature
            p = series_sum(x, pressure, pressure_rest)
            liquid_sum = series_sum(x, liquid, liquid_rest)
            v = series_sum(x, vapour, vapour_rest)
            return Saturation(
                self._pc * exp(u * (p if p < 0.0 else 0.0)),
                self._rhoc * (liquid_sum if liquid_sum > 1.0 else 1.0),
                self._rhoc * exp(u * (v if v < 0.0 else 0.0)),
            )
        inside, held = self._inside(cast(Array, temperature))
        position, which = self._position_block(held)
        ratio = self._tc / held
        return Saturation(
            cast(Real, np.where(inside, self._pressure_block(position, which, ratio), _NAN)),
            cast(Real, np.where(inside, self._liquid_block(position, which), _NAN)),
            cast(Real, np.where(inside, self._vapour_block(position, which, ratio), _NAN)),
        )

    def slope(self, temperature: Real) -> Real:
        """Return dp_sat/dT, Pa/K; NaN off the curve.

        Within a few thousandths of the critical temperature the value is good to about 1e-4, else to about 1e-7.

        :param temperature: K, a float or an array of shape (n,)
        """
        if type(temperature) is float:
            if not self._tmin <= temperature <= self._tc:
                return _NAN
            value, rate = self._log_pressure(temperature)
            return self._pc * exp(value) * rate
        inside, held = self._inside(cast(Array, temperature))
        values, rates = self._log_pressure_block(held)
        return cast(Real, np.where(inside, self._pc * exp(values) * rates, _NAN))

    def temperature(self, pressure: Real) -> Real:
        """Return the temperature at which the gas is saturated, K, converged to rounding.

        NaN above the critical pressure, where there is no such temperature, and below ``pressure_min``.

        :param pressure: Pa, a float or an array of shape (n,)
        """
        tc = self._tc
        tmin = self._tmin
        if type(pressure) is float:
            if not self.pressure_min <= pressure <= self._pc:
                return _NAN
            y = log(pressure / self._pc)
            t = tc / self._start(y)
            for _ in range(_NEWTON_STEPS):
                t = t if t > tmin else tmin
                t = t if t < tc else tc
                value, rate = self._log_pressure(t)
                t -= (value - y) / rate
            t = t if t > tmin else tmin
            return t if t < tc else tc
        block = cast(Array, pressure)
        inside = (block >= self.pressure_min) & (block <= self._pc)
        y_block = log(np.where(inside, block, self._pc) / self._pc)
        ts = tc / self._start(y_block)
        for _ in range(_NEWTON_STEPS):
            ts = np.minimum(np.maximum(ts, tmin), tc)
            values, rates = self._log_pressure_block(ts)
            ts = ts - (values - y_block) / rates
        return cast(Real, np.where(inside, np.minimum(np.maximum(ts, tmin), tc), _NAN))
