"""The phase of a mixture for the service: the engine's verdict, with its flags in words."""

from __future__ import annotations

import math
from collections.abc import Callable
from functools import cached_property
from typing import Final

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.elementary import Array
from gasapi.engine.phase.mixture import DewKind, MixtureFlag, MixturePhase, MixtureVerdict, is_near
from gasapi.engine.phase.region import Region
from gasapi.engine.phase.stability import Stability
from gasapi.service.answers import PhaseWarning
from gasapi.service.prepared import Margins

__all__ = ["MixtureJudge"]

_GAS: Final = int(Region.GAS)
_SUPERCRITICAL: Final = int(Region.SUPERCRITICAL)
_UNKNOWN: Final = int(Region.UNKNOWN)
_TWO_PHASE: Final = int(Region.TWO_PHASE)

# where the water dew line is not known: how far above the other dew point (or above this temperature, K) water is looked for
_WATER_REACH: Final = 60.0
_WATER_NEAR: Final = 400.0

# within these parts of the critical temperature and density an isotherm of a mixture is nearly flat
_NEAR_TEMPERATURE: Final = 0.02
_NEAR_DENSITY: Final = 0.4

_SENTENCES: Final = (
    (
        int(MixtureFlag.HYDRATE_POSSIBLE),
        "hydrate_possible",
        "Free water is near and the gas forms hydrates at low temperature: they may plug the line above the ice point.",
    ),
    (
        int(MixtureFlag.ICE_POSSIBLE),
        "ice_possible",
        "Below its freezing point the water of this gas comes out as ice or frost.",
    ),
    (
        int(MixtureFlag.NEAR_CRITICAL),
        "near_critical",
        "The state is near the critical point of the mixture: small errors of input are large ones of density.",
    ),
    (
        int(MixtureFlag.DEW_BELOW_RANGE),
        "dew_point_below_range",
        "The dew point at this pressure, if there is one, lies below the lowest temperature of the equation.",
    ),
    (
        int(MixtureFlag.ABOVE_CRICONDENBAR),
        "above_cricondenbar",
        "The pressure is above the highest one at which the mixture can condense on cooling.",
    ),
    (
        int(MixtureFlag.DIRECT),
        "margin_not_known",
        "The phase was decided by a stability test of this state alone; no dew point is given.",
    ),
    (
        int(MixtureFlag.EXTRAPOLATED),
        "dew_point_extrapolated",
        "The dew point lies below the lowest pressure that was traced and is extrapolated.",
    ),
    (
        int(MixtureFlag.WATER_AND_LIQUID),
        "three_phases_possible",
        "Both liquid water and a liquid of the gas can form: three phases are possible.",
    ),
)

_WATER: Final = int(DewKind.WATER)
_DEW_NAMES: Final = {int(DewKind.HYDROCARBON): "of the gas itself", int(DewKind.WATER): "of water"}


_NEAR_BOUNDARY: Final = "There is no dew point at this pressure, but a little below it the mixture becomes two phases."


