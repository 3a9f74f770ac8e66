"""Mixtures for phase tests; all compositions are invented."""

from collections.abc import Mapping
from functools import cache

from gasapi.engine.models.gerg_2008 import GergSystem
from gasapi.engine.phase.mixture import MixturePhase, mixture_phase
from gasapi.gases.loader import load_gerg

NATURAL_GAS = {
    "methane": 0.9,
    "nitrogen": 0.02,
    "carbon-dioxide": 0.015,
    "ethane": 0.04,
    "propane": 0.015,
    "n-butane": 0.003,
    "isobutane": 0.003,
    "n-pentane": 0.0012,
    "isopentane": 0.0012,
    "n-hexane": 0.0006,
    "helium": 0.001,
}
DRY_AIR = {"nitrogen": 0.7812, "oxygen": 0.2096, "argon": 0.0092}


def with_water(gas: Mapping[str, float], fraction: float) -> dict[str, float]:
    """Return a gas with a mole fraction of water in it."""
    return {**{name: x * (1.0 - fraction) for name, x in gas.items()}, "water": fraction}


@cache
def _phase(items: tuple[tuple[str, float], ...]) -> MixturePhase:
    total = sum(x for _, x in items)
    return mixture_phase(GergSystem(load_gerg(), [name for name, _ in items]), [x / total for _, x in items])


def gerg_phase(gas: Mapping[str, float]) -> MixturePhase:
    """Return the phase of a mixture by GERG-2008."""
    return _phase(tuple(gas.items()))
