"""GERG-2008: the wide-range equation for natural gases and other mixtures of its 21 components.

Kunz and Wagner, J. Chem. Eng. Data 57 (2012) 3032; also ISO 20765-2. Residual energy eq. 12 of the paper:
alpha_r = sum x_i a_i(delta, tau) + sum x_i x_j F_ij a_ij(delta, tau), with tau = T_r(x)/T and delta = rho/rho_r(x).

A ``GergSystem`` holds what depends on the set of components only; its ``fluid`` collapses the equation at one composition,
where terms with equal exponents add up over the components.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Final, cast

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.critical_point import find_critical_point
from gasapi.engine.elementary import Array, Real
from gasapi.engine.estimate import DensityEstimate
from gasapi.engine.helmholtz import TermLayout, TermSum
from gasapi.engine.models.helmholtz_fluid import HelmholtzFluid, unbounded
from gasapi.engine.protocol import Branch, CriticalPoint
from gasapi.gases.records import GergData, ResidualTerm

__all__ = ["ID", "GergFluid", "GergSystem"]

ID = "gerg-2008"
NAME = "GERG-2008 wide-range equation for mixtures"

# Loops between the branches begin at T_r/T = 1.05, that of vapour and liquid at about 1; below this ratio isotherms rise
_GUARDED_ABOVE: Final = 0.95
# A typical critical compressibility and acentric factor, for first guesses only
_GUESS_Z: Final = 0.29
_GUESS_ACENTRIC: Final = 0.05


class GergSystem:
    """GERG-2008 for one set of components. Immutable.

    :param data: the coefficients
    :param components: ids, in any order, each once
    :raises KeyError: for an id that is not a component
    """

    def __init__(self, data: GergData, components: Sequence[str]) -> None:
        position = {c.id: i for i, c in enumerate(data.components)}
        indices = [position[c] for c in components]
        self.data = data
        self.components = tuple(components)
        members = [data.components[i] for i in indices]
        self.molar_masses = tuple(m.molar_mass for m in members)
        self.critical_temperatures = np.array([m.critical_temperature for m in members])
        self.critical_volumes = np.array([1.0 / m.critical_density for m in members])

        local = {k: i for i, k in enumerate(indices)}
        departures = {d.id: d.terms for d in data.departures}
        terms: list[ResidualTerm] = []
        owner: list[int] = []
        for i, member in enumerate(members):
            terms.extend(member.terms)
            owner.extend([i] * len(member.terms))
        first: list[int] = []
        second: list[int] = []
        rows: list[tuple[float, ...]] = []
        factors: list[float] = []
        bases: list[str] = []
        for pair in data.pairs:
            if pair.i not in local or pair.j not in local:
                continue
            i, j = local[pair.i], local[pair.j]
            t_ij = math.sqrt(members[i].critical_temperature * members[j].critical_temperature)
            v_ij = (members[i].critical_density ** (-1 / 3) + members[j].critical_density ** (-1 / 3)) ** 3 / 8.0
            if pair.departure is not None and pair.factor != 0.0:
                departure = departures[pair.departure]
                terms.extend(departure)
                owner.extend([len(members) + len(first)] * len(departure))
            first.append(i)
            second.append(j)
            factors.append(pair.factor)
            bases.append(pair.basis)
            rows.append(
                (
                    2.0 * pair.beta_t * pair.gamma_t * t_ij,
                    pair.beta_t * pair.beta_t,
                    2.0 * pair.beta_v * pair.gamma_v * v_ij,
                    pair.beta_v * pair.beta_v,
                )
            )
        self.first = np.array(first, dtype=np.intp)
        self.second = np.array(second, dtype=np.intp)
        self.factors = np.array(factors)
        self.pair_bases = tuple(bases)
        parameters = np.array(rows).reshape(-1, 4)
        self.temperature_weight, self.temperature_skew = parameters[:, 0].copy(), parameters[:, 1].copy()
        self.volume_weight, self.volume_skew = parameters[:, 2].copy(), parameters[:, 3].copy()
        self.terms = tuple(terms)
        self.owner: NDArray[np.intp] = np.array(owner, dtype=np.intp)
        self.layout = TermLayout(terms)
        self._coefficients = np.array([t.n for t in terms])

    def reducing(self, fractions: Array) -> tuple[float, float]:
        """Return the reducing temperature, K, and density, mol/m3 (eqs. 16 and 17 of the paper).

        :param fractions: mole fractions in the order of the components, shape (n,), [-]
        """
        squares = fractions * fractions
        x, y = fractions.take(self.first), fractions.take(self.second)
        product = x * y
        weighted = product * (x + y)
        t = math.fsum((squares * self.critical_temperatures).tolist()) + math.fsum(
            (weighted * self.temperature_weight / (self.temperature_skew * x + y)).tolist()
        )
        v = math.fsum((squares * self.critical_volumes).tolist()) + math.fsum(
            (weighted * self.volume_weight / (self.volume_skew * x + y)).tolist()
        )
        return t, 1.0 / v

    def fluid(self, fractions: Sequence[float]) -> GergFluid:
        """Return the equation at one composition.

        :param fractions: mole fractions in the order of the components, all above 0, summing to 1, [-]
        """
        return GergFluid(self, tuple(fractions))

    def energy(self, fractions: Array) -> TermSum:
        """Return the residual energy at one composition.

        :param fractions: mole fractions in the order of the components, shape (n,), [-]
        """
        pairs = fractions.take(self.first) * fractions.take(self.second) * self.factors
        weights = np.concatenate([fractions, pairs])
        return TermSum(self.layout, self._coefficients * weights.take(self.owner))


class GergFluid(HelmholtzFluid):
    """GERG-2008 at one composition. Immutable; made by ``GergSystem.fluid``."""

    def __init__(self, system: GergSystem, fractions: tuple[float, ...]) -> None:
        x = np.array(fractions)
        super().__init__(system.energy(x), *system.reducing(x))
        self.model = ID
        self.system = system
        self.fractions = fractions
        self.gas_constant = system.data.gas_constant
        self.molar_mass = math.fsum(a * m for a, m in zip(fractions, system.molar_masses, strict=True))
        self.critical = self._pure_critical_point() if len(fractions) == 1 else None
        t, d = self.reducing_temperature, self.reducing_density
        self._estimate = DensityEstimate(self.gas_constant, t, _GUESS_Z * self.gas_constant * t * d, _GUESS_ACENTRIC)

    def _pure_critical_point(self) -> CriticalPoint:
        tau, delta = find_critical_point(self._energy, 1.0, 1.0)
        t, d = self.reducing_temperature / tau, self.reducing_density * delta
        return CriticalPoint(t, self.stiffness(t, d).pressure, d)

    def rises_throughout(self, temperature: Real) -> bool | NDArray[np.bool_]:
        """Return where an isotherm has one root only; see ``Fluid.rises_throughout``."""
        return self.reducing_temperature < _GUARDED_ABOVE * temperature

    def _search_float(self, temperature: float, pressure: float, branch: Branch) -> tuple[float, float, float, bool]:
        if self.reducing_temperature < _GUARDED_ABOVE * temperature:
            return self._estimate.gas(temperature, pressure), 0.0, math.inf, False
        if branch == Branch.GAS:
            return self._gas_start_float(temperature, pressure), 0.0, math.inf, True
        return self._liquid_start_float(temperature, pressure), 0.0, math.inf, True

    def _search_block(
        self, temperature: Array, pressure: Array, branch: Branch
    ) -> tuple[Array, Array, Array, NDArray[np.bool_]]:
        low, high = unbounded(temperature.size)
        guarded = ~(self.reducing_temperature < _GUARDED_ABOVE * temperature)
        start = self._estimate.gas(temperature, pressure)
        rows = np.flatnonzero(guarded)
        if rows.size:
            t, p = temperature.take(rows), pressure.take(rows)
            if branch == Branch.GAS:
                start[rows] = self._gas_start_block(t, p)
            else:
                start[rows] = self._liquid_start_block(t, p)
        return start, low, high, cast("NDArray[np.bool_]", guarded)
