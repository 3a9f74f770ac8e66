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
# error left after a step of relative size e, with bend k = delta F''/(2 F'): k^2 e^3 (Halley), k e^2 (Newton); where
# e (1 + k) is below the bound, that is 3e-17 at most
_HALLEY_STEP: Final = 6e-6
_NEWTON_STEP: Final = 1e-8
# longest step of a guarded search, in reduced density: a fifth of the least width between the branches at T_r/T = 1.05
GUARDED_STEP: Final = 0.15
# relative width at which a bracket cannot shrink any further
_CLOSED: Final = 4.5e-16


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
    halley = _HALLEY_STEP if isotherm.exact_third else _NEWTON_STEP
    rows = np.arange(n)
    x = start
    free = bool(guarded.any())
    # where every row is bracketed from the start, two of the decisions are the same for all
    enclosed = ~guarded
    enough: Array | float = np.where(guarded, _NEWTON_STEP, halley) if free else halley
    with np.errstate(all="ignore"):
        for _ in range(_MOST_STEPS):
            first, second, third = isotherm.euler(x)
            residual = x * first
            residual += x
            residual -= target
            slope = 1.0 + first
            slope += second
            above = residual > 0.0
            if free:
                high = np.where(above, x, high)
                low = np.where(above, low, x)
                enclosed = enclosed | ((low > 0.0) & (high < math.inf))
            bend = second + third
            bend *= 0.5
            bend /= slope
            ratio = slope * x
            np.divide(residual, ratio, out=ratio)
            damp = ratio * bend
            np.subtract(1.0, damp, out=damp)
            curved = damp > 0.5
            if free:
                curved &= enclosed
            step = ratio / damp
            if not curved.all():
                step = np.where(curved, step, ratio)
            np.abs(bend, out=bend)
            bend += 1.0
            bend *= np.abs(step)
            rising = slope > 0.0
            done = bend <= enough
            done &= rising
            step *= x
            new = x - step
            finished = np.flatnonzero(done)
            if finished.size:
                at = rows.take(finished)
                result[at] = new.take(finished)
                status[at] = Status.CONVERGED
                if finished.size == rows.size:
                    return Root(result, cast("NDArray[np.int8]", status))
                # the rest alone goes on, and all that follows is done for the rest alone
                keep = np.flatnonzero(~done)
                isotherm = isotherm.take(keep)
                rows, x, new, target = rows.take(keep), x.take(keep), new.take(keep), target.take(keep)
                low, high, above, rising = low.take(keep), high.take(keep), above.take(keep), rising.take(keep)
                if free:
                    enclosed, enough = enclosed.take(keep), cast(Array, enough).take(keep)
            if not free:
                high = np.where(above, x, high)
                low = np.where(above, low, x)
            bounded = high < math.inf
            double = 2.0 * x
            new = np.minimum(new, double)
            outside = ~((low < new) & (new < high))
            if free:
                outside &= enclosed
                short = np.fmin(np.fmax(new, x - GUARDED_STEP), x + GUARDED_STEP)
                new = np.where(enclosed, new, np.where(short <= 0.0, 0.5 * x, short))
            outside |= ~rising
            if outside.any():
                new = np.where(outside, np.where(bounded, 0.5 * (low + high), double), new)
            ended = bounded & (high - low <= _CLOSED * high)
            lost = ~(rising | enclosed) if free else None
            if ended.any() or (lost is not None and lost.any()):
                status[rows[ended]] = Status.CONVERGED
                if lost is not None:
                    status[rows[lost]] = Status.NO_ROOT
                    ended |= lost
                result[rows[ended]] = x[ended]
                keep = np.flatnonzero(~ended)
                isotherm = isotherm.take(keep)
                rows, new, target = rows.take(keep), new.take(keep), target.take(keep)
                low, high = low.take(keep), high.take(keep)
                if free:
                    enclosed, enough = enclosed.take(keep), cast(Array, enough).take(keep)
            x = new
            if rows.size == 0:
                break
    result[rows] = x
    return Root(result, cast("NDArray[np.int8]", status))
