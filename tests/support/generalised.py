"""The generalised equations ready for tests: catalogue substances, published k_ij, and states that try every corner."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from functools import cache
from types import ModuleType

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.models import (
    ideal_gas,
    lee_kesler,
    peng_robinson,
    soave_redlich_kwong,
    van_der_waals,
    virial,
)
from gasapi.engine.protocol import Fluid
from gasapi.gases.loader import load_interaction, load_substances
from gasapi.gases.records import CubicPair, Substance

MODELS: dict[str, ModuleType] = {
    module.ID: module for module in (ideal_gas, lee_kesler, peng_robinson, soave_redlich_kwong, van_der_waals, virial)
}

NATURAL_GAS = {
    "methane": 0.86,
    "ethane": 0.06,
    "propane": 0.025,
    "n-butane": 0.01,
    "carbon-dioxide": 0.02,
    "nitrogen": 0.02,
    "hydrogen": 0.005,
}
"""Invented, not a sample of any field."""

COMPOSITIONS = {
    "nitrogen": {"nitrogen": 1.0},
    "ammonia": {"ammonia": 1.0},
    "n-octane": {"n-octane": 1.0},
    "hydrogen": {"hydrogen": 1.0},
    "natural gas": NATURAL_GAS,
    "helium in nitrogen": {"helium": 0.3, "nitrogen": 0.7},
}


@cache
def _catalogue() -> dict[str, Substance]:
    return {gas.id: gas.substance for gas in load_substances() if gas.substance is not None}


def substances(*ids: str) -> list[Substance]:
    """Return records of catalogue substances."""
    return [_catalogue()[id] for id in ids]


def interaction(first: str, second: str) -> CubicPair | None:
    """Return the published pair, or None."""
    low, high = sorted((first, second))
    return load_interaction().get((low, high))


@cache
def fluid(model: str, composition: str) -> Fluid:
    """Return a fluid of the tables above."""
    fractions = COMPOSITIONS[composition]
    return built(MODELS[model].build, tuple(fractions), tuple(fractions.values()))


def built(
    build: Callable[[Sequence[Substance], Sequence[float], Callable[[str, str], CubicPair | None]], Fluid],
    ids: Sequence[str],
    fractions: Sequence[float],
) -> Fluid:
    """Return a fluid of catalogue substances."""
    return build(substances(*ids), list(fractions), interaction)


def scale(composition: str) -> tuple[float, float]:
    """Return mole averages of the critical temperature, K, and pressure, Pa."""
    pairs = [(x, substances(id)[0]) for id, x in COMPOSITIONS[composition].items()]
    return sum(x * s.critical_temperature for x, s in pairs), sum(x * s.critical_pressure for x, s in pairs)


def states(composition: str, count: int, seed: int) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return temperatures, K, and pressures, Pa: a third anywhere, a third below Tc, a third around the critical point."""
    random = np.random.default_rng(seed)
    tc, pc = scale(composition)
    near = random.choice([-1.0, 1.0], count)
    t = [
        10.0 ** random.uniform(-0.4, 1.3, count),
        random.uniform(0.4, 1.0, count),
        1.0 + near * 10.0 ** random.uniform(-12.0, -1.0, count),
    ]
    p = [
        10.0 ** random.uniform(-8.0, 3.0, count),
        10.0 ** random.uniform(-4.0, 1.0, count),
        1.0 + near * 10.0 ** random.uniform(-12.0, -0.5, count),
    ]
    return tc * np.concatenate(t), pc * np.concatenate(p)
