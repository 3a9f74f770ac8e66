"""The Lee-Kesler equation of 1975: three-parameter corresponding states.

Two fluids are solved at the same reduced temperature and pressure and on the same branch: a simple one (argon, krypton,
methane) and a reference (n-octane, acentric factor 0.3978); see ``gasapi.engine.reduced_bwr``. Between them

    Z = Z0 + h (Zr - Z0),   ln(phi) = ln(phi0) + h (ln(phir) - ln(phi0)),   h = omega/0.3978

(the paper's "Z1" is (Zr - Z0)/0.3978). At equal p_r and T_r the volumes blend in the same way,
V = (1 - h) V0 + h Vr, so the density is explicit in temperature and pressure and has a step of its own. The pressure at a given
density is the p_r at which the blended volume meets it, and its derivatives follow from the implicit function; densities
at which the blend has no branch have no pressure (NaN). Within 3e-7 of Tc, between the critical points of the two fluids,
and within 1 % of it for a negative acentric factor one density can belong to two pressures; either may be given then.

Where one of the fluids has no root on the branch that is asked for, the answer is "no root", and never a blend of a gas with a
liquid. For omega from 0 to 0.45 that costs a sliver within 1 % of the saturation pressure above T_r = 0.96, where one fluid's
branch has ended already; outside it costs more (the gas of hydrogen within 5 % from T_r = 0.85, the liquid of omega = 0.6
within 5 % from 0.95). A blend that would not be a stable state (extrapolated in omega) is "not applicable".

The saturation line is the vapour-pressure correlation of the same paper. Mixtures by the paper's own mixing rules:
Vc_i = (0.2905 - 0.085 omega_i) R Tc_i/pc_i, Vc = 1/8 sum x_i x_j (Vc_i^(1/3) + Vc_j^(1/3))^3,
Tc = 1/(8 Vc) sum x_i x_j (Vc_i^(1/3) + Vc_j^(1/3))^3 sqrt(Tc_i Tc_j), omega = sum x_i omega_i,
pc = (0.2905 - 0.085 omega) R Tc/Vc; they have no interaction parameter.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from functools import cache
from typing import Final, NamedTuple, cast

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.elementary import Array, Real, exp, log
from gasapi.engine.models.cubic import GAS_CONSTANT, refusal
from gasapi.engine.protocol import Branch, CriticalPoint, Fluid, PressureDerivatives, Root, Status
from gasapi.engine.reduced_bwr import (
    REDUCED_TEMPERATURE_MAX,
    REDUCED_TEMPERATURE_MIN,
    BwrConstants,
    ReducedFluid,
    select_rows,
    terms,
)
from gasapi.gases.records import CubicPair, Limits, Substance

__all__ = [
    "ACENTRIC_FACTOR_MAX",
    "ID",
    "NAME",
    "REFERENCE",
    "SIMPLE",
    "SOURCE",
    "LeeKesler",
    "PseudoCritical",
    "build",
    "pseudo_critical",
    "reduced_vapour_pressure",
    "serves",
]

ID = "lee-kesler"
NAME = "Lee-Kesler equation (1975)"
SOURCE = "B. I. Lee, M. G. Kesler, AIChE J. 21 (1975) 510, doi 10.1002/aic.690210313"

SIMPLE = BwrConstants(
    b1=0.1181193,
    b2=0.265728,
    b3=0.154790,
    b4=0.030323,
    c1=0.0236744,
    c2=0.0186984,
    c3=0.0,
    c4=0.042724,
    d1=0.155488e-4,
    d2=0.623689e-4,
    beta=0.65392,
    gamma=0.060167,
    acentric_factor=0.0,
)
REFERENCE = BwrConstants(
    b1=0.2026579,
    b2=0.331511,
    b3=0.027655,
    b4=0.203488,
    c1=0.0313385,
    c2=0.0503618,
    c3=0.016901,
    c4=0.041577,
    d1=0.48736e-4,
    d2=0.0740336e-4,
    beta=1.226,
    gamma=0.03754,
    acentric_factor=0.3978,
)
"""Table 1 of the paper."""

ACENTRIC_FACTOR_MAX: Final = 1.0
"""Our choice: beyond it the extrapolated blend of the liquid is no stable state at most pressures."""

# rows solved together: their temporaries stay in the processor's second-level cache
_BLOCK_ROWS: Final = 2048
_TINY: Final = 1e-300
_MAX_STEPS: Final = 30
# the steps are Newton's: an error of this size is squared by the last one
_MATCH: Final = 1e-9
_VOLUME: Final = 1e-14
_RESOLUTION: Final = 1e-15
# of p_r/T_r, reached at a reduced density of about 40
_PRESSURE_MAX: Final = 5e4
_PRESSURE_MIN: Final = 1e-14
_MAX_SEARCH_STEPS: Final = 200
_CRITICAL_REGION: Final = 0.99
_VAPOUR_STEPS: Final = 8
_NAN: Final = math.nan


class PseudoCritical(NamedTuple):
    """Critical temperature, K, and pressure, Pa, and acentric factor of a pure gas or of a mixture as one fluid."""

    temperature: float
    pressure: float
    acentric_factor: float


def _critical_compressibility(acentric_factor: float) -> float:
    return 0.2905 - 0.085 * acentric_factor


def pseudo_critical(substances: Sequence[Substance], fractions: Sequence[float]) -> PseudoCritical:
    """Return the constants of a mixture by the paper's rules; those of a pure gas are its own.

    :param substances: the components
    :param fractions: mole fractions in the same order, summing to 1, [-]
    """
    present = [(x, s) for x, s in zip(fractions, substances, strict=True) if x > 0.0]
    if len(present) == 1:
        only = present[0][1]
        return PseudoCritical(only.critical_temperature, only.critical_pressure, only.acentric_factor)
    roots = [
        (_critical_compressibility(s.acentric_factor) * GAS_CONSTANT * s.critical_temperature / s.critical_pressure)
        ** (1.0 / 3.0)
        for _, s in present
    ]
    volume = weighted = 0.0
    for (xi, first), ri in zip(present, roots, strict=True):
        for (xj, second), rj in zip(present, roots, strict=True):
            share = 0.125 * xi * xj * (ri + rj) ** 3
            volume += share
            weighted += share * math.sqrt(first.critical_temperature * second.critical_temperature)
    temperature = weighted / volume
    omega = sum(x * s.acentric_factor for x, s in present)
    return PseudoCritical(temperature, _critical_compressibility(omega) * GAS_CONSTANT * temperature / volume, omega)


def reduced_vapour_pressure(temperature: Real, acentric_factor: float) -> Real:
    """Return p_r of the saturation line, [-], for 0.3 to 1.

    :param temperature: T_r, a float or an array of shape (n,), [-]
    :param acentric_factor: [-]
    """
    return exp(_log_vapour_pressure(temperature, acentric_factor))


def _log_vapour_pressure(temperature: Real, acentric_factor: float) -> Real:
    t3 = temperature * temperature * temperature
    t6 = t3 * t3
    logarithm = log(temperature)
    simple = 5.92714 - 6.09648 / temperature - 1.28862 * logarithm + 0.169347 * t6
    departure = 15.2518 - 15.6875 / temperature - 13.4721 * logarithm + 0.43577 * t6
    return simple + acentric_factor * departure


def _log_vapour_slope(temperature: Real, acentric_factor: float) -> Real:
    """Return d ln(p_r)/d(1/T_r), [-]."""
    t3 = temperature * temperature * temperature
    t7 = t3 * t3 * temperature
    simple = -6.09648 + 1.28862 * temperature - 6.0 * 0.169347 * t7
    departure = -15.6875 + 13.4721 * temperature - 6.0 * 0.43577 * t7
    return simple + acentric_factor * departure


@cache
def _fluids() -> tuple[ReducedFluid, ReducedFluid]:
    """Return the two fluids; they are the same for every gas."""
    return ReducedFluid(SIMPLE), ReducedFluid(REFERENCE)


class LeeKesler(Fluid):
    """The equation for one (pseudo-)critical point. Immutable.

    :param constants: critical temperature and pressure, acentric factor
    :param molar_mass: kg/mol
    :param pure: whether the constants are those of one substance
    """

    constants: PseudoCritical
    """What the equation sees of the gas."""

    validity: Limits
    """The range of the paper's tables."""

    def __init__(self, constants: PseudoCritical, molar_mass: float, pure: bool) -> None:
        self.model = ID
        self.gas_constant = GAS_CONSTANT
        self.molar_mass = molar_mass
        self.constants = constants
        self._tc, self._pc, self._omega = constants
        self._h = constants.acentric_factor / REFERENCE.acentric_factor
        self._unit = self._pc / (GAS_CONSTANT * self._tc)
        self._simple, self._reference = _fluids()
        # the reciprocal of the blended critical density, and how far the two fluids' own are from it
        simple, reference = self._simple.critical_density, self._reference.critical_density
        self._softening = (1.0 - self._h) / simple + self._h / reference
        self._simple_shift = simple * self._softening - 1.0
        self._reference_shift = reference * self._softening - 1.0
        self.validity = Limits(
            0.3 * self._tc, 4.0 * self._tc, 10.0 * self._pc, "reduced range of the tables of Lee and Kesler (1975)"
        )
        self.critical = None
        if pure:
            density = self._unit / _critical_compressibility(self._omega)
            self.critical = CriticalPoint(self._tc, self._pc, density)

    def density(self, temperature: Real, pressure: Real, branch: Branch) -> Root[Real]:
        """Return the density root of a branch; see ``Fluid.density``. Outside T_r from 0.2 to 1e6, and beyond p_r = 5e4 T_r, it
        is not applicable."""
        if type(temperature) is float:
            return cast("Root[Real]", self._density_float(temperature, cast(float, pressure), branch))
        ts, ps = cast(Array, temperature), cast(Array, pressure)
        density = np.empty(ts.shape)
        status = np.empty(ts.shape, dtype=np.int8)
        with np.errstate(all="ignore"):
            for start in range(0, ts.size, _BLOCK_ROWS):
                part = slice(start, start + _BLOCK_ROWS)
                density[part], status[part] = self._density_block(ts[part], ps[part], branch)
        return cast("Root[Real]", Root(density, status))

    def _density_float(self, temperature: float, pressure: float, branch: Branch) -> Root[float]:
        t, p = temperature / self._tc, pressure / self._pc
        if not (REDUCED_TEMPERATURE_MIN <= t <= REDUCED_TEMPERATURE_MAX and p <= _PRESSURE_MAX * t):
            return Root(_NAN, Status.NOT_APPLICABLE)
        simple = self._simple.root(t, p, branch)
        if simple.status != Status.CONVERGED:
            return Root(_NAN, simple.status)
        reference = self._reference.root(t, p, branch)
        if reference.status != Status.CONVERGED:
            return Root(_NAN, reference.status)
        h = self._h
        x0 = simple.density if simple.density > _TINY else _TINY
        xr = reference.density if reference.density > _TINY else _TINY
        ratio = x0 / xr
        # volume and compressibility of the blend, in units of the simple fluid's volume
        volume = 1.0 - h + h * ratio
        softness = (1.0 - h) / simple.slope + h * (ratio * ratio) / reference.slope
        if not (volume > 0.0 and softness > 0.0):
            return Root(_NAN, Status.NOT_APPLICABLE)
        return Root(self._unit * x0 / volume, Status.CONVERGED)

    def _density_block(self, temperature: Array, pressure: Array, branch: Branch) -> tuple[Array, NDArray[np.int8]]:
        t, p = temperature / self._tc, pressure / self._pc
        outside = ~((t >= REDUCED_TEMPERATURE_MIN) & (t <= REDUCED_TEMPERATURE_MAX) & (p <= _PRESSURE_MAX * t))
        t, p = np.where(outside, 1.0, t), np.where(outside, 1.0, p)
        x0, slope0, status0 = self._simple.roots(t, p, branch)
        xr, sloper, statusr = self._reference.roots(t, p, branch)
        h = self._h
        x0, xr = np.maximum(x0, _TINY), np.maximum(xr, _TINY)
        ratio = x0 / xr
        volume = 1.0 - h + h * ratio
        softness = (1.0 - h) / slope0 + h * (ratio * ratio) / sloper
        status = np.where(status0 != Status.CONVERGED, status0, statusr)
        unstable = ~((volume > 0.0) & (softness > 0.0)) & (status == Status.CONVERGED)
        status[outside | unstable] = Status.NOT_APPLICABLE
        return np.where(status == Status.CONVERGED, self._unit * x0 / volume, _NAN), status.astype(np.int8)

    def pressure(self, temperature: Real, density: Real) -> PressureDerivatives[Real]:
        """Return pressure and its derivatives; see ``Fluid.pressure``. NaN where the blend has no branch."""
        t = temperature / self._tc
        x = density / self._unit
        x0, xr, p = self._match(t, x)
        h = self._h
        v0, vr = x / x0, x / xr
        _, slope0, _, _ = terms(self._simple.isotherm(t), x0)
        _, sloper, _, _ = terms(self._reference.isotherm(t), xr)
        k0 = (1.0 - h) * (v0 * v0) / slope0
        kr = h * (vr * vr) / sloper
        # for each fluid F' dx = dp_r/T_r - (p_r/T_r + T_r x dZ/dT_r) dT_r/T_r, and dV = -((1 - h) dx0/x0^2 + h dxr/xr^2)
        softness = k0 + kr
        f = p / t
        expansion = k0 * (f + x0 * self._simple.compressibility_slope(t, x0)) + kr * (
            f + xr * self._reference.compressibility_slope(t, xr)
        )
        return PressureDerivatives(
            p * self._pc,
            GAS_CONSTANT * temperature / softness,
            self._pc / self._tc * (expansion / softness),
        )

    def residual_gibbs(self, temperature: Real, density: Real) -> Real:
        """Return ln(phi), [-], blended at equal T_r and p_r, NaN off the branches; see ``Fluid.residual_gibbs``."""
        t = temperature / self._tc
        x0, xr, _ = self._match(t, density / self._unit)
        if type(x0) is float:
            return self._blend(t, x0, xr) if x0 == x0 else x0
        # the logarithm takes no NaN
        found = ~np.isnan(cast(Array, x0))
        first, second = np.where(found, x0, 1.0), np.where(found, xr, 1.0)
        return cast(Real, np.where(found, self._blend(cast(Array, t), first, second), _NAN))

    def _blend(self, temperature: Real, simple_density: Real, reference_density: Real) -> Real:
        """Return ln(phi) of the blend from the two fluids' densities, all reduced, [-]."""
        simple = self._simple.log_fugacity_coefficient(temperature, simple_density)
        reference = self._reference.log_fugacity_coefficient(temperature, reference_density)
        return simple + self._h * (reference - simple)

    def saturation_pressure(self, temperature: Real) -> Real:
        """Return the vapour pressure by the paper's correlation, Pa; NaN outside 0.3 Tc to Tc.

        :param temperature: K, a float or an array of shape (n,)
        """
        t = temperature / self._tc
        if type(t) is float:
            return self._pc * reduced_vapour_pressure(t, self._omega) if 0.3 <= t <= 1.0 else _NAN
        ts = cast(Array, t)
        inside = (ts >= 0.3) & (ts <= 1.0)
        result = self._pc * reduced_vapour_pressure(np.where(inside, ts, 1.0), self._omega)
        return cast(Real, np.where(inside, result, _NAN))

    def saturation_temperature(self, pressure: Real) -> Real:
        """Return the temperature at which ``saturation_pressure`` has a value, K; NaN off the curve.

        :param pressure: Pa, a float or an array of shape (n,)
        """
        low = _log_vapour_pressure(0.3, self._omega)
        high = _log_vapour_pressure(1.0, self._omega)
        reduced = pressure / self._pc
        if type(reduced) is float:
            y = log(reduced) if reduced > 0.0 else -math.inf
            return self._tc * self._saturation_ratio(y, low, high) if low <= y <= high else _NAN
        p = cast(Array, reduced)
        positive = p > 0.0
        logarithm = log(np.where(positive, p, 1.0))
        inside = positive & (logarithm >= low) & (logarithm <= high)
        result = self._tc * self._saturation_ratio(np.where(inside, logarithm, high), low, high)
        return cast(Real, np.where(inside, result, _NAN))

    def _saturation_ratio(self, y: Real, low: float, high: float) -> Real:
        """Solve ln(p_r) = y for T_r by Newton's method in 1/T_r, from the chord: the curve is nearly straight there."""
        u = 1.0 + (high - y) * ((1.0 / 0.3 - 1.0) / (high - low))
        for _ in range(_VAPOUR_STEPS):
            t = 1.0 / u
            u = u - (_log_vapour_pressure(t, self._omega) - y) / _log_vapour_slope(t, self._omega)
        return 1.0 / u

    def _match(self, temperature: Real, density: Real) -> tuple[Real, Real, Real]:
        """Return both reduced densities and p_r at which the blended density is the given one.

        Newton's method on the three unknowns at once: each volume is linear in p_r, and the blend fixes p_r.
        """
        if type(temperature) is float:
            return cast("tuple[Real, Real, Real]", self._match_float(temperature, cast(float, density)))
        ts, xs = cast(Array, temperature), cast(Array, density)
        with np.errstate(all="ignore"):
            return cast("tuple[Real, Real, Real]", self._match_block(ts, xs))

    def _match_float(self, temperature: float, density: float) -> tuple[float, float, float]:
        if not (temperature >= REDUCED_TEMPERATURE_MIN and density > 0.0):
            return _NAN, _NAN, _NAN
        h = self._h
        share = density * self._softening
        branch = Branch.GAS if share <= 1.0 else Branch.LIQUID
        share = share if share < 1.0 else 1.0
        x0, xr = density * (1.0 + share * self._simple_shift), density * (1.0 + share * self._reference_shift)
        low0, high0 = _bracket(self._simple, temperature, branch)
        lowr, highr = _bracket(self._reference, temperature, branch)
        first, second = self._simple.isotherm(temperature), self._reference.isotherm(temperature)
        x0 = x0 if x0 < high0 else high0
        x0 = x0 if x0 > low0 else low0
        xr = xr if xr < highr else highr
        xr = xr if xr > lowr else lowr
        for _ in range(_MAX_STEPS):
            f0, slope0, _, _ = terms(first, x0)
            fr, sloper, _, _ = terms(second, xr)
            slope0 = slope0 if slope0 > 1e-12 else 1e-12
            sloper = sloper if sloper > 1e-12 else 1e-12
            v0, vr = density / x0, density / xr
            k0 = (1.0 - h) * (v0 * v0) / slope0
            kr = h * (vr * vr) / sloper
            f = (((1.0 - h) * v0 + h * vr - 1.0) * density + k0 * f0 + kr * fr) / (k0 + kr)
            ratio0 = 1.0 - (f - f0) / (x0 * slope0)
            ratior = 1.0 - (f - fr) / (xr * sloper)
            done = abs(ratio0 - 1.0) <= _MATCH and abs(ratior - 1.0) <= _MATCH
            ratio0 = ratio0 if ratio0 > 0.5 else 0.5
            ratior = ratior if ratior > 0.5 else 0.5
            x0 = x0 / (ratio0 if ratio0 < 2.0 else 2.0)
            xr = xr / (ratior if ratior < 2.0 else 2.0)
            x0 = x0 if x0 < high0 else high0
            x0 = x0 if x0 > low0 else low0
            xr = xr if xr < highr else highr
            xr = xr if xr > lowr else lowr
            if done and f > 0.0 and k0 + kr > 0.0:
                return x0, xr, f * temperature
        return self._search(temperature, density)

    def _search(self, temperature: float, density: float) -> tuple[float, float, float]:
        """Do the same by bracketing p_r, where Newton's method has failed (densities off the branches, mostly)."""
        branch = Branch.GAS if density * self._softening <= 1.0 else Branch.LIQUID
        found = self._search_branch(temperature, 1.0 / density, branch)
        if math.isnan(found[0]) and temperature > _CRITICAL_REGION:
            # next to the critical point, a branch may reach across the critical density
            found = self._search_branch(temperature, 1.0 / density, Branch(1 - branch))
        return found

    def _search_branch(self, temperature: float, volume: float, branch: Branch) -> tuple[float, float, float]:
        h = self._h
        ends = []
        for fluid in (self._simple, self._reference):
            end = fluid.branch_end(temperature, branch)
            if end is not None:
                ends.append(temperature * terms(fluid.isotherm(temperature), end)[0])
        if branch == Branch.GAS:
            # no gas here has Z below 0.01
            low, high = 0.01 * temperature / volume, min([_PRESSURE_MAX * temperature, *ends])
        else:
            low, high = max([_PRESSURE_MIN, *ends]), _PRESSURE_MAX * temperature
        if not 0.0 < low < high:
            return _NAN, _NAN, _NAN
        p = math.sqrt(low * high)
        for _ in range(_MAX_SEARCH_STEPS):
            simple = self._simple.root(temperature, p, branch)
            reference = self._reference.root(temperature, p, branch)
            found = simple.status == Status.CONVERGED and reference.status == Status.CONVERGED
            new = 0.0
            if found:
                x0, xr = simple.density, reference.density
                excess = (1.0 - h) / x0 + h / xr - volume
                softness = ((1.0 - h) / (x0 * x0 * simple.slope) + h / (xr * xr * reference.slope)) * p / temperature
                # where the blend softens with pressure, it has passed the end of its branch before the two fluids did
                found = softness > 0.0
                # where the branch ends, a step of p_r in its last digit moves the volume by more
                exhausted = high - low <= _VOLUME * high
                if found and abs(excess) <= _VOLUME * (volume + softness if exhausted else volume):
                    return x0, xr, p
                new = p * exp(excess / softness) if found else 0.0
            if (excess > 0.0) if found else (branch == Branch.LIQUID):
                low = p
            else:
                high = p
            if high - low <= _RESOLUTION * high:
                break
            p = new if low < new < high else math.sqrt(low * high)
        return _NAN, _NAN, _NAN

    def _match_block(self, temperature: Array, density: Array) -> tuple[Array, Array, Array]:
        h = self._h
        result = np.full((3, temperature.size), _NAN)
        rows = np.flatnonzero((temperature >= REDUCED_TEMPERATURE_MIN) & (density > 0.0))
        t, x = temperature[rows], density[rows]
        share = x * self._softening
        gas = share <= 1.0
        share = np.minimum(share, 1.0)
        x0, xr = x * (1.0 + share * self._simple_shift), x * (1.0 + share * self._reference_shift)
        low0, high0 = _brackets(self._simple, t, gas)
        lowr, highr = _brackets(self._reference, t, gas)
        x0 = np.maximum(np.minimum(x0, high0), low0)
        xr = np.maximum(np.minimum(xr, highr), lowr)
        first, second = self._simple.isotherm(t), self._reference.isotherm(t)
        for _ in range(_MAX_STEPS):
            if not rows.size:
                break
            f0, slope0, _, _ = terms(first, x0)
            fr, sloper, _, _ = terms(second, xr)
            slope0, sloper = np.maximum(slope0, 1e-12), np.maximum(sloper, 1e-12)
            v0, vr = x / x0, x / xr
            k0 = (1.0 - h) * (v0 * v0) / slope0
            kr = h * (vr * vr) / sloper
            f = (((1.0 - h) * v0 + h * vr - 1.0) * x + k0 * f0 + kr * fr) / (k0 + kr)
            ratio0 = 1.0 - (f - f0) / (x0 * slope0)
            ratior = 1.0 - (f - fr) / (xr * sloper)
            done = (np.abs(ratio0 - 1.0) <= _MATCH) & (np.abs(ratior - 1.0) <= _MATCH) & (f > 0.0)
            done &= k0 + kr > 0.0
            x0 = x0 / np.minimum(np.maximum(ratio0, 0.5), 2.0)
            xr = xr / np.minimum(np.maximum(ratior, 0.5), 2.0)
            x0 = np.maximum(np.minimum(x0, high0), low0)
            xr = np.maximum(np.minimum(xr, highr), lowr)
            if done.any():
                result[:, rows[done]] = x0[done], xr[done], f[done] * t[done]
                left = ~done
                rows, t, x, x0, xr = rows[left], t[left], x[left], x0[left], xr[left]
                low0, high0, lowr, highr = low0[left], high0[left], lowr[left], highr[left]
                first, second = select_rows(first, left), select_rows(second, left)
        for row in rows:
            result[:, row] = self._search(float(temperature[row]), float(density[row]))
        return result[0], result[1], result[2]


