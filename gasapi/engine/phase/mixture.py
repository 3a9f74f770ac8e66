"""The phase of a mixture: one object a composition, microseconds a state.

How a service calls it::

    phase = mixture_phase(system, fractions)      # GergSystem or CubicMixture; 20 to 60 ms, keep it in a bounded cache
    verdict = phase.at(temperature, pressure)     # region, dew point, margins, flags: some 10 us
    verdicts = phase.block(temperature, pressure) # the same bits for arrays
    regions = phase.region_block(temperature, pressure)       # regions alone, where margins are not asked for
    region, near = phase.survey_float(temperature, pressure, 5.0)   # and survey_block: what quality needs
    phase.outline()                               # arrays and named points for a phase diagram
    phase.flash(temperature, pressure)            # two phases at one state (milliseconds)

On construction the boundary of the dry mixture is traced and the water dew line solved at fixed pressures, both with shapes
that depend on the composition only, and kept as cubics on equal cells: T(p) in w = sqrt(ln p_max - ln p), which passes the
cricondenbar without a break, and ln p(T) in u = sqrt(T_max - T), which passes the cricondentherm. Values at the knots are
rounded (1e-7 K, 1e-10 in ln p) before the cubics are made, so that nothing hangs on the last bits of a linear solve. Whatever
the tables do not cover is put to a direct stability test, one state at a time; so a block has the bits of its states.

The ``critical``, ``outline`` and curves are those of the gas without its water, at its share of the pressure; a boundary
that cannot be traced leaves every state to the direct test (some 20 ms each: a service may wish to bound how many it allows).
The equation is never asked about solids: ice and hydrates are flags, dry ice and frozen heavy ends are not told.

Where both a hydrocarbon liquid and liquid water can form, the dew point is the higher of the two. States below both lines are
two-phase here, although a third phase may be present.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from functools import cached_property
from typing import Final

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.elementary import Array, log
from gasapi.engine.models.cubic import CubicMixture
from gasapi.engine.models.gerg_2008 import GergSystem
from gasapi.engine.models.gerg_2008_fugacity import GergEnergy
from gasapi.engine.phase.boundary import NamedPoint
from gasapi.engine.phase.cubic_energy import CubicEnergy
from gasapi.engine.phase.curves import DIRECT, WaterCurve
from gasapi.engine.phase.dry_boundary import NO_DEW_POINT, dry_boundary
from gasapi.engine.phase.energy import Floats, MixtureEnergy
from gasapi.engine.phase.flash import FlashResult, two_phase_flash
from gasapi.engine.phase.mixture_verdict import (
    UNSURE,
    DewKind,
    DewUncertainty,
    MixtureBlock,
    MixtureFlag,
    MixtureOutline,
    MixtureVerdict,
    kelvin_block,
    kelvin_float,
)
from gasapi.engine.phase.region import Region
from gasapi.engine.phase.spline import spline_slopes
from gasapi.engine.phase.stability import Stability, StabilityResult, StabilityTest
from gasapi.engine.phase.table import CubicTable
from gasapi.engine.phase.water import WATER, LiquidWater, frost_excess, is_dry, water_line
from gasapi.engine.protocol import Branch, Fluid

__all__ = [
    "DewKind",
    "DewUncertainty",
    "MixtureBlock",
    "MixtureFlag",
    "MixtureOutline",
    "MixturePhase",
    "MixtureVerdict",
    "is_near",
    "mixture_phase",
]

_GAS: Final = int(Region.GAS)
_SUPERCRITICAL: Final = int(Region.SUPERCRITICAL)
_LIQUID: Final = int(Region.LIQUID)
_TWO_PHASE: Final = int(Region.TWO_PHASE)
_UNKNOWN: Final = int(Region.UNKNOWN)

LOWEST_TEMPERATURE: Final = 60.0
"""K: the lower end of the extended range of GERG-2008; taken for the cubic equations as well."""

_LOG_LOWEST: Final = math.log(1e3)
_LOG_HIGHEST: Final = math.log(1.5e8)
_WATER_NODES: Final = 48
_FEWEST: Final = 6
_BLOCK_ROWS: Final = 4096
_JUMP: Final = 6.0
_DRY_FLOOR: Final = 15.0

# a mixture whose boundary is not known is a single phase well above all its critical temperatures, gas-gas equilibria of
# helium and hydrogen at hundreds of megapascal apart. Common practice, no source.
_HOT: Final = 1.3
_HOT_PRESSURE: Final = 1e8

# scarce and heavy components that may fall out before the bulk of the gas condenses
_SCARCE: Final = 0.02
_HEAVIER: Final = 1.5

# clathrate formers, and below which temperature and above which pressure a warning is due: the hydrate lines of hydrogen
# sulfide and methane end near 302 K in practice. Common practice, no source.
_HYDRATE_FORMERS: Final = frozenset(
    {"methane", "ethane", "propane", "isobutane", "n-butane", "carbon-dioxide", "hydrogen-sulfide", "nitrogen", "oxygen"}
    | {"argon", "krypton", "xenon", "ethylene", "cyclopropane", "sulfur-dioxide"}
)
_HYDRATE_TEMPERATURE: Final = 303.0
_HYDRATE_PRESSURE: Final = 1e5
_HYDRATE_NEAR: Final = 8.0
_TRIPLE: Final = 273.16
_NEAR_TEMPERATURE: Final = 0.02
_NEAR_PRESSURE: Final = 0.1
_CLOSE_PER_KELVIN: Final = 0.006

_LIGHT: Final = 460.0
"""K: critical temperatures of the butanes lie below, those of the pentanes at it or above."""

_LOG_CHECKED: Final = math.log(3e7)
_LOG_HOT: Final = math.log(_HOT_PRESSURE)
_WATER_CRITICAL: Final = 660.0

# what a state is by several curves: the worst that one of them says
_RANKED: Final = np.array([_GAS, _LIQUID, DIRECT, _TWO_PHASE], dtype=np.int8)
_RANK: Final = np.zeros(256, dtype=np.int8)
_RANK[_LIQUID], _RANK[DIRECT], _RANK[_TWO_PHASE] = 1, 2, 3


def _worse(one: int, other: int) -> int:
    return int(_RANKED[max(_RANK[one], _RANK[other])])


def _margin_temperature(t: float, region: int, dew: float, up: float, low: float) -> float:
    """Return the margin to the dew point, or to the nearer end of the two-phase range; NaN for none."""
    if region == _UNKNOWN:
        return math.nan
    margin = t - dew
    rise = t - low
    if region == _LIQUID:
        # a liquid without a bubble line at this pressure has no margin to the gas
        return (rise if rise < 0.0 else 0.0) if rise == rise else margin if up == up else math.nan
    if region == _TWO_PHASE and rise < -margin:
        # never above zero, though the curves meet only to their own accuracy
        return -rise if rise > 0.0 else 0.0
    return margin


def _share(energy: MixtureEnergy, z: Floats, kept: Sequence[int]) -> tuple[MixtureEnergy, Floats, float]:
    """Return part of a mixture by itself: equation, fractions, and by how much the ln p of the whole exceeds its own.

    Exact for an ideal gas, and what is left out is scarce wherever it does not condense first.
    """
    left = z[list(kept)]
    share = math.fsum(left.tolist())
    return energy.subset(kept), left / share, -math.log(share)


class MixturePhase:
    """The phase of one composition by one equation. Immutable, and safe to share between threads.

    ``boundary`` is the traced boundary of the dry mixture or None, ``end`` why the trace ended, ``critical`` the critical point
    on it or None.

    :param energy: the equation of state for phase equilibria
    :param fluid: the same equation at this composition
    :param fractions: mole fractions in the order of the energy's components, all above 0, [-]
    :param dry: the numbers of the components without water, where liquid water does not mix with the rest; else None
    :param cold_water: whether the equation has no trustworthy liquid water below 240 K
    :param uncertainty: of the dew temperature of the dry mixture, and of water
    """

    def __init__(
        self,
        energy: MixtureEnergy,
        fluid: Fluid,
        fractions: Sequence[float],
        dry: Sequence[int] | None = None,
        cold_water: bool = False,
        uncertainty: tuple[DewUncertainty, DewUncertainty] = (UNSURE, UNSURE),
    ) -> None:
        z = np.array(fractions, dtype=np.float64)
        names = energy.components
        self.energy, self.fluid, self.fractions = energy, fluid, tuple(z.tolist())
        self.model = fluid.model
        self.hydrocarbon_uncertainty, self.water_uncertainty = uncertainty
        self._wet = dry is not None
        self._icy = WATER in names
        self._hydrates = self._icy and not _HYDRATE_FORMERS.isdisjoint(names)
        liquid = LiquidWater(energy, cold_water) if self._wet else None
        self._test = StabilityTest(energy, z, liquid)
        rest, traced, shift = energy, z, 0.0
        if dry is not None:
            rest, traced, shift = _share(energy, z, dry)
        self._shift = shift
        self._hot = _HOT * float(rest.critical_temperatures.max())
        with np.errstate(all="ignore"):
            found = dry_boundary(rest, traced, shift, LOWEST_TEMPERATURE)
        self._curves, self.boundary, self.end, self._doubts = found.curves, found.boundary, found.end, found.doubts
        self._coldest_sure, self._find_cold = found.coldest_sure, found.cold
        known = bool(self._curves)
        self._never = not known and self._never_condenses(rest, traced)
        self._odd = not known and not self._never
        self._closed = bool(self._curves) and all(c.closed for c in self._curves)
        self._lowest_curve = min(self._curves, key=lambda c: c.log_first, default=None)
        self._log_top = max((c.log_top for c in self._curves), default=-math.inf)
        self._set_critical(rest, traced)
        self._water_gas: WaterCurve | None = None
        self._water_dense: WaterCurve | None = None
        self._water_unsure = False
        if liquid is not None:
            with np.errstate(all="ignore"):
                self._solve_water(z, liquid)

    # construction

    @cached_property
    def _cold_liquid(self) -> float:
        """Return the temperature below which a dense single phase is left to the direct test, found when it is first asked for.

        It depends on the composition alone, so that two threads that find it at once find the same.
        """
        with np.errstate(all="ignore"):
            return self._find_cold()

    def _never_condenses(self, rest: MixtureEnergy, z: Floats) -> bool:
        """Return whether the dry gas is stable at the lowest temperature of the equation at every pressure tried."""
        if self.end != NO_DEW_POINT:
            return False
        if float(rest.critical_temperatures.max()) < LOWEST_TEMPERATURE:
            return True
        test = StabilityTest(rest, z, None)
        pressures = (1e4, 1e5, 5e5, 2e6, 5e6, 1e7, 3e7, 7e7)
        return all(test.at(LOWEST_TEMPERATURE, p).verdict == Stability.STABLE for p in pressures)

    def _set_critical(self, rest: MixtureEnergy, z: Floats) -> None:
        """Choose the critical point, and tabulate Z along its isochore."""
        point = None if self.boundary is None or self._odd else self.boundary.critical
        self.critical = self._shifted(point)
        if point is not None:
            t, rho = point.temperature, point.density
        else:
            # no critical point on the traced part: pseudo-critical values for telling gas from dense fluid
            t = float((z * rest.critical_temperatures).sum())
            rho = float(rest.close_packing(z[None])[0]) / 3.6
            t = max([t, *(c.hottest for c in self._curves)])
        self._critical_temperature, self._critical_density = t, rho
        inverse = np.linspace(0.1, 1.0, 65)
        temperature = t / inverse
        p = self.fluid.pressure(temperature, np.full(65, rho)).pressure
        factor = p / (rho * self.energy.gas_constant * temperature)
        slopes = spline_slopes(inverse, factor)
        self._isochore = CubicTable(0.1, 1.0, np.round(factor, 11), np.round(slopes, 11))
        self._isochore_scale = rho * self.energy.gas_constant
        self._critical_pressure = float(p[-1]) if self.critical is None else self.critical.pressure

    def _shifted(self, point: NamedPoint | None) -> NamedPoint | None:
        """Return a point of the dry mixture at the pressure of the whole."""
        if point is None or self._shift == 0.0:
            return point
        share = math.exp(self._shift)
        return NamedPoint(point.temperature, point.pressure * share, point.density * share)

    def _solve_water(self, z: Floats, liquid: LiquidWater) -> None:
        log_p = np.linspace(_LOG_LOWEST, _LOG_HIGHEST, _WATER_NODES)
        line = water_line(self.energy, self.fluid, z, log_p, Branch.GAS, liquid)
        dew = np.full(log_p.size, -np.inf)
        for curve in self._curves:
            dew = np.maximum(dew, curve.dew_temperature(log_p))
        # where the gas condenses first, its metastable water line is of no use
        good = line.found & ~(line.temperature < dew - _DRY_FLOOR)
        count = _leading(good, line.temperature)
        if count >= _FEWEST:
            self._water_gas = WaterCurve(log_p[:count], line.temperature[:count])
        else:
            count = 0
        # where no line was kept, the gas has to condense before water does
        rest = np.flatnonzero((np.arange(_WATER_NODES) >= count) & (log_p <= self._log_top) & np.isfinite(dew))
        self._water_unsure = not self._curves or not bool(
            is_dry(self.energy, self.fluid, z, dew[rest] + 0.5, log_p[rest], liquid).all()
        )
        if count < _WATER_NODES and self._closed:
            line = water_line(self.energy, self.fluid, z, log_p, Branch.LIQUID, liquid)
            back = _leading(line.found[::-1], line.temperature[::-1])
            if back >= _FEWEST:
                self._water_dense = WaterCurve(log_p[-back:], line.temperature[-back:])

    # one state

    def _survey_float(self, t: float, lp: float) -> tuple[int, float, float, float]:
        """Return the region (or DIRECT), dew and bubble temperature of the dry mixture, and the water dew point.

        NaN where there is none.
        """
        region, up, low = _GAS, math.nan, math.nan
        if self._odd:
            region = _GAS if t > self._hot and lp < _LOG_HOT else DIRECT
        elif not self._never:
            for curve in self._curves:
                state, here, bubble = curve.state_float(t, lp)
                if not here <= up:
                    up = here if here == here else up
                    low = bubble if here == here else low
                region = _worse(region, state)
            if lp > self._log_top and region == _GAS and t < self._critical_temperature:
                region = _LIQUID
            if (
                t < self._coldest_sure
                and (region == _LIQUID or (region == _GAS and lp > self._log_top))
                and t < self._cold_liquid
            ):
                region = DIRECT
            for low, high, warm in self._doubts:
                if low <= lp <= high and t < warm and region != _TWO_PHASE:
                    region = DIRECT
        water = math.nan
        if self._wet:
            water, unsure = self._water_float(lp, region == _LIQUID)
            if t < water:
                region = _TWO_PHASE
            elif unsure and region != _TWO_PHASE and not (t > self._hot and lp < _LOG_HOT and t > _WATER_CRITICAL):
                region = DIRECT
        if t < LOWEST_TEMPERATURE:
            region = _UNKNOWN
        return region, up, low, water

    def _water_float(self, lp: float, liquid: bool) -> tuple[float, bool]:
        """Return the water dew temperature, NaN for none, and whether there should be one but it is not known."""
        gas, dense = self._water_gas, self._water_dense
        if gas is not None and lp <= gas.high and (not liquid or dense is None):
            return gas.temperature_float(lp), False
        if liquid or lp > self._log_top:
            if dense is not None and dense.low <= lp <= dense.high:
                return dense.temperature_float(lp), False
            return math.nan, True
        return math.nan, self._water_unsure

    def at(self, temperature: float, pressure: float) -> MixtureVerdict:
        """Return the verdict on one state.

        :param temperature: K
        :param pressure: Pa
        """
        t, p = temperature, pressure
        if not (0.0 < t < math.inf and 0.0 < p < math.inf):
            return MixtureVerdict(_UNKNOWN, None, 0, None, None, None, 0)
        lp = log(p)
        region, up, low, water = self._survey_float(t, lp)
        direct = region == DIRECT
        if direct:
            region = self._direct(t, p)
        region = self._name_float(t, p, region)
        kelvin = None
        if up == up and not water >= up:
            dew, kind, kelvin = up, 1, kelvin_float(self.hydrocarbon_uncertainty, p)
        elif water == water:
            dew, kind, kelvin = water, 2, kelvin_float(self.water_uncertainty, p)
        else:
            dew, kind = math.nan, 0
        margin_t = _margin_temperature(t, region, dew, up, low)
        margin_p = math.nan if direct or region == _UNKNOWN else self._margin_pressure(t, p, region, t < water)
        return MixtureVerdict(
            region,
            dew if dew == dew else None,
            kind,
            margin_t if margin_t == margin_t else None,
            margin_p if margin_p == margin_p else None,
            kelvin,
            self._flags_float(t, p, lp, up, water) | (32 if direct else 0),
        )

    def _direct(self, t: float, p: float) -> int:
        """Return the region by a stability test of this one state."""
        if t < LOWEST_TEMPERATURE:
            return _UNKNOWN
        result = self._test.at(t, p)
        if result.verdict == Stability.UNSTABLE:
            return _TWO_PHASE
        if result.verdict == Stability.UNKNOWN or not result.feed_density > 0.0:
            return _UNKNOWN
        dense = result.feed_density >= self._critical_density
        return _LIQUID if dense and t < self._critical_temperature else _GAS

    def _name_float(self, t: float, p: float, region: int) -> int:
        """Call a gas above the critical point and at or above its density supercritical."""
        if region != _GAS or t < self._critical_temperature or p < self._critical_pressure:
            return region
        dense = p >= self._isochore_scale * t * self._isochore(self._critical_temperature / t)
        return _SUPERCRITICAL if dense else _GAS

    def _margin_pressure(self, t: float, p: float, region: int, wet: bool) -> float:
        """Return the distance to the nearest line, negative where it has to be crossed to reach the gas; NaN for none."""
        gap, depth = math.inf, -1.0
        for curve in self._curves:
            distance, inside = curve.distance_float(t, p)
            if inside:
                depth = distance if distance > depth else depth
            else:
                gap = distance if distance < gap else gap
        if self._wet:
            nearest = self._water_distance_float(t, p)
            if wet:
                depth = nearest if nearest > depth else depth
            else:
                gap = nearest if nearest < gap else gap
        if region == _TWO_PHASE and depth >= 0.0:
            gap = depth
        if gap == math.inf:
            return math.nan
        return -gap if region in (_TWO_PHASE, _LIQUID) else gap

    def _water_distance_float(self, t: float, p: float) -> float:
        nearest = math.inf
        for curve in (self._water_gas, self._water_dense):
            if curve is not None:
                distance = curve.distance_float(t, p)
                nearest = distance if distance < nearest else nearest
        return nearest

    def _flags_float(self, t: float, p: float, lp: float, up: float, water: float) -> int:
        flags = 0
        first = self._lowest_curve
        if first is not None:
            if lp > self._log_top and self._closed:
                flags = 8
            elif lp < first.log_first:
                flags = 16 if first.ends_with_equation else 64
        elif self._never:
            flags = 16
        if self._icy and water == water:
            if t < _TRIPLE and t < water + frost_excess(water):
                flags |= 2
            if self._hydrates and t < _HYDRATE_TEMPERATURE and t < water + _HYDRATE_NEAR and p > _HYDRATE_PRESSURE:
                flags |= 1
        if t < up and t < water:
            flags |= 128
        if self.critical is not None:
            tc, pc = self._critical_temperature, self._critical_pressure
            if abs(t - tc) < _NEAR_TEMPERATURE * tc and abs(p - pc) < _NEAR_PRESSURE * pc:
                flags |= 4
        return flags

    # rows

    def _survey_block(self, t: Array, lp: Array) -> tuple[NDArray[np.int8], Array, Array, Array]:
        n = t.size
        region = np.full(n, _GAS, dtype=np.int8)
        up, low = np.full(n, math.nan), np.full(n, math.nan)
        if self._odd:
            region[~((t > self._hot) & (lp < _LOG_HOT))] = DIRECT
        elif not self._never:
            for number, curve in enumerate(self._curves):
                state, here, bubble = curve.state_block(t, lp)
                if number == 0:
                    region, up, low = state, here, bubble
                    continue
                higher = ~(here <= up) & (here == here)
                up, low = np.where(higher, here, up), np.where(higher, bubble, low)
                region = _RANKED.take(np.maximum(_RANK.take(region), _RANK.take(state)))
            beyond = lp > self._log_top
            region[beyond & (region == _GAS) & (t < self._critical_temperature)] = _LIQUID
            dense = (t < self._coldest_sure) & ((region == _LIQUID) | (beyond & (region == _GAS)))
            if dense.any():
                region[dense & (t < self._cold_liquid)] = DIRECT
            for first, last, warm in self._doubts:
                region[(first <= lp) & (lp <= last) & (t < warm) & (region != _TWO_PHASE)] = DIRECT
        water = np.full(n, math.nan)
        if self._wet:
            water, unsure = self._water_block(lp, region == _LIQUID)
            wet = t < water
            lost = unsure & ~wet & (region != _TWO_PHASE)
            lost &= ~((t > self._hot) & (lp < _LOG_HOT) & (t > _WATER_CRITICAL))
            region[wet] = _TWO_PHASE
            region[lost] = DIRECT
        region[t < LOWEST_TEMPERATURE] = _UNKNOWN
        return region, up, low, water

    def _water_block(self, lp: Array, liquid: NDArray[np.bool_]) -> tuple[Array, NDArray[np.bool_]]:
        gas, dense = self._water_gas, self._water_dense
        water = np.full(lp.size, math.nan)
        unsure = np.full(lp.size, self._water_unsure)
        beyond = liquid | (lp > self._log_top)
        unsure[beyond] = True
        if dense is not None:
            rows = np.flatnonzero(beyond & (dense.low <= lp) & (lp <= dense.high))
            water[rows] = dense.temperature_block(lp.take(rows))
            unsure[rows] = False
        if gas is not None:
            covered = lp <= gas.high
            if dense is not None:
                covered &= ~liquid
            if covered.all():
                return gas.temperature_block(lp), np.zeros(lp.size, dtype=bool)
            rows = np.flatnonzero(covered)
            water[rows] = gas.temperature_block(lp.take(rows))
            unsure[rows] = False
        return water, unsure

    def _finish_block(self, t: Array, p: Array, region: NDArray[np.int8]) -> NDArray[np.bool_]:
        """Put what the curves leave open to the direct test, name supercritical rows; return which rows were direct."""
        direct = region == DIRECT
        for row in np.flatnonzero(direct).tolist():
            region[row] = self._direct(float(t[row]), float(p[row]))
        rows = np.flatnonzero((region == _GAS) & (t >= self._critical_temperature) & (p >= self._critical_pressure))
        if rows.size:
            here = t.take(rows)
            dense = p.take(rows) >= self._isochore_scale * here * self._isochore(self._critical_temperature / here)
            region[rows[dense]] = _SUPERCRITICAL
        return direct

    def region_block(self, temperature: Array, pressure: Array) -> NDArray[np.int8]:
        """Return the regions of rows alone.

        :param temperature: K, shape (n,)
        :param pressure: Pa, shape (n,)
        """
        parts = [
            self._region_rows(temperature[i : i + _BLOCK_ROWS], pressure[i : i + _BLOCK_ROWS])
            for i in range(0, temperature.size, _BLOCK_ROWS)
        ]
        return np.concatenate(parts) if parts else np.empty(0, dtype=np.int8)

    def _region_rows(self, t: Array, p: Array) -> NDArray[np.int8]:
        usable = (t > 0.0) & (p > 0.0) & (t < math.inf) & (p < math.inf)
        every = bool(usable.all())
        if not every:
            t, p = np.where(usable, t, 300.0), np.where(usable, p, 1e5)
        with np.errstate(all="ignore"):
            region, _, _, _ = self._survey_block(t, log(p))
            if not every:
                region[~usable] = _UNKNOWN
            self._finish_block(t, p, region)
        return region

    def block(self, temperature: Array, pressure: Array) -> MixtureBlock:
        """Return the verdicts of rows, with the bits that ``at`` gives for each.

        :param temperature: K, shape (n,)
        :param pressure: Pa, shape (n,)
        """
        if temperature.size <= _BLOCK_ROWS:
            return self._rows(temperature, pressure)
        parts = [
            self._rows(temperature[i : i + _BLOCK_ROWS], pressure[i : i + _BLOCK_ROWS])
            for i in range(0, temperature.size, _BLOCK_ROWS)
        ]
        return MixtureBlock(*(np.concatenate(columns) for columns in zip(*parts, strict=True)))

    def _rows(self, t: Array, p: Array) -> MixtureBlock:
        usable = (t > 0.0) & (p > 0.0) & (t < math.inf) & (p < math.inf)
        every = bool(usable.all())
        if not every:
            t, p = np.where(usable, t, 300.0), np.where(usable, p, 1e5)
        with np.errstate(all="ignore"):
            lp = log(p)
            region, up, low, water = self._survey_block(t, lp)
            if not every:
                region[~usable] = _UNKNOWN
            direct = self._finish_block(t, p, region)
            if self._wet:
                by_water = (water == water) & ~((up == up) & ~(water >= up))
                dew = np.where(by_water, water, up)
                kind = np.where(by_water, np.int8(2), np.int8(1))
            else:
                dew, kind = up, np.ones(t.size, dtype=np.int8)
            none = dew != dew
            kelvin = kelvin_block(self.hydrocarbon_uncertainty, p)
            if self._wet:
                kelvin = np.where(kind == 2, kelvin_block(self.water_uncertainty, p), kelvin)
            if none.any():
                kind[none] = 0
                kelvin[none] = math.nan
            margin_t = self._margin_temperature_block(t, region, dew, up, low)
            margin_p = self._margin_pressure_block(t, p, region, t < water)
            unknown = direct | (region == _UNKNOWN)
            if unknown.any():
                margin_p[unknown] = math.nan
            flags = self._flags_block(t, p, lp, up, water)
            flags[direct] |= 32
        if not every:
            lost = ~usable
            dew, margin_t, margin_p, kelvin = (np.where(lost, math.nan, a) for a in (dew, margin_t, margin_p, kelvin))
            kind[lost] = 0
            flags[lost] = 0
        return MixtureBlock(region, dew, kind, margin_t, margin_p, kelvin, flags)

    @staticmethod
    def _margin_temperature_block(t: Array, region: NDArray[np.int8], dew: Array, up: Array, low: Array) -> Array:
        margin = t - dew
        rows = np.flatnonzero((region == _LIQUID) | (region == _TWO_PHASE))
        if rows.size:
            rise = t.take(rows) - low.take(rows)
            here, above = margin.take(rows), up.take(rows)
            in_liquid = np.where(rise == rise, np.where(rise < 0.0, rise, 0.0), np.where(above == above, here, math.nan))
            between = np.where(rise < -here, np.where(rise > 0.0, -rise, 0.0), here)
            margin[rows] = np.where(region.take(rows) == _LIQUID, in_liquid, between)
        margin[region == _UNKNOWN] = math.nan
        return margin

    def _margin_pressure_block(self, t: Array, p: Array, region: NDArray[np.int8], wet: NDArray[np.bool_]) -> Array:
        gap, depth = np.full(t.size, math.inf), np.full(t.size, -1.0)
        for curve in self._curves:
            distance, inside = curve.distance_block(t, p)
            depth = np.where(inside & (distance > depth), distance, depth)
            gap = np.where(~inside & (distance < gap), distance, gap)
        if self._wet:
            nearest = np.full(t.size, math.inf)
            for water in (self._water_gas, self._water_dense):
                if water is not None:
                    distance = water.distance_block(t, p)
                    nearest = np.where(distance < nearest, distance, nearest)
            depth = np.where(wet & (nearest > depth), nearest, depth)
            gap = np.where(~wet & (nearest < gap), nearest, gap)
        split = region == _TWO_PHASE
        gap = np.where(split & (depth >= 0.0), depth, gap)
        gap = np.where(split | (region == _LIQUID), -gap, gap)
        gap[np.isinf(gap)] = math.nan
        return gap

    def _flags_block(self, t: Array, p: Array, lp: Array, up: Array, water: Array) -> NDArray[np.int16]:
        flags = np.zeros(t.size, dtype=np.int16)
        first = self._lowest_curve
        if first is not None:
            flags[lp < first.log_first] = 16 if first.ends_with_equation else 64
            if self._closed:
                flags[lp > self._log_top] = 8
        elif self._never:
            flags[:] = 16
        if self._icy and self._wet:
            known = water == water
            excess = 0.12 * (273.16 - water)
            frost = water + np.where(273.16 - water > 0.0, excess, 0.0)
            flags[known & (t < _TRIPLE) & (t < frost)] |= 2
            if self._hydrates:
                near = known & (t < _HYDRATE_TEMPERATURE) & (t < water + _HYDRATE_NEAR) & (p > _HYDRATE_PRESSURE)
                flags[near] |= 1
            flags[(t < up) & (t < water)] |= 128
        if self.critical is not None:
            tc, pc = self._critical_temperature, self._critical_pressure
            flags[(np.abs(t - tc) < _NEAR_TEMPERATURE * tc) & (np.abs(p - pc) < _NEAR_PRESSURE * pc)] |= 4
        return flags

    # what a series asks

    def log_pressure_of_lost_water(self) -> float:
        """Return ln p, p in Pa, above which the water dew line of a gas with water is not known; infinite without water."""
        if not self._wet:
            return math.inf
        return -math.inf if self._water_gas is None else self._water_gas.high

    def survey_float(self, temperature: float, pressure: float, margin: float) -> tuple[int, bool]:
        """Return the region of one state, and whether it is one phase close to where another appears; see ``is_near``.

        :param temperature: K
        :param pressure: Pa
        :param margin: K
        """
        verdict = self.at(temperature, pressure)
        return verdict.region, is_near(verdict, pressure, margin)

    def survey_block(self, temperature: Array, pressure: Array, margin: float) -> tuple[NDArray[np.int8], NDArray[np.bool_]]:
        """Return the same for rows, each of shape (n,)."""
        parts = [
            self._survey_rows(temperature[i : i + _BLOCK_ROWS], pressure[i : i + _BLOCK_ROWS], margin)
            for i in range(0, temperature.size, _BLOCK_ROWS)
        ]
        if not parts:
            return np.empty(0, dtype=np.int8), np.empty(0, dtype=bool)
        return np.concatenate([region for region, _ in parts]), np.concatenate([near for _, near in parts])

    def _survey_rows(self, t: Array, p: Array, margin: float) -> tuple[NDArray[np.int8], NDArray[np.bool_]]:
        usable = (t > 0.0) & (p > 0.0) & (t < math.inf) & (p < math.inf)
        every = bool(usable.all())
        if not every:
            t, p = np.where(usable, t, 300.0), np.where(usable, p, 1e5)
        near = np.zeros(t.size, dtype=bool)
        with np.errstate(all="ignore"):
            region, up, _, water = self._survey_block(t, log(p))
            if not every:
                region[~usable] = _UNKNOWN
            direct = self._finish_block(t, p, region)
            single = (region == _GAS) | (region == _SUPERCRITICAL)
            warm = t - (np.where((water == water) & ~((up == up) & ~(water >= up)), water, up) if self._wet else up)
            near = single & (warm < margin)
            rows = np.flatnonzero(single & (warm != warm) & ~direct)
            if rows.size:
                here, there = t.take(rows), p.take(rows)
                gap = self._margin_pressure_block(here, there, region.take(rows), here < water.take(rows))
                near[rows] = gap < _CLOSE_PER_KELVIN * margin * there
        return region, near

    # other questions

    def stability(self, temperature: float, pressure: float) -> StabilityResult:
        """Return the direct stability test of one state: slow, and independent of the boundary.

        :param temperature: K
        :param pressure: Pa
        """
        return self._test.at(temperature, pressure)

    def flash(self, temperature: float, pressure: float) -> FlashResult:
        """Return the two phases of one state; see ``two_phase_flash``.

        :param temperature: K
        :param pressure: Pa
        """
        return two_phase_flash(self.energy, self._test, np.array(self.fractions), temperature, pressure)

    def outline(self) -> MixtureOutline:
        """Return the phase diagram."""
        b = self.boundary
        empty = np.empty(0)
        line = self._water_gas or self._water_dense
        water_lp = np.linspace(line.low, line.high, _WATER_NODES) if line else empty
        water_t = line.temperature_block(water_lp) if line else empty
        if b is None:
            return MixtureOutline(empty, empty, water_t, np.exp(water_lp), None, None, None, False, self.end)
        # a bubble line is left where its pressure rises again
        steps = np.diff(b.log_pressure) < 0.0
        top = int(steps.argmax()) if steps.any() else b.log_pressure.size - 1
        fall = steps[top:]
        end = b.log_pressure.size if bool(fall.all()) else top + int(fall.argmin()) + 1
        return MixtureOutline(
            np.exp(b.log_temperature[:end]),
            np.exp(b.log_pressure[:end] + self._shift),
            water_t,
            np.exp(water_lp),
            self._shifted(b.critical),
            self._shifted(b.cricondentherm),
            self._shifted(b.cricondenbar),
            b.complete,
            b.end,
        )


def is_near(verdict: MixtureVerdict, pressure: float, margin: float) -> bool:
    """Return whether a state is one phase close to where another appears.

    Close is less than ``margin`` above the dew temperature; above the cricondenbar, where there is none, less than 0.6 % of the
    pressure for each kelvin of the margin from the boundary (our choice: some kelvin for a natural gas).

    :param verdict: on the state
    :param pressure: Pa
    :param margin: K
    """
    if verdict.region != _GAS and verdict.region != _SUPERCRITICAL:
        return False
    if verdict.margin_temperature is not None:
        return verdict.margin_temperature < margin
    return verdict.margin_pressure is not None and verdict.margin_pressure < _CLOSE_PER_KELVIN * margin * pressure


def _leading(good: NDArray[np.bool_], temperature: Floats) -> int:
    """Return how many rows from the first on are good and follow each other without a jump."""
    count = 0
    for i in range(good.size):
        if not good[i]:
            break
        if i >= 2 and abs(temperature[i] - 2.0 * temperature[i - 1] + temperature[i - 2]) > _JUMP:
            break
        count = i + 1
    return count


def mixture_phase(system: GergSystem | CubicMixture, fractions: Sequence[float]) -> MixturePhase:
    """Return the phase of a composition; components with fraction 0 are left out.

    :param system: the equation for a set of components
    :param fractions: mole fractions in the order of its components, summing to 1, [-]
    """
    present = [i for i, x in enumerate(fractions) if x > 0.0]
    z = [float(fractions[i]) for i in present]
    if isinstance(system, GergSystem):
        if len(present) < len(fractions):
            system = GergSystem(system.data, [system.components[i] for i in present])
        energy: MixtureEnergy = GergEnergy(system)
        fluid: Fluid = system.fluid(z)
        miscible, missing, allowance = False, False, (1.0, 3.0)
        # against enhancement factors of moist air (low by 0.1 K at 0.1 MPa and 1.3 K at 2 MPa) and the water content of methane
        # at 7 MPa (low by 2 K)
        water = DewUncertainty(0.5, 0.6e-6, 5.0, "estimate")
    else:
        energy = CubicEnergy(system, present)
        cubic = system.fluid(fractions)
        substances = [system.substances[i] for i in present]
        miscible = any("associating" in s.flags and s.id != WATER for s in substances)
        fluid, missing, allowance = cubic, bool(cubic.missing_pairs), (3.0, 5.0)
        water = UNSURE
    names = energy.components
    dry = [i for i, c in enumerate(names) if c != WATER]
    light, heavy = allowance
    # pentanes and heavier: their binary data are scarcer, and traces of them decide
    kelvin = light if all(energy.critical_temperatures[i] < _LIGHT for i in dry) else heavy
    if missing:
        kelvin = 2.0 * heavy
        water = DewUncertainty(2.0 * water.kelvin, 0.0, 2.0 * water.most, "estimate")
    return MixturePhase(
        energy,
        fluid,
        z,
        dry if 0 < len(dry) < len(names) and not miscible else None,
        cold_water=isinstance(system, GergSystem),
        uncertainty=(DewUncertainty(kelvin, 0.0, kelvin, "estimate"), water),
    )
