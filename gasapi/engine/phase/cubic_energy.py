"""The cubic equations in the variables of phase equilibria: derivatives in the molar densities of the components.

With N = sum rho_i, B = sum rho_i b_i and A = sum rho_i rho_j a_ij the residual energy of a volume over R T is
psi = -N ln(1 - B) - A F(B)/(R T), F(B) = ln((1 + delta1 B)/(1 + delta2 B))/((delta1 - delta2) B); after Michelsen and Mollerup,
Thermodynamic Models (2007), ch. 3. Ordinary NumPy: see ``phase.energy``.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.models.cubic import GAS_CONSTANT, CubicMixture
from gasapi.engine.phase.energy import EnergyDerivatives, Floats, Isotherms, MixtureEnergy, Volumetric

__all__ = ["CubicEnergy"]

_CLOSEST: Final = 0.9999
"""b rho from which the liquid root is sought downward: the pressure is infinite at 1."""


class _CubicIsotherms(Isotherms):
    """Isotherms of the cubic, each given by a/(b R T)."""

    def __init__(self, theta: Floats, delta1: float, delta2: float) -> None:
        self._theta, self._delta1, self._delta2 = theta, delta1, delta2

    def take(self, rows: NDArray[np.intp]) -> Isotherms:
        """Return some of the isotherms."""
        return _CubicIsotherms(self._theta[rows], self._delta1, self._delta2)

    def at(self, packing: Floats) -> Volumetric:
        """Return Z and its stiffness; see ``Isotherms``."""
        eta = packing * _CLOSEST
        free = 1.0 / (1.0 - eta)
        d1, d2 = self._delta1, self._delta2
        form = 1.0 / ((1.0 + d1 * eta) * (1.0 + d2 * eta))
        pull = self._theta[:, None] * eta * form
        return Volumetric(free - pull, free * free - pull * (2.0 + (d1 + d2) * eta) * form)


class CubicEnergy(MixtureEnergy):
    """A cubic equation for one set of components, for phase equilibria. Immutable.

    :param mixture: the equation
    :param chosen: numbers of the components to keep, all where None
    """

    def __init__(self, mixture: CubicMixture, chosen: Sequence[int] | None = None) -> None:
        self._mixture = mixture
        self._kept = kept = list(range(len(mixture.substances))) if chosen is None else list(chosen)
        substances = [mixture.substances[i] for i in kept]
        parameters = [mixture.form.component(s) for s in substances]
        self.components = tuple(s.id for s in substances)
        self.gas_constant = GAS_CONSTANT
        self.molar_masses = np.array([s.molar_mass for s in substances])
        self.critical_temperatures = np.array([s.critical_temperature for s in substances])
        self.critical_pressures = np.array([s.critical_pressure for s in substances])
        self.acentric_factors = np.array([s.acentric_factor for s in substances])
        self._delta1, self._delta2 = mixture.form.delta1, mixture.form.delta2
        self._constants = np.array([c.constant for c in parameters])
        self._slopes = np.array([c.slope for c in parameters])
        self._covolumes = np.array([c.covolume for c in parameters])
        self._pair_factors = (1.0 - mixture.interaction_parameters)[np.ix_(kept, kept)]

    def subset(self, chosen: Sequence[int]) -> CubicEnergy:
        """Return the same equation for some of the components."""
        return CubicEnergy(self._mixture, [self._kept[i] for i in chosen])

    def close_packing(self, fractions: Floats) -> Floats:
        """Return the density from which the liquid root is sought; see ``MixtureEnergy``."""
        return _CLOSEST / (fractions @ self._covolumes)

    def lowest_temperature(self, fractions: Floats) -> Floats:
        """Return 0: a cubic has no terms that cancel; see ``MixtureEnergy``."""
        return np.zeros(fractions.shape[0])

    def _attraction(self, temperature: Floats) -> tuple[Floats, Floats]:
        """Return a_ij/(R T) and T times its derivative, shape (m, n, n)."""
        root = np.sqrt(temperature)[:, None]
        signed = self._constants - self._slopes * root
        q = np.abs(signed)
        growth = -0.5 * self._slopes * root * np.sign(signed)
        scale = self._pair_factors / (GAS_CONSTANT * temperature)[:, None, None]
        a = scale * (q[:, :, None] * q[:, None, :])
        cross = growth[:, :, None] * q[:, None, :]
        return a, scale * (cross + cross.transpose(0, 2, 1)) - a

    def isotherms(self, temperature: Floats, fractions: Floats) -> Isotherms:
        """Return isotherms to be followed in density; see ``MixtureEnergy``."""
        a, _ = self._attraction(temperature)
        summed = (np.matmul(a, fractions[:, :, None])[:, :, 0] * fractions).sum(axis=1)
        return _CubicIsotherms(summed / (fractions @ self._covolumes), self._delta1, self._delta2)

    def derivatives(self, temperature: Floats, densities: Floats) -> EnergyDerivatives:
        """Return all first and second derivatives; see ``MixtureEnergy``."""
        b = self._covolumes
        a, a_slope = self._attraction(temperature)
        number = densities.sum(axis=1)
        eta = densities @ b
        free = 1.0 / (1.0 - eta)
        d1, d2 = self._delta1, self._delta2
        form = 1.0 / ((1.0 + d1 * eta) * (1.0 + d2 * eta))
        integral = np.log((1.0 + d1 * eta) / (1.0 + d2 * eta)) / (d1 - d2) if d1 != d2 else eta / (1.0 + d1 * eta)
        f0 = integral / eta
        f1 = (form - f0) / eta
        f2 = (-(d1 + d2 + 2.0 * d1 * d2 * eta) * form * form - 2.0 * f1) / eta
        single = np.matmul(a, densities[:, :, None])[:, :, 0]
        single_slope = np.matmul(a_slope, densities[:, :, None])[:, :, 0]
        both = (single * densities).sum(axis=1)
        both_slope = (single_slope * densities).sum(axis=1)
        potential = (-np.log1p(-eta))[:, None] + (number * free - both * f1)[:, None] * b - 2.0 * f0[:, None] * single
        slope = -2.0 * f0[:, None] * single_slope - (both_slope * f1)[:, None] * b
        half = (free[:, None] - 2.0 * f1[:, None] * single)[:, :, None] * b
        hessian = half + half.transpose(0, 2, 1)
        hessian += (number * free * free - both * f2)[:, None, None] * (b[:, None] * b)
        hessian -= 2.0 * f0[:, None, None] * a
        return EnergyDerivatives(
            free - both * form / number,
            potential,
            hessian * number[:, None, None],
            slope,
            -both_slope * form / number,
        )
