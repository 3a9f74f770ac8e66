"""The verdict on a state of a fluid with saturation lines: region, margins to condensation, and signs to warn of.

Shared by pure gases and by air, which differ in their lines only. Two steps, since one needs the density and the other
chooses its branch: ``survey`` tells the region as far as temperature and pressure do, ``refine`` completes it.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from typing import Final, NamedTuple

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.elementary import Array, Real
from gasapi.engine.phase.cold_side import ColdSide
from gasapi.engine.phase.region import Region
from gasapi.engine.protocol import CriticalPoint, Fluid

__all__ = ["Margins", "PhaseVerdict", "Sign"]

_GAS: Final = int(Region.GAS)
_LIQUID: Final = int(Region.LIQUID)
_SUPERCRITICAL: Final = int(Region.SUPERCRITICAL)
_TWO_PHASE: Final = int(Region.TWO_PHASE)
_SOLID: Final = int(Region.SOLID_POSSIBLE)
_UNKNOWN: Final = int(Region.UNKNOWN)

# a pure gas on its saturation line, to 1 part in 1e9 of the pressure, is two-phase
_ON_THE_LINE: Final = 1e-9

# Near the critical point: d ln p / d ln rho below this (1 for an ideal gas), so that an error of the pressure becomes one
# of more than 20 times its size in the density; and only within these bounds of the critical point, outside of which no
# stable state is so soft. On the critical isochore of most gases this begins at 1.01 Tc.
_SOFT: Final = 0.05
_NEAR_TEMPERATURE: Final = 0.05
_NEAR_DENSITY: Final = (0.25, 2.0)

# Beyond these a critical point is reported as shifted from the accepted one: they single out the older equations whose dew
# points next to it are off by more than a plant thermometer or gauge would show. Our choice, no source.
_SHIFTED_TEMPERATURE: Final = 0.2
_SHIFTED_PRESSURE: Final = 0.01
# and the shift matters for states within this part of the critical temperature
_SHIFT_REACH: Final = 0.1

# Melting lines are not held. Molecular solids melt 0.2 to 0.3 K higher per MPa, plastic crystals (cyclohexane, neopentane) up
# to 0.6 K: a dense state below this bound may freeze. Common practice, no source.
_MELTING_SLOPE: Final = 0.6e-6
_MELTING_NEAR: Final = 5.0


class Margins(NamedTuple):
    """How far a state is from condensing: K, K and Pa, positive on the gas side; None where there is no such boundary."""

    dew_point_temperature: float | None
    margin_temperature: float | None
    margin_pressure: float | None


class Sign(NamedTuple):
    """Something to warn of: a snake_case code and the numbers that a sentence about it needs (K and Pa; ratios bare)."""

    code: str
    numbers: tuple[tuple[str, float], ...]


class PhaseVerdict(ABC):
    """The phase of one fluid by one equation of state. Immutable, and safe to share between threads.

    Regions are codes of ``Region``, int8 in blocks.

    :param model: the id of the equation that the lines belong to
    :param fluid: the equation, asked for its stiffness near the critical point
    :param critical: its critical point
    :param accepted: the accepted critical temperature, K, and pressure, Pa, where they are known to differ
    :param triple: the triple-point temperature, K, or None
    :param hottest: the highest temperature of the lines, K
    :param coldest: the lowest temperature of the lines at which the liquid is stable, K
    :param highest: the highest pressure at which the gas condenses on cooling, Pa
    :param cold_side: the rules below ``coldest``
    """

    def __init__(
        self,
        model: str,
        fluid: Fluid,
        critical: CriticalPoint,
        accepted: tuple[float, float] | None,
        triple: float | None,
        hottest: float,
        coldest: float,
        highest: float,
        cold_side: ColdSide,
    ) -> None:
        self.model: str | None = model
        self.critical = critical
        self.triple_temperature = triple
        self.fluid = fluid
        self._accepted = accepted
        self._hottest = hottest
        self._coldest = coldest
        self._highest = highest
        self._cold_side = cold_side
        self._shifted = accepted is not None and (
            abs(critical.temperature - accepted[0]) > _SHIFTED_TEMPERATURE
            or abs(critical.pressure / accepted[1] - 1.0) > _SHIFTED_PRESSURE
        )

    @abstractmethod
    def _dew_pressure(self, temperature: Real) -> Real:
        """Return the pressure at which the gas begins to condense, Pa; NaN off the line."""

    @abstractmethod
    def _dew_and_bubble(self, temperature: Real) -> tuple[Real, Real]:
        """Return the pressures at which gas begins and ends to condense, Pa; NaN off the lines."""

    @abstractmethod
    def dew_temperature(self, pressure: float) -> float | None:
        """Return the temperature at which the gas begins to condense, K, or to deposit solid where the line of that is
        known; None where there is no such temperature or it is not known.

        :param pressure: Pa
        """

    @abstractmethod
    def condensing_pressure(self, temperature: float) -> float | None:
        """Return the pressure at which the gas begins to condense (or to deposit solid), Pa; None as for the temperature.

        :param temperature: K
        """

    def covers(self, temperature: float, pressure: float) -> bool:
        """Return whether the region can be told from temperature and pressure alone.

        :param temperature: K
        :param pressure: Pa
        """
        if temperature > self._hottest and pressure >= self.critical.pressure:
            return False
        return self.region_float(temperature, pressure) != _UNKNOWN

    def region_float(self, temperature: float, pressure: float) -> int:
        """Return the region of one state, without its density: a supercritical state reads as gas (or liquid).

        :param temperature: K
        :param pressure: Pa
        """
        if not (temperature > 0.0 and pressure > 0.0):
            return _UNKNOWN
        if temperature > self._hottest:
            return _GAS
        if temperature < self._coldest:
            return self._cold_side.region_float(temperature, pressure)
        dew, bubble = self._dew_and_bubble(temperature)
        if pressure < dew * (1.0 - _ON_THE_LINE):
            return _GAS
        return _LIQUID if pressure > bubble * (1.0 + _ON_THE_LINE) else _TWO_PHASE

    def region_block(self, temperature: Array, pressure: Array) -> NDArray[np.int8]:
        """Return the regions of rows, each of shape (n,)."""
        region = np.full(temperature.size, _GAS, dtype=np.int8)
        usable = (temperature > 0.0) & (pressure > 0.0)
        region[~usable] = _UNKNOWN
        rows = np.flatnonzero(usable & (temperature <= self._hottest))
        if rows.size:
            t, p = temperature.take(rows), pressure.take(rows)
            dew, bubble = self._dew_and_bubble(np.maximum(t, self._coldest))
            found = np.where(p > bubble * (1.0 + _ON_THE_LINE), np.int8(_LIQUID), np.int8(_TWO_PHASE))
            found[p < dew * (1.0 - _ON_THE_LINE)] = _GAS
            cold = np.flatnonzero(t < self._coldest)
            if cold.size:
                found[cold] = self._cold_side.region_block(t.take(cold), p.take(cold))
            region[rows] = found
        return region

    def survey_float(self, temperature: float, pressure: float, margin: float) -> tuple[int, bool]:
        """Return the region of one state, and whether it is a gas less than a margin above its dew point.

        :param temperature: K
        :param pressure: Pa
        :param margin: K
        """
        region = self.region_float(temperature, pressure)
        if region != _GAS or pressure > self._highest:
            return region, False
        colder = temperature - margin
        if colder > self._hottest:
            return region, False
        if colder >= self._coldest:
            return region, pressure > self._dew_pressure(colder)
        return region, not colder > 0.0 or pressure > self._cold_side.vapour_below(colder)

    def survey_block(self, temperature: Array, pressure: Array, margin: float) -> tuple[NDArray[np.int8], NDArray[np.bool_]]:
        """Return the same for rows, each of shape (n,)."""
        region = self.region_block(temperature, pressure)
        near = np.zeros(temperature.size, dtype=bool)
        colder = temperature - margin
        rows = np.flatnonzero((region == _GAS) & (pressure <= self._highest) & (colder <= self._hottest))
        if rows.size:
            t, p = colder.take(rows), pressure.take(rows)
            found = p > self._dew_pressure(np.maximum(t, self._coldest))
            cold = np.flatnonzero(t < self._coldest)
            if cold.size:
                held = t.take(cold)
                positive = held > 0.0
                bound = self._cold_side.vapour_below(np.where(positive, held, 1.0))
                found[cold] = ~positive | (p.take(cold) > bound)
            near[rows] = found
        return region, near

    def refine_float(self, temperature: float, pressure: float, density: float, region: int) -> int:
        """Return the final region of one state.

        :param temperature: K
        :param pressure: Pa
        :param density: mol/m3
        :param region: as surveyed
        """
        tc, pc, rhoc = self.critical
        if density >= rhoc and temperature >= tc and pressure >= pc and region in (_GAS, _LIQUID):
            return _SUPERCRITICAL
        return region

    def refine_block(self, temperature: Array, pressure: Array, density: Array, region: NDArray[np.int8]) -> NDArray[np.int8]:
        """Return the final regions of rows, each of shape (n,)."""
        tc, pc, rhoc = self.critical
        above = (density >= rhoc) & (temperature >= tc) & (pressure >= pc) & ((region == _GAS) | (region == _LIQUID))
        return np.where(above, np.int8(_SUPERCRITICAL), region)

    def near_critical_float(self, temperature: float, density: float) -> bool:
        """Return whether the density is ill-conditioned: d ln p / d ln rho below 0.05, close to the critical point.

        :param temperature: K
        :param density: mol/m3
        """
        reduced = density / self.critical.density
        if not (
            abs(temperature / self.critical.temperature - 1.0) < _NEAR_TEMPERATURE
            and _NEAR_DENSITY[0] < reduced < _NEAR_DENSITY[1]
        ):
            return False
        p, slope, _ = self.fluid.pressure(temperature, density)
        return density * slope < _SOFT * p

    def near_critical_block(self, temperature: Array, density: Array) -> NDArray[np.bool_]:
        """Return the same for rows, each of shape (n,)."""
        reduced = density / self.critical.density
        near = np.abs(temperature / self.critical.temperature - 1.0) < _NEAR_TEMPERATURE
        near &= (reduced > _NEAR_DENSITY[0]) & (reduced < _NEAR_DENSITY[1])
        rows = np.flatnonzero(near)
        if rows.size:
            rho = density.take(rows)
            p, slope, _ = self.fluid.pressure(temperature.take(rows), rho)
            near[rows] = rho * slope < _SOFT * p
        return near

    def margins(self, temperature: float, pressure: float) -> Margins:
        """Return how far one state is from condensing.

        Above the highest pressure at which the gas condenses there is no dew point. Below the triple point the margins are
        to the sublimation line where it is known, and None elsewhere.

        :param temperature: K
        :param pressure: Pa
        """
        dew = self.dew_temperature(pressure)
        limit = self.condensing_pressure(temperature)
        return Margins(dew, None if dew is None else temperature - dew, None if limit is None else limit - pressure)

    def signs(
        self,
        temperature: float,
        pressure: float,
        density: float | None,
        region: int,
        margin: float = 5.0,
        margins: Margins | None = None,
    ) -> tuple[Sign, ...]:
        """Return what there is to warn of at one state.

        ``near_dew_point`` (gas) and ``near_saturation`` (liquid) less than ``margin`` from the line; ``near_critical``;
        ``below_triple_point``; ``freezing_possible`` (a dense state not far above the triple point, allowing for a melting
        line that rises with pressure); ``critical_point_shifted`` (near the critical point of an equation which is off the
        accepted one).

        :param temperature: K
        :param pressure: Pa
        :param density: mol/m3, or None where there is none
        :param region: the final region
        :param margin: K
        :param margins: the margins of this state, where they are known already
        """
        found = []
        dew = self.dew_temperature(pressure) if margins is None else margins.dew_point_temperature
        if region == _GAS and self.survey_float(temperature, pressure, margin)[1]:
            found.append(Sign("near_dew_point", _numbers(margin=margin, dew_point_temperature=dew)))
        if region == _LIQUID and dew is not None and dew - temperature < margin:
            found.append(Sign("near_saturation", _numbers(margin=margin, dew_point_temperature=dew)))
        if density is not None and self.near_critical_float(temperature, density):
            p, slope, _ = self.fluid.pressure(temperature, density)
            found.append(
                Sign(
                    "near_critical",
                    _numbers(
                        critical_temperature=self.critical.temperature,
                        critical_pressure=self.critical.pressure,
                        density_sensitivity=p / (density * slope) if slope > 0.0 else None,
                    ),
                )
            )
        triple = self.triple_temperature
        if triple is not None:
            if temperature < triple:
                found.append(Sign("below_triple_point", _numbers(triple_temperature=triple)))
            elif region in (_LIQUID, _SUPERCRITICAL):
                bound = triple + _MELTING_NEAR + _MELTING_SLOPE * pressure
                if temperature < bound:
                    found.append(Sign("freezing_possible", _numbers(triple_temperature=triple)))
        if self._shifted and abs(temperature / self.critical.temperature - 1.0) < _SHIFT_REACH:
            assert self._accepted is not None
            found.append(
                Sign(
                    "critical_point_shifted",
                    _numbers(
                        critical_temperature=self.critical.temperature,
                        critical_pressure=self.critical.pressure,
                        accepted_critical_temperature=self._accepted[0],
                        accepted_critical_pressure=self._accepted[1],
                    ),
                )
            )
        return tuple(found)


def _numbers(**values: float | None) -> tuple[tuple[str, float], ...]:
    return tuple((name, value) for name, value in values.items() if value is not None)
