"""Whether one state of a mixture is stable: the tangent-plane distance of trial phases.

Michelsen, Fluid Phase Equilibria 9 (1982) 1. Every trial starts from its own composition (Wilson's K-values both ways, each
heavy or associating component nearly pure, the light ones nearly pure as a gas) on its own branch of the density, goes by
successive substitution, all trials in one block, and then by Newton's method in component densities, where its stationary
points have one constant c = mu_i(trial) - mu_i(feed), over R T, for all components. Any trial below the tangent plane proves
the state unstable. It is stable only when every trial has come to rest above the plane or at the feed itself; else it is
unknown.

Water and hydrocarbons do not share a trial: hydrocarbon trials are dry, and the aqueous one holds solutes only (see ``water``).
"""

from __future__ import annotations

from enum import IntEnum
from typing import Final, NamedTuple

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.phase.energy import Floats, MixtureEnergy
from gasapi.engine.phase.water import COLD, COLD_DENSITY, SOLUTES, WATER, LiquidWater
from gasapi.engine.protocol import Branch, Status

__all__ = ["PROOF", "Stability", "StabilityResult", "StabilityTest"]

_SUBSTITUTIONS: Final = 7
_NEWTON_STEPS: Final = 30
_CLOSE: Final = 1e-8
PROOF: Final = 1e-7
"""A tangent-plane distance (over R T) below minus this proves instability; rounding is some 1e-10."""

_TRIVIAL: Final = 1e-4
_PURE: Final = 0.99
_HEAVY: Final = 0.75
"""Components with a critical temperature above this part of the state's get a liquid trial of their own."""

_MOST_TRIALS: Final = 12
_ASIDE: Final = (0.1, 0.5)


class Stability(IntEnum):
    """The verdict on a state."""

    STABLE = 0
    UNSTABLE = 1
    UNKNOWN = 2


class StabilityResult(NamedTuple):
    """``verdict``; the lowest tangent-plane distance over R T found (0 for the feed itself); the trial that has it, its mole
    fractions (n,) and density, mol/m3; the feed's density, mol/m3 (NaN where it has none).
    """

    verdict: Stability
    distance: float
    fractions: Floats
    density: float
    feed_density: float


