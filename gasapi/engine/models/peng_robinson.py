"""The Peng-Robinson equation in its form of 1978, without volume translation.

    p = R T/(v - b) - a_c alpha(T)/(v^2 + 2 b v - b^2),    alpha = (1 + m (1 - sqrt(T/Tc)))^2
    m = 0.37464 + 1.54226 w - 0.26992 w^2                          (w <= 0.491, as in 1976)
    m = 0.379642 + 1.48503 w - 0.164423 w^2 + 0.016666 w^3         (w > 0.491, 1978)

The constants are the exact ones that follow from the critical point: eta_c = 1/(1 + (4 - sqrt 8)^(1/3) + (4 + sqrt 8)^(1/3)),
Omega_a = 8 (5 eta_c + 1)/(49 - 37 eta_c), Omega_b = eta_c/(eta_c + 3). alpha is used as published beyond Tc too, for hydrogen
and helium with their negative acentric factors as well: the k_ij in use belong with it.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence

from gasapi.engine.models.cubic import CubicFluid, CubicForm, CubicMixture, refusal
from gasapi.gases.records import CubicPair, Substance

__all__ = ["FORM", "ID", "NAME", "SOURCE", "acentric_slope", "build", "mixture", "serves"]

ID = "peng-robinson"
NAME = "Peng-Robinson equation (1978)"
SOURCE = (
    "D.-Y. Peng, D. B. Robinson, Ind. Eng. Chem. Fundam. 15 (1976) 59, doi 10.1021/i160057a011; "
    "D. B. Robinson, D.-Y. Peng, Gas Processors Association, Research Report 28 (1978)"
)

_ACENTRIC_SWITCH = 0.491
_ROOT = math.sqrt(8.0)
_PACKING = 1.0 / (1.0 + (4.0 - _ROOT) ** (1.0 / 3.0) + (4.0 + _ROOT) ** (1.0 / 3.0))


def acentric_slope(acentric_factor: float) -> float:
    """Return m(omega), [-]."""
    w = acentric_factor
    if w <= _ACENTRIC_SWITCH:
        return 0.37464 + w * (1.54226 - 0.26992 * w)
    return 0.379642 + w * (1.48503 + w * (-0.164423 + 0.016666 * w))


FORM = CubicForm(
    model=ID,
    delta1=1.0 + math.sqrt(2.0),
    delta2=1.0 - math.sqrt(2.0),
    omega_a=8.0 * (5.0 * _PACKING + 1.0) / (49.0 - 37.0 * _PACKING),
    omega_b=_PACKING / (_PACKING + 3.0),
    critical_packing=_PACKING,
    temperature_slope=acentric_slope,
    interaction=lambda pair: pair.peng_robinson,
)


def serves(substances: Sequence[Substance]) -> str | None:
    """Return why these substances cannot be served, or None."""
    return refusal(substances, NAME)


def mixture(substances: Sequence[Substance], interaction: Callable[[str, str], CubicPair | None]) -> CubicMixture:
    """Return the equation for a set of components."""
    return CubicMixture(FORM, substances, interaction)


def build(
    substances: Sequence[Substance],
    fractions: Sequence[float],
    interaction: Callable[[str, str], CubicPair | None],
) -> CubicFluid:
    """Return the equation at one composition.

    :param substances: the components
    :param fractions: mole fractions in the same order, summing to 1, [-]
    :param interaction: returns the published parameters of a pair of ids, or None for k_ij = 0
    """
    return mixture(substances, interaction).fluid(fractions)
