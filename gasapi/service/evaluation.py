"""One prepared model, many states: region, density and reasons, for a float or for a block of rows.

The two forms do the same comparisons on the same numbers, so that a row of a series has the numbers, the region and the
level of the single state.
"""

from __future__ import annotations

from typing import Final, NamedTuple, cast

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.elementary import Array
from gasapi.engine.phase.region import Region
from gasapi.engine.protocol import Branch, PressureDerivatives, Solution, Status
from gasapi.service.prepared import PreparedModel
from gasapi.service.quality import BAD, Reason

__all__ = ["Block", "Point", "evaluate_block", "evaluate_float", "is_state"]

# a generalised equation is good where its stated uncertainty is at most this
GOOD_UNCERTAINTY: Final = 0.01

# beyond these a number is no state of matter; the least pressure keeps a density off the end of a double (Pa, Pa, K)
_THINNEST: Final = 1e-100
_HIGHEST: Final = 1e13
_HOTTEST: Final = 1e6

_OUTSIDE_VALIDITY = int(Reason.OUTSIDE_VALIDITY)
_OUTSIDE_LIMITS = int(Reason.OUTSIDE_LIMITS)
_NEAR_DEW_POINT = int(Reason.NEAR_DEW_POINT)
_NEAR_CRITICAL = int(Reason.NEAR_CRITICAL)
_LIQUID = int(Reason.LIQUID)
_UNCERTAINTY_LARGE = int(Reason.UNCERTAINTY_LARGE)
_PHASE_UNKNOWN = int(Reason.PHASE_UNKNOWN)
_TWO_PHASE = int(Reason.TWO_PHASE)
_SOLID_POSSIBLE = int(Reason.SOLID_POSSIBLE)
_NOT_CONVERGED = int(Reason.NOT_CONVERGED)
_INPUT_BAD = int(Reason.INPUT_BAD)

_LIQUID_REGION = int(Region.LIQUID)
_SOLID_REGION = int(Region.SOLID_POSSIBLE)
_TWO_PHASE_REGION = int(Region.TWO_PHASE)
_UNKNOWN_REGION = int(Region.UNKNOWN)

_REASON_OF_STATUS: Final = {
    int(Status.CONVERGED): 0,
    int(Status.NOT_CONVERGED): _NOT_CONVERGED,
    int(Status.NO_ROOT): _NOT_CONVERGED,
    int(Status.NOT_APPLICABLE): _OUTSIDE_LIMITS,
}
_REASON_OF_STATUS_ARRAY: Final = np.array([_REASON_OF_STATUS[i] for i in range(4)], dtype=np.int64)


class Point(NamedTuple):
    """One state: density in mol/m3 (0 where bad), reasons, region, the model's relative uncertainty (k = 2), derivatives.

    ``surveyed`` is what the phase judge found on the way.
    """

    density: float
    flags: int
    region: int
    uncertainty: float | None
    derivatives: PressureDerivatives[float] | None = None
    surveyed: object = None


class Block(NamedTuple):
    """Rows of states, each of shape (n,): density in mol/m3 and relative uncertainty (NaN where bad), reasons, regions."""

    density: Array
    flags: NDArray[np.int64]
    region: NDArray[np.int8]
    uncertainty: Array


def is_state(temperature: Array, pressure: Array) -> NDArray[np.bool_]:
    """Return which rows are states at all, shape (n,): what ``evaluate_float`` calls a bad input is not.

    :param temperature: K, shape (n,)
    :param pressure: Pa, shape (n,)
    """
    with np.errstate(invalid="ignore"):
        warm: NDArray[np.bool_] = (temperature > 0.0) & (temperature < _HOTTEST)
        return warm & (pressure >= _THINNEST) & (pressure < _HIGHEST)


