"""The stated uncertainty of the generalised equations: what was measured against reference equations, and what adds to it.

Relative to density, expanded with k = 2. ``tests/calibration/measure_generalised.py`` measures the tables; the rule is

    u^2 = (f sum x_i u_class,i)^2 + sum over constants (S_c sum x_i e_c,i)^2 + (d sum x_strong u_ideal)^2
          + (s u_mixing)^2 + (s_missing u_missing)^2 + u_molar_mass^2 + (x_associating u_association)^2

* ``u_class``: the 95th percentile of the deviations from the reference equations of the component's class, by reduced
  temperature and p/p_sat (p/pc from Tc on), gas and liquid apart. Classes follow from data: quantum (flagged, or Tc below
  50 K), hydrogen-bonding (a list in the data), polar (reduced dipole moment 1e5 mu^2 pc/Tc^2 in debye, atm and K from 40
  on), non-polar; unknown, measured on all but quantum gases together, where the data hold no dipole moment.
* ``f``: 2 where an acentric factor is beyond those of the gases measured (an estimate), else 1.
* ``S_c e_c``: errors of Tc, pc and omega by the grade of the substance (estimates), with the change of density that each
  makes. Errors of several components are taken to go the same way.
* ``d u_ideal``: a reduced dipole moment from 200 on is larger than that of any gas measured (hydrogen cyanide, nitriles,
  formaldehyde). Their vapours associate, and second virial coefficients of twice what corresponding states gives are known;
  d is an estimate, times what a polar gas differs from the ideal one. It is smaller for the virial equation where it has a
  polar term.
* ``s``: the share of unlike pairs, 1 - sum x_i^2; ``u_mixing`` was measured against GERG-2008, and ``s_missing`` are the
  pairs without a published k_ij, for equations that use one.
* ``u_molar_mass``: molar mass and gas constant, the floor that is left as the pressure goes to 0.
* ``u_association``: 300 % of an associating component, an estimate: a dimer doubles the density, and HF at its boiling
  point is more than three times as dense as its formula says. Such a gas is never good.

A mixture's reduced state is that of mole-fraction averages of Tc, pc and omega. The vapour pressure that tells gas from
liquid is Lee and Kesler's (1975, eqs. 15 to 17), so that temperature and pressure are enough; within 10 % of it the
larger of both uncertainties counts. Tables are interpolated in the logarithms of uncertainty and pressure and linearly in
temperature; below the lowest pressure the part that they give is proportional to pressure, as the second virial
coefficient is. Beyond the other ends of the grid the last value stands, and the basis is ``estimate``. An uncertainty of 1
makes no claim: so it is where an equation refuses, and for the virial equation where the state may be a liquid.

What the reference equations themselves are off (0.02 to 0.5 % in the gas) is part of the deviations, and not added again.
"""

from __future__ import annotations

import math
from bisect import bisect_right
from collections.abc import Collection, Mapping, Sequence
from functools import lru_cache
from itertools import pairwise
from typing import Final

import numpy as np

from gasapi.engine.elementary import Array, Real, exp, log, sqrt
from gasapi.engine.models import ideal_gas, lee_kesler, virial
from gasapi.engine.protocol import Branch
from gasapi.gases.loader import load_generalised_uncertainty, load_interaction
from gasapi.gases.records import Substance
from gasapi.gases.uncertainty_file import ModelTables, Rows, UncertaintyData

__all__ = ["GeneralisedUncertainty", "class_of"]

_ATMOSPHERE: Final = 101325.0
_QUANTUM_BELOW: Final = 50.0
# ln(p/p_sat) within which the phase is not told by temperature and pressure alone
_BAND: Final = math.log(1.1)
_LEAST: Final = 1e-9
_OUTSIDE: Final = 2.0


