"""The stated density uncertainty of a published equation, and the propagation of input uncertainty (JCGM 100:2008).

Uncertainties are relative and expanded with k = 2. A generalised equation's own rule is in ``generalised_uncertainty``.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Final

import numpy as np

from gasapi.engine.elementary import Array
from gasapi.gases.records import DensityUncertainty, Limits

__all__ = ["PublishedUncertainty", "expanded_density_uncertainty"]

# outside its published range an equation is trusted this much less, and never better than the second figure
_OUTSIDE_FACTOR: Final = 5.0
_OUTSIDE_LEAST: Final = 0.005

_BASES: Final = {"publication": "publication", "from memory": "estimate", "estimate": "estimate"}


class PublishedUncertainty:
    """The list of statements that comes with a published equation; the first that holds for a state counts. Immutable.

    :param statements: in order, the last one without limits
    :param validity: outside it the last statement is widened
    :param gas_below: density below which a state counts as gas, mol/m3
    :param least: no statement is taken for better than this, [-]
    """

    def __init__(
        self, statements: Sequence[DensityUncertainty], validity: Limits, gas_below: float, least: float = 0.0
    ) -> None:
        self._statements = tuple(statements)
        self._validity = validity
        self._gas_below = gas_below
        self._least = least
        self.basis = "estimate" if least > 0.0 else _BASES[statements[0].basis]

    def _find(self, temperature: float, pressure: float, density: float) -> DensityUncertainty | None:
        v = self._validity
        if not (v.temperature_min <= temperature <= v.temperature_max and pressure <= v.pressure_max):
            return None
        for s in self._statements:
            if (
                (s.phase == "fluid" or density < self._gas_below)
                and (s.temperature_min is None or temperature >= s.temperature_min)
                and (s.temperature_max is None or temperature <= s.temperature_max)
                and (s.pressure_max is None or pressure <= s.pressure_max)
            ):
                return s
        return None

    def _outside(self) -> float:
        return max(_OUTSIDE_FACTOR * self._statements[-1].relative, _OUTSIDE_LEAST, self._least)

    def at(self, temperature: float, pressure: float, density: float) -> float:
        """Return the uncertainty at one state (K, Pa, mol/m3), [-]."""
        found = self._find(temperature, pressure, density)
        return self._outside() if found is None else max(found.relative, self._least)

    def basis_at(self, temperature: float, pressure: float, density: float) -> str:
        """Return where the uncertainty at one state comes from."""
        found = self._find(temperature, pressure, density)
        return "estimate" if found is None or found.relative < self._least else _BASES[found.basis]

    def block(self, temperature: Array, pressure: Array, density: Array) -> Array:
        """Return the uncertainty of rows, each of shape (n,), [-]."""
        result = np.full(temperature.size, self._outside())
        v = self._validity
        left = (temperature >= v.temperature_min) & (temperature <= v.temperature_max) & (pressure <= v.pressure_max)
        for s in self._statements:
            holds = left.copy()
            if s.phase == "gas":
                holds &= density < self._gas_below
            if s.temperature_min is not None:
                holds &= temperature >= s.temperature_min
            if s.temperature_max is not None:
                holds &= temperature <= s.temperature_max
            if s.pressure_max is not None:
                holds &= pressure <= s.pressure_max
            result[holds] = max(s.relative, self._least)
            left &= ~holds
        return result


def expanded_density_uncertainty(
    density: float,
    density_pressure: float,
    density_temperature: float,
    pressure_uncertainty: float,
    temperature_uncertainty: float,
    model_relative: float,
) -> float:
    """Return the expanded uncertainty (k = 2) of a density from independent inputs and the model's own part.

    JCGM 100:2008, eq. 10 (law of propagation, uncorrelated inputs) and 6.2.1 (expanded uncertainty).

    :param density: kg/m3
    :param density_pressure: d rho/dp, kg/m3/Pa
    :param density_temperature: d rho/dT, kg/m3/K
    :param pressure_uncertainty: standard, Pa
    :param temperature_uncertainty: standard, K
    :param model_relative: relative, expanded with k = 2
    """
    parts = (
        density_pressure * pressure_uncertainty,
        density_temperature * temperature_uncertainty,
        0.5 * model_relative * density,
    )
    return 2.0 * math.sqrt(math.fsum(part * part for part in parts))
