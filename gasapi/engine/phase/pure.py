"""The phase of a pure gas, by the saturation curve of its equation of state."""

from __future__ import annotations

import math
from typing import cast

from gasapi.engine.elementary import Real
from gasapi.engine.phase.cold_side import ColdSide, CurveEnd
from gasapi.engine.phase.saturation import SaturationCurve
from gasapi.engine.phase.sublimation import SublimationLine
from gasapi.engine.phase.verdict import PhaseVerdict
from gasapi.engine.protocol import Fluid
from gasapi.gases.records import ReferenceEquation

__all__ = ["PureVerdict", "reference_verdict"]


class PureVerdict(PhaseVerdict):
    """The phase of a pure gas; see ``PhaseVerdict``. Immutable.

    :param fluid: the equation that the curve belongs to
    :param curve: its saturation curve, which may go on below the triple point: it is not used there
    :param triple: the triple-point temperature, K (a melting temperature at low pressure serves as well), or None for a
        substance that does not freeze or for which it is not known
    :param sublimation: the sublimation line, or None
    :param accepted: the accepted critical temperature, K, and pressure, Pa, to compare the equation's own with, or None
    """

    def __init__(
        self,
        fluid: Fluid,
        curve: SaturationCurve,
        triple: float | None = None,
        sublimation: SublimationLine | None = None,
        accepted: tuple[float, float] | None = None,
    ) -> None:
        coldest = curve.temperature_min
        if triple is not None and coldest < triple < curve.critical.temperature:
            coldest = triple
        pressure = curve.pressure(coldest)
        end = CurveEnd(coldest, pressure, coldest * curve.slope(coldest) / pressure)
        super().__init__(
            fluid.model,
            fluid,
            curve.critical,
            accepted,
            triple,
            curve.critical.temperature,
            coldest,
            curve.critical.pressure,
            ColdSide(end, triple, sublimation),
        )
        self.curve = curve
        self.sublimation = sublimation
        self._end_pressure = pressure

    def _dew_pressure(self, temperature: Real) -> Real:
        return self.curve.pressure(temperature)

    def _dew_and_bubble(self, temperature: Real) -> tuple[Real, Real]:
        pressure = self.curve.pressure(temperature)
        return pressure, pressure

    def dew_temperature(self, pressure: float) -> float | None:
        """Return the saturation (or sublimation) temperature, K; see ``PhaseVerdict.dew_temperature``."""
        if pressure >= self._end_pressure:
            found = self.curve.temperature(pressure)
        elif self.sublimation is not None:
            # between the pressures that the two curves have at the triple point, it is the triple point
            found = self.sublimation.temperature(min(pressure, self.sublimation.triple_pressure))
        else:
            return None
        return None if math.isnan(found) else found

    def condensing_pressure(self, temperature: float) -> float | None:
        """Return the saturation (or sublimation) pressure, Pa; see ``PhaseVerdict.condensing_pressure``."""
        if temperature >= self._coldest:
            found = self.curve.pressure(temperature)
        elif self.sublimation is not None:
            found = self.sublimation.pressure(temperature)
        else:
            return None
        return None if math.isnan(found) else found


def reference_verdict(equation: ReferenceEquation, fluid: Fluid, curve: SaturationCurve) -> PureVerdict:
    """Return the phase of a pure gas by its reference equation.

    :param equation: the record, for triple point, sublimation line and accepted critical point
    :param fluid: the equation of state
    :param curve: the curve built from ``equation.saturation``
    """
    accepted = equation.critical_published
    return PureVerdict(
        fluid,
        curve,
        None if equation.triple is None else equation.triple.temperature,
        None if equation.sublimation is None else SublimationLine(equation.sublimation),
        None if accepted.pressure is None else (accepted.temperature, cast(float, accepted.pressure)),
    )
