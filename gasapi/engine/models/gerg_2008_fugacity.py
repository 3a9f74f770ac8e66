"""GERG-2008 in the variables of phase equilibria: derivatives in the molar densities of the components.

Kunz and Wagner, J. Chem. Eng. Data 57 (2012) 3032, eqs. 12 to 17. Both reducing functions are homogeneous of degree 2 in the
fractions, so that with V_i = d ln v_r/d x_i and T_i = d ln T_r/d x_i the density derivatives of the arguments are

    rho d ln(delta)/d rho_i = V_i - 1 =: d_i,      rho d ln(tau)/d rho_i = T_i - 2 =: t_i,

and with alpha_r = alpha1 + alpha2, its parts linear and quadratic in the fractions, and A_i = d alpha_r/d x_i,

    g_i = A_i - alpha2 + alpha_delta d_i + alpha_tau t_i        (indices: derivatives in ln delta, ln tau).

The Hessian follows by the same rules. Evaluated for many rows at once with ordinary NumPy: see ``phase.energy``.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.models.gerg_2008 import GergSystem
from gasapi.engine.phase.energy import EnergyDerivatives, Floats, Isotherms, MixtureEnergy, Volumetric

__all__ = ["GergEnergy"]

_CLOSEST: Final = 3.6
"""Reduced density of close packing: liquids of this equation stay below 3.4."""

_COLDEST: Final = 3.2
"""T_r/T of a liquid above which single terms dwarf their sum."""

_TINY: Final = 1e-80

_ROWS: Final = 32
"""Rows evaluated together: with more, arrays leave the processor's cache, and a row costs three times as much."""

# critical pressure, Pa, and acentric factor, for first guesses only; rounded, from memory
_GUESSES: Final = {
    "methane": (4.60e6, 0.011),
    "nitrogen": (3.40e6, 0.037),
    "carbon-dioxide": (7.38e6, 0.224),
    "ethane": (4.87e6, 0.100),
    "propane": (4.25e6, 0.152),
    "n-butane": (3.80e6, 0.200),
    "isobutane": (3.63e6, 0.184),
    "n-pentane": (3.37e6, 0.251),
    "isopentane": (3.38e6, 0.227),
    "n-hexane": (3.03e6, 0.300),
    "n-heptane": (2.74e6, 0.350),
    "n-octane": (2.49e6, 0.399),
    "n-nonane": (2.28e6, 0.444),
    "n-decane": (2.11e6, 0.488),
    "hydrogen": (1.30e6, -0.219),
    "oxygen": (5.04e6, 0.022),
    "carbon-monoxide": (3.49e6, 0.050),
    "water": (22.06e6, 0.344),
    "hydrogen-sulfide": (9.00e6, 0.100),
    "helium": (0.227e6, -0.385),
    "argon": (4.86e6, -0.002),
}


class _GergIsotherms(Isotherms):
    """Isotherms as sums of functions of delta: one coefficient for each isotherm and function."""

    def __init__(self, energy: GergEnergy, slots: Floats) -> None:
        self._energy = energy
        self._coefficients = slots

    def take(self, rows: NDArray[np.intp]) -> Isotherms:
        """Return some of the isotherms."""
        return _GergIsotherms(self._energy, self._coefficients[rows])

    def at(self, packing: Floats) -> Volumetric:
        """Return Z and its stiffness; see ``Isotherms``."""
        delta = packing * _CLOSEST
        f, u, v = self._energy.slots(np.log(delta), delta)
        f *= self._coefficients[:, None, :]
        first = f * u
        second = first * u + f * v
        a = first.sum(axis=2)
        return Volumetric(1.0 + a, 1.0 + a + second.sum(axis=2))


