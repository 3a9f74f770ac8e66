"""Two phases in equilibrium at given temperature and pressure.

Rachford and Rice, Trans. AIME 195 (1952) 327, for the vapour fraction; successive substitution in ln K, sped up by Anderson
mixing (J. ACM 12 (1965) 547), from the trial phase that the stability test found. A component that the incipient phase may
not hold (see ``stability``) stays out of it here as well.
"""

from __future__ import annotations

from typing import Final, NamedTuple

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.phase.energy import Floats, MixtureEnergy
from gasapi.engine.phase.stability import Stability, StabilityTest
from gasapi.engine.protocol import Branch, Status

__all__ = ["FlashResult", "FlashStatus", "two_phase_flash", "vapour_fraction"]

FlashStatus = Stability
"""STABLE: one phase; UNSTABLE: two phases, found; UNKNOWN: not converged."""

_STEPS: Final = 300
_DEPTH: Final = 4
_STRIDE: Final = 6.0
_LONGEST: Final = 0.3
_CONVERGED: Final = 1e-11
_ACCEPTED: Final = 1e-8
_FURTHER: Final = 1e-5
"""How far below the tangent plane of the vapour, over R T, a third phase has to be."""

_ABSENT: Final = 1e-14
"""Mole fraction that stands for a component held out of a phase."""


class FlashResult(NamedTuple):
    """What two phases a state splits into.

    ``status`` as above; ``vapour_fraction`` by amount; ``vapour`` and ``liquid`` mole fractions, shape (n,); densities of the
    phases and of the whole, mol/m3; ``aqueous`` tells that the denser phase is liquid water; ``third_phase`` that the vapour
    beside it would condense further, so that these two phases are not all, and the densities are not to be used. For a single
    phase the vapour fraction is NaN, and the densities are the feed's.
    """

    status: Stability
    vapour_fraction: float
    vapour: Floats
    liquid: Floats
    vapour_density: float
    liquid_density: float
    density: float
    aqueous: bool
    third_phase: bool


def vapour_fraction(fractions: Floats, k: Floats) -> float:
    """Return the root of sum z_i (K_i - 1)/(1 + beta (K_i - 1)) between its poles; outside [0, 1] for a single phase.

    :param fractions: mole fractions of the feed, shape (n,), [-]
    :param k: K-values, shape (n,), [-]
    """
    excess = k - 1.0
    low, high = -1.0 / float(excess.max()), -1.0 / float(excess.min())
    low, high = (low, high) if float(excess.max()) > 0.0 > float(excess.min()) else (-1e9, 1e9)
    beta = min(max(0.5, low), high)
    for _ in range(200):
        ratio = excess / (1.0 + beta * excess)
        value = float((fractions * ratio).sum())
        slope = -float((fractions * ratio * ratio).sum())
        if value > 0.0:
            low = beta
        else:
            high = beta
        new = beta - value / slope if slope != 0.0 else 0.5 * (low + high)
        if not low < new < high:
            new = 0.5 * (low + high)
        if abs(new - beta) < 1e-15 * max(1.0, abs(beta)):
            return new
        beta = new
    return beta


def two_phase_flash(
    energy: MixtureEnergy, test: StabilityTest, fractions: Floats, temperature: float, pressure: float
) -> FlashResult:
    """Return the phases of one state.

    :param energy: the equation of state
    :param test: the stability test of this composition
    :param fractions: mole fractions of the feed, shape (n,), all above 0, [-]
    :param temperature: K
    :param pressure: Pa
    """
    found = test.at(temperature, pressure)
    nan = float("nan")
    single = FlashResult(
        found.verdict, nan, fractions, fractions, found.feed_density, found.feed_density, found.feed_density, False, False
    )
    if found.verdict != Stability.UNSTABLE:
        return single
    denser = found.density > found.feed_density
    held_out = found.fractions <= 0.0
    trial = np.maximum(found.fractions, _ABSENT)
    log_k = np.log(fractions / trial) if denser else np.log(trial / fractions)
    split = _Split(energy, fractions, temperature, pressure, held_out, log_k)
    with np.errstate(all="ignore"):
        solved = split.solve(np.where(held_out, 0.0, log_k))
    if solved is None:
        return single._replace(status=Stability.UNKNOWN)
    beta, y, x, rho_v, rho_l = solved
    whole = 1.0 / (beta / rho_v + (1.0 - beta) / rho_l)
    aqueous = test.is_aqueous(x)
    # hydrocarbons may condense beside the water, or water beside them
    third = test.is_wet and test.of(np.maximum(y, _ABSENT)).at(temperature, pressure, _FURTHER).verdict == Stability.UNSTABLE
    return FlashResult(Stability.UNSTABLE, beta, y, x, rho_v, rho_l, whole, aqueous, third)


