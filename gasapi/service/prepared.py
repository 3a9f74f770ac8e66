"""A model made ready for one gas: the equation at its composition, its ranges, its uncertainty and its phase verdict."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.elementary import Array
from gasapi.engine.protocol import Fluid
from gasapi.gases.records import Limits
from gasapi.service.answers import PhaseWarning

__all__ = ["Margins", "PhaseJudge", "PreparedModel", "UncertaintyRule"]


@dataclass(frozen=True, slots=True)
class Margins:
    """How far a state is from condensing: K, K and Pa, positive on the gas side; None where there is no such boundary."""

    dew_point_temperature: float | None
    margin_temperature: float | None
    margin_pressure: float | None
    warnings: tuple[PhaseWarning, ...] = ()


class UncertaintyRule(Protocol):
    """The relative density uncertainty (k = 2) of a model."""

    basis: str
    """``publication``, ``calibration`` or ``estimate``; of the tightest statement where there are several."""

    def at(self, temperature: float, pressure: float, density: float) -> float:
        """Return the uncertainty at one state (K, Pa, mol/m3)."""
        ...

    def block(self, temperature: Array, pressure: Array, density: Array) -> Array:
        """Return the uncertainty of rows, each of shape (n,)."""
        ...

    def basis_at(self, temperature: float, pressure: float, density: float) -> str:
        """Return where the uncertainty at one state comes from."""
        ...


class PhaseJudge(Protocol):
    """The phase of one gas by one equation. Regions are codes of ``gasapi.engine.phase.region.Region``.

    ``survey`` gives the region as far as temperature and pressure tell it, and whether the dew point is nearer than a
    margin (K); ``refine`` completes it with the density that was found.
    """

    model: str | None
    compares_roots: bool
    """Whether an isotherm may have two roots in one phase, of which that with the lower Gibbs energy is meant."""

    def covers(self, temperature: float, pressure: float) -> bool:
        """Return whether a region can be told there at all, even where the density model makes no claim."""
        ...

    def region_float(self, temperature: float, pressure: float) -> int:
        """Return the region, without the density."""
        ...

    def survey_float(self, temperature: float, pressure: float, margin: float) -> tuple[int, bool, object]:
        """Return region and nearness of one state, and what ``margins`` can use of the work (None where nothing)."""
        ...

    def survey_block(self, temperature: Array, pressure: Array, margin: float) -> tuple[NDArray[np.int8], NDArray[np.bool_]]:
        """Return regions and nearness of rows, each of shape (n,)."""
        ...

    def refine_float(self, temperature: float, pressure: float, density: float, region: int) -> int:
        """Return the final region of one state."""
        ...

    def refine_block(self, temperature: Array, pressure: Array, density: Array, region: NDArray[np.int8]) -> NDArray[np.int8]:
        """Return the final regions of rows."""
        ...

    def near_critical_float(self, temperature: float, density: float) -> bool:
        """Return whether the density is ill-conditioned."""
        ...

    def near_critical_block(self, temperature: Array, density: Array) -> NDArray[np.bool_]:
        """Return the same for rows."""
        ...

    def margins(
        self, temperature: float, pressure: float, density: float | None, region: int, margin: float, surveyed: object
    ) -> Margins:
        """Return the margins and warnings of one state, for an answer."""
        ...


@dataclass(frozen=True, slots=True)
class PreparedModel:
    """A model for one gas. Immutable.

    ``fractions`` are mole fractions and ``molar_masses`` (kg/mol) those of the model, in the order of the gas's components;
    ``flags`` are reasons that hold at every state; ``generalised`` models have no published range of their own;
    ``gas_only`` models have no liquid.
    """

    id: str
    name: str
    source: str
    fluid: Fluid
    fractions: tuple[float, ...]
    molar_masses: tuple[float, ...]
    validity: Limits
    extended: Limits
    uncertainty: UncertaintyRule
    phase: PhaseJudge
    flags: int
    generalised: bool
    gas_only: bool
    notes: tuple[str, ...] = ()
