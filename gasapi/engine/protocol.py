"""What an equation of state owes to the rest of the engine.

A ``Fluid`` is one equation of state at one fixed composition, built once and never changed. It answers three questions:
the density on a named branch, the pressure with its derivatives, and the residual Gibbs energy by which branches are
compared. Numbers come as floats or as one-dimensional arrays, never mixed, and rows of an array never see each other.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from enum import IntEnum
from typing import Generic, NamedTuple

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.elementary import Real

__all__ = ["Branch", "CriticalPoint", "Fluid", "PressureDerivatives", "Root", "Solution", "Status"]


class Branch(IntEnum):
    """Which end of the isotherm a density root is sought from."""

    GAS = 0
    """Upward from zero density."""

    LIQUID = 1
    """Downward from close packing."""


class Status(IntEnum):
    """Why a density solve stopped."""

    CONVERGED = 0
    NOT_CONVERGED = 1
    NO_ROOT = 2
    """The branch does not reach this pressure at this temperature."""

    NOT_APPLICABLE = 3
    """A root exists, but the equation makes no claim there (a truncated virial series at high density)."""


class Root(NamedTuple, Generic[Real]):
    """A density root: ``density`` in mol/m3 (meaningless unless converged) and ``status``, an int or an int8 array."""

    density: Real
    status: int | NDArray[np.int8]


class PressureDerivatives(NamedTuple, Generic[Real]):
    """Pressure, Pa; its density derivative, Pa m3/mol; its temperature derivative at fixed density, Pa/K."""

    pressure: Real
    density_derivative: Real
    temperature_derivative: Real


class Solution(NamedTuple):
    """A density root of one state with the pressure derivatives there, None where there is no root."""

    root: Root[float]
    derivatives: PressureDerivatives[float] | None


class CriticalPoint(NamedTuple):
    """The critical point of an equation for a pure gas: K, Pa, mol/m3."""

    temperature: float
    pressure: float
    density: float


class Fluid(ABC):
    """One equation of state at one composition. Immutable, and safe to share between threads.

    ``model`` is the id of the equation, ``gas_constant`` (J/mol/K) and ``molar_mass`` (kg/mol) are those it was fitted
    with, ``critical`` is the equation's own critical point for a pure gas and None for a mixture.
    """

    model: str
    gas_constant: float
    molar_mass: float
    critical: CriticalPoint | None

    @abstractmethod
    def density(self, temperature: Real, pressure: Real, branch: Branch) -> Root[Real]:
        """Return the density root of a branch.

        :param temperature: K, a float or an array of shape (n,)
        :param pressure: Pa, of the same kind and shape
        :param branch: one branch for all rows
        :returns: density in mol/m3 and a status for each row; a row without a root says so and never borrows the other
            branch's root. Where the isotherm has one root only (a supercritical one), both branches return it.
        """

    @abstractmethod
    def pressure(self, temperature: Real, density: Real) -> PressureDerivatives[Real]:
        """Return pressure and its derivatives.

        :param temperature: K, a float or an array of shape (n,)
        :param density: mol/m3, of the same kind and shape
        """

    @abstractmethod
    def residual_gibbs(self, temperature: Real, density: Real) -> Real:
        """Return g_res/(R T) = alpha_r + Z - 1 - ln Z, [-], against the ideal gas at the same T and p.

        For a pure gas this is ln(phi), with phi the fugacity coefficient.

        :param temperature: K, a float or an array of shape (n,)
        :param density: mol/m3, of the same kind and shape
        """

    def rises_throughout(self, temperature: Real) -> bool | NDArray[np.bool_]:
        """Return where an isotherm is known to have one root only; nowhere, unless an equation knows better.

        :param temperature: K, a float or an array of shape (n,)
        """
        return False if isinstance(temperature, float) else np.zeros(len(temperature), dtype=bool)

    def solve(self, temperature: float, pressure: float, branch: Branch) -> Solution:
        """Return the density root of one state and the derivatives there, with the bits of ``density`` and ``pressure``.

        An equation overrides this where the two can share work.

        :param temperature: K
        :param pressure: Pa
        :param branch: the branch
        """
        root = self.density(temperature, pressure, branch)
        if root.status != Status.CONVERGED:
            return Solution(root, None)
        return Solution(root, self.pressure(temperature, root.density))
