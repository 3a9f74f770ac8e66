"""The water dew line: where a nearly pure liquid water forms beside a gas or a dense fluid.

The aqueous phase may hold water and, as solutes, small gases whose interaction with water was fitted; hydrocarbons are kept
out of it, since their combining rule with water is a guess and an unrestricted trial finds a water-hydrocarbon liquid that
no one has measured. Below the temperature at which the equation has a trustworthy liquid water, its fugacity follows the
vapour pressure of supercooled water (Murphy and Koop, Q. J. R. Meteorol. Soc. 131 (2005) 1539, eq. 10), scaled to
join the equation's own. Ice is not modelled; its line lies up to some kelvin higher, see ``frost_excess``.
"""

from __future__ import annotations

import math
from typing import Final, NamedTuple

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.phase.energy import Floats, MixtureEnergy
from gasapi.engine.phase.incipient import IncipientPhase
from gasapi.engine.protocol import Branch, Fluid, Status

__all__ = [
    "COLD",
    "COLD_DENSITY",
    "SOLUTES",
    "WATER",
    "LiquidWater",
    "WaterLine",
    "frost_excess",
    "is_dry",
    "supercooled_vapour_pressure",
    "water_line",
]

WATER: Final = "water"

SOLUTES: Final = frozenset(
    {"methane", "carbon-dioxide", "hydrogen-sulfide", "nitrogen", "oxygen", "argon", "sulfur-dioxide", "carbonyl-sulfide"}
)
"""What the aqueous phase may hold besides water."""

COLD: Final = 240.0
COLD_DENSITY: Final = 54_400.0
_LOWEST: Final = 150.0
_PUREST: Final = 0.85
_MOST_STEPS: Final = 16
_LONGEST_STEP: Final = 0.06
_DONE: Final = 1e-9
_DRYNESS: Final = 0.03
"""By how much ln f of water in the gas has to be below that of liquid water: solutes in it take some of it away."""


class WaterLine(NamedTuple):
    """Dew temperatures, K, at given ln p, shape (m,), and which of them were found."""

    log_pressure: Floats
    temperature: Floats
    found: NDArray[np.bool_]


def supercooled_vapour_pressure(temperature: Floats) -> Floats:
    """Return the vapour pressure of liquid water, Pa, for 123 K < T < 332 K (Murphy and Koop 2005, eq. 10)."""
    t = temperature
    log_t = np.log(t)
    return np.exp(
        54.842763
        - 6763.22 / t
        - 4.210 * log_t
        + 0.000367 * t
        + np.tanh(0.0415 * (t - 218.8)) * (53.878 - 1331.22 / t - 9.44523 * log_t + 0.014025 * t)
    )


def frost_excess(dew_temperature: float) -> float:
    """Return by how many kelvin frost forms above a dew point of supercooled water (0 from 273.16 K on).

    The vapour pressures of supercooled water and ice differ by a factor that falls by 1 % a kelvin, and each by 9 to 10 %: the
    excess is a little over a tenth of the distance to the triple point. Common practice; Murphy and Koop's equations give
    1.1 K at 263 K, 2.2 K at 253 K and 3.9 K at 233 K.
    """
    below = 273.16 - dew_temperature
    return 0.12 * below if below > 0.0 else 0.0


