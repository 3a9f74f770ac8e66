"""Many states of a mixture looked through for a second phase at once, when its boundary is made.

A few successive substitutions (Michelsen, Fluid Phase Equilibria 9 (1982) 1) from each of the liquids that may form first and
from a gas: a trial below the tangent plane proves a state unstable. That none is found proves nothing; ``StabilityTest`` is
the thorough test of one state.
"""

from __future__ import annotations

from typing import Final, NamedTuple

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.phase.dew_search import first_liquids, ideal_gas_trials
from gasapi.engine.phase.energy import Floats, MixtureEnergy
from gasapi.engine.protocol import Branch, Status

__all__ = ["Screened", "screen"]

_STEPS: Final = 5
_PROOF: Final = 1e-6
_TRIVIAL: Final = 1e-3
_SAME_ROOT: Final = 1e-4


class Screened(NamedTuple):
    """Which states are proven unstable, shape (m,), and the mole fractions of the trial that proves it, (m, n)."""

    unstable: NDArray[np.bool_]
    fractions: Floats


def screen(energy: MixtureEnergy, fractions: Floats, temperature: Floats, pressure: Floats, alone_most: int = 3) -> Screened:
    """Look for a trial phase below the tangent plane of each state.

    :param energy: the equation of state
    :param fractions: mole fractions of the feed, shape (n,), all above 0, [-]
    :param temperature: K, shape (m,)
    :param pressure: Pa, shape (m,)
    :param alone_most: how many nearly pure liquids are among the trials
    """
    m, n = temperature.size, fractions.size
    log_f = _feed(energy, fractions, temperature, pressure)
    found = np.zeros(m, dtype=bool)
    shown = np.broadcast_to(fractions, (m, n)).copy()
    trials = [(Branch.LIQUID, guess.fractions) for guess in first_liquids(energy, fractions, np.log(pressure), alone_most)]
    trials.append((Branch.GAS, ideal_gas_trials(energy, fractions, temperature)))
    for branch, start in trials:
        rows = np.flatnonzero(~found & np.isfinite(log_f[:, 0]))
        w = start[rows]
        rho = np.zeros(rows.size)
        for count in range(_STEPS):
            if rows.size == 0:
                break
            if count == 0:
                log_phi, rho, status = energy.log_fugacity(temperature[rows], pressure[rows], w, branch)
                known = status == Status.CONVERGED
            else:
                log_phi, rho, known = energy.log_fugacity_near(temperature[rows], pressure[rows], w, rho)
            held = w > 0.0
            excess = np.where(held, np.log(np.where(held, w, 1.0)) + log_phi - log_f[rows], 0.0)
            distance = np.where(known, (w * excess).sum(axis=1), np.inf)
            below = np.flatnonzero(distance < -_PROOF)
            if below.size:
                # only a root that is reached from outside is a phase
                root, status = energy.density(temperature[rows[below]], pressure[rows[below]], w[below], branch)
                with np.errstate(invalid="ignore"):
                    real = below[(status == Status.CONVERGED) & (np.abs(root / rho[below] - 1.0) < _SAME_ROOT)]
                found[rows[real]], shown[rows[real]] = True, w[real]
            new = np.where(held, np.exp(np.clip(log_f[rows] - log_phi, -600.0, 600.0)), 0.0)
            total = new.sum(axis=1)
            going = known & ~found[rows] & np.isfinite(total) & (total > 0.0)
            rows, w, rho = rows[going], new[going] / total[going, None], rho[going]
            # what came back to the feed shows nothing more
            away = np.abs(w - fractions).max(axis=1) > _TRIVIAL
            rows, w, rho = rows[away], w[away], rho[away]
    return Screened(found, shown)


def _feed(energy: MixtureEnergy, fractions: Floats, temperature: Floats, pressure: Floats) -> Floats:
    """Return ln f_i of the feed on the root of the lower Gibbs energy, NaN where it has none."""
    feed = np.broadcast_to(fractions, (temperature.size, fractions.size))
    lowest = np.full(temperature.size, np.inf)
    log_f = np.full(feed.shape, np.nan)
    for branch in (Branch.GAS, Branch.LIQUID):
        log_phi, _, status = energy.log_fugacity(temperature, pressure, feed, branch)
        gibbs = np.where(status == Status.CONVERGED, (feed * log_phi).sum(axis=1), np.inf)
        lower = gibbs < lowest
        lowest = np.where(lower, gibbs, lowest)
        log_f = np.where(lower[:, None], log_phi + np.log(fractions), log_f)
    return log_f
