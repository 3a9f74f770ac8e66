"""Certified tables: an interpolant of Z(T, p) on fixed patches, in place of the exact solve where a caller allows an error.

A patch is a rectangle in tau = T_r/T and in pressure over rho_r R T_r, above the temperatures at which an isotherm can have
more than one root, so that it lies inside one phase. Z on it is a polynomial in both, through the exact solutions at
Chebyshev points (Trefethen, Approximation Theory and Approximation Practice, SIAM 2013, ch. 2 to 4). Its error is measured
against exact solutions on a grid of its own, halfway between the nodes, where the error of such a polynomial peaks; a patch
whose error, doubled for what lies between the points of the grid, is above what was allowed is not used, and states outside
all patches are solved exactly as well.

Patches depend on the equation and on the error that was allowed, never on what was asked before: each is fitted by itself,
when a state first falls into it. Floats and blocks take the same operations in the same order, and have the same bits.
"""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Sequence
from typing import Final, NamedTuple, cast

import numpy as np
from numpy.polynomial import chebyshev
from numpy.typing import NDArray

from gasapi.engine.elementary import Array, Real
from gasapi.engine.models.helmholtz_fluid import HelmholtzFluid
from gasapi.engine.protocol import Branch, Fluid, PressureDerivatives, Root

__all__ = ["Certificate", "CertifiedFluid"]

_TAU_EDGES: Final = (0.2, 0.35, 0.5, 0.6, 0.7, 0.78, 0.85, 0.9, 0.94)
_PRESSURE_EDGES: Final = (0.0, 0.1, 0.2, 0.3, 0.4, 0.5, 0.65, 0.85, 1.15, 1.6, 2.5)
_COLUMNS: Final = len(_PRESSURE_EDGES) - 1
_OUTSIDE: Final = -1
# what lies between the points of the checking grid may be off by more than these are
_SAFETY: Final = 2.0
# at zero pressure Z is 1; a root is sought just above it
_LEAST_PRESSURE: Final = 1e-6


class _Tier(NamedTuple):
    """A number of nodes, and what depends on it alone: nodes, matrices from values to powers, points of the checking grid."""

    least_accuracy: float
    tau_nodes: Array
    pressure_nodes: Array
    tau_powers: Array
    pressure_powers: Array
    tau_checks: Array
    pressure_checks: Array


def _nodes(count: int) -> Array:
    return np.cos(np.pi * (2.0 * np.arange(count) + 1.0) / (2.0 * count))


def _peaks(count: int) -> Array:
    """Return where the polynomial that vanishes at the nodes is largest, the ends included: the error peaks near there."""
    return np.cos(np.pi * np.arange(count + 1) / count)


def _powers(count: int) -> Array:
    """Return the matrix from values at the nodes to coefficients of powers."""
    to_series = np.linalg.inv(chebyshev.chebvander(_nodes(count), count - 1))
    to_powers = np.array([np.pad(chebyshev.cheb2poly([0.0] * k + [1.0]), (0, count - 1 - k)) for k in range(count)]).T
    return np.asarray(to_powers @ to_series)


def _tier(least_accuracy: float, tau_count: int, pressure_count: int) -> _Tier:
    return _Tier(
        least_accuracy,
        _nodes(tau_count),
        _nodes(pressure_count),
        _powers(tau_count),
        _powers(pressure_count),
        _peaks(tau_count),
        _peaks(pressure_count),
    )


_TIERS: Final = (_tier(3e-7, 7, 8), _tier(0.0, 9, 12))


class _Patch(NamedTuple):
    """A polynomial in x and y of Z, both from -1 to 1 on the patch: its coefficients by powers of x, then of y."""

    tau_middle: float
    tau_scale: float
    pressure_middle: float
    pressure_scale: float
    coefficients: tuple[tuple[float, ...], ...]
    error: float
    """The largest relative error on the checking grid."""

    usable: bool


class Certificate(NamedTuple):
    """How many states a table answers, and the largest error of its patches for them (None where there is no such state)."""

    rows: int
    largest_error: float | None