def class_of(substance: Substance, polar_from: float, hydrogen_bonding: Collection[str]) -> str:
    """Return the class of a substance.

    :param polar_from: reduced dipole moment from which a substance is polar, [-]
    :param hydrogen_bonding: ids of molecules that bond with their like
    """
    if "quantum" in substance.flags or substance.critical_temperature < _QUANTUM_BELOW:
        return "quantum"
    if substance.id in hydrogen_bonding:
        return "hydrogen-bonding"
    if substance.dipole_moment is None:
        return "unknown"
    return "polar" if _reduced_dipole(substance) >= polar_from else "non-polar"


class _Surface:
    """ln(u) over reduced temperature and ln(pressure), bilinear between nodes. Immutable.

    :param temperatures: nodes, [-]
    :param pressures: nodes, [-]
    :param values: u at the nodes, shape (temperatures, pressures), [-]
    """

    __slots__ = (
        "_columns",
        "_flat",
        "_heights",
        "_inverse",
        "_inverse_array",
        "_logs",
        "_logs_array",
        "_rows",
        "_temperatures",
        "_temperatures_array",
        "_widths",
        "_widths_array",
    )

    def __init__(self, temperatures: Sequence[float], pressures: Sequence[float], values: Array) -> None:
        logs = np.log(np.clip(values, _LEAST, 1.0))
        self._rows: list[list[float]] = logs.tolist()
        self._flat = logs.ravel()
        self._columns = len(pressures)
        self._temperatures = list(temperatures)
        self._logs = [math.log(p) for p in pressures]
        self._inverse = [1.0 / (b - a) for a, b in pairwise(temperatures)]
        self._widths = [1.0 / (b - a) for a, b in pairwise(self._logs)]
        self._temperatures_array = np.array(self._temperatures)
        self._logs_array = np.array(self._logs)
        self._inverse_array = np.array(self._inverse)
        self._widths_array = np.array(self._widths)

    def log_float(self, temperature: float, log_pressure: float) -> float:
        """Return ln(u) at one state."""
        nodes, logs = self._temperatures, self._logs
        t = temperature if temperature > nodes[0] else nodes[0]
        t = t if t < nodes[-1] else nodes[-1]
        y = log_pressure if log_pressure > logs[0] else logs[0]
        y = y if y < logs[-1] else logs[-1]
        i = bisect_right(nodes, t, 1, len(nodes) - 1) - 1
        j = bisect_right(logs, y, 1, len(logs) - 1) - 1
        wt = (t - nodes[i]) * self._inverse[i]
        wy = (y - logs[j]) * self._widths[j]
        cold, hot = self._rows[i], self._rows[i + 1]
        low = cold[j] + wy * (cold[j + 1] - cold[j])
        high = hot[j] + wy * (hot[j + 1] - hot[j])
        value = low + wt * (high - low)
        below = log_pressure - logs[0]
        return value + below if below < 0.0 else value

    def log_block(self, temperature: Array, log_pressure: Array) -> Array:
        """Return ln(u) of rows, each of shape (n,)."""
        nodes, logs, flat = self._temperatures_array, self._logs_array, self._flat
        t = np.minimum(np.maximum(temperature, nodes[0]), nodes[-1])
        y = np.minimum(np.maximum(log_pressure, logs[0]), logs[-1])
        i = np.searchsorted(nodes[1:-1], t, side="right")
        j = np.searchsorted(logs[1:-1], y, side="right")
        wt = (t - nodes.take(i)) * self._inverse_array.take(i)
        wy = (y - logs.take(j)) * self._widths_array.take(j)
        cold = i * self._columns + j
        hot = cold + self._columns
        corner, other = flat.take(cold), flat.take(hot)
        low = corner + wy * (flat.take(cold + 1) - corner)
        high = other + wy * (flat.take(hot + 1) - other)
        value = low + wt * (high - low)
        below = log_pressure - logs[0]
        return np.where(below < 0.0, value + below, value)


