"""The phase of a mixture: one object a composition, microseconds a state.

How a service calls it::

    phase = mixture_phase(system, fractions)      # GergSystem or CubicMixture; 20 to 60 ms, keep it in a bounded cache
    verdict = phase.at(temperature, pressure)     # region, dew point, margins, flags: some 10 us
    verdicts = phase.block(temperature, pressure) # the same bits for arrays
    regions = phase.region_block(temperature, pressure)   # regions alone, where margins are not asked for
    phase.outline()                               # arrays and named points for a phase diagram
    phase.flash(temperature, pressure)            # two phases at one state (milliseconds)

On construction the boundary of the dry mixture is traced and the water dew line solved at fixed pressures, both with shapes
that depend on the composition only, and kept as cubics on equal cells: T(p) in w = sqrt(ln p_max - ln p), which passes the
cricondenbar without a break, and ln p(T) in u = sqrt(T_max - T), which passes the cricondentherm. Values at the knots are
rounded (1e-7 K, 1e-10 in ln p) before the cubics are made, so that nothing hangs on the last bits of a linear solve. Whatever
the tables do not cover is put to a direct stability test, one state at a time; so a block has the bits of its states.

Where both a hydrocarbon liquid and liquid water can form, the dew point is the higher of the two. States below both lines are
two-phase here, although a third phase may be present.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from enum import IntEnum, IntFlag
from typing import Final, NamedTuple, cast

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline, PchipInterpolator

from gasapi.engine.elementary import Array, exp, log
from gasapi.engine.models.cubic import CubicMixture
from gasapi.engine.models.gerg_2008 import GergSystem
from gasapi.engine.models.gerg_2008_fugacity import GergEnergy
from gasapi.engine.phase.boundary import Boundary, NamedPoint, trace_boundary
from gasapi.engine.phase.cubic_energy import CubicEnergy
from gasapi.engine.phase.energy import Floats, MixtureEnergy
from gasapi.engine.phase.flash import FlashResult, two_phase_flash
from gasapi.engine.phase.region import Region
from gasapi.engine.phase.stability import Stability, StabilityResult, StabilityTest
from gasapi.engine.phase.table import CubicTable
from gasapi.engine.phase.water import WATER, LiquidWater, frost_excess, water_line
from gasapi.engine.protocol import Branch, Fluid

__all__ = [
    "DewKind",
    "DewUncertainty",
    "MixtureBlock",
    "MixtureFlag",
    "MixtureOutline",
    "MixturePhase",
    "MixtureVerdict",
    "mixture_phase",
]

_GAS: Final = int(Region.GAS)
_SUPERCRITICAL: Final = int(Region.SUPERCRITICAL)
_LIQUID: Final = int(Region.LIQUID)
_TWO_PHASE: Final = int(Region.TWO_PHASE)
_UNKNOWN: Final = int(Region.UNKNOWN)
_DIRECT: Final = -1

LOWEST_TEMPERATURE: Final = 60.0
"""K: the lower end of the extended range of GERG-2008; taken for the cubic equations as well."""

_LOG_LOWEST: Final = math.log(1e3)
_LOG_HIGHEST: Final = math.log(1.5e8)
_WATER_NODES: Final = 48
_KNOTS: Final = 160
_BLOCK_ROWS: Final = 8192
_JUMP: Final = 6.0
_DRY_FLOOR: Final = 15.0

# what makes a clathrate former, and below which temperature and above which pressure a warning is due: the hydrate lines of
# hydrogen sulfide and methane end near 302 K in practice. Common practice, no source.
_HYDRATE_FORMERS: Final = frozenset(
    {"methane", "ethane", "propane", "isobutane", "n-butane", "carbon-dioxide", "hydrogen-sulfide", "nitrogen", "oxygen"}
    | {"argon", "krypton", "xenon", "ethylene", "cyclopropane", "sulfur-dioxide"}
)
_HYDRATE_TEMPERATURE: Final = 303.0
_HYDRATE_PRESSURE: Final = 1e5
_HYDRATE_NEAR: Final = 8.0
_TRIPLE: Final = 273.16
_LIGHT: Final = 460.0
"""K: critical temperatures of the butanes lie below, those of the pentanes at it or above."""

_NEAR_TEMPERATURE: Final = 0.02
_NEAR_PRESSURE: Final = 0.1


class DewKind(IntEnum):
    """Which phase appears first on cooling at constant pressure."""

    NONE = 0
    HYDROCARBON = 1
    """A liquid of the gas itself (or, beyond the critical point, a bubble in it)."""

    WATER = 2
    """An aqueous liquid."""


class MixtureFlag(IntFlag):
    """What else is to be said of a state."""

    HYDRATE_POSSIBLE = 1
    ICE_POSSIBLE = 2
    NEAR_CRITICAL = 4
    ABOVE_CRICONDENBAR = 8
    """There is no dew point at this pressure, since it is above the cricondenbar."""

    DEW_BELOW_RANGE = 16
    """The dew point lies below the lowest temperature of the equation, if there is one."""

    DIRECT = 32
    """By a stability test of this state, not by the boundary: no dew point and no margins."""

    EXTRAPOLATED = 64
    """The dew point lies below the lowest pressure of the trace (1 kPa, or more where the liquid is too cold)."""

    WATER_AND_LIQUID = 128
    """Below both dew points: three phases are possible."""


class DewUncertainty(NamedTuple):
    """The uncertainty of a dew temperature, K (k = 2), and its basis, one of ``publication``, ``estimate``."""

    kelvin: float
    basis: str


class MixtureVerdict(NamedTuple):
    """The phase of one state: K and Pa, margins positive on the gas side; None where there is no such boundary."""

    region: int
    dew_point_temperature: float | None
    dew_kind: int
    margin_temperature: float | None
    margin_pressure: float | None
    dew_point_uncertainty: float | None
    flags: int


class MixtureBlock(NamedTuple):
    """The same for rows, each of shape (n,): regions, kinds and flags as small integers, NaN where there is no boundary."""

    region: NDArray[np.int8]
    dew_point_temperature: Array
    dew_kind: NDArray[np.int8]
    margin_temperature: Array
    margin_pressure: Array
    dew_point_uncertainty: Array
    flags: NDArray[np.int16]


class MixtureOutline(NamedTuple):
    """A phase diagram: dew and bubble line as one curve, the water dew line, named points; K and Pa, None where missing."""

    temperature: Floats
    pressure: Floats
    water_temperature: Floats
    water_pressure: Floats
    critical: NamedPoint | None
    cricondentherm: NamedPoint | None
    cricondenbar: NamedPoint | None
    complete: bool
    end: str


class _Branches:
    """The boundary of the dry mixture as smooth functions; ``shift`` is added to its ln p. Immutable."""

    def __init__(self, b: Boundary, shift: float) -> None:
        lp, t = b.log_pressure + shift, np.exp(b.log_temperature)
        top = int(lp.argmax()) if b.cricondenbar is None else int(np.searchsorted(b.position, _position(b, b.cricondenbar)))
        first_turn = b.cricondenbar is not None
        # rising pressure up to the top, falling beyond it for as long as it does
        rise = _run(lp[: top + 1][::-1], falling=True)
        if rise != top + 1:
            raise _Odd
        self.closed = first_turn
        fall = _run(lp[top:], falling=True) if first_turn else 1
        used = lp[: top + fall]
        self.log_top = round(float(lp[top]), 10)
        w = np.sqrt(np.maximum(self.log_top - used, 0.0))
        w[top + 1 :] *= -1.0
        w[top] = 0.0
        self.by_pressure = _table(-w, t[: top + fall], 1e-7)
        self.log_first = round(float(lp[0]), 10)
        self.log_last = round(float(used[-1]), 10) if fall > 1 else math.inf
        self.last_temperature = float(t[top + fall - 1])

        hot = int(t.argmax()) if b.cricondentherm is None else int(np.searchsorted(b.position, _position(b, b.cricondentherm)))
        if _run(t[: hot + 1][::-1], falling=True) != hot + 1:
            raise _Odd
        self.turns = b.cricondentherm is not None
        fall = _run(t[hot:], falling=True) if self.turns else 1
        self.hottest = round(float(t[hot]), 7)
        u = np.sqrt(np.maximum(self.hottest - t[: hot + fall], 0.0))
        u[: hot + 1] *= -1.0
        u[hot] = 0.0
        self.by_temperature = _table(u, lp[: hot + fall], 1e-10)
        self.coldest_first = float(t[0])
        self.coldest_top = float(t[hot + fall - 1]) if fall > 1 else math.inf
        # the line goes on straight in ln p against 1/T below its first point
        self.inverse_first = 1.0 / self.coldest_first
        self.inverse_slope = -float(b.temperature_slope[0] / b.pressure_slope[0]) / self.coldest_first
        if not self.inverse_slope < 0.0:
            raise _Odd


class _Odd(Exception):
    """A boundary that is not of the usual shape: every state is put to the direct test."""


def _position(b: Boundary, point: NamedPoint) -> float:
    s = math.log(point.density)
    # the named points are nodes of the grid; a hair below them finds the node itself
    return s + 3.0 * math.exp(s) / b.scale - 1e-9


def _run(values: Floats, falling: bool) -> int:
    """Return how many values from the first on fall strictly."""
    steps = np.diff(values) < 0.0 if falling else np.diff(values) > 0.0
    return values.size if bool(steps.all()) else int(steps.argmin()) + 1


def _table(x: Floats, y: Floats, grain: float) -> CubicTable:
    """Return the table of a curve whose abscissa rises."""
    spline = CubicSpline(x, y)
    knots = np.linspace(x[0], x[-1], _KNOTS + 1)
    values = np.round(spline(knots) / grain) * grain
    slopes = np.round(spline(knots, 1) / grain) * grain
    return CubicTable(float(x[0]), float(x[-1]), values, slopes)


class _Monotone(NamedTuple):
    """A rising or falling stretch of the water line: ln p as a function of T between two temperatures."""

    low: float
    high: float
    log_pressure: CubicTable


class _WaterBranch:
    """The water dew line over a range of pressure. Immutable."""

    def __init__(self, log_pressure: Floats, temperature: Floats) -> None:
        self.low, self.high = float(log_pressure[0]), float(log_pressure[-1])
        self.by_pressure = _table(log_pressure, temperature, 1e-7)
        fine = np.linspace(self.low, self.high, 8 * (log_pressure.size - 1) + 1)
        t = cast(Floats, self.by_pressure(fine))
        turns = [0, *(np.flatnonzero(np.diff(t)[1:] * np.diff(t)[:-1] < 0.0) + 1).tolist(), t.size - 1]
        stretches = []
        for a, z in zip(turns[:-1], turns[1:], strict=True):
            if z - a < 3 or t[a] == t[z]:
                continue
            order = slice(a, z + 1)
            ts, lps = (t[order], fine[order]) if t[z] > t[a] else (t[order][::-1], fine[order][::-1])
            inverse = PchipInterpolator(ts, lps)
            knots = np.linspace(ts[0], ts[-1], 97)
            table = CubicTable(
                float(ts[0]), float(ts[-1]), np.round(inverse(knots), 10), np.round(inverse(knots, 1), 10)
            )
            stretches.append(_Monotone(float(ts[0]), float(ts[-1]), table))
        self.stretches = tuple(stretches)


class MixturePhase:
    """The phase of one composition by one equation. Immutable, and safe to share between threads.

    :param energy: the equation of state for phase equilibria
    :param fluid: the same equation at this composition
    :param fractions: mole fractions in the order of the energy's components, all above 0, [-]
    :param dry: the equation of state without water, where liquid water does not mix with the rest; else None
    :param checked: whether the boundary is to be compared with direct tests, for components that associate
    :param cold_water: whether the equation has no trustworthy liquid water below 240 K
    :param uncertainty: of the dew temperature of the dry mixture, and of water
    """

    def __init__(
        self,
        energy: MixtureEnergy,
        fluid: Fluid,
        fractions: Sequence[float],
        dry: MixtureEnergy | None = None,
        checked: bool = False,
        cold_water: bool = False,
        uncertainty: tuple[DewUncertainty, DewUncertainty] = (DewUncertainty(5.0, "estimate"), DewUncertainty(3.0, "estimate")),
    ) -> None:
        z = np.array(fractions, dtype=np.float64)
        self.energy, self.fluid, self.fractions = energy, fluid, tuple(float(x) for x in fractions)
        self.model = fluid.model
        self.hydrocarbon_uncertainty, self.water_uncertainty = uncertainty
        names = energy.components
        self._wet = dry is not None
        self._hydrates = WATER in names and not _HYDRATE_FORMERS.isdisjoint(names)
        self._icy = WATER in names
        self._test = StabilityTest(energy, z, self._wet)
        rest, shift, traced = energy, 0.0, z
        if dry is not None:
            # the dry gas at its share of the pressure: exact for an ideal gas, and water is scarce where it does not condense first
            left = z[[i for i, c in enumerate(names) if c != WATER]]
            share = math.fsum(left.tolist())
            rest, shift, traced = dry, -math.log(share), left / share
        self._shift = shift
        with np.errstate(all="ignore"):
            boundary, self.end = trace_boundary(rest, traced, LOWEST_TEMPERATURE)
        self.boundary = boundary
        self._lines: _Branches | None = None
        self._never = False
        self._below_range = False
        self._odd = False
        if boundary is not None:
            try:
                self._lines = _Branches(boundary, shift)
                self._below_range = self._lines.coldest_first < 1.06 * LOWEST_TEMPERATURE
            except (_Odd, ValueError):
                self._odd = True
        else:
            self._never = self._never_condenses(rest, traced)
            self._below_range = self._never
            self._odd = not self._never
        if checked and self._lines is not None and not self._agrees():
            self._odd = True
        self._set_critical(rest, traced)
        self._water_gas: _WaterBranch | None = None
        self._water_dense: _WaterBranch | None = None
        self._water_unsure = False
        if self._wet:
            with np.errstate(all="ignore"):
                self._solve_water(z, cold_water)

    # construction

    def _never_condenses(self, rest: MixtureEnergy, z: Floats) -> bool:
        """Return whether the dry gas is stable at the lowest temperature of the equation at every pressure tried."""
        if float(rest.critical_temperatures.max()) < LOWEST_TEMPERATURE:
            return True
        test = StabilityTest(rest, z, False)
        pressures = (1e4, 1e5, 5e5, 2e6, 5e6, 1e7, 3e7, 7e7)
        return all(test.at(LOWEST_TEMPERATURE, p).verdict == Stability.STABLE for p in pressures)

    def _agrees(self) -> bool:
        """Return whether states just outside the boundary are stable by the direct test."""
        assert self._lines is not None
        span = self._lines.log_top - self._lines.log_first
        for part in (0.3, 0.6, 0.85, 0.97):
            lp = self._lines.log_first + part * span
            t = self._lines.by_pressure(-math.sqrt(self._lines.log_top - lp))
            if self._test.at(t + 2.0, math.exp(lp)).verdict != Stability.STABLE:
                return False
        return True

    def _set_critical(self, rest: MixtureEnergy, z: Floats) -> None:
        """Choose the critical point, and tabulate Z along its isochore."""
        point = None if self.boundary is None else self.boundary.critical
        self.critical = point
        if point is not None:
            t, rho = point.temperature, point.density
        else:
            # no critical point on the traced part: pseudo-critical values for telling gas from dense fluid
            packed = float(rest.close_packing(z[None])[0])
            t = float((z * rest.critical_temperatures).sum())
            rho = packed / 3.6
            if self.boundary is not None and self.boundary.cricondentherm is not None:
                t = max(t, self.boundary.cricondentherm.temperature)
        self._critical_temperature, self._critical_density = t, rho
        inverse = np.linspace(0.1, 1.0, 65)
        temperature = t / inverse
        p = self.fluid.pressure(temperature, np.full(65, rho)).pressure
        factor = p / (rho * self.energy.gas_constant * temperature)
        spline = CubicSpline(inverse, factor)
        self._isochore = CubicTable(0.1, 1.0, np.round(spline(inverse), 11), np.round(spline(inverse, 1), 11))
        self._isochore_scale = rho * self.energy.gas_constant
        self.critical_pressure = float(p[-1]) if point is None else point.pressure

    def _solve_water(self, z: Floats, cold: bool) -> None:
        log_p = np.linspace(_LOG_LOWEST, _LOG_HIGHEST, _WATER_NODES)
        liquid = LiquidWater(self.energy, cold)
        line = water_line(self.energy, self.fluid, z, log_p, Branch.GAS, liquid)
        good = line.found.copy()
        if self._lines is not None:
            # where the gas condenses first, its metastable water line is of no use
            good &= ~(line.temperature < self._hydrocarbon_dew(log_p) - _DRY_FLOOR)
        count = _leading(good, line.temperature)
        if count >= 6:
            self._water_gas = _WaterBranch(log_p[:count], line.temperature[:count])
        else:
            self._water_unsure = True
        if count < _WATER_NODES and self._lines is not None and self._lines.closed:
            line = water_line(self.energy, self.fluid, z, log_p, Branch.LIQUID, liquid)
            back = _leading(line.found[::-1], line.temperature[::-1])
            if back >= 6:
                self._water_dense = _WaterBranch(log_p[-back:], line.temperature[-back:])
        self._water_top = math.inf
        if self._lines is not None and self._water_gas is not None and count < _WATER_NODES:
            # from where the line left the gas on, the gas condenses before water does, up to the cricondenbar
            last = self._water_gas.by_pressure(self._water_gas.high)
            cut = float(self._hydrocarbon_dew(np.array([self._water_gas.high]))[0])
            if not last < cut + 2.0:
                self._water_unsure = True

    def _hydrocarbon_dew(self, log_p: Floats) -> Floats:
        """Return the dew temperature of the dry gas, K, -inf where there is none."""
        lines = self._lines
        assert lines is not None
        w = np.sqrt(np.maximum(lines.log_top - log_p, 0.0))
        inside = cast(Floats, lines.by_pressure(-w))
        below = 1.0 / np.maximum(lines.inverse_first + lines.inverse_slope * (log_p - lines.log_first), 1e-4)
        result = np.where(log_p < lines.log_first, -np.inf if self._below_range else below, inside)
        return np.where(log_p > lines.log_top, -np.inf, result)

    # one state

    def _region_float(self, t: float, lp: float, p: float) -> tuple[int, float, float, float]:
        """Return the region (or _DIRECT) with the dew and bubble temperatures of the dry mixture and the water dew point.

        NaN stands for a line that does not exist there.
        """
        nan = math.nan
        lines = self._lines
        up = low = nan
        if not (t > 0.0 and p > 0.0):
            return _UNKNOWN, nan, nan, nan
        if self._odd:
            region = _DIRECT
        elif lines is None:
            region = _GAS if t >= LOWEST_TEMPERATURE else _UNKNOWN
        elif lp > lines.log_top:
            region = _GAS if lines.closed else _DIRECT
            if region == _GAS and t < self._critical_temperature:
                region = _LIQUID
        elif lp >= lines.log_first:
            w = math.sqrt(lines.log_top - lp)
            up = lines.by_pressure(-w)
            if lp >= lines.log_last:
                low = lines.by_pressure(w)
            if t > up:
                region = _GAS
            elif low == low:
                region = _LIQUID if t < low else _TWO_PHASE
            else:
                region = _TWO_PHASE if t >= lines.last_temperature else _DIRECT
        elif self._below_range:
            region = _GAS if t >= LOWEST_TEMPERATURE else _UNKNOWN
        else:
            rest = lines.inverse_first + lines.inverse_slope * (lp - lines.log_first)
            up = 1.0 / (rest if rest > 1e-4 else 1e-4)
            region = _GAS if t > up else _TWO_PHASE
        water = nan
        if self._wet:
            water, unsure = self._water_float(lp, region)
            if t < water:
                region = _TWO_PHASE
            elif unsure and region != _TWO_PHASE:
                region = _DIRECT
        return region, up, low, water

    def _water_float(self, lp: float, region: int) -> tuple[float, bool]:
        """Return the water dew temperature, NaN for none, and whether it should be known but is not."""
        gas, dense = self._water_gas, self._water_dense
        if gas is not None and lp <= gas.high and region != _LIQUID:
            return gas.by_pressure(lp if lp > gas.low else gas.low), lp < gas.low
        if gas is not None and self._water_dense is None and lp <= gas.high:
            return gas.by_pressure(lp if lp > gas.low else gas.low), lp < gas.low
        lines = self._lines
        beyond = lines is None or lp > lines.log_top
        if beyond or region == _LIQUID:
            if dense is not None and dense.low <= lp <= dense.high:
                return dense.by_pressure(lp), False
            return math.nan, True
        return math.nan, self._water_unsure

    def at(self, temperature: float, pressure: float) -> MixtureVerdict:
        """Return the verdict on one state.

        :param temperature: K
        :param pressure: Pa
        """
        t, p = temperature, pressure
        if not (t > 0.0 and 0.0 < p < math.inf and t < math.inf):
            return MixtureVerdict(_UNKNOWN, None, 0, None, None, None, 0)
        lp = log(p)
        region, up, low, water = self._region_float(t, lp, p)
        flags = 0
        if region == _DIRECT:
            region = self._direct(t, p)
            flags = int(MixtureFlag.DIRECT)
        region = self._name_float(t, p, region)
        dew, kind, kelvin = None, 0, None
        if up == up and not water >= up:
            dew, kind, kelvin = up, 1, self.hydrocarbon_uncertainty.kelvin
        elif water == water:
            dew, kind, kelvin = water, 2, self.water_uncertainty.kelvin
        return MixtureVerdict(
            region,
            dew,
            kind,
            self._margin_temperature(t, region, dew, low),
            self._margin_pressure(t, p, region, flags),
            kelvin,
            flags | self._flags(t, p, lp, up, water),
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
        if region == _GAS and t >= self._critical_temperature and p >= self.critical_pressure:
            inverse = self._critical_temperature / t
            if p >= self._isochore_scale * t * self._isochore(inverse):
                return _SUPERCRITICAL
        return region

    def _margin_temperature(self, t: float, region: int, dew: float | None, low: float) -> float | None:
        if dew is None or region == _UNKNOWN:
            return None
        if region == _LIQUID:
            return t - low if low == low else t - dew
        margin = t - dew
        if region == _TWO_PHASE and low == low and t - low < -margin:
            # never above zero, though tables meet only to their own accuracy
            return -(t - low) if t > low else 0.0
        return margin

    def _margin_pressure(self, t: float, p: float, region: int, flags: int) -> float | None:
        if region == _UNKNOWN or flags:
            return None
        best = math.inf
        inside = region == _TWO_PHASE
        lines = self._lines
        depth = -math.inf
        if lines is not None and t < lines.hottest:
            u = math.sqrt(lines.hottest - t)
            if t >= lines.coldest_first:
                lower = exp(lines.by_temperature(-u))
            elif self._below_range:
                lower = math.nan
            else:
                lower = exp((1.0 / t - lines.inverse_first) / lines.inverse_slope + lines.log_first)
            upper = exp(lines.by_temperature(u)) if t >= lines.coldest_top else math.nan
            a = abs(p - lower) if lower == lower else math.inf
            b = abs(p - upper) if upper == upper else math.inf
            best = a if a < b else b
            if lower < p and not p > upper:
                depth = best
        nearest = math.inf
        for branch in (self._water_gas, self._water_dense):
            if branch is None:
                continue
            for stretch in branch.stretches:
                if stretch.low <= t <= stretch.high:
                    distance = abs(p - exp(stretch.log_pressure(t)))
                    nearest = distance if distance < nearest else nearest
        if inside:
            best = best if depth == -math.inf else depth
            found = best if best < nearest or nearest == math.inf else nearest
            if depth > -math.inf and nearest < math.inf:
                found = depth
            return None if found == math.inf else -found
        found = best if best < nearest else nearest
        if found == math.inf:
            return None
        return -found if region == _LIQUID else found

    def _flags(self, t: float, p: float, lp: float, up: float, water: float) -> int:
        flags = 0
        lines = self._lines
        if lines is not None:
            if lp > lines.log_top and lines.closed:
                flags |= 8
            elif lp < lines.log_first:
                flags |= 16 if self._below_range else 64
        elif self._never:
            flags |= 16
        if self._icy and water == water:
            if t < _TRIPLE and t < water + frost_excess(water):
                flags |= 2
            if self._hydrates and t < _HYDRATE_TEMPERATURE and t < water + _HYDRATE_NEAR and p > _HYDRATE_PRESSURE:
                flags |= 1
        if t < up and t < water:
            flags |= 128
        tc, pc = self._critical_temperature, self.critical_pressure
        if self.critical is not None and abs(t - tc) < _NEAR_TEMPERATURE * tc and abs(p - pc) < _NEAR_PRESSURE * pc:
            flags |= 4
        return flags

    def block(self, temperature: Array, pressure: Array) -> MixtureBlock:
        """Return the verdicts of rows, with the bits that ``at`` gives for each.

        :param temperature: K, shape (n,)
        :param pressure: Pa, shape (n,)
        """
        raise NotImplementedError

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
        water_t = cast(Floats, line.by_pressure(water_lp)) if line else empty
        if b is None:
            return MixtureOutline(empty, empty, water_t, np.exp(water_lp), None, None, None, False, self.end)
        return MixtureOutline(
            np.exp(b.log_temperature),
            np.exp(b.log_pressure),
            water_t,
            np.exp(water_lp),
            b.critical,
            b.cricondentherm,
            b.cricondenbar,
            b.complete,
            b.end,
        )


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
        names = system.components
        dry_names = [c for c in names if c != WATER]
        dry = GergEnergy(GergSystem(system.data, dry_names)) if WATER in names and dry_names else None
        hottest = max(t for t, c in zip(system.critical_temperatures.tolist(), names, strict=True) if c != WATER or not dry)
        # pentanes and heavier: their binary data are scarcer
        gas = DewUncertainty(1.0 if hottest < _LIGHT else 3.0, "estimate")
        both = (gas, DewUncertainty(2.0, "estimate"))
        return MixturePhase(GergEnergy(system), system.fluid(z), z, dry, cold_water=True, uncertainty=both)
    substances = [system.substances[i] for i in present]
    polar = any("associating" in s.flags and s.id != WATER for s in substances)
    wet = any(s.id == WATER for s in substances)
    kept = [i for i in present if system.substances[i].id != WATER]
    fluid = system.fluid(fractions)
    hottest = max(s.critical_temperature for s in substances)
    gas = DewUncertainty(10.0 if fluid.missing_pairs else 3.0 if hottest < _LIGHT else 5.0, "estimate")
    return MixturePhase(
        CubicEnergy(system, present),
        fluid,
        z,
        CubicEnergy(system, kept) if wet and kept and not polar else None,
        checked=polar,
        uncertainty=(gas, DewUncertainty(5.0, "estimate")),
    )
