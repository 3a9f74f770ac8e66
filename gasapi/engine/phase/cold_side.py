"""Below the end of a vapour-pressure curve: what can still be said about a state.

Where a sublimation line is known it separates vapour from solid. Elsewhere only bounds are left, from the end (T0, p0) of
the curve that is known and its steepness L = d ln p / d ln T there:

    ln(p/p0) = -k L (T0/T - 1)

the equation of Clausius and Clapeyron for a vapour that is nearly ideal, with a heat k times that at the end. A solid
takes the heat of fusion on top of the heat of vaporisation; over every solid known to us it is smaller than the latter
(carbon dioxide, 0.6 of it, and uranium hexafluoride, 0.7, are extreme), so that below the pressure for k = 2 there is vapour
only. Over a liquid the heat grows as it cools, or falls a little for helium and hydrogen: its vapour pressure lies between
those for k = 0.8 and k = 1.3 (the reference equations, cut off anywhere below 0.78 Tc, stay between 0.82 and 1.26). Bounds
of our own, no source.
"""

from __future__ import annotations

from typing import Final, NamedTuple, cast

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.elementary import Array, Real, exp
from gasapi.engine.phase.region import Region
from gasapi.engine.phase.sublimation import SublimationLine

__all__ = ["ColdSide", "CurveEnd"]

_SOLID_HEAT: Final = 2.0
_LIQUID_HEAT_MOST: Final = 1.3
_LIQUID_HEAT_LEAST: Final = 0.8
# a pure gas on the line counts as condensing: 1 part in 1e9, as on the saturation line
_ON_THE_LINE: Final = 1e-9


class CurveEnd(NamedTuple):
    """Where a vapour-pressure curve ends: K, Pa, and d ln p / d ln T there, [-]."""

    temperature: float
    pressure: float
    steepness: float


class ColdSide:
    """Verdicts below the end of a vapour-pressure curve. Immutable.

    :param end: where the curve ends
    :param freezing: the triple-point temperature, K, or None for a substance that has none or whose is not known
    :param sublimation: the sublimation line, or None
    """

    __slots__ = ("_end", "_freezing", "_sublimation", "_vapour_end")

    def __init__(self, end: CurveEnd, freezing: float | None, sublimation: SublimationLine | None) -> None:
        self._end = end
        self._freezing = 0.0 if freezing is None else freezing
        self._sublimation = sublimation
        self._vapour_end = end
        if sublimation is not None:
            lowest = sublimation.temperature_min
            steepness = lowest * sublimation.slope(lowest) / sublimation.pressure_min
            self._vapour_end = CurveEnd(lowest, sublimation.pressure_min, steepness)

    @staticmethod
    def _line(end: CurveEnd, heat: float, temperature: Real) -> Real:
        return end.pressure * exp((heat * end.steepness) * (1.0 - end.temperature / temperature))

    def vapour_below(self, temperature: Real) -> Real:
        """Return a pressure below which there is vapour only, Pa: the sublimation line, or a bound that is safe.

        :param temperature: K, above zero, a float or an array of shape (n,)
        """
        if type(temperature) is float:
            if self._sublimation is not None:
                if temperature >= self._sublimation.temperature_min:
                    return self._sublimation.pressure(temperature)
                return self._line(self._vapour_end, _LIQUID_HEAT_MOST, temperature)
            return self._line(self._end, _SOLID_HEAT if temperature < self._freezing else _LIQUID_HEAT_MOST, temperature)
        block = cast(Array, temperature)
        if self._sublimation is not None:
            beyond = self._line(self._vapour_end, _LIQUID_HEAT_MOST, block)
            return cast(Real, np.where(block >= self._sublimation.temperature_min, self._sublimation.pressure(block), beyond))
        solid = self._line(self._end, _SOLID_HEAT, block)
        return cast(Real, np.where(block < self._freezing, solid, self._line(self._end, _LIQUID_HEAT_MOST, block)))

    def region_float(self, temperature: float, pressure: float) -> int:
        """Return the region of one state below the end of the curve.

        :param temperature: K, above zero
        :param pressure: Pa, above zero
        """
        if pressure < self.vapour_below(temperature) * (1.0 - _ON_THE_LINE):
            return Region.GAS
        if temperature < self._freezing:
            return Region.SOLID_POSSIBLE
        if pressure > self._line(self._end, _LIQUID_HEAT_LEAST, temperature):
            return Region.LIQUID
        return Region.UNKNOWN

    def region_block(self, temperature: Array, pressure: Array) -> NDArray[np.int8]:
        """Return the regions of rows, each of shape (n,)."""
        liquid = pressure > self._line(self._end, _LIQUID_HEAT_LEAST, temperature)
        region = np.where(liquid, np.int8(Region.LIQUID), np.int8(Region.UNKNOWN))
        region = np.where(temperature < self._freezing, np.int8(Region.SOLID_POSSIBLE), region)
        gas = pressure < self.vapour_below(temperature) * (1.0 - _ON_THE_LINE)
        return np.where(gas, np.int8(Region.GAS), region)
