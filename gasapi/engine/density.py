"""The density root of a reduced isotherm: delta (1 + D alpha_r(delta)) = p / (rho_r R T).

One iteration, two drivers: on floats with plain branches, on blocks with one decision a row, both doing the same
arithmetic in the same order, so that a row has the same bits alone and in a block. Steps are Halley's (third order),
kept inside a bracket that every evaluation narrows; a row is done when the step it has just taken is so small that what is
left is below rounding, and leaves the block.

Two kinds of search:

*bracketed*: the isotherm is known to rise through exactly one root between the bounds (between zero and the saturated
vapour, above the saturated liquid, or anywhere at a supercritical temperature).

*guarded*: nothing is known. Newton's steps start below the gas root (above the liquid root), where the isotherm bends such
that they cannot pass it, and are too short to leap over the region between the branches; a slope that is not positive means
that the branch ends before this pressure: there is no root. Multiparameter equations have further roots with a positive
slope between the branches, which this search never meets.
"""

from __future__ import annotations

import math
from typing import Final, Protocol, cast

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.elementary import Array
from gasapi.engine.protocol import Root, Status

__all__ = ["GUARDED_STEP", "ReducedIsotherm", "solve_block", "solve_float"]

_MOST_STEPS: Final = 120
# error left after a step of relative size e, with bend k = delta F''/(2 F'): k^2 e^3 (Halley), k e^2 (Newton)
_HALLEY_STEP: Final = 1e-6
_NEWTON_STEP: Final = 1e-8
# longest step of a guarded search, in reduced density: a fifth of the least width between the branches at T_r/T = 1.05
GUARDED_STEP: Final = 0.15
# relative width at which a bracket cannot shrink any further
_CLOSED: Final = 4.5e-16
# above this fraction of rows at work a block is not worth compressing
_COMPRESS: Final = 0.75


class ReducedIsotherm(Protocol):
    """What the search asks of an isotherm: Euler derivatives, and the choice of rows for a block."""

    @property
    def exact_third(self) -> bool:
        """Whether the third derivative is complete."""
        ...


def solve_float(isotherm, target: float, start: float, low: float, high: float, guarded: bool) -> Root[float]:  # type: ignore[no-untyped-def]
    """Return the reduced density root of one isotherm.

    :param isotherm: has ``euler(delta)`` and ``exact_third``
    :param target: p / (rho_r R T), [-]
    :param start: first guess; for a guarded search on a known side of the root, [-]
    :param low: lower bound, 0 where none is known, [-]
    :param high: upper bound, infinite where none is known, [-]
    :param guarded: whether the search is guarded (see the module)
    """
    exact = isotherm.exact_third
    euler = isotherm.euler
    enough = _HALLEY_STEP if exact and not guarded else _NEWTON_STEP
    enclosed = not guarded
    x = start
    for _ in range(_MOST_STEPS):
        first, second, third = euler(x)
        residual = x + x * first - target
        slope = 1.0 + first + second
        if residual > 0.0:
            high = x
        else:
            low = x
        if guarded and low > 0.0 and high < math.inf:
            enclosed = True
        if slope > 0.0:
            bend = 0.5 * (second + third) / slope
            ratio = residual / (slope * x)
            damp = 1.0 - ratio * bend
            step = ratio / damp if damp > 0.5 and enclosed else ratio
            size = step if step > 0.0 else -step
            stiff = 1.0 + (bend if bend > 0.0 else -bend)
            new = x - x * step
            if size * stiff <= enough:
                return Root(new, Status.CONVERGED)
            if new > 2.0 * x:
                new = 2.0 * x
            if enclosed and not low < new < high:
                new = 0.5 * (low + high) if high < math.inf else 2.0 * x
            elif not enclosed:
                if new > x + GUARDED_STEP:
                    new = x + GUARDED_STEP
                elif new < x - GUARDED_STEP:
                    new = x - GUARDED_STEP
                if new <= 0.0:
                    new = 0.5 * x
        else:
            if not enclosed:
                return Root(x, Status.NO_ROOT)
            new = 0.5 * (low + high) if high < math.inf else 2.0 * x
        if high < math.inf and high - low <= _CLOSED * high:
            return Root(x, Status.CONVERGED)
        x = new
    return Root(x, Status.NOT_CONVERGED)


def solve_block(  # type: ignore[no-untyped-def]
    isotherm, target: Array, start: Array, low: Array, high: Array, guarded: NDArray[np.bool_]
) -> Root[Array]:
    """Return the reduced density roots of a block of isotherms, row for row as ``solve_float`` does.

    :param isotherm: has ``euler(delta)``, ``take(rows)`` and ``exact_third``
    :param target: p / (rho_r R T), shape (n,), [-]; likewise ``start``, ``low``, ``high`` and ``guarded``
    """
    n = target.size
    result = start.copy()
    status = np.full(n, Status.NOT_CONVERGED, dtype=np.int8)
    if n == 0:
        return Root(result, status)
    exact = isotherm.exact_third
    rows = np.arange(n)
    at_work = np.ones(n, dtype=bool)
    enough = np.where(guarded, _NEWTON_STEP, _HALLEY_STEP if exact else _NEWTON_STEP)
    enclosed = ~guarded
    x = start
    with np.errstate(all="ignore"):
        for _ in range(_MOST_STEPS):
            first, second, third = isotherm.euler(x)
            residual = x + x * first - target
            slope = 1.0 + first + second
            above = residual > 0.0
            high = np.where(above, x, high)
            low = np.where(above, low, x)
            bounded = high < math.inf
            enclosed = enclosed | ((low > 0.0) & bounded)
            rising = slope > 0.0
            bend = 0.5 * (second + third) / slope
            ratio = residual / (slope * x)
            damp = 1.0 - ratio * bend
            step = np.where((damp > 0.5) & enclosed, ratio / damp, ratio)
            done = rising & (np.abs(step) * (1.0 + np.abs(bend)) <= enough)
            new = x - x * step
            finished = at_work & done
            result[rows[finished]] = new[finished]
            status[rows[finished]] = Status.CONVERGED
            at_work &= ~done
            lost = at_work & ~rising & ~enclosed
            result[rows[lost]] = x[lost]
            status[rows[lost]] = Status.NO_ROOT
            at_work &= ~lost
            double = 2.0 * x
            new = np.where(new > double, double, new)
            outside = enclosed & ~((low < new) & (new < high)) | ~rising
            if not enclosed.all():
                short = np.fmin(np.fmax(new, x - GUARDED_STEP), x + GUARDED_STEP)
                new = np.where(enclosed, new, np.where(short <= 0.0, 0.5 * x, short))
            new = np.where(outside, np.where(bounded, 0.5 * (low + high), double), new)
            closed = at_work & (high < math.inf) & (high - low <= _CLOSED * high)
            result[rows[closed]] = x[closed]
            status[rows[closed]] = Status.CONVERGED
            at_work &= ~closed
            left = int(np.count_nonzero(at_work))
            if left == 0:
                break
            if left <= _COMPRESS * at_work.size:
                keep = np.flatnonzero(at_work)
                isotherm = isotherm.take(keep)
                rows, x, new = rows.take(keep), x.take(keep), new.take(keep)
                target, low, high = target.take(keep), low.take(keep), high.take(keep)
                enclosed, enough = enclosed.take(keep), enough.take(keep)
                at_work = np.ones(keep.size, dtype=bool)
            x = np.where(at_work, new, x)
    result[rows[at_work]] = x[at_work]
    return Root(result, cast("NDArray[np.int8]", status))
