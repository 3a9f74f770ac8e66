"""What the phase machinery asks of an equation of state for mixtures: derivatives in the molar densities of the components.

In the variables (T, rho_1 ... rho_n) a phase equilibrium needs no density solve of its own: with psi the residual Helmholtz
energy of a volume over R T and g_i = d psi/d rho_i, the fugacity is f_i = rho_i R T exp(g_i), and
p = R T (rho + sum rho_i g_i - psi). Newton's method then works on densities and temperature together (Deiters and Bell,
Ind. Eng. Chem. Res. 58 (2019) 2983).

These are ordinary NumPy sums, whose last bits may depend on the number of rows. They may therefore feed an answer only where
the rows are fixed by the composition (or by the composition and one state), never by how many states were asked together.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.protocol import Branch, Status

__all__ = ["EnergyDerivatives", "Floats", "Isotherms", "MixtureEnergy", "Volumetric"]

Floats = NDArray[np.float64]
"""An array of any shape."""

# an isotherm is walked on these fractions of close packing before any root on it is believed
_THIN = (1e-7, 1e-4, 1e-3, 3e-3, 0.01, 0.02, 0.035, 0.055, 0.08, 0.11, 0.14, 0.17, 0.2, 0.23, 0.26)
_WALK = np.concatenate([_THIN, np.linspace(0.3, 1.0, 18)])
_STEPS = 60
_DONE = 1e-13
_FEW_STEPS = 4
_ROUGHLY = 1e-6

_ROWS = 16
"""Isotherms walked together: with more, arrays leave the processor's cache."""


class EnergyDerivatives(NamedTuple):
    """Derivatives at m states of n components, all made dimensionless.

    ``compressibility`` Z, shape (m,); ``potential`` g_i = ln(phi_i Z), (m, n); ``hessian`` rho d g_i/d rho_j at fixed T,
    (m, n, n); ``potential_slope`` T d g_i/dT and ``compressibility_slope`` T dZ/dT at fixed densities, (m, n) and (m,).
    """

    compressibility: Floats
    potential: Floats
    hessian: Floats
    potential_slope: Floats
    compressibility_slope: Floats


class Volumetric(NamedTuple):
    """Z and d(rho Z)/d rho at fixed T and composition, of the shape of the density."""

    compressibility: Floats
    stiffness: Floats


class Isotherms(ABC):
    """Isotherms of m compositions. Immutable."""

    @abstractmethod
    def at(self, packing: Floats) -> Volumetric:
        """Return Z and its stiffness.

        :param packing: densities over ``close_packing``, shape (m, k), [-]
        """

    @abstractmethod
    def take(self, rows: NDArray[np.intp]) -> Isotherms:
        """Return some of the isotherms."""


def _walked(isotherms: Isotherms, grid: Floats, target: Floats, branch: Branch) -> tuple[Floats, Floats]:
    """Return by how much the pressure at each point is above its target, and the stiffness: as far as the walk goes.

    Most walks end in the half where they begin. What lies beyond is marked as an end, which is never reached.
    """
    gas = branch == Branch.GAS
    excess, stiffness = np.full(grid.shape, np.inf if gas else -np.inf), np.ones(grid.shape)
    halves = (slice(0, len(_THIN)), slice(len(_THIN), grid.shape[1]))
    rows = np.arange(grid.shape[0])
    for half in halves if gas else halves[::-1]:
        here = isotherms if rows.size == grid.shape[0] else isotherms.take(rows)
        z, stiff = here.at(grid[rows, half])
        over = grid[rows, half] * z - target[rows, None]
        excess[rows, half], stiffness[rows, half] = over, stiff
        ended = ((over >= 0.0) if gas else (over <= 0.0)) | (stiff <= 0.0)
        rows = rows[~ended.any(axis=1)]
        if rows.size == 0:
            break
    return excess, stiffness


