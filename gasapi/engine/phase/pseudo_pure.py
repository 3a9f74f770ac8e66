"""The phase of a pseudo-pure fluid (air), by its bubble and dew lines."""

from __future__ import annotations

import math

from gasapi.engine.elementary import Real
from gasapi.engine.phase.bubble_dew import BubbleDewLines
from gasapi.engine.phase.cold_side import ColdSide, CurveEnd
from gasapi.engine.phase.verdict import PhaseVerdict
from gasapi.engine.protocol import Fluid

__all__ = ["PseudoPureVerdict"]


class PseudoPureVerdict(PhaseVerdict):
    """The phase of a pseudo-pure fluid: two-phase between its dew and its bubble line; see ``PhaseVerdict``. Immutable.

    :param fluid: the equation of state, which knows its critical point
    :param lines: bubble and dew lines
    :param freezing: the temperature at which a component begins to freeze, K, or None
    """

    def __init__(self, fluid: Fluid, lines: BubbleDewLines, freezing: float | None = None) -> None:
        critical = fluid.critical
        if critical is None:
            raise ValueError(f"{fluid.model} has no critical point here")
        coldest = lines.temperature_min
        pressure = lines.dew_pressure(coldest)
        step = 1e-4 * coldest
        steepness = coldest * math.log(lines.dew_pressure(coldest + step) / pressure) / step
        super().__init__(
            fluid.model,
            fluid,
            critical,
            None,
            freezing,
            lines.temperature_max,
            coldest,
            lines.dew_pressure(lines.temperature_max),
            ColdSide(CurveEnd(coldest, pressure, steepness), freezing, None),
        )
        self.lines = lines

    def _dew_pressure(self, temperature: Real) -> Real:
        return self.lines.dew_pressure(temperature)

    def _dew_and_bubble(self, temperature: Real) -> tuple[Real, Real]:
        return self.lines.dew_pressure(temperature), self.lines.bubble_pressure(temperature)

    def dew_temperature(self, pressure: float) -> float | None:
        """Return the dew temperature, K; see ``PhaseVerdict.dew_temperature``."""
        found = self.lines.dew_temperature(pressure)
        return None if math.isnan(found) else found

    def condensing_pressure(self, temperature: float) -> float | None:
        """Return the dew pressure, Pa; see ``PhaseVerdict.condensing_pressure``."""
        found = self.lines.dew_pressure(temperature)
        return None if math.isnan(found) else found
