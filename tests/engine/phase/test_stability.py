"""Stability of mixtures: traps that must come out right, and 10,000 random states none of which is a false gas."""

import numpy as np
import pytest
from gerg_mixtures import NATURAL_GAS, gerg_phase, with_water

from gasapi.engine.models.gerg_2008 import GergSystem
from gasapi.engine.models.gerg_2008_fugacity import GergEnergy
from gasapi.engine.phase.curves import DIRECT
from gasapi.engine.phase.mixture import DewKind, mixture_phase
from gasapi.engine.phase.region import Region
from gasapi.engine.phase.stability import Stability
from gasapi.engine.protocol import Branch, Status
from gasapi.gases.loader import load_gerg

_SINGLE = (int(Region.GAS), int(Region.SUPERCRITICAL))


def _splits(energy, fractions, temperature, pressure):
    """Return for each state whether some liquid lies below the tangent plane: plain substitution, all states at once.

    Trials: Wilson's liquid without water, the two heaviest components nearly pure, and pure water. Only a distance clearly
    below zero counts, so that this finds no false splits; it may miss some.
    """
    m, n = temperature.size, fractions.size
    feed = np.broadcast_to(fractions, (m, n))
    best, log_f = np.full(m, np.inf), np.full((m, n), np.nan)
    for branch in (Branch.GAS, Branch.LIQUID):
        log_phi, _, status = energy.log_fugacity(temperature, pressure, feed, branch)
        gibbs = np.where(status == Status.CONVERGED, (fractions * log_phi).sum(axis=1), np.inf)
        lower = gibbs < best
        best, log_f = np.where(lower, gibbs, best), np.where(lower[:, None], log_phi + np.log(fractions), log_f)
    water = np.array([c == "water" for c in energy.components])
    k = energy.critical_pressures / pressure[:, None]
    k = k * np.exp(5.373 * (1.0 + energy.acentric_factors) * (1.0 - energy.critical_temperatures / temperature[:, None]))
    starts = [np.where(water, 0.0, fractions / k)]
    heavy = [i for i in np.argsort(-energy.critical_temperatures).tolist() if not water[i]][:2]
    for i in [*heavy, *np.flatnonzero(water).tolist()]:
        pure = np.where(water, 0.0, 0.01 * fractions) if not water[i] else np.zeros(n)
        pure[i] = 1.0
        starts.append(np.broadcast_to(pure, (m, n)))
    found = np.zeros(m, dtype=bool)
    for start in starts:
        w = start / start.sum(axis=1)[:, None]
        for _ in range(5):
            rows = np.flatnonzero(~found & np.isfinite(log_f[:, 0]))
            if rows.size == 0:
                break
            log_phi, _, status = energy.log_fugacity(temperature[rows], pressure[rows], w[rows], Branch.LIQUID)
            x = w[rows]
            excess = np.where(x > 0.0, np.log(np.where(x > 0.0, x, 1.0)) + log_phi - log_f[rows], 0.0)
            distance = np.where(status == Status.CONVERGED, (x * excess).sum(axis=1), np.inf)
            found[rows[distance < -1e-5]] = True
            new = np.where(x > 0.0, np.exp(np.clip(log_f[rows] - log_phi, -300.0, 300.0)), 0.0)
            total = new.sum(axis=1)
            usable = (status == Status.CONVERGED) & np.isfinite(total) & (total > 0.0)
            w = w.copy()
            w[rows[usable]] = new[usable] / total[usable, None]
    return found