class GeneralisedUncertainty:
    """The uncertainty of one generalised model for one gas. Immutable.

    :param model: id of the equation
    :param substances: the components
    :param fractions: mole fractions in the same order, summing to 1, [-]
    """

    basis = "calibration"

    def __init__(self, model: str, substances: Sequence[Substance], fractions: Sequence[float]) -> None:
        data = load_generalised_uncertainty()
        tables = data.models[model]
        parts = list(zip(fractions, substances, strict=True))
        self._tc = math.fsum(x * s.critical_temperature for x, s in parts)
        self._pc = math.fsum(x * s.critical_pressure for x, s in parts)
        self._omega = math.fsum(x * s.acentric_factor for x, s in parts)
        self._virial = _virial(model, substances, fractions)
        low, high = data.acentric_factors
        outside = any(not low <= s.acentric_factor <= high for x, s in parts)
        strong = math.fsum(x * _departure(s, data, self._virial) for x, s in parts)
        association = data.association * math.fsum(x for x, s in parts if "associating" in s.flags)
        self._constant = data.molar_mass * data.molar_mass + association * association
        if outside or strong > 0.0 or association > 0.0:
            self.basis = "estimate"
        grid = data.grid
        self._coldest, self._hottest = grid.temperatures[0], grid.temperatures[-1]
        self._densest = grid.gas_pressures[-1]
        classes: dict[str, float] = {}
        for x, s in parts:
            name = class_of(s, data.polar_from, data.hydrogen_bonding)
            classes[name] = classes.get(name, 0.0) + x * (_OUTSIDE if outside else 1.0)
        errors = [
            (name, math.fsum(x * getattr(data.grades[s.grade], name) for x, s in parts)) for name in sorted(tables.constants)
        ]
        added = _mixing_parts(tables, substances, fractions)
        if strong > 0.0:
            added.append((strong, _array(data.models[ideal_gas.ID].gas["polar"])))
        self._gas = _Surface(
            grid.temperatures, grid.gas_pressures, _total(tables.gas, classes, data.gas_sensitivity, errors, added)
        )
        self._liquid: _Surface | None = None
        if tables.liquid:
            total = _total(tables.liquid, classes, data.liquid_sensitivity, errors, ())
            if outside and model == lee_kesler.ID:
                # linear in omega, and its liquid was seen to be unstable there
                total = np.ones_like(total)
            self._liquid = _Surface(grid.liquid_temperatures, grid.liquid_pressures, total)

    def at(self, temperature: float, pressure: float, density: float) -> float:
        """Return the uncertainty at one state (K, Pa; the density is not looked at), [-]."""
        t = temperature / self._tc
        reduced = log(pressure / self._pc)
        if t >= 1.0:
            value = self._gas.log_float(t, reduced)
            ratio = -1.0
        else:
            ratio = reduced - self._log_vapour_pressure(t, log(t))
            if ratio <= -_BAND:
                value = self._gas.log_float(t, ratio)
            elif ratio < _BAND:
                value = self._gas.log_float(t, ratio if ratio < 0.0 else 0.0)
                if self._liquid is not None:
                    liquid = self._liquid.log_float(t, reduced)
                    value = value if value > liquid else liquid
            else:
                value = 0.0 if self._liquid is None else self._liquid.log_float(t, reduced)
        if self._virial is not None and (ratio > -_BAND or self._virial.density(temperature, pressure, Branch.GAS).status != 0):
            value = 0.0
        u = exp(value)
        return sqrt(u * u + self._constant)

    def block(self, temperature: Array, pressure: Array, density: Array) -> Array:
        """Return the uncertainty of rows, each of shape (n,), [-]; the same numbers as ``at``."""
        t = temperature / self._tc
        reduced = log(pressure / self._pc)
        cold = t < 1.0
        held = np.where(cold, t, 1.0)
        ratio = np.where(cold, reduced - self._log_vapour_pressure(held, log(held)), -1.0)
        value = self._gas.log_block(t, np.where(cold, np.minimum(ratio, 0.0), reduced))
        rows = np.flatnonzero(ratio > -_BAND)
        if rows.size:
            near = ratio.take(rows) < _BAND
            gas = value.take(rows)
            if self._liquid is None:
                value[rows] = np.where(near, gas, 0.0)
            else:
                liquid = self._liquid.log_block(t.take(rows), reduced.take(rows))
                value[rows] = np.where(near & (gas > liquid), gas, liquid)
        if self._virial is not None:
            refused = self._virial.density(temperature, pressure, Branch.GAS).status != np.int8(0)
            value[refused | (ratio > -_BAND)] = 0.0
        u = exp(value)
        return sqrt(u * u + self._constant)

    def basis_at(self, temperature: float, pressure: float, density: float) -> str:
        """Return where the uncertainty comes from: ``calibration``, or ``estimate`` beyond the states that were measured."""
        measured = self._coldest * self._tc <= temperature <= self._hottest * self._tc and pressure <= self._densest * self._pc
        return self.basis if measured else "estimate"

    def _log_vapour_pressure(self, t: Real, logarithm: Real) -> Real:
        t3 = t * t * t
        t6 = t3 * t3
        simple = 5.92714 - 6.09648 / t - 1.28862 * logarithm + 0.169347 * t6
        departure = 15.2518 - 15.6875 / t - 13.4721 * logarithm + 0.43577 * t6
        return simple + self._omega * departure