class LiquidWater:
    """The fugacity of pure liquid water by the equation, continued below 240 K. Immutable.

    :param energy: the equation of state; water is one of its components
    :param cold: whether the equation has no trustworthy liquid water below 240 K
    """

    def __init__(self, energy: MixtureEnergy, cold: bool) -> None:
        self._energy = energy
        self._pure = np.zeros(len(energy.components))
        self.index = energy.components.index(WATER)
        self._pure[self.index] = 1.0
        self._scale: float | None = None
        if cold:
            # the Poynting factor is taken off again: below the join it has a constant volume
            log_f, _, good = self._own(np.array([COLD]), np.array([1e5]))
            self._scale = math.nan
            if good[0]:
                reduced = float(log_f[0]) - 1e5 / (COLD_DENSITY * energy.gas_constant * COLD)
                self._scale = reduced - float(np.log(supercooled_vapour_pressure(np.array([COLD])))[0])

    def _own(self, temperature: Floats, pressure: Floats) -> tuple[Floats, Floats, NDArray[np.bool_]]:
        rows = np.broadcast_to(self._pure, (temperature.size, self._pure.size))
        rho, status = self._energy.density(temperature, pressure, rows, Branch.LIQUID)
        return *_log_fugacity(self._energy, temperature, rho, rows, self.index), status == Status.CONVERGED

    def log_fugacity(self, temperature: Floats, pressure: Floats) -> tuple[Floats, Floats, NDArray[np.bool_]]:
        """Return ln(f/Pa), its derivative in ln T at fixed p, and whether it is known, each of shape (m,).

        :param temperature: K, shape (m,)
        :param pressure: Pa, shape (m,)
        """
        value, slope, good = np.empty(temperature.size), np.empty(temperature.size), np.zeros(temperature.size, dtype=bool)
        cold = temperature < COLD if self._scale is not None else np.zeros(temperature.size, dtype=bool)
        warm = np.flatnonzero(~cold)
        if warm.size:
            value[warm], slope[warm], good[warm] = self._own(temperature[warm], pressure[warm])
        rows = np.flatnonzero(cold)
        if rows.size and self._scale is not None:
            t = temperature[rows]
            poynting = pressure[rows] / (COLD_DENSITY * self._energy.gas_constant * t)
            here = np.log(supercooled_vapour_pressure(t))
            value[rows] = self._scale + here + poynting
            slope[rows] = (np.log(supercooled_vapour_pressure(t * 1.0001)) - here) / math.log(1.0001) - poynting
            good[rows] = math.isfinite(self._scale)
        return value, slope, good


def _log_fugacity(
    energy: MixtureEnergy, temperature: Floats, density: Floats, fractions: Floats, index: int
) -> tuple[Floats, Floats]:
    """Return ln(f/Pa) of one component and its derivative in ln T at fixed pressure and composition."""
    d = energy.derivatives(temperature, density[:, None] * fractions)
    summed = (d.hessian * fractions[:, None, :]).sum(axis=2)
    stiffness = 1.0 + (summed * fractions).sum(axis=1)
    expansion = -(d.compressibility + d.compressibility_slope) / stiffness
    value = d.potential[:, index] + np.log(fractions[:, index] * density * energy.gas_constant * temperature)
    return value, 1.0 + d.potential_slope[:, index] + (1.0 + summed[:, index]) * expansion


