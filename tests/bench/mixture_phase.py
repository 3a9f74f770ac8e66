"""What a phase verdict costs: a new composition, a single state, a row; against a general library's loop of dew points.

Run as ``python tests/bench/mixture_phase.py``. Processor time, best of several runs; the gas is invented. The project's aims:
150 ms (better 60) for a new 11-component gas, 20 microseconds a state, 0.3 a row.
"""

from __future__ import annotations

import sys
import time
from collections.abc import Callable
from pathlib import Path

import CoolProp
import numpy as np

sys.path.insert(0, str(Path(__file__).resolve().parents[1] / "support"))

from gerg_mixtures import DRY_AIR, NATURAL_GAS, with_water

from gasapi.engine.models.gerg_2008 import GergSystem
from gasapi.engine.phase.mixture import mixture_phase
from gasapi.gases.loader import load_gerg

_COOLPROP = {
    "methane": "Methane",
    "nitrogen": "Nitrogen",
    "carbon-dioxide": "CarbonDioxide",
    "ethane": "Ethane",
    "propane": "Propane",
    "n-butane": "n-Butane",
    "isobutane": "IsoButane",
    "n-pentane": "n-Pentane",
    "isopentane": "Isopentane",
    "n-hexane": "n-Hexane",
}


def _best(call: Callable[[], object], runs: int) -> float:
    """Return the least processor time of a call, s."""
    times = []
    for _ in range(runs):
        start = time.process_time()
        call()
        times.append(time.process_time() - start)
    return min(times)


def _library_dew_points() -> int:
    """Return how many of 20 dew points a general library finds for the natural gas without its helium."""
    state = CoolProp.AbstractState("HEOS", "&".join(_COOLPROP.values()))
    total = sum(NATURAL_GAS[c] for c in _COOLPROP)
    state.set_mole_fractions([NATURAL_GAS[c] / total for c in _COOLPROP])
    found = 0
    for pressure in np.geomspace(1e5, 4e6, 20):
        try:
            state.update(CoolProp.PQ_INPUTS, float(pressure), 1.0)
        except ValueError:
            continue
        found += 1
    return found


def main() -> None:
    """Print the table."""
    data = load_gerg()
    gases = {
        "natural gas, 11 components": NATURAL_GAS,
        "the same with 50 ppm water": with_water(NATURAL_GAS, 5e-5),
        "moist air": with_water(DRY_AIR, 0.01),
    }
    for name, gas in gases.items():
        system = GergSystem(data, list(gas))
        total = sum(gas.values())
        fractions = [x / total for x in gas.values()]
        phase = mixture_phase(system, fractions)
        new = _best(lambda s=system, x=fractions: mixture_phase(s, x).at(300.0, 5e6), 5)
        state = _best(lambda p=phase: [p.at(285.0, 5e6) for _ in range(2000)], 5) / 2000
        t, p = np.linspace(260.0, 330.0, 50_000), np.linspace(1e5, 7e6, 50_000)
        row = _best(lambda f=phase, a=t, b=p: f.block(a, b), 5) / t.size
        region = _best(lambda f=phase, a=t, b=p: f.region_block(a, b), 5) / t.size
        flash = _best(lambda f=phase: f.flash(230.0, 4e6), 3)
        print(f"{name:28}  new {new * 1e3:6.1f} ms  state {state * 1e6:5.2f} us  row {row * 1e6:6.3f} us", end="")
        print(f"  region alone {region * 1e6:6.3f} us  flash {flash * 1e3:5.1f} ms")
    start = time.process_time()
    found = _library_dew_points()
    print(f"a general library's loop: {found} of 20 dew points in {(time.process_time() - start) * 1e3:.0f} ms")


if __name__ == "__main__":
    main()