class MixtureJudge:
    """The phase of one composition; see ``PhaseJudge``. The boundary is traced when it is first asked for.

    :param model: the id of the equation
    :param make: makes the engine's verdict
    """

    compares_roots = True

    def __init__(self, model: str, make: Callable[[], MixturePhase]) -> None:
        self.model: str | None = model
        self._make = make

    @cached_property
    def phase(self) -> MixturePhase:
        """The engine's verdict on the composition."""
        return self._make()

    def covers(self, temperature: float, pressure: float) -> bool:
        """Return whether a region can be told."""
        return self.region_float(temperature, pressure) != _UNKNOWN

    def region_float(self, temperature: float, pressure: float) -> int:
        """Return the region of one state."""
        return self._settled(temperature, pressure, self.phase.at(temperature, pressure)).region

    def survey_float(self, temperature: float, pressure: float, margin: float) -> tuple[int, bool, object]:
        """Return region and nearness to the dew point of one state."""
        verdict = self._settled(temperature, pressure, self.phase.at(temperature, pressure))
        return verdict.region, is_near(verdict, pressure, margin), verdict

    def survey_block(self, temperature: Array, pressure: Array, margin: float) -> tuple[NDArray[np.int8], NDArray[np.bool_]]:
        """Return regions and nearness of rows, each of shape (n,)."""
        region, near = self.phase.survey_block(temperature, pressure, margin)
        if self._lost_water < math.inf:
            region, near = region.copy(), near.copy()
            for i in np.flatnonzero((pressure > self._lost_water) & (region <= _SUPERCRITICAL)).tolist():
                t, p = float(temperature[i]), float(pressure[i])
                found = self._settled(t, p, self.phase.at(t, p))
                region[i], near[i] = found.region, is_near(found, p, margin)
        return region, near

    @cached_property
    def _lost_water(self) -> float:
        """The pressure, Pa, above which the water dew line was lost; infinite where it was not."""
        return math.exp(min(700.0, self.phase.log_pressure_of_lost_water())) if self._has_water else math.inf

    @cached_property
    def _has_water(self) -> bool:
        return self.phase.log_pressure_of_lost_water() < math.inf

    def _settled(self, temperature: float, pressure: float, verdict: MixtureVerdict) -> MixtureVerdict:
        """Return a verdict that a gas is one phase only if a direct test says so too, where the water dew line is not known."""
        if pressure <= self._lost_water or verdict.region not in (_GAS, _SUPERCRITICAL):
            return verdict
        dew = verdict.dew_point_temperature
        if temperature > (_WATER_NEAR if dew is None else dew) + _WATER_REACH:
            return verdict
        found = self.phase.stability(temperature, pressure).verdict
        if found == Stability.STABLE:
            return verdict
        return verdict._replace(region=_TWO_PHASE if found == Stability.UNSTABLE else _UNKNOWN)

    def refine_float(self, temperature: float, pressure: float, density: float, region: int) -> int:
        """Return the region as surveyed, which took the density at the critical isochore into account."""
        return region

    def refine_block(self, temperature: Array, pressure: Array, density: Array, region: NDArray[np.int8]) -> NDArray[np.int8]:
        """Return the regions as surveyed."""
        return region

    def near_critical_float(self, temperature: float, density: float) -> bool:
        """Return whether the state is close to the critical point of the mixture."""
        point = self.phase.critical
        if point is None:
            return False
        return (
            abs(temperature / point.temperature - 1.0) < _NEAR_TEMPERATURE
            and abs(density / point.density - 1.0) < _NEAR_DENSITY
        )

    def near_critical_block(self, temperature: Array, density: Array) -> NDArray[np.bool_]:
        """Return the same for rows."""
        point = self.phase.critical
        if point is None:
            return np.zeros(temperature.size, dtype=bool)
        near: NDArray[np.bool_] = np.abs(temperature / point.temperature - 1.0) < _NEAR_TEMPERATURE
        return near & (np.abs(density / point.density - 1.0) < _NEAR_DENSITY)

    def margins(
        self, temperature: float, pressure: float, density: float | None, region: int, margin: float, surveyed: object
    ) -> Margins:
        """Return the margins and warnings of one state."""
        verdict = surveyed if isinstance(surveyed, MixtureVerdict) else self.phase.at(temperature, pressure)
        flags = verdict.flags
        warnings = [PhaseWarning(code, text) for flag, code, text in _SENTENCES if flags & flag] if flags else []
        dew = verdict.dew_point_temperature
        if dew is not None:
            kind = _DEW_NAMES.get(verdict.dew_kind, "")
            warm = verdict.margin_temperature
            near = warm is not None and 0.0 <= warm < margin
            within = f", within {verdict.dew_point_uncertainty:.2g} K (k = 2)" if verdict.dew_point_uncertainty else ""
            text = f"The dew point {kind} at this pressure lies at {dew:.5g} K{within}."
            if near:
                warnings.insert(0, PhaseWarning("near_dew_point", text))
            elif verdict.dew_kind == _WATER:
                warnings.insert(0, PhaseWarning("water_dew_point", text))
            else:
                warnings.insert(0, PhaseWarning("gas_dew_point", text))
        elif is_near(verdict, pressure, margin):
            warnings.insert(0, PhaseWarning("near_dew_point", _NEAR_BOUNDARY))
        return Margins(dew, verdict.margin_temperature, verdict.margin_pressure, tuple(warnings))
