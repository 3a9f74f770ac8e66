"""The published multiparameter equation of one gas: a reduced Helmholtz energy fitted to the best data for that gas."""

from __future__ import annotations

import math
from typing import Final, Protocol

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.elementary import Array, Real
from gasapi.engine.estimate import DensityEstimate
from gasapi.engine.helmholtz import TermSum
from gasapi.engine.models.helmholtz_fluid import HelmholtzFluid, unbounded
from gasapi.engine.protocol import Branch, CriticalPoint
from gasapi.gases.records import ReferenceEquation

__all__ = ["ID", "ReferenceFluid", "SaturationLine"]

ID = "reference"
NAME = "Reference equation of the gas"

# A saturated density from the stored curve is off by up to 1e-7 (3.4e-5 within 1e-6 of the critical temperature)
_CURVE_SLACK: Final = 1e-4
# A pseudo-pure fluid has no saturation line of its own; searches start outside its dew and bubble curves
_GUARDED_BELOW: Final = 1.001


class SaturationLine(Protocol):
    """What the search needs of a saturation curve; temperatures in K, pressures in Pa, densities in mol/m3."""

    def pressure(self, temperature: Real) -> Real:
        """Return the saturation pressure."""
        ...

    def liquid_density(self, temperature: Real) -> Real:
        """Return the density of the saturated liquid."""
        ...

    def vapour_density(self, temperature: Real) -> Real:
        """Return the density of the saturated vapour."""
        ...


class ReferenceFluid(HelmholtzFluid):
    """One gas by its reference equation. Immutable.

    :param equation: the coefficients
    :param saturation: the saturation curve of this equation; None for a pseudo-pure fluid
    """

    def __init__(self, equation: ReferenceEquation, saturation: SaturationLine | None) -> None:
        super().__init__(TermSum.of(equation.terms), equation.reducing_temperature, equation.reducing_density)
        self.model = ID
        self.equation = equation
        self.gas_constant = equation.gas_constant
        self.molar_mass = equation.molar_mass
        point = equation.critical
        assert point.pressure is not None
        assert point.density is not None
        self.critical = CriticalPoint(point.temperature, point.pressure, point.density)
        self.saturation = saturation
        self._lowest = equation.saturation.temperature_min if equation.saturation is not None else 0.0
        self._estimate = DensityEstimate(equation.gas_constant, point.temperature, point.pressure, equation.acentric_factor)

    def _search_float(self, temperature: float, pressure: float, branch: Branch) -> tuple[float, float, float, bool]:
        critical = self.critical
        assert critical is not None
        if self.saturation is None:
            if temperature >= _GUARDED_BELOW * self.reducing_temperature:
                return self._estimate.gas(temperature, pressure), 0.0, math.inf, False
            return self._guarded_start(temperature, pressure, branch)
        if temperature >= critical.temperature:
            return self._estimate.gas(temperature, pressure), 0.0, math.inf, False
        if temperature < self._lowest:
            return self._guarded_start(temperature, pressure, branch)
        stable_gas = pressure <= self.saturation.pressure(temperature)
        if branch == Branch.GAS:
            edge = self.saturation.vapour_density(temperature) * (1.0 + _CURVE_SLACK)
            if not stable_gas:
                return self._gas_start_float(temperature, pressure), 0.0, math.inf, True
            start = self._estimate.gas(temperature, pressure)
            return (start if start < edge else edge), 0.0, edge, False
        edge = self.saturation.liquid_density(temperature) * (1.0 - _CURVE_SLACK)
        if stable_gas:
            return edge * (1.0 + 2.0 * _CURVE_SLACK), 0.0, math.inf, True
        start = self._estimate.liquid(temperature, pressure)
        return (start if start > edge else edge), edge, math.inf, False

    def _guarded_start(self, temperature: float, pressure: float, branch: Branch) -> tuple[float, float, float, bool]:
        if branch == Branch.GAS:
            return self._gas_start_float(temperature, pressure), 0.0, math.inf, True
        return self._liquid_start_float(temperature, pressure), 0.0, math.inf, True

    def _search_block(
        self, temperature: Array, pressure: Array, branch: Branch
    ) -> tuple[Array, Array, Array, NDArray[np.bool_]]:
        critical = self.critical
        assert critical is not None
        low, high = unbounded(temperature.size)
        start = self._estimate.gas(temperature, pressure)
        if self.saturation is None:
            guarded = temperature < _GUARDED_BELOW * self.reducing_temperature
            return self._guard_block(temperature, pressure, branch, start, guarded), low, high, guarded
        guarded = temperature < self._lowest
        rows = np.flatnonzero((temperature < critical.temperature) & ~guarded)
        start = self._guard_block(temperature, pressure, branch, start, guarded)
        if rows.size:
            t, p = temperature.take(rows), pressure.take(rows)
            stable_gas = p <= self.saturation.pressure(t)
            if branch == Branch.GAS:
                edge = self.saturation.vapour_density(t) * (1.0 + _CURVE_SLACK)
                guess = start.take(rows)
                start[rows] = np.where(stable_gas, np.where(guess < edge, guess, edge), self._gas_start_block(t, p))
                high[rows] = np.where(stable_gas, edge, math.inf)
                guarded[rows] = ~stable_gas
            else:
                edge = self.saturation.liquid_density(t) * (1.0 - _CURVE_SLACK)
                guess = self._estimate.liquid(t, p)
                start[rows] = np.where(stable_gas, edge * (1.0 + 2.0 * _CURVE_SLACK), np.where(guess > edge, guess, edge))
                low[rows] = np.where(stable_gas, 0.0, edge)
                guarded[rows] = stable_gas
        return start, low, high, guarded

    def _guard_block(
        self, temperature: Array, pressure: Array, branch: Branch, start: Array, guarded: NDArray[np.bool_]
    ) -> Array:
        rows = np.flatnonzero(guarded)
        if rows.size:
            t, p = temperature.take(rows), pressure.take(rows)
            if branch == Branch.GAS:
                start[rows] = self._gas_start_block(t, p)
            else:
                start[rows] = self._liquid_start_block(t, p)
        return start