def _bracket(fluid: ReducedFluid, temperature: float, branch: Branch) -> tuple[float, float]:
    end = fluid.branch_end(temperature, branch)
    if end is None:
        return 0.0, math.inf
    return (0.0, end) if branch == Branch.GAS else (end, math.inf)


def _brackets(fluid: ReducedFluid, temperature: Array, gas: NDArray[np.bool_]) -> tuple[Array, Array]:
    low, high = np.zeros_like(temperature), np.full_like(temperature, math.inf)
    looped = fluid.has_loop(temperature)
    rows = np.flatnonzero(looped & gas)
    high[rows] = fluid.branch_ends(temperature[rows], Branch.GAS)
    rows = np.flatnonzero(looped & ~gas)
    low[rows] = fluid.branch_ends(temperature[rows], Branch.LIQUID)
    return low, high


def serves(substances: Sequence[Substance]) -> str | None:
    """Return why these substances cannot be served, or None."""
    for substance in substances:
        if substance.acentric_factor > ACENTRIC_FACTOR_MAX:
            return (
                f"{NAME} blends two fluids of acentric factor 0 and 0.3978 and is not carried to "
                f"{substance.acentric_factor:g} ({substance.id}); it takes up to {ACENTRIC_FACTOR_MAX:g}"
            )
    return refusal(substances, NAME)


def build(
    substances: Sequence[Substance],
    fractions: Sequence[float],
    interaction: Callable[[str, str], CubicPair | None],
) -> LeeKesler:
    """Return the equation at one composition.

    :param substances: the components
    :param fractions: mole fractions in the same order, summing to 1, [-]
    :param interaction: not used: the paper's mixing rules have no parameter
    """
    molar_mass = sum(x * substance.molar_mass for x, substance in zip(fractions, substances, strict=True))
    return LeeKesler(pseudo_critical(substances, fractions), molar_mass, max(fractions) == 1.0)