class MixtureEnergy(ABC):
    """An equation of state for one set of components. Immutable.

    ``components`` are ids, ``critical_temperatures`` K, ``critical_pressures`` Pa and ``acentric_factors`` serve first guesses.
    """

    components: tuple[str, ...]
    gas_constant: float
    molar_masses: Floats
    critical_temperatures: Floats
    critical_pressures: Floats
    acentric_factors: Floats

    @abstractmethod
    def derivatives(self, temperature: Floats, densities: Floats) -> EnergyDerivatives:
        """Return all first and second derivatives.

        :param temperature: K, shape (m,)
        :param densities: molar densities of the components, mol/m3, shape (m, n); zeros are allowed
        """

    @abstractmethod
    def isotherms(self, temperature: Floats, fractions: Floats) -> Isotherms:
        """Return isotherms to be followed in density.

        :param temperature: K, shape (m,)
        :param fractions: mole fractions, shape (m, n), [-]
        """

    @abstractmethod
    def close_packing(self, fractions: Floats) -> Floats:
        """Return the density from which the liquid root is sought downward, mol/m3, shape (m,).

        :param fractions: mole fractions, shape (m, n), [-]
        """

    @abstractmethod
    def lowest_temperature(self, fractions: Floats) -> Floats:
        """Return the temperature below which sums of terms are rounding noise in the liquid, K, shape (m,)."""

    @abstractmethod
    def subset(self, chosen: Sequence[int]) -> MixtureEnergy:
        """Return the same equation for some of the components."""

    def density(
        self, temperature: Floats, pressure: Floats, fractions: Floats, branch: Branch
    ) -> tuple[Floats, NDArray[np.int8]]:
        """Return density roots, walking from the outside inward while the pressure rises with density.

        A root behind a stretch of falling pressure lies in a false loop and is not taken (status NO_ROOT).

        :param temperature: K, shape (m,)
        :param pressure: Pa, shape (m,)
        :param fractions: mole fractions, shape (m, n), [-]
        :param branch: GAS upward from zero density, LIQUID downward from close packing
        :returns: densities, mol/m3, shape (m,), and statuses
        """
        if temperature.size <= _ROWS:
            return self._density(temperature, pressure, fractions, branch)
        cuts = [slice(i, i + _ROWS) for i in range(0, temperature.size, _ROWS)]
        parts = [self._density(temperature[c], pressure[c], fractions[c], branch) for c in cuts]
        return np.concatenate([rho for rho, _ in parts]), np.concatenate([status for _, status in parts])

    def _density(
        self, temperature: Floats, pressure: Floats, fractions: Floats, branch: Branch
    ) -> tuple[Floats, NDArray[np.int8]]:
        packed = self.close_packing(fractions)
        target = pressure / (packed * self.gas_constant * temperature)
        # the ideal gas may lie below the first point
        grid = np.maximum(_WALK, 0.0)[None, :].repeat(temperature.size, axis=0)
        grid[:, 0] = np.minimum(0.5 * target, _WALK[0])
        isotherms = self.isotherms(temperature, fractions)
        excess, stiffness = _walked(isotherms, grid, target, branch)
        rows = np.arange(temperature.size)
        if branch == Branch.GAS:
            # the last point before the pressure is passed, or before the isotherm turns down
            bad = (excess >= 0.0) | (stiffness <= 0.0)
            stop = np.where(bad.any(axis=1), bad.argmax(axis=1), bad.shape[1])
            first = np.maximum(stop - 1, 0)
            second = np.minimum(stop, grid.shape[1] - 1)
        else:
            flipped = ((excess <= 0.0) | (stiffness <= 0.0))[:, ::-1]
            stop = np.where(flipped.any(axis=1), flipped.argmax(axis=1), flipped.shape[1])
            first = grid.shape[1] - np.maximum(stop, 1)
            second = np.maximum(first - 1, 0)
        x = grid[rows, first]
        edge = grid[rows, second]
        low, high = np.minimum(x, edge), np.maximum(x, edge)
        enclosed = (excess[rows, first] * excess[rows, second] <= 0.0) & (stiffness[rows, second] > 0.0)
        # the guarded side: Newton's steps from the outer point cannot pass the root
        status = np.full(temperature.size, Status.NOT_CONVERGED, dtype=np.int8)
        for _ in range(_STEPS):
            here = x[rows]
            z, stiffness = (part[:, 0] for part in isotherms.at(here[:, None]))
            residual = here * z - target[rows]
            with np.errstate(all="ignore"):
                step = residual / stiffness
                new = here - step
                falls = ~(stiffness > 0.0)
                done = ~falls & (np.abs(step) <= _DONE * here * (1.0 + np.abs(z) / stiffness))
            above = residual > 0.0
            high[rows] = np.where(above, np.minimum(here, high[rows]), high[rows])
            low[rows] = np.where(above, low[rows], np.maximum(here, low[rows]))
            outside = ~((low[rows] <= new) & (new <= high[rows]))
            shut = enclosed[rows]
            lost = (falls | (outside & ~done)) & ~shut
            new = np.where(shut & (falls | outside), 0.5 * (low[rows] + high[rows]), new)
            x[rows] = np.where(~lost & np.isfinite(new), new, here)
            status[rows[lost]] = Status.NO_ROOT
            status[rows[done & ~lost]] = Status.CONVERGED
            left = ~(done | lost)
            if not left.any():
                break
            if not left.all():
                rows, isotherms = rows[left], isotherms.take(np.flatnonzero(left))
        return x * packed, status

    def log_fugacity_near(
        self, temperature: Floats, pressure: Floats, fractions: Floats, density: Floats
    ) -> tuple[Floats, Floats, NDArray[np.bool_]]:
        """Return ln(phi_i), shape (m, n), and the density root beside a first guess, with whether there is one.

        For trials on their way: the root is not walked to from outside, and may be a false one.

        :param temperature: K, shape (m,)
        :param pressure: Pa, shape (m,)
        :param fractions: mole fractions, shape (m, n), [-]
        :param density: first guess, mol/m3, shape (m,)
        """
        packed = self.close_packing(fractions)
        target = pressure / (packed * self.gas_constant * temperature)
        isotherms = self.isotherms(temperature, fractions)
        x = density / packed
        good = np.zeros(temperature.size, dtype=bool)
        with np.errstate(all="ignore"):
            for _ in range(_FEW_STEPS):
                z, stiffness = (part[:, 0] for part in isotherms.at(x[:, None]))
                step = (x * z - target) / stiffness
                x = np.where((stiffness > 0.0) & (np.abs(step) < 0.3 * x), x - step, x)
                good = (stiffness > 0.0) & (np.abs(step) < _ROUGHLY * x)
                if good.all():
                    break
            rho = x * packed
            d = self.derivatives(temperature, rho[:, None] * fractions)
            log_z = np.log(np.where(d.compressibility > 0.0, d.compressibility, np.nan))
        return d.potential - log_z[:, None], rho, good & np.isfinite(log_z)

    def log_fugacity(
        self, temperature: Floats, pressure: Floats, fractions: Floats, branch: Branch
    ) -> tuple[Floats, Floats, NDArray[np.int8]]:
        """Return ln(phi_i), shape (m, n), [-], with the density, mol/m3, and status of each row; NaN where there is no root.

        :param temperature: K, shape (m,)
        :param pressure: Pa, shape (m,)
        :param fractions: mole fractions, shape (m, n), [-]
        :param branch: which root
        """
        density, status = self.density(temperature, pressure, fractions, branch)
        d = self.derivatives(temperature, density[:, None] * fractions)
        log_z = np.log(np.where(d.compressibility > 0.0, d.compressibility, np.nan))
        found = status == Status.CONVERGED
        return np.where(found[:, None], d.potential - log_z[:, None], np.nan), density, status