@pytest.mark.slow
def test_no_false_gas_in_ten_thousand_states():
    """Of 10,000 states of 57 invented mixtures none more than 1 K inside two phases is called a gas.

    Of states that the curves leave to the direct test, milliseconds each, four of a mixture are taken.
    """
    data = load_gerg()
    names = [c.id for c in data.components]
    rng = np.random.default_rng(2024)
    gases = two_phase = states = 0
    for _ in range(57):
        chosen = [str(c) for c in rng.choice(names, rng.integers(3, 8), replace=False)]
        x = np.maximum(rng.dirichlet(np.full(len(chosen), 0.6)), 1e-5)
        if "water" in chosen:
            x[chosen.index("water")] = 10.0 ** rng.uniform(-5.5, -2.0)
        x /= x.sum()
        system = GergSystem(data, chosen)
        phase, energy = mixture_phase(system, x.tolist()), GergEnergy(system)
        t = rng.uniform(180.0, 480.0, 200)
        p = np.exp(rng.uniform(np.log(2e4), np.log(3e7), 200))
        # half of them near the dew line
        dew = phase._survey_block(t, np.log(p))[1]
        near = np.isfinite(dew) & (dew > 150.0) & (np.arange(200) % 2 == 0)
        t = np.where(near, dew + rng.uniform(-6.0, 3.0, 200), t)
        direct = phase._survey_block(t, np.log(p))[0] == DIRECT
        kept = np.sort(np.concatenate([np.flatnonzero(~direct), np.flatnonzero(direct)[:4]]))
        t, p = t[kept], p[kept]
        states += kept.size
        regions = phase.region_block(t, p)
        gas = np.isin(regions, _SINGLE)
        gases, two_phase = gases + int(gas.sum()), two_phase + int((regions == Region.TWO_PHASE).sum())
        rows = np.flatnonzero(gas)
        if rows.size == 0:
            continue
        with np.errstate(all="ignore"):
            suspect = rows[_splits(energy, x, t[rows], p[rows])]
            if suspect.size:
                deep = _splits(energy, x, t[suspect] + 1.0, p[suspect]) & _splits(energy, x, t[suspect] - 1.0, p[suspect])
                assert not deep.any(), (chosen, x, t[suspect][deep], p[suspect][deep])
    assert states >= 10_000
    assert gases > 2000
    assert two_phase > 2000


@pytest.mark.parametrize(
    ("gas", "pressure"),
    [
        ({"carbon-dioxide": 0.9995, "water": 0.0005}, 3e6),
        ({"carbon-dioxide": 0.998, "water": 0.002}, 1.2e7),
        (with_water(NATURAL_GAS, 5e-4), 6e6),
        ({"hydrogen": 0.998, "water": 0.002}, 5e6),
    ],
)
def test_just_inside_the_water_dew_point(gas, pressure):
    """Half a kelvin below the water dew point an aqueous trial splits the state, half a kelvin above it none does."""
    phase = gerg_phase(gas)
    verdict = phase.at(450.0, pressure)
    assert verdict.dew_kind == DewKind.WATER
    below = phase.stability(verdict.dew_point_temperature - 0.5, pressure)
    assert below.verdict == Stability.UNSTABLE
    assert below.fractions[list(gas).index("water")] > 0.9
    assert phase.stability(verdict.dew_point_temperature + 0.5, pressure).verdict == Stability.STABLE


def test_water_and_heptane_do_not_share_a_liquid():
    """Heptane and water are kept apart: an unrestricted trial would find a common liquid that no one has measured."""
    phase = gerg_phase({"methane": 0.98, "n-heptane": 0.019, "water": 0.001})
    dew = phase.at(450.0, 3e6)
    assert dew.dew_kind == DewKind.HYDROCARBON
    without = gerg_phase({"methane": 0.98 / 0.999, "n-heptane": 0.019 / 0.999}).at(450.0, 3e6)
    assert dew.dew_point_temperature == pytest.approx(without.dew_point_temperature, abs=0.1)
    result = phase.stability(dew.dew_point_temperature - 1.0, 3e6)
    assert result.verdict == Stability.UNSTABLE
    assert result.fractions[2] == 0.0


def test_wide_boiling_mixture():
    """A trace of decane in methane is found at 20 MPa and at 0.1 MPa, far from where methane condenses."""
    phase = gerg_phase({"methane": 0.999, "n-decane": 0.001})
    for pressure in (1e5, 2e6, 1.5e7):
        dew = phase.at(450.0, pressure).dew_point_temperature
        assert dew > 270.0
        assert phase.stability(dew - 0.5, pressure).verdict == Stability.UNSTABLE
        assert phase.stability(dew + 0.5, pressure).verdict == Stability.STABLE


def test_next_to_the_critical_point():
    """Close to the critical point, where the trivial solution attracts, either side of the boundary is told apart."""
    phase = gerg_phase({"methane": 0.8, "ethane": 0.2})
    t, p, _ = phase.critical
    assert phase.stability(t, p * 0.985).verdict == Stability.UNSTABLE
    assert phase.stability(t, p * 1.02).verdict == Stability.STABLE
    assert phase.at(t, p * 0.985).region == Region.TWO_PHASE
    assert phase.at(t, p * 1.02).region != Region.TWO_PHASE


def test_a_feed_without_a_root_is_unknown():
    """Where the equation gives the feed no density, no verdict is made up."""
    phase = gerg_phase({"methane": 0.8, "ethane": 0.2})
    assert phase.stability(20.0, 5e8).verdict == Stability.UNKNOWN