class _Split:
    """One flash calculation."""

    def __init__(
        self,
        energy: MixtureEnergy,
        fractions: Floats,
        temperature: float,
        pressure: float,
        held_out: NDArray[np.bool_],
        log_k: Floats,
    ) -> None:
        self._energy, self._z = energy, fractions
        self._t, self._p = np.array([temperature]), np.array([pressure])
        self._held_out = held_out
        # a component held out of one phase keeps the K-value that says so
        self._fixed = np.where(held_out, np.where(log_k > 0.0, 30.0, -30.0), 0.0)

    def _phase(self, x: Floats, first: Branch) -> tuple[Floats, float] | None:
        for branch in (first, Branch(1 - first)):
            log_phi, rho, status = self._energy.log_fugacity(self._t, self._p, x[None], branch)
            if status[0] == Status.CONVERGED:
                return log_phi[0], float(rho[0])
        return None

    def _evaluate(self, log_k: Floats) -> tuple[Floats, tuple[float, Floats, Floats, float, float]] | None:
        """Return what successive substitution makes of ln K, and the phases that ln K gives."""
        k = np.exp(np.where(self._held_out, self._fixed, np.clip(log_k, -300.0, 300.0)))
        beta = vapour_fraction(self._z, k)
        x = self._z / (1.0 + beta * (k - 1.0))
        y = k * x
        x, y = np.maximum(x, 0.0) / x.sum(), np.maximum(y, 0.0) / y.sum()
        vapour, liquid = self._phase(y, Branch.GAS), self._phase(x, Branch.LIQUID)
        if vapour is None or liquid is None or not np.isfinite(vapour[0] + liquid[0]).all():
            return None
        new = np.where(self._held_out, 0.0, liquid[0] - vapour[0])
        return new, (beta, y, x, vapour[1], liquid[1])

    def solve(self, log_k: Floats) -> tuple[float, Floats, Floats, float, float] | None:
        """Return vapour fraction, compositions and densities; None where they were not found."""
        points: list[Floats] = []
        residuals: list[Floats] = []
        best: tuple[float, tuple[float, Floats, Floats, float, float]] | None = None
        current = log_k
        last = np.inf
        for _ in range(_STEPS):
            evaluated = self._evaluate(current)
            if evaluated is None:
                if not points:
                    return None
                # back to plain substitution from the last good point
                current = points[-1] + residuals[-1]
                points, residuals = [], []
                evaluated = self._evaluate(current)
                if evaluated is None:
                    return None
            new, phases = evaluated
            residual = new - current
            size = float(np.abs(residual).max())
            if best is None or size < best[0]:
                best = (size, phases)
            if size < _CONVERGED:
                break
            if size > last:
                # still leaving the neighbourhood of the feed, where mixing would lead back to it: longer steps the same way
                points, residuals = [], []
                current = current + residual * min(_STRIDE, max(1.0, _LONGEST / size))
                last = size
                continue
            last = size
            points.append(current)
            residuals.append(residual)
            points, residuals = points[-_DEPTH - 1 :], residuals[-_DEPTH - 1 :]
            current = new
            if len(points) > 2:
                r = np.array([residuals[i + 1] - residuals[i] for i in range(len(points) - 1)]).T
                x = np.array([points[i + 1] - points[i] for i in range(len(points) - 1)]).T
                weights = np.linalg.lstsq(r, residual, rcond=1e-10)[0]
                mixed = new - (x + r) @ weights
                if float(np.abs(mixed - current).max()) < 3.0:
                    current = mixed
        if best is None or best[0] > _ACCEPTED:
            return None
        beta, y, x, rho_v, rho_l = best[1]
        if not 0.0 < beta < 1.0 or (abs(rho_v / rho_l - 1.0) < 1e-6 and float(np.abs(x - y).max()) < 1e-6):
            return None
        if rho_v > rho_l:
            return 1.0 - beta, x, y, rho_l, rho_v
        return beta, y, x, rho_v, rho_l
