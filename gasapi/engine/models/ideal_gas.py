"""The ideal gas: Z = 1 at every temperature and pressure, the limit that every other equation meets at zero density."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from typing import cast

import numpy as np

from gasapi.engine.elementary import Array, Real
from gasapi.engine.models.cubic import GAS_CONSTANT
from gasapi.engine.protocol import Branch, Fluid, PressureDerivatives, Root, Status
from gasapi.gases.records import CubicPair, Substance

__all__ = ["ID", "NAME", "SOURCE", "IdealGas", "build", "serves"]

ID = "ideal-gas"
NAME = "Ideal gas law"
SOURCE = "E. Clapeyron, J. Ec. Polytech. 14 (cahier 23) (1834) 153; R of CODATA 2018, doi 10.1103/RevModPhys.93.025010"


class IdealGas(Fluid):
    """p = rho R T. Immutable.

    :param molar_mass: kg/mol
    """

    def __init__(self, molar_mass: float) -> None:
        self.model = ID
        self.gas_constant = GAS_CONSTANT
        self.molar_mass = molar_mass
        self.critical = None

    def density(self, temperature: Real, pressure: Real, branch: Branch) -> Root[Real]:
        """Return p/(R T), mol/m3; see ``Fluid.density``. The isotherm has one root, which both branches return."""
        density = pressure / (GAS_CONSTANT * temperature)
        if type(temperature) is float:
            return Root(density, Status.CONVERGED if math.isfinite(cast(float, density)) else Status.NOT_CONVERGED)
        status = np.where(np.isfinite(cast(Array, density)), Status.CONVERGED, Status.NOT_CONVERGED)
        return Root(density, status.astype(np.int8))

    def pressure(self, temperature: Real, density: Real) -> PressureDerivatives[Real]:
        """Return pressure and its derivatives; see ``Fluid.pressure``."""
        rt = GAS_CONSTANT * temperature
        return PressureDerivatives(density * rt, rt + 0.0 * density, GAS_CONSTANT * density)

    def residual_gibbs(self, temperature: Real, density: Real) -> Real:
        """Return zero, [-]; see ``Fluid.residual_gibbs``."""
        return 0.0 * (temperature * density)


def serves(substances: Sequence[Substance]) -> str | None:
    """Return why these substances cannot be served, or None: a molar mass is all that is needed."""
    return None


def build(
    substances: Sequence[Substance],
    fractions: Sequence[float],
    interaction: Callable[[str, str], CubicPair | None],
) -> IdealGas:
    """Return the ideal gas of a composition.

    :param substances: the components
    :param fractions: mole fractions in the same order, summing to 1, [-]
    :param interaction: not used
    """
    return IdealGas(sum(x * substance.molar_mass for x, substance in zip(fractions, substances, strict=True)))