class CertifiedFluid(Fluid):
    """An equation whose gas densities come from certified tables where these are good enough. Safe to share between threads.

    What is held grows to one patch of 48 or 108 numbers for each of 80 rectangles at most.

    :param exact: the equation
    :param accuracy: the relative error of density that is allowed, [-]
    """

    def __init__(self, exact: HelmholtzFluid, accuracy: float) -> None:
        self.exact = exact
        self.accuracy = accuracy
        self.model = exact.model
        self.gas_constant = exact.gas_constant
        self.molar_mass = exact.molar_mass
        self.critical = exact.critical
        self._reducing_temperature = exact.reducing_temperature
        self._reducing_pressure = exact.reducing_density * exact.gas_constant * exact.reducing_temperature
        self._tier = next(tier for tier in _TIERS if accuracy >= tier.least_accuracy)
        self._patches: dict[int, _Patch] = {}

    def density(self, temperature: Real, pressure: Real, branch: Branch) -> Root[Real]:
        """Return the density root of a branch, from a table where one is good enough; see ``Fluid.density``."""
        if branch != Branch.GAS:
            return self.exact.density(temperature, pressure, branch)
        if type(temperature) is float:
            return cast("Root[Real]", self._density_float(temperature, cast(float, pressure)))
        return cast("Root[Real]", self._density_block(cast(Array, temperature), cast(Array, pressure)))

    def pressure(self, temperature: Real, density: Real) -> PressureDerivatives[Real]:
        """Return pressure and its derivatives, exactly; see ``Fluid.pressure``."""
        return self.exact.pressure(temperature, density)

    def residual_gibbs(self, temperature: Real, density: Real) -> Real:
        """Return alpha_r + Z - 1 - ln Z, exactly, [-]; see ``Fluid.residual_gibbs``."""
        return self.exact.residual_gibbs(temperature, density)

    def rises_throughout(self, temperature: Real) -> bool | NDArray[np.bool_]:
        """Return where an isotherm is known to have one root only; see ``Fluid.rises_throughout``."""
        return self.exact.rises_throughout(temperature)

    def certificate(self, temperature: Array, pressure: Array) -> Certificate:
        """Return how gas states are answered.

        :param temperature: K, shape (n,)
        :param pressure: Pa, shape (n,)
        """
        keys = self._keys(self._reducing_temperature / temperature, pressure / self._reducing_pressure)
        counts = np.bincount(keys + 1, minlength=1)[1:]
        used = [key for key in np.flatnonzero(counts).tolist() if self._patch(key).usable]
        return Certificate(int(sum(counts[key] for key in used)), max((self._patch(key).error for key in used), default=None))

    def _density_float(self, temperature: float, pressure: float) -> Root[float]:
        tau = self._reducing_temperature / temperature
        reduced = pressure / self._reducing_pressure
        row = bisect_right(_TAU_EDGES, tau) - 1
        column = bisect_right(_PRESSURE_EDGES, reduced) - 1
        if not (0 <= row < len(_TAU_EDGES) - 1 and 0 <= column < _COLUMNS):
            return self.exact.density(temperature, pressure, Branch.GAS)
        patch = self._patch(row * _COLUMNS + column)
        if not patch.usable:
            return self.exact.density(temperature, pressure, Branch.GAS)
        return Root(pressure / (_evaluate_float(patch, tau, reduced) * self.gas_constant * temperature), 0)

    def _density_block(self, temperature: Array, pressure: Array) -> Root[Array]:
        tau = self._reducing_temperature / temperature
        reduced = pressure / self._reducing_pressure
        keys = self._keys(tau, reduced)
        # patch by patch in order, so that rows are gathered once and each patch is a slice
        order = np.argsort(keys, kind="stable")
        counts = np.bincount(keys + 1, minlength=1)
        ends = np.cumsum(counts).tolist()
        present = np.flatnonzero(counts).tolist()
        self._build([key - 1 for key in present if key > 0])
        x, y = tau.take(order), reduced.take(order)
        factor = np.ones(tau.size)
        exact: list[NDArray[np.intp]] = []
        for key in present:
            part = slice(ends[key] - int(counts[key]), ends[key])
            if key == 0 or not self._patch(key - 1).usable:
                exact.append(order[part])
            else:
                factor[part] = _evaluate_block(self._patch(key - 1), x[part], y[part])
        z = np.empty(tau.size)
        z[order] = factor
        z *= self.gas_constant
        z *= temperature
        density = pressure / z
        status = np.zeros(tau.size, dtype=np.int8)
        if exact:
            rows = np.sort(np.concatenate(exact))
            root = self.exact.density(temperature.take(rows), pressure.take(rows), Branch.GAS)
            density[rows], status[rows] = root.density, root.status
        return Root(density, status)

    def _keys(self, tau: Array, reduced: Array) -> NDArray[np.int8]:
        """Return the patch of each state, -1 outside all of them."""
        row = _interval(_TAU_EDGES, tau)
        column = _interval(_PRESSURE_EDGES, reduced)
        inside = (row >= 0) & (row < len(_TAU_EDGES) - 1) & (column >= 0) & (column < _COLUMNS)
        return np.where(inside, row * np.int8(_COLUMNS) + column, np.int8(_OUTSIDE))

    def _patch(self, key: int) -> _Patch:
        patch = self._patches.get(key)
        if patch is None:
            self._build([key])
            patch = self._patches[key]
        return patch

    def _build(self, keys: Sequence[int]) -> None:
        """Fit the patches that are not held; all their states are solved in one block, which leaves their bits alone."""
        missing = [key for key in keys if key not in self._patches]
        if not missing:
            return
        tier = self._tier
        sizes = (tier.tau_nodes.size * tier.pressure_nodes.size, tier.tau_checks.size * tier.pressure_checks.size)
        states = [grid for key in missing for grid in self._grids(key)]
        temperature, pressure = (np.concatenate(column) for column in zip(*states, strict=True))
        root = self.exact.density(temperature, pressure, Branch.GAS)
        converged = np.asarray(root.status) == 0
        with np.errstate(all="ignore"):
            z = np.where(converged, pressure / (root.density * self.gas_constant * temperature), np.nan)
        at = 0
        for key in missing:
            nodes, checks = z[at : at + sizes[0]], z[at + sizes[0] : at + sum(sizes)]
            at += sum(sizes)
            self._patches[key] = self._fitted(key, nodes, checks)

    def _grids(self, key: int) -> list[tuple[Array, Array]]:
        """Return temperatures and pressures of the nodes of a patch, and of its checking grid."""
        tier = self._tier
        tau_middle, tau_half, pressure_middle, pressure_half = _rectangle(key)
        grids = []
        for x, y in ((tier.tau_nodes, tier.pressure_nodes), (tier.tau_checks, tier.pressure_checks)):
            tau = np.repeat(tau_middle + tau_half * x, y.size)
            reduced = np.tile(np.maximum(pressure_middle + pressure_half * y, _LEAST_PRESSURE), x.size)
            grids.append((self._reducing_temperature / tau, reduced * self._reducing_pressure))
        return grids

    def _fitted(self, key: int, nodes: Array, checks: Array) -> _Patch:
        tier = self._tier
        tau_middle, tau_half, pressure_middle, pressure_half = _rectangle(key)
        values = nodes.reshape(tier.tau_nodes.size, tier.pressure_nodes.size)
        # sums in a written order: a product of matrices would leave it to the library
        by_tau = sum(np.multiply.outer(tier.tau_powers[:, i], values[i]) for i in range(tier.tau_nodes.size))
        both = sum(np.multiply.outer(by_tau[:, j], tier.pressure_powers[:, j]) for j in range(tier.pressure_nodes.size))
        coefficients = tuple(tuple(row) for row in both.tolist())
        patch = _Patch(tau_middle, 1.0 / tau_half, pressure_middle, 1.0 / pressure_half, coefficients, 0.0, False)
        x, y = tier.tau_checks, tier.pressure_checks
        tau = np.repeat(tau_middle + tau_half * x, y.size)
        reduced = np.tile(np.maximum(pressure_middle + pressure_half * y, _LEAST_PRESSURE), x.size)
        error = float(np.max(np.abs(_evaluate_block(patch, tau, reduced) / checks - 1.0)))
        # NaN, where a state did not converge, fails the comparison
        return patch._replace(error=error, usable=_SAFETY * error <= self.accuracy)