def water_line(
    energy: MixtureEnergy, fluid: Fluid, fractions: Floats, log_pressure: Floats, branch: Branch, liquid: LiquidWater
) -> WaterLine:
    """Return the dew temperatures of water: first for pure liquid water, then with the solutes in it.

    :param energy: the equation of state
    :param fluid: the same at the composition of the feed
    :param fractions: mole fractions of the feed, shape (n,), all above 0, [-]
    :param log_pressure: ln p, rising, shape (m,)
    :param branch: the density root of the feed
    :param liquid: the liquid water of the equation
    """
    water = liquid.index
    tc, pc = float(energy.critical_temperatures[water]), float(energy.critical_pressures[water])
    growth = 5.373 * (1.0 + float(energy.acentric_factors[water]))
    partial = log_pressure + math.log(fractions[water])
    pressure = np.exp(log_pressure)
    m = log_pressure.size
    t = tc / (1.0 - np.minimum(partial - math.log(pc), -0.05) / growth)
    density = np.full(m, np.nan)
    found = np.zeros(m, dtype=bool)
    rows = np.arange(m)
    with np.errstate(all="ignore"):
        for _ in range(_MOST_STEPS):
            here, p = t[rows], pressure[rows]
            root = fluid.density(here, p, branch)
            density[rows] = root.density
            known = root.status == Status.CONVERGED
            feed = np.broadcast_to(fractions, (rows.size, fractions.size))
            vapour, vapour_slope = _log_fugacity(energy, here, root.density, feed, water)
            value, slope, good = liquid.log_fugacity(here, p)
            step = (vapour - value) / (slope - vapour_slope)
            # a branch that does not reach this pressure, or a liquid that does not exist: go where they do
            step = np.where(known, step, -0.02 if branch == Branch.LIQUID else 0.02)
            step = np.where(good & np.isfinite(step), step, np.where(here > 450.0, -0.02, 0.02))
            step = np.clip(step, -_LONGEST_STEP, _LONGEST_STEP)
            t[rows] = np.clip(here * np.exp(step), _LOWEST, 0.999 * tc)
            done = known & good & (np.abs(step) < _DONE)
            found[rows[done]] = True
            rows = rows[~done]
            if rows.size == 0:
                break
    warm = np.flatnonzero(found & (t > COLD + 1.0))
    if warm.size:
        t[warm] = _with_solutes(energy, fractions, water, log_pressure[warm], t[warm], density[warm])
    return WaterLine(log_pressure, np.where(found, t, np.nan), found)


def is_dry(
    energy: MixtureEnergy, fluid: Fluid, fractions: Floats, temperature: Floats, log_pressure: Floats, liquid: LiquidWater
) -> NDArray[np.bool_]:
    """Return for gaseous states whether pure liquid water would evaporate into them, shape (m,).

    :param temperature: K, shape (m,)
    :param log_pressure: ln p, shape (m,)
    """
    if temperature.size == 0:
        return np.ones(0, dtype=bool)
    water, pressure = liquid.index, np.exp(log_pressure)
    root = fluid.density(temperature, pressure, Branch.GAS)
    feed = np.broadcast_to(fractions, (temperature.size, fractions.size))
    vapour, _ = _log_fugacity(energy, temperature, root.density, feed, water)
    value, _, good = liquid.log_fugacity(temperature, pressure)
    hot = temperature > float(energy.critical_temperatures[water])
    return hot | (good & (root.status == Status.CONVERGED) & (vapour < value - _DRYNESS))


def _with_solutes(
    energy: MixtureEnergy, fractions: Floats, water: int, log_pressure: Floats, temperature: Floats, density: Floats
) -> Floats:
    """Return the dew temperatures with solutes in the aqueous phase; those for pure water where that fails."""
    allowed = np.array([c == WATER or c in SOLUTES for c in energy.components])
    system = IncipientPhase(energy, fractions, allowed)
    k, m = system.active.size, temperature.size
    place = int(np.flatnonzero(system.active == water)[0])
    aqueous = np.zeros((m, fractions.size))
    aqueous[:, water] = 1.0
    rho_w, status = energy.density(temperature, np.exp(log_pressure), aqueous, Branch.LIQUID)
    d = energy.derivatives(
        np.concatenate([temperature, temperature]),
        np.concatenate([density[:, None] * fractions, rho_w[:, None] * aqueous]),
    )
    start = np.empty((m, system.size))
    start[:, :k] = np.minimum(
        (d.potential[:m] - d.potential[m:])[:, system.active],
        np.log(0.03 * rho_w / density)[:, None] - np.log(fractions[system.active]),
    )
    start[:, place] = np.log(rho_w / (density * fractions[water]))
    start[:, k] = np.log(density)
    start[:, k + 1] = np.log(temperature)
    points = system.solve(start, -1, log_pressure)
    phase = system.incipient_densities(points.unknown)
    total = phase.sum(axis=1)
    solved = np.exp(points.unknown[:, k + 1])
    good = points.converged & (status == Status.CONVERGED) & (phase[:, water] > _PUREST * total)
    good &= np.abs(solved / temperature - 1.0) < 0.05
    return np.where(good, solved, temperature)
