"""The stated uncertainty of the generalised equations (placeholder grid until the measured one lands)."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from gasapi.engine.elementary import Array
from gasapi.gases.records import Substance

__all__ = ["GeneralisedUncertainty"]


class GeneralisedUncertainty:
    """The uncertainty of one generalised model for one gas."""

    basis = "calibration"

    def __init__(self, model: str, substances: Sequence[Substance], fractions: Sequence[float]) -> None:
        self._model = model
        self._tc = sum(x * s.critical_temperature for x, s in zip(fractions, substances, strict=True))
        self._pc = sum(x * s.critical_pressure for x, s in zip(fractions, substances, strict=True))

    def at(self, temperature: float, pressure: float, density: float) -> float:
        """Return the uncertainty at one state, [-]."""
        return min(0.5, 0.002 + 0.3 * (pressure / self._pc) / (temperature / self._tc))

    def basis_at(self, temperature: float, pressure: float, density: float) -> str:
        """Return where the uncertainty comes from."""
        return "calibration"

    def block(self, temperature: Array, pressure: Array, density: Array) -> Array:
        """Return the uncertainty of rows, each of shape (n,), [-]."""
        return np.minimum(0.5, 0.002 + 0.3 * (pressure / self._pc) / (temperature / self._tc))