def _virial(model: str, substances: Sequence[Substance], fractions: Sequence[float]) -> virial.Virial | None:
    """Return the virial equation, which says where it refuses at little cost; None for any other."""
    if model != virial.ID:
        return None
    return virial.Virial(substances, fractions)


def _departure(substance: Substance, data: UncertaintyData, equation: virial.Virial | None) -> float:
    """Return the factor of ``u_ideal`` for a substance more polar than those that were measured, else 0."""
    if substance.dipole_moment is None or "associating" in substance.flags:
        return 0.0
    if _reduced_dipole(substance) < data.strongly_polar_from:
        return 0.0
    has_term = equation is not None and substance.id not in equation.without_polar_term
    return data.strong_departure_with_polar_term if has_term else data.strong_departure


def _reduced_dipole(substance: Substance) -> float:
    assert substance.dipole_moment is not None
    tc, pc = substance.critical_temperature, substance.critical_pressure / _ATMOSPHERE
    return 1e5 * substance.dipole_moment**2 * pc / (tc * tc)


def _mixing_parts(
    tables: ModelTables, substances: Sequence[Substance], fractions: Sequence[float]
) -> list[tuple[float, Array]]:
    """Return the parts of unlike pairs, each as its share and its table."""
    unlike = 1.0 - math.fsum(x * x for x in fractions)
    if len(substances) == 1 or unlike <= 0.0:
        return []
    parts = [(unlike, _array(tables.mixing))]
    if tables.missing_interaction is not None:
        known = load_interaction()
        missing = math.fsum(
            2.0 * fractions[i] * fractions[j]
            for i in range(len(substances))
            for j in range(i)
            if _pair(substances[i].id, substances[j].id) not in known
        )
        if missing > 0.0:
            parts.append((missing, _array(tables.missing_interaction)))
    return parts


def _pair(first: str, second: str) -> tuple[str, str]:
    return (first, second) if first < second else (second, first)


@lru_cache(maxsize=256)
def _array(rows: Rows) -> Array:
    table = np.array(rows)
    table.flags.writeable = False
    return table


def _total(
    tables: Mapping[str, Rows],
    classes: Mapping[str, float],
    sensitivity: Mapping[str, Rows],
    errors: Sequence[tuple[str, float]],
    added: Sequence[tuple[float, Array]],
) -> Array:
    """Return the root of the sum of squares of all parts that depend on the state; 1 where any class makes no claim."""
    own = [(x, _array(tables[name])) for name, x in classes.items()]
    total = np.zeros_like(own[0][1])
    silent = np.zeros(total.shape, dtype=bool)
    for x, table in own:
        total += x * table
        silent |= table >= 1.0
    total *= total
    for name, error in errors:
        part = error * _array(sensitivity[name])
        total += part * part
    for share, table in added:
        part = share * table
        total += part * part
    return np.where(silent, 1.0, np.sqrt(total))
