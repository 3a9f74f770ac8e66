"""The van der Waals equation, and the file to learn from: every equation of state here has these parts.

    p = R T/(v - b) - a/v^2,    a = 27 R^2 Tc^2/(64 pc),    b = R Tc/(8 pc)

``ID`` is the name in questions and answers, ``NAME`` and ``SOURCE`` are what an answer shows. ``serves`` says whether the
equation can be used for some substances at all, ``build`` makes the ``Fluid`` for one composition, and the fluid answers
density, pressure and residual Gibbs energy. Numbers that are published stand here, with their source; machinery that
several equations share stands beside (here ``cubic``). A file like this and a line in the table of models make a new equation.

Mixtures: a = (sum x_i sqrt(a_i))^2 and b = sum x_i b_i. The critical compressibility is 3/8 for every gas, against 0.23 to 0.31
measured: a teaching and comparing equation, good to a few per cent of density well below the critical pressure.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence

from gasapi.engine.models.cubic import GAS_CONSTANT, CubicComponent, CubicFluid, CubicForm, CubicMixture
from gasapi.gases.records import CubicPair, Substance

__all__ = ["FORM", "ID", "NAME", "SOURCE", "build", "from_constants", "mixture", "serves"]

ID = "van-der-waals"
NAME = "van der Waals equation"
SOURCE = (
    "J. D. van der Waals, Over de continuiteit van den gas- en vloeistoftoestand, thesis, Leiden (1873); "
    "mixtures: Z. Phys. Chem. 5 (1890) 133"
)

FORM = CubicForm(
    model=ID,
    delta1=0.0,
    delta2=0.0,
    omega_a=27.0 / 64.0,
    omega_b=1.0 / 8.0,
    critical_packing=1.0 / 3.0,
    temperature_slope=None,
    interaction=lambda pair: 0.0,
)


def serves(substances: Sequence[Substance]) -> str | None:
    """Return why these substances cannot be served, or None: a critical point is all that is needed."""
    return None


def _no_interaction(first: str, second: str) -> CubicPair:
    """Return a pair without parameters: the geometric mean is the rule here, so that none is missing."""
    return CubicPair(0.0, 0.0, "")


def mixture(substances: Sequence[Substance], interaction: Callable[[str, str], CubicPair | None]) -> CubicMixture:
    """Return the equation for a set of components; van der Waals' mixing rule has no interaction parameter."""
    return CubicMixture(FORM, substances, _no_interaction)


def build(
    substances: Sequence[Substance],
    fractions: Sequence[float],
    interaction: Callable[[str, str], CubicPair | None],
) -> CubicFluid:
    """Return the equation at one composition.

    :param substances: the components
    :param fractions: mole fractions in the same order, summing to 1, [-]
    :param interaction: not used: van der Waals' mixing rule has no parameter
    """
    return mixture(substances, interaction).fluid(fractions)


def from_constants(a: float, b: float, molar_mass: float) -> CubicFluid:
    """Return the equation of a pure gas whose constants are given, as handbooks list them.

    :param a: Pa m6/mol2, positive
    :param b: m3/mol, positive
    :param molar_mass: kg/mol
    """
    critical = FORM.critical_point(8.0 * a / (27.0 * b * GAS_CONSTANT), a / (27.0 * b * b))
    return CubicFluid(FORM, [CubicComponent(math.sqrt(a), 0.0, b)], [1.0], [[1.0]], molar_mass, critical)
