"""A fluid given by a reduced residual Helmholtz energy: what the reference equations and GERG-2008 have in common."""

from __future__ import annotations

import math
from abc import abstractmethod
from typing import Final, cast

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.density import GUARDED_STEP, solve_block, solve_float
from gasapi.engine.elementary import Array, Real, log
from gasapi.engine.estimate import DensityEstimate
from gasapi.engine.helmholtz import Isotherm, TermSum
from gasapi.engine.protocol import Branch, Fluid, PressureDerivatives, Root, Solution

__all__ = ["BLOCK_ROWS", "HelmholtzFluid"]

# rows that are solved together: buffers stay in the processor's second-level cache (1 MB), and NumPy's cost of a call, half
# of the time at 2048 rows, is spread
BLOCK_ROWS = 6144
# a guarded search for a liquid starts this much above an estimate, and at this reduced density at least: where the estimate has
# no liquid root it is a gas's
LIQUID_EXCESS: Final = 1.3
LEAST_LIQUID: Final = 2.2


class HelmholtzFluid(Fluid):
    """An equation alpha_r(T_r/T, rho/rho_r) at one composition. Immutable.

    :param energy: the residual energy
    :param reducing_temperature: K
    :param reducing_density: mol/m3
    """

    _estimate: DensityEstimate

    def __init__(self, energy: TermSum, reducing_temperature: float, reducing_density: float) -> None:
        self._energy = energy
        self.reducing_temperature = reducing_temperature
        self.reducing_density = reducing_density

    @abstractmethod
    def _search_float(self, temperature: float, pressure: float, branch: Branch) -> tuple[float, float, float, bool]:
        """Return start, lower and upper bound of the density, mol/m3, and whether the search is guarded."""

    @abstractmethod
    def _search_block(
        self, temperature: Array, pressure: Array, branch: Branch
    ) -> tuple[Array, Array, Array, NDArray[np.bool_]]:
        """Return the same for a block, each of shape (n,)."""

    def _gas_start_float(self, temperature: float, pressure: float) -> float:
        """Return where a guarded search for a gas root begins: at the ideal gas's density, but at one step at most."""
        ideal = pressure / (self.gas_constant * temperature)
        most = GUARDED_STEP * self.reducing_density
        return ideal if ideal < most else most

    def _gas_start_block(self, temperature: Array, pressure: Array) -> Array:
        ideal = pressure / (self.gas_constant * temperature)
        most = GUARDED_STEP * self.reducing_density
        return np.where(ideal < most, ideal, most)

    def _liquid_start_float(self, temperature: float, pressure: float) -> float:
        """Return where a guarded search for a liquid root begins: well inside the liquid."""
        guess = LIQUID_EXCESS * self._estimate.liquid(temperature, pressure)
        least = LEAST_LIQUID * self.reducing_density
        return guess if guess > least else least

    def _liquid_start_block(self, temperature: Array, pressure: Array) -> Array:
        guess = LIQUID_EXCESS * self._estimate.liquid(temperature, pressure)
        least = LEAST_LIQUID * self.reducing_density
        return np.where(guess > least, guess, least)

    def density(self, temperature: Real, pressure: Real, branch: Branch) -> Root[Real]:
        """Return the density root of a branch; see ``Fluid.density``."""
        if type(temperature) is float:
            return cast("Root[Real]", self._density_float(temperature, cast(float, pressure), branch))
        t, p = cast(Array, temperature), cast(Array, pressure)
        if t.size <= BLOCK_ROWS:
            return cast("Root[Real]", self._density_block(t, p, branch))
        parts = [
            self._density_block(t[i : i + BLOCK_ROWS], p[i : i + BLOCK_ROWS], branch) for i in range(0, t.size, BLOCK_ROWS)
        ]
        status = np.concatenate([cast("NDArray[np.int8]", part.status) for part in parts])
        return cast("Root[Real]", Root(np.concatenate([part.density for part in parts]), status))

    def _density_float(self, temperature: float, pressure: float, branch: Branch) -> Root[float]:
        isotherm = self._energy.isotherm(self.reducing_temperature / temperature)
        return self._root_float(isotherm, temperature, pressure, branch)

    def _root_float(self, isotherm: Isotherm[float], temperature: float, pressure: float, branch: Branch) -> Root[float]:
        rho_r = self.reducing_density
        start, low, high, guarded = self._search_float(temperature, pressure, branch)
        target = pressure / (rho_r * self.gas_constant * temperature)
        root = solve_float(isotherm, target, start / rho_r, low / rho_r, high / rho_r, guarded)
        return Root(root.density * rho_r, root.status)

    def solve(self, temperature: float, pressure: float, branch: Branch) -> Solution:
        """Return root and derivatives of one state from one isotherm; see ``Fluid.solve``."""
        isotherm, slope = self._energy.with_slopes(self.reducing_temperature / temperature)
        root = self._root_float(isotherm, temperature, pressure, branch)
        if root.status != 0:
            return Solution(root, None)
        return Solution(root, self._derivatives(isotherm, slope, temperature, root.density))

    def _derivatives(
        self, isotherm: Isotherm[Real], slope: Isotherm[Real], temperature: Real, density: Real
    ) -> PressureDerivatives[Real]:
        delta = density / self.reducing_density
        first, second, _ = isotherm.euler(delta)
        rt = self.gas_constant * temperature
        return PressureDerivatives(
            density * rt * (1.0 + first),
            rt * (1.0 + first + second),
            density * self.gas_constant * (1.0 + first - slope.first_of_slope(delta)),
        )

    def _density_block(self, temperature: Array, pressure: Array, branch: Branch) -> Root[Array]:
        rho_r = self.reducing_density
        start, low, high, guarded = self._search_block(temperature, pressure, branch)
        target = pressure / (rho_r * self.gas_constant * temperature)
        isotherm = self._energy.isotherm(self.reducing_temperature / temperature)
        root = solve_block(isotherm, target, start / rho_r, low / rho_r, high / rho_r, guarded)
        return Root(root.density * rho_r, root.status)

    def pressure(self, temperature: Real, density: Real) -> PressureDerivatives[Real]:
        """Return pressure and its derivatives; see ``Fluid.pressure``."""
        isotherm, slope = self._energy.with_slopes(self.reducing_temperature / temperature)
        return self._derivatives(isotherm, slope, temperature, density)

    def stiffness(self, temperature: Real, density: Real) -> PressureDerivatives[Real]:
        """Return pressure and its density derivative only; the temperature derivative is given as 0."""
        tau = self.reducing_temperature / temperature
        first, second, _ = self._energy.isotherm(tau).euler(density / self.reducing_density)
        rt = self.gas_constant * temperature
        return PressureDerivatives(density * rt * (1.0 + first), rt * (1.0 + first + second), 0.0 * density)

    def residual_gibbs(self, temperature: Real, density: Real) -> Real:
        """Return alpha_r + Z - 1 - ln Z, [-]; see ``Fluid.residual_gibbs``."""
        isotherm = self._energy.isotherm(self.reducing_temperature / temperature)
        delta = density / self.reducing_density
        first, _, _ = isotherm.euler(delta)
        return isotherm.value(delta) + first - log(1.0 + first)


def unbounded(rows: int) -> tuple[Array, Array]:
    """Return the widest bracket for a block: zeros and infinities, each of shape (rows,)."""
    return np.zeros(rows), np.full(rows, math.inf)