class StabilityTest:
    """Stability of one composition. Immutable.

    :param energy: the equation of state
    :param fractions: mole fractions of the feed, shape (n,), all above 0, [-]
    :param liquid_water: liquid water by this equation, where water keeps to its own trial; else None
    """

    def __init__(self, energy: MixtureEnergy, fractions: Floats, liquid_water: LiquidWater | None) -> None:
        self.energy = energy
        self.fractions = fractions
        n = fractions.size
        names = energy.components
        everything = np.ones(n, dtype=bool)
        self._liquid_water = liquid_water
        self._water = liquid_water.index if liquid_water is not None else -1
        self._hydrocarbon = np.array([c != WATER for c in names]) if self._water >= 0 else everything
        self._aqueous = np.array([c == WATER or c in SOLUTES for c in names])

    @property
    def is_wet(self) -> bool:
        """Whether water keeps to its own trial."""
        return self._water >= 0

    def of(self, fractions: Floats) -> StabilityTest:
        """Return the test for another composition of the same components.

        :param fractions: mole fractions, shape (n,), all above 0, [-]
        """
        return StabilityTest(self.energy, fractions, self._liquid_water)

    def is_aqueous(self, fractions: Floats) -> bool:
        """Return whether a phase of these mole fractions, shape (n,), is liquid water beside dry hydrocarbons."""
        return self._water >= 0 and float(fractions[self._water]) > 0.5

    def _feed(self, temperature: float, pressure: float) -> tuple[Floats, float] | None:
        """Return ln f_i of the feed on its stable branch, and its density."""
        t, p = np.array([temperature, temperature]), np.array([pressure, pressure])
        best: tuple[float, Floats, float] | None = None
        for branch in (Branch.GAS, Branch.LIQUID):
            log_phi, rho, status = self.energy.log_fugacity(t[:1], p[:1], self.fractions[None], branch)
            if status[0] == Status.CONVERGED and np.isfinite(log_phi).all():
                gibbs = float((self.fractions * log_phi[0]).sum())
                if best is None or gibbs < best[0] - 1e-12:
                    best = (gibbs, log_phi[0], float(rho[0]))
        if best is None:
            return None
        return best[1] + np.log(self.fractions), best[2]

    def _trials(self, temperature: float, pressure: float) -> list[tuple[Branch, NDArray[np.bool_], Floats]]:
        e, z, mask = self.energy, self.fractions, self._hydrocarbon
        wilson = np.exp(
            np.clip(
                np.log(e.critical_pressures / pressure)
                + 5.373 * (1.0 + e.acentric_factors) * (1.0 - e.critical_temperatures / temperature),
                -300.0,
                300.0,
            )
        )
        everything = np.ones(z.size, dtype=bool)
        trials = [(Branch.LIQUID, mask, np.where(mask, z / wilson, 0.0)), (Branch.GAS, everything, z * wilson)]
        if mask.sum() > 1 or self._water < 0:
            heavy = [i for i in np.argsort(-e.critical_temperatures, kind="stable").tolist() if mask[i]]
            chosen = [i for i in heavy if e.critical_temperatures[i] > _HEAVY * temperature][: _MOST_TRIALS - 3]
            light = heavy[-1]
            for i in dict.fromkeys([*chosen, light]):
                pure = np.where(mask, z, 0.0) * ((1.0 - _PURE) / max(float(z[mask].sum()), 1e-300))
                pure[i] += _PURE
                trials.append((Branch.LIQUID if i != light or i in chosen else Branch.GAS, mask, pure))
        if self._water >= 0:
            pure = np.zeros(z.size)
            pure[self._water] = 1.0
            trials.append((Branch.LIQUID, self._aqueous, pure))
        return trials

    def _beside_the_feed(self, temperature: float, density: float) -> list[tuple[Branch, NDArray[np.bool_], Floats]]:
        """Return trials on either side of the feed along its softest direction, for states near a critical point.

        The direction is the eigenvector of the smallest eigenvalue of sqrt(z_i z_j) d ln f_i/d n_j.
        """
        z = self.fractions
        d = self.energy.derivatives(np.array([temperature]), density * z[None])
        hessian = d.hessian[0]
        summed = 1.0 + hessian @ z
        # at constant pressure the volume gives way
        hessian = hessian - np.outer(summed, summed) / float(z @ summed)
        root = np.sqrt(z)
        matrix = root[:, None] * hessian * root + np.eye(z.size)
        if not np.isfinite(matrix).all():
            return []
        _, vectors = np.linalg.eigh(matrix)
        direction = vectors[:, 0] / root
        direction /= np.abs(direction).max()
        heavier = float(direction @ (z * self.energy.critical_temperatures)) > 0.0
        mask = self._hydrocarbon
        trials = []
        for sign, branch in ((1.0, Branch.LIQUID), (-1.0, Branch.GAS)):
            for size in _ASIDE:
                w = z * np.exp((sign if heavier else -sign) * size * direction)
                trials.append((branch, mask, np.where(mask, w, 0.0)))
        return trials

    def at(self, temperature: float, pressure: float, proof: float = PROOF) -> StabilityResult:
        """Return the verdict on one state.

        :param temperature: K
        :param pressure: Pa
        :param proof: how far below the tangent plane, over R T, a trial has to be to prove instability
        """
        with np.errstate(all="ignore"):
            feed = self._feed(temperature, pressure)
            if feed is None:
                return StabilityResult(Stability.UNKNOWN, 0.0, self.fractions, np.nan, np.nan)
            log_f, feed_density = feed
            trials = self._trials(temperature, pressure) + self._beside_the_feed(temperature, feed_density)
            worst = StabilityResult(Stability.STABLE, 0.0, self.fractions, feed_density, feed_density)
            if self._liquid_water is not None and temperature < COLD:
                # below the equation's own liquid water there is no root for the aqueous trial
                worst = self._supercooled(temperature, pressure, log_f, worst)
            open_trials = False
            for branch in (Branch.LIQUID, Branch.GAS):
                masks = np.array([m for b, m, _ in trials if b == branch])
                if masks.size == 0:
                    continue
                start = np.array([w for b, _, w in trials if b == branch])
                found, unsettled = self._descend(temperature, pressure, log_f, feed_density, branch, masks, start)
                if found.verdict == Stability.UNSTABLE and found.distance < worst.distance:
                    worst = found
                open_trials |= unsettled
            if worst.verdict != Stability.UNSTABLE and open_trials:
                return worst._replace(verdict=Stability.UNKNOWN)
            if worst.verdict == Stability.UNSTABLE and worst.distance > -proof:
                return worst._replace(verdict=Stability.STABLE)
            return worst

    def _supercooled(self, temperature: float, pressure: float, log_f: Floats, worst: StabilityResult) -> StabilityResult:
        """Compare the feed with pure liquid water by its vapour pressure."""
        assert self._liquid_water is not None
        log_w, _, known = self._liquid_water.log_fugacity(np.array([temperature]), np.array([pressure]))
        distance = float(log_w[0] - log_f[self._water] - np.log(pressure))
        if not known[0]:
            return worst._replace(verdict=Stability.UNKNOWN)
        if distance > -PROOF:
            return worst
        pure = np.zeros(self.fractions.size)
        pure[self._water] = 1.0
        return StabilityResult(Stability.UNSTABLE, distance, pure, COLD_DENSITY, worst.feed_density)

    def _descend(
        self,
        temperature: float,
        pressure: float,
        log_f: Floats,
        feed_density: float,
        branch: Branch,
        mask: NDArray[np.bool_],
        start: Floats,
    ) -> tuple[StabilityResult, bool]:
        """Bring trials of one branch to rest; return the lowest, and whether one is left unsettled."""
        m = start.shape[0]
        t, p = np.full(m, temperature), np.full(m, pressure)
        w = start / start.sum(axis=1)[:, None]
        best = StabilityResult(Stability.STABLE, 0.0, self.fractions, feed_density, feed_density)
        density = np.full(m, np.nan)
        alive = np.ones(m, dtype=bool)
        for _ in range(_SUBSTITUTIONS):
            log_phi, rho, status = self.energy.log_fugacity(t, p, w, branch)
            ok = status == Status.CONVERGED
            # a trial whose branch does not exist has no phase of that kind to form
            alive &= ok
            density = np.where(ok, rho, density)
            log_w = np.log(np.where(w > 0.0, w, 1.0))
            excess = np.where(mask & (w > 0.0), log_w + log_phi - log_f, 0.0)
            distance = np.where(alive, (w * excess).sum(axis=1), np.inf)
            low = int(distance.argmin())
            if distance[low] < -PROOF and not self._is_feed(w[low], density[low], feed_density):
                best = StabilityResult(
                    Stability.UNSTABLE, float(distance[low]), w[low].copy(), float(density[low]), feed_density
                )
            new = np.where(mask, np.exp(np.clip(log_f - log_phi, -600.0, 600.0)), 0.0)
            total = new.sum(axis=1)
            w = np.where((alive & (total > 0.0))[:, None], new / np.where(total > 0.0, total, 1.0)[:, None], w)
            if not alive.any():
                break
        if best.verdict == Stability.UNSTABLE or not alive.any():
            return best, False
        rows = np.flatnonzero(alive)
        return self._newton(t[rows], p[rows], log_f, feed_density, branch, mask[rows], w[rows], density[rows])

    def _is_feed(self, w: Floats, density: float, feed_density: float) -> bool:
        return bool(np.abs(w - self.fractions).max() < _TRIVIAL and abs(density / feed_density - 1.0) < 10.0 * _TRIVIAL)

    def _newton(
        self,
        t: Floats,
        p: Floats,
        log_f: Floats,
        feed_density: float,
        branch: Branch,
        mask: NDArray[np.bool_],
        w: Floats,
        density: Floats,
    ) -> tuple[StabilityResult, bool]:
        """Solve ln f_i(trial) - ln f_i(feed) = c and p(trial) = p for ln rho_i and c."""
        m, n = w.shape
        log_rt = np.log(self.energy.gas_constant * t)
        x = np.where(mask, np.log(np.maximum(w * density[:, None], 1e-280)), 0.0)
        c = np.zeros(m)
        settled = np.zeros(m, dtype=bool)
        lost = np.zeros(m, dtype=bool)
        index = np.arange(n)
        for step_number in range(_NEWTON_STEPS):
            rho_i = np.where(mask, np.exp(x), 0.0)
            total = rho_i.sum(axis=1)
            d = self.energy.derivatives(t, rho_i)
            fractions = rho_i / total[:, None]
            weighted = d.hessian * fractions[:, None, :]
            imbalance = x + log_rt[:, None] + d.potential - log_f
            if step_number == 0:
                c = (fractions * np.where(mask, imbalance, 0.0)).sum(axis=1)
            residual = np.empty((m, n + 1))
            residual[:, :n] = np.where(mask, imbalance - c[:, None], 0.0)
            scaled = p / (self.energy.gas_constant * t * total)
            residual[:, n] = d.compressibility - scaled
            jacobian = np.zeros((m, n + 1, n + 1))
            jacobian[:, :n, :n] = np.where(mask[:, :, None] & mask[:, None, :], weighted, 0.0)
            jacobian[:, index, index] += 1.0
            jacobian[:, :n, n] = np.where(mask, -1.0, 0.0)
            own = (d.hessian * fractions[:, None, :]).sum(axis=2)
            jacobian[:, n, :n] = np.where(mask, fractions + own * fractions - fractions * residual[:, n : n + 1], 0.0)
            try:
                step = np.linalg.solve(jacobian, residual[:, :, None])[:, :, 0]
            except np.linalg.LinAlgError:
                lost |= ~settled
                break
            size = np.abs(step).max(axis=1)
            lost |= ~np.isfinite(size)
            damp = np.where(size > 1.0, 1.0 / size, 1.0)
            working = ~(settled | lost)
            x = np.where(working[:, None], x - damp[:, None] * step[:, :n], x)
            c = np.where(working, c - damp * step[:, n], c)
            settled |= working & (size < _CLOSE)
            if (settled | lost).all():
                break
        rho_i = np.where(mask, np.exp(x), 0.0)
        total = rho_i.sum(axis=1)
        fractions = rho_i / total[:, None]
        # only a root that is reached from outside along a rising isotherm is a phase
        safe = np.where(np.isfinite(fractions).all(axis=1)[:, None], fractions, w)
        checked, status = self.energy.density(t, p, safe, branch)
        genuine = (status == Status.CONVERGED) & (np.abs(checked / total - 1.0) < 1e-6)
        best = StabilityResult(Stability.STABLE, 0.0, self.fractions, feed_density, feed_density)
        unsettled = False
        for i in range(m):
            if not settled[i] or not genuine[i]:
                other = self._substitute(float(t[i]), float(p[i]), log_f, feed_density, branch, mask[i], w[i])
                if other is None:
                    unsettled = True
                elif other.distance < best.distance:
                    best = other
                continue
            if c[i] < -PROOF and c[i] < best.distance and not self._is_feed(fractions[i], float(total[i]), feed_density):
                best = StabilityResult(Stability.UNSTABLE, float(c[i]), fractions[i].copy(), float(total[i]), feed_density)
        return best, unsettled

    def _substitute(
        self,
        temperature: float,
        pressure: float,
        log_f: Floats,
        feed_density: float,
        branch: Branch,
        mask: NDArray[np.bool_],
        w: Floats,
    ) -> StabilityResult | None:
        """Go on by successive substitution with a dominant-eigenvalue step now and then; None where it does not settle.

        Crowe and Nishio, AIChE J. 21 (1975) 528: the general dominant eigenvalue method, here with one eigenvalue.
        """
        t, p = np.array([temperature]), np.array([pressure])
        log_w = np.where(mask, np.log(np.maximum(w, 1e-280)), -np.inf)
        last = None
        for count in range(240):
            amounts = np.where(mask, np.exp(log_w), 0.0)
            fractions = amounts / amounts.sum()
            log_phi, rho, status = self.energy.log_fugacity(t, p, fractions[None], branch)
            if status[0] != Status.CONVERGED:
                return StabilityResult(Stability.STABLE, 0.0, self.fractions, feed_density, feed_density)
            used = mask & (fractions > 0.0)
            excess = np.where(used, np.log(np.where(used, fractions, 1.0)) + log_phi[0] - log_f, 0.0)
            distance = float((fractions * excess).sum())
            if self._is_feed(fractions, float(rho[0]), feed_density):
                return StabilityResult(Stability.STABLE, 0.0, self.fractions, feed_density, feed_density)
            if distance < -PROOF:
                return StabilityResult(Stability.UNSTABLE, distance, fractions, float(rho[0]), feed_density)
            new = np.where(mask, log_f - log_phi[0], -np.inf)
            move = np.where(mask, new - log_w, 0.0)
            if np.abs(move).max() < 1e-9:
                return StabilityResult(Stability.STABLE, 0.0, self.fractions, feed_density, feed_density)
            if last is not None and count % 5 == 4:
                ratio = float((move * last).sum() / max(float((last * last).sum()), 1e-300))
                if 0.3 < ratio < 0.98:
                    new = np.where(mask, log_w + move / (1.0 - ratio), -np.inf)
            last = move
            log_w = new
        return None
