"""The Soave-Redlich-Kwong equation of 1972, without volume translation.

    p = R T/(v - b) - a_c alpha(T)/(v (v + b)),    alpha = (1 + m (1 - sqrt(T/Tc)))^2,    m = 0.480 + 1.574 w - 0.176 w^2

The constants are the exact ones that follow from the critical point,
a_c = R^2 Tc^2/(9 (2^(1/3) - 1) pc) and b = (2^(1/3) - 1) R Tc/(3 pc). alpha is used as published beyond Tc too, for hydrogen
and helium with their negative acentric factors as well: the k_ij in use belong with it.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence

from gasapi.engine.models.cubic import CubicFluid, CubicForm, CubicMixture, refusal
from gasapi.gases.records import CubicPair, Substance

__all__ = ["FORM", "ID", "NAME", "SOURCE", "acentric_slope", "build", "mixture", "serves"]

ID = "soave-redlich-kwong"
NAME = "Soave-Redlich-Kwong equation (1972)"
SOURCE = "G. Soave, Chem. Eng. Sci. 27 (1972) 1197, doi 10.1016/0009-2509(72)80096-4"

_ROOT = 2.0 ** (1.0 / 3.0) - 1.0


def acentric_slope(acentric_factor: float) -> float:
    """Return m(omega), [-]."""
    return 0.480 + acentric_factor * (1.574 - 0.176 * acentric_factor)


FORM = CubicForm(
    model=ID,
    delta1=1.0,
    delta2=0.0,
    omega_a=1.0 / (9.0 * _ROOT),
    omega_b=_ROOT / 3.0,
    critical_packing=_ROOT,
    temperature_slope=acentric_slope,
    interaction=lambda pair: pair.soave_redlich_kwong,
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