def evaluate_float(model: PreparedModel, temperature: float, pressure: float, margin: float) -> Point:
    """Return the state at one temperature and pressure.

    :param temperature: K
    :param pressure: Pa
    :param margin: where nearness to the dew point begins, K
    """
    if not (0.0 < temperature < _HOTTEST and _THINNEST <= pressure < _HIGHEST):
        return Point(0.0, model.flags | _INPUT_BAD, _UNKNOWN_REGION, None)
    flags = model.flags
    inside, extended = model.validity, model.extended
    if not (extended.temperature_min <= temperature <= extended.temperature_max and pressure <= extended.pressure_max):
        region = (
            model.phase.region_float(temperature, pressure) if model.phase.covers(temperature, pressure) else _UNKNOWN_REGION
        )
        return Point(0.0, flags | _OUTSIDE_LIMITS, region, None)
    if not (inside.temperature_min <= temperature <= inside.temperature_max and pressure <= inside.pressure_max):
        flags |= _OUTSIDE_VALIDITY
    region, near_dew, surveyed = model.phase.survey_float(temperature, pressure, margin)
    if region == _TWO_PHASE_REGION:
        return Point(0.0, flags | _TWO_PHASE, region, None, None, surveyed)
    if region == _SOLID_REGION:
        return Point(0.0, flags | _SOLID_POSSIBLE, region, None)
    if region == _LIQUID_REGION:
        flags |= _LIQUID
        if model.gas_only:
            return Point(0.0, flags | _OUTSIDE_LIMITS, region, None)
    elif region == _UNKNOWN_REGION:
        flags |= _PHASE_UNKNOWN
    root, derivatives = _solve_float(model, temperature, pressure, Branch.LIQUID if region == _LIQUID_REGION else Branch.GAS)
    if root.status != 0:
        return Point(0.0, flags | _REASON_OF_STATUS[int(root.status)], region, None)
    density = root.density
    region = model.phase.refine_float(temperature, pressure, density, region)
    if near_dew:
        flags |= _NEAR_DEW_POINT
    if model.phase.near_critical_float(temperature, density):
        flags |= _NEAR_CRITICAL
    uncertainty = model.uncertainty.at(temperature, pressure, density)
    if model.generalised and not uncertainty <= GOOD_UNCERTAINTY:
        flags |= _UNCERTAINTY_LARGE
    return Point(density, flags, region, uncertainty, derivatives, surveyed)


def _other(branch: Branch) -> Branch:
    return Branch.LIQUID if branch == Branch.GAS else Branch.GAS


def _solve_float(model: PreparedModel, temperature: float, pressure: float, branch: Branch) -> Solution:
    """Return the root of a branch; where both branches have one in a single phase, that of the lower Gibbs energy."""
    fluid = model.fluid
    solution = fluid.solve(temperature, pressure, branch)
    if not model.phase.compares_roots or fluid.rises_throughout(temperature):
        return solution
    other = fluid.density(temperature, pressure, _other(branch))
    if other.status != 0:
        return solution
    first = solution.root
    if first.status == 0:
        if first.density == other.density:
            return solution
        here = fluid.residual_gibbs(temperature, first.density)
        if not fluid.residual_gibbs(temperature, other.density) < here:
            return solution
    return fluid.solve(temperature, pressure, _other(branch))


def _solve_block(model: PreparedModel, temperature: Array, pressure: Array, branch: Branch) -> tuple[Array, NDArray[np.int8]]:
    """Return density and status of rows, root for root as ``_solve_float`` does."""
    fluid = model.fluid
    root = fluid.density(temperature, pressure, branch)
    status = cast("NDArray[np.int8]", root.status)
    if not model.phase.compares_roots:
        return root.density, status
    rows = np.flatnonzero(~np.asarray(fluid.rises_throughout(temperature)))
    if rows.size == 0:
        return root.density, status
    t, p = temperature.take(rows), pressure.take(rows)
    other = fluid.density(t, p, _other(branch))
    there = cast("NDArray[np.int8]", other.status) == 0
    here = status.take(rows) == 0
    better = there & ~here
    both = np.flatnonzero(there & here & (other.density != root.density.take(rows)))
    if both.size:
        ours = fluid.residual_gibbs(t.take(both), root.density.take(rows.take(both)))
        better[both] = fluid.residual_gibbs(t.take(both), other.density.take(both)) < ours
    density, status = root.density.copy(), status.copy()
    density[rows[better]] = other.density[better]
    status[rows[better]] = 0
    return density, status