def _rectangle(key: int) -> tuple[float, float, float, float]:
    """Return middle and half width of a patch in tau and in reduced pressure."""
    row, column = divmod(key, _COLUMNS)
    low, high = _TAU_EDGES[row], _TAU_EDGES[row + 1]
    bottom, top = _PRESSURE_EDGES[column], _PRESSURE_EDGES[column + 1]
    return 0.5 * (low + high), 0.5 * (high - low), 0.5 * (bottom + top), 0.5 * (top - bottom)


def _interval(edges: Sequence[float], values: Array) -> NDArray[np.int8]:
    """Return how many edges lie at or below each value, less one, as ``bisect_right`` counts them."""
    found = np.full(values.size, -1, dtype=np.int8)
    for edge in edges:
        found += values >= edge
    return found


def _evaluate_float(patch: _Patch, tau: float, reduced: float) -> float:
    x = (tau - patch.tau_middle) * patch.tau_scale
    y = (reduced - patch.pressure_middle) * patch.pressure_scale
    total = 0.0
    for row in reversed(patch.coefficients):
        inner = row[-1]
        for coefficient in row[-2::-1]:
            inner = inner * y + coefficient
        total = total * x + inner
    return total


def _evaluate_block(patch: _Patch, tau: Array, reduced: Array) -> Array:
    x = tau - patch.tau_middle
    x *= patch.tau_scale
    y = reduced - patch.pressure_middle
    y *= patch.pressure_scale
    total = np.zeros(tau.size)
    for row in reversed(patch.coefficients):
        inner = y * row[-1]
        inner += row[-2]
        for coefficient in row[-3::-1]:
            inner *= y
            inner += coefficient
        total *= x
        total += inner
    return total