class GergEnergy(MixtureEnergy):
    """GERG-2008 for one set of components, for phase equilibria. Immutable.

    :param system: the equation
    """

    def __init__(self, system: GergSystem) -> None:
        self._system = system
        self.components = system.components
        self.gas_constant = system.data.gas_constant
        self.molar_masses = np.array(system.molar_masses)
        self.critical_temperatures = system.critical_temperatures
        self.critical_pressures = np.array([_GUESSES[c][0] for c in system.components])
        self.acentric_factors = np.array([_GUESSES[c][1] for c in system.components])
        self._critical_volumes = system.critical_volumes
        n = len(system.components)
        self._collect_terms(system, n)
        self._collect_reducing(system, n)

    def _collect_terms(self, system: GergSystem, n: int) -> None:
        slots: dict[tuple[str, float, tuple[float, ...]], int] = {}
        powers: dict[float, int] = {}
        entries: dict[tuple[int, int], int] = {}
        shared: dict[tuple[tuple[float, ...], ...], int] = {}
        cells: list[tuple[int, int, float]] = []
        matrices: list[Floats] = []
        coefficient_of_column: dict[int, int] = {}
        columns: dict[int, list[tuple[int, float]]] = {}
        for term, owner in zip(system.terms, system.owner.tolist(), strict=True):
            slot = slots.setdefault((term.kind, term.d, term.parameters), len(slots))
            power = powers.setdefault(term.t, len(powers))
            entry = entries.setdefault((slot, power), len(entries))
            columns.setdefault(owner, []).append((entry, term.n))
        for owner, column in columns.items():
            if owner < n:
                coefficient_of_column[owner] = owner
                cells.extend((entry, owner, value) for entry, value in column)
                continue
            # pairs with the same departure function share a column
            key = tuple(sorted(column))
            if key not in shared:
                shared[key] = len(shared)
                matrices.append(np.zeros((n, n)))
                cells.extend((entry, n + shared[key], value) for entry, value in column)
            pair = owner - n
            i, j = int(system.first[pair]), int(system.second[pair])
            matrices[shared[key]][i, j] = matrices[shared[key]][j, i] = system.factors[pair]
        self._n = n
        coefficients = np.zeros((len(entries), n + len(matrices)))
        for entry, column_index, value in cells:
            coefficients[entry, column_index] += value
        self._coefficients = coefficients
        self._departures = np.array(matrices).reshape(len(matrices), n, n)
        self._departures_flat = self._departures.reshape(len(matrices), n * n)
        self._departures_rows = self._departures.transpose(1, 0, 2).reshape(n, len(matrices) * n).copy()
        self._tau_exponents = np.array(list(powers))
        self._entry_slot = np.array([s for s, _ in entries], dtype=np.intp)
        self._entry_power = np.array([t for _, t in entries], dtype=np.intp)
        self._entry_tau = self._tau_exponents[self._entry_power]
        # D ln of a slot: d - g l delta^l (damped), d + a delta^2 + b delta (density Gaussian)
        count = len(slots)
        self._degree = np.zeros(count)
        self._damping = np.zeros(count)
        self._damping_power = np.zeros(count)
        self._square = np.zeros(count)
        self._linear = np.zeros(count)
        self._offset = np.zeros(count)
        for (kind, d, parameters), slot in slots.items():
            self._degree[slot] = d
            if kind == "damped":
                self._damping[slot], self._damping_power[slot] = parameters
            elif kind == "density_gaussian":
                eta, epsilon, beta, gamma = parameters
                self._square[slot] = -eta
                self._linear[slot] = 2.0 * eta * epsilon - beta
                self._offset[slot] = beta * gamma - eta * epsilon * epsilon
            elif kind != "monomial":
                raise ValueError(f"GERG-2008 has no term of kind {kind!r}")
        self._powers_used = tuple(sorted(set(self._damping_power.tolist()) - {0.0}))
        self._power_index = np.array([([0.0, *self._powers_used]).index(p) for p in self._damping_power.tolist()])
        self._gaussian = bool(np.any(self._square != 0.0) or np.any(self._linear != 0.0))
        self._merge = np.zeros((len(entries), count))
        self._merge[np.arange(len(entries)), self._entry_slot] = 1.0

    def _collect_reducing(self, system: GergSystem, n: int) -> None:
        weight = np.zeros((2, n, n))
        skew = np.ones((2, n, n))
        i, j = system.first, system.second
        for k, (w, s) in enumerate(
            [(system.volume_weight, system.volume_skew), (system.temperature_weight, system.temperature_skew)]
        ):
            weight[k, i, j], skew[k, i, j] = w, s
            weight[k, j, i], skew[k, j, i] = w / s, 1.0 / s
        self._weight, self._skew, self._lean = weight, skew, 1.0 - skew
        self._pure = np.stack([system.critical_volumes, system.critical_temperatures])
        self._double_pure = 2.0 * self._pure

    def subset(self, chosen: Sequence[int]) -> GergEnergy:
        """Return the same equation for some of the components."""
        return GergEnergy(GergSystem(self._system.data, [self.components[i] for i in chosen]))

    def close_packing(self, fractions: Floats) -> Floats:
        """Return the density from which the liquid root is sought; see ``MixtureEnergy``."""
        return _CLOSEST / self._reducing(fractions)[0]

    def lowest_temperature(self, fractions: Floats) -> Floats:
        """Return the lowest temperature at which a liquid is evaluated; see ``MixtureEnergy``."""
        return self._reducing(fractions)[1] / _COLDEST

    def _reducing(self, fractions: Floats) -> Floats:
        """Return the reducing volume, m3/mol, and temperature, K, shape (2, m)."""
        safe = np.maximum(fractions, _TINY)
        x, y = safe[:, :, None], safe[:, None, :]
        shared = x * y * (x + y)
        cross = np.empty((2, fractions.shape[0]))
        for k in range(2):
            cross[k] = 0.5 * (self._weight[k] * shared / (self._skew[k] * x + y)).sum(axis=(1, 2))
        return cross + self._pure @ (safe * safe).T

    def _reducing_derivatives(self, fractions: Floats) -> tuple[Floats, Floats, Floats]:
        """Return values (2, m), gradients (2, m, n) and Hessians (2, m, n, n) in formally independent fractions."""
        safe = np.maximum(fractions, _TINY)
        x, y = safe[None, :, :, None], safe[None, :, None, :]
        weight, skew, lean = self._weight[:, None], self._skew[:, None], self._lean[:, None]
        q = 1.0 / (skew * x + y)
        r = (x + y) * q
        q_lean = lean * (q * q)
        r_x = y * q_lean
        x_r_x = x * r_x
        first = weight * y * (r + x_r_x)
        gradient = first.sum(axis=3) + self._double_pure[:, None, :] * safe[None]
        q_lean *= q
        second = weight * y * (2.0 * r_x - 2.0 * (skew * (x * y)) * q_lean)
        # y r_y = -x r_x; r_xy = lean (q^-1 - 2 y) q^3
        hessian = weight * (r + (x * y) * (q_lean * (skew * x - y)))
        index = np.arange(self._n)
        hessian[:, :, index, index] = second.sum(axis=3) + self._double_pure[:, None, :]
        value = 0.5 * (gradient * safe[None]).sum(axis=2)
        return value, gradient, hessian

    def slots(self, log_delta: Floats, delta: Floats) -> tuple[Floats, Floats, Floats]:
        """Return for each slot its function of delta, D of its logarithm, and D of that; shape (..., slots)."""
        shape = (*delta.shape, self._degree.size)
        exponent = log_delta[..., None] * self._degree
        if self._powers_used:
            table = np.zeros((*delta.shape, len(self._powers_used) + 1))
            for k, power in enumerate(self._powers_used):
                table[..., k + 1] = np.exp(power * log_delta)
            damped = self._damping * table.take(self._power_index, axis=-1)
        else:
            damped = np.zeros(shape)
        exponent -= damped
        damped *= self._damping_power
        u = self._degree - damped
        v = -self._damping_power * damped
        if self._gaussian:
            square = self._square * (delta * delta)[..., None]
            linear = self._linear * delta[..., None]
            exponent += square + linear + self._offset
            u += 2.0 * square + linear
            v += 4.0 * square + linear
        return np.exp(exponent), u, v

    def isotherms(self, temperature: Floats, fractions: Floats) -> Isotherms:
        """Return isotherms to be followed in density; see ``MixtureEnergy``."""
        _, reducing_temperature = self._reducing(fractions)
        log_tau = np.log(reducing_temperature / temperature)
        weights = np.concatenate([fractions, self._pair_weights(fractions)], axis=1)
        powers = np.exp(log_tau[:, None] * self._tau_exponents)
        amplitude = (weights @ self._coefficients.T) * powers.take(self._entry_power, axis=1)
        return _GergIsotherms(self, amplitude @ self._merge)

    def _pair_weights(self, fractions: Floats) -> Floats:
        partners = (fractions @ self._departures_rows).reshape(fractions.shape[0], -1, self._n)
        return 0.5 * (partners * fractions[:, None, :]).sum(axis=2)

    def derivatives(self, temperature: Floats, densities: Floats) -> EnergyDerivatives:
        """Return all first and second derivatives; see ``MixtureEnergy``."""
        parts = [
            self._derivatives(temperature[i : i + _ROWS], densities[i : i + _ROWS]) for i in range(0, temperature.size, _ROWS)
        ]
        if len(parts) == 1:
            return parts[0]
        if not parts:
            return self._derivatives(temperature, densities)
        return EnergyDerivatives(*(np.concatenate(columns) for columns in zip(*parts, strict=True)))

    def _derivatives(self, temperature: Floats, densities: Floats) -> EnergyDerivatives:
        n = self._n
        m = temperature.size
        density = densities.sum(axis=1)
        x = densities / density[:, None]
        value, gradient, curvature = self._reducing_derivatives(x)
        gradient = gradient / value[:, :, None]
        curvature = curvature / value[:, :, None, None]
        curvature -= gradient[:, :, :, None] * gradient[:, :, None, :]
        log_gradient_v, log_gradient_t = gradient
        d = log_gradient_v - 1.0
        t = log_gradient_t - 2.0
        delta = density * value[0]
        log_tau = np.log(value[1] / temperature)

        f, u, v = self.slots(np.log(delta), delta)
        powers = np.exp(log_tau[:, None] * self._tau_exponents)
        slot, power = self._entry_slot, self._entry_power
        stack = np.empty((6, m, slot.size))
        u_entry = u.take(slot, axis=1)
        np.multiply(f.take(slot, axis=1), powers.take(power, axis=1), out=stack[0])
        np.multiply(stack[0], u_entry, out=stack[1])
        np.multiply(stack[0], self._entry_tau, out=stack[2])
        np.multiply(stack[1], u_entry, out=stack[3])
        stack[3] += stack[0] * v.take(slot, axis=1)
        np.multiply(stack[2], u_entry, out=stack[4])
        np.multiply(stack[2], self._entry_tau, out=stack[5])
        # value, delta, tau, delta-delta, delta-tau, tau-tau: for each component and each departure function
        sums = (stack.reshape(6 * m, -1) @ self._coefficients).reshape(6, m, -1)
        pure, departure = sums[:, :, :n], sums[:, :, n:]
        if self._departures.shape[0]:
            partners = (x @ self._departures_rows).reshape(m, -1, n)
            b = np.matmul(departure.transpose(1, 0, 2), partners).transpose(1, 0, 2)
            cross = (departure[0] @ self._departures_flat).reshape(m, n, n)
        else:
            b = np.zeros((6, m, n))
            cross = np.zeros((m, n, n))
        a = pure + b
        quadratic = 0.5 * (b * x).sum(axis=2)
        total = (pure * x).sum(axis=2) + quadratic
        _, by_delta, by_tau, delta_delta, delta_tau, tau_tau = total[:, :, None]
        lean = a - quadratic[:, :, None]
        potential = lean[0] + by_delta * d + by_tau * t
        slope = -(lean[2] + delta_tau * d + tau_tau * t)

        # half of the symmetric part, to which its transpose is added
        delta_row = lean[1] + 0.5 * delta_delta * d + delta_tau * t
        tau_row = lean[2] + 0.5 * tau_tau * t
        half = delta_row[:, :, None] * d[:, None, :]
        half += tau_row[:, :, None] * t[:, None, :]
        half -= b[0][:, :, None]
        hessian = half + half.transpose(0, 2, 1)
        hessian += cross
        hessian += by_delta[:, :, None] * curvature[0]
        hessian += by_tau[:, :, None] * curvature[1]
        hessian += (2.0 * quadratic[0] + total[1] + 2.0 * total[2])[:, None, None]
        return EnergyDerivatives(1.0 + total[1], potential, hessian, slope, -total[4])