def evaluate_block(model: PreparedModel, temperature: Array, pressure: Array, margin: float) -> Block:
    """Return the states of rows.

    :param temperature: K, shape (n,)
    :param pressure: Pa, shape (n,); NaN in either is a bad row
    :param margin: where nearness to the dew point begins, K
    """
    n = temperature.size
    density = np.full(n, np.nan)
    uncertainty = np.full(n, np.nan)
    region = np.full(n, _UNKNOWN_REGION, dtype=np.int8)
    flags = np.full(n, model.flags, dtype=np.int64)
    usable = is_state(temperature, pressure)
    flags[~usable] |= _INPUT_BAD
    rows = np.flatnonzero(usable)
    t, p = temperature.take(rows), pressure.take(rows)
    inside, extended = model.validity, model.extended
    limited = (t >= extended.temperature_min) & (t <= extended.temperature_max) & (p <= extended.pressure_max)
    if not limited.all():
        outside = np.flatnonzero(~limited)
        flags[rows.take(outside)] |= _OUTSIDE_LIMITS
        for i in outside.tolist():
            if model.phase.covers(float(t[i]), float(p[i])):
                region[rows[i]] = model.phase.region_float(float(t[i]), float(p[i]))
        keep = np.flatnonzero(limited)
        rows, t, p = rows.take(keep), t.take(keep), p.take(keep)
    if rows.size == 0:
        return Block(density, flags, region, uncertainty)
    row_flags = flags.take(rows)
    valid = (t >= inside.temperature_min) & (t <= inside.temperature_max) & (p <= inside.pressure_max)
    row_flags[~valid] |= _OUTSIDE_VALIDITY
    row_region, near_dew = model.phase.survey_block(t, p, margin)
    row_flags[row_region == _TWO_PHASE_REGION] |= _TWO_PHASE
    row_flags[row_region == _SOLID_REGION] |= _SOLID_POSSIBLE
    liquid = row_region == _LIQUID_REGION
    row_flags[liquid] |= (_LIQUID | _OUTSIDE_LIMITS) if model.gas_only else _LIQUID
    row_flags[row_region == _UNKNOWN_REGION] |= _PHASE_UNKNOWN
    row_density = np.full(t.size, np.nan)
    row_uncertainty = np.full(t.size, np.nan)
    solvable = (row_flags & BAD) == 0
    for branch, chosen in ((Branch.GAS, solvable & ~liquid), (Branch.LIQUID, solvable & liquid)):
        some = np.flatnonzero(chosen)
        if some.size:
            found, status = _solve_block(model, t.take(some), p.take(some), branch)
            row_flags[some] |= _REASON_OF_STATUS_ARRAY.take(status)
            row_density[some] = found
    good = np.flatnonzero((row_flags & BAD) == 0)
    if good.size:
        tg, pg, rho = t.take(good), p.take(good), row_density.take(good)
        row_region[good] = model.phase.refine_block(tg, pg, rho, row_region.take(good))
        row_uncertainty[good] = model.uncertainty.block(tg, pg, rho)
        extra = np.where(near_dew.take(good), _NEAR_DEW_POINT, 0)
        extra |= np.where(model.phase.near_critical_block(tg, rho), _NEAR_CRITICAL, 0)
        if model.generalised:
            extra |= np.where(row_uncertainty[good] <= GOOD_UNCERTAINTY, 0, _UNCERTAINTY_LARGE)
        row_flags[good] |= extra
    row_density[(row_flags & BAD) != 0] = np.nan
    density[rows] = row_density
    uncertainty[rows] = row_uncertainty
    region[rows] = row_region
    flags[rows] = row_flags
    return Block(density, flags, region, uncertainty)
