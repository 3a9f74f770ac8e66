"""What a mixture splits into at a two-phase state, for callers who accept the density of the whole."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import NamedTuple

from gasapi.engine.phase.stability import Stability
from gasapi.service.answers import PhasePart, TwoPhaseAnswer
from gasapi.service.mixture_phase import MixtureJudge
from gasapi.service.prepared import PreparedModel

__all__ = ["Split", "split"]


class Split(NamedTuple):
    """The density of the whole, mol/m3, and both parts for an answer."""

    density: float
    answer: TwoPhaseAnswer


def split(model: PreparedModel, components: Sequence[str], temperature: float, pressure: float) -> Split | None:
    """Return the two phases of a state by the model's own equation; None for a pure gas, or where none were found.

    A pure gas on its saturation line has no density that pressure and temperature fix.

    :param model: the model
    :param components: catalogue ids, in the order of the model's fractions
    :param temperature: K
    :param pressure: Pa
    """
    judge = model.phase
    if not isinstance(judge, MixtureJudge) or judge.model != model.id:
        return None
    found = judge.phase.flash(temperature, pressure)
    if found.status != Stability.UNSTABLE or not math.isfinite(found.vapour_fraction):
        return None

    def part(share: float, density: float, fractions: Sequence[float]) -> PhasePart:
        molar_mass = math.fsum(x * m for x, m in zip(fractions, model.molar_masses, strict=True))
        return PhasePart(share, density * molar_mass, tuple(zip(components, fractions, strict=True)))

    vapour = [float(y) for y in found.vapour]
    liquid = [float(x) for x in found.liquid]
    return Split(
        float(found.density),
        TwoPhaseAnswer(
            part(float(found.vapour_fraction), float(found.vapour_density), vapour),
            part(1.0 - float(found.vapour_fraction), float(found.liquid_density), liquid),
        ),
    )
