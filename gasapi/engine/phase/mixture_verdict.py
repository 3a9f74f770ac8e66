"""What is said of the phase of a mixture: numbers only, the words belong to the layers above."""

from __future__ import annotations

from enum import IntEnum, IntFlag
from typing import Final, NamedTuple

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.elementary import Array
from gasapi.engine.phase.boundary import NamedPoint
from gasapi.engine.phase.energy import Floats

__all__ = [
    "UNSURE",
    "DewKind",
    "DewUncertainty",
    "MixtureBlock",
    "MixtureFlag",
    "MixtureOutline",
    "MixtureVerdict",
    "kelvin_block",
    "kelvin_float",
]


class DewKind(IntEnum):
    """Which phase appears first on cooling at constant pressure."""

    NONE = 0
    HYDROCARBON = 1
    """A liquid of the gas itself (or, beyond the critical point, a bubble in it)."""

    WATER = 2
    """An aqueous liquid."""


class MixtureFlag(IntFlag):
    """What else is to be said of a state."""

    HYDRATE_POSSIBLE = 1
    ICE_POSSIBLE = 2
    NEAR_CRITICAL = 4
    ABOVE_CRICONDENBAR = 8
    """There is no dew point at this pressure, since it is above the cricondenbar."""

    DEW_BELOW_RANGE = 16
    """The dew point lies below the lowest temperature of the equation, if there is one."""

    DIRECT = 32
    """By a stability test of this state, not by the boundary: no dew point and no margins."""

    EXTRAPOLATED = 64
    """The dew point lies below the lowest pressure of the trace (1 kPa, or more where the liquid is too cold)."""

    WATER_AND_LIQUID = 128
    """Below both dew points: three phases are possible."""


class DewUncertainty(NamedTuple):
    """The uncertainty of a dew temperature (k = 2): ``kelvin`` + ``per_pascal`` p, but ``most`` K at most, and its basis."""

    kelvin: float
    per_pascal: float
    most: float
    basis: str


UNSURE: Final = DewUncertainty(5.0, 0.0, 5.0, "estimate")


def kelvin_float(u: DewUncertainty, p: float) -> float:
    """Return the uncertainty at a pressure in Pa, K."""
    kelvin = u.kelvin + u.per_pascal * p
    return kelvin if kelvin < u.most else u.most


def kelvin_block(u: DewUncertainty, p: Array) -> Array:
    """Return the same for rows, shape (n,)."""
    if u.per_pascal == 0.0:
        return np.full(p.size, u.kelvin)
    kelvin = u.kelvin + u.per_pascal * p
    return np.where(kelvin < u.most, kelvin, u.most)


class MixtureVerdict(NamedTuple):
    """The phase of one state: K and Pa, margins positive on the gas side; None where there is no such boundary."""

    region: int
    dew_point_temperature: float | None
    dew_kind: int
    margin_temperature: float | None
    margin_pressure: float | None
    dew_point_uncertainty: float | None
    flags: int


class MixtureBlock(NamedTuple):
    """The same for rows, each of shape (n,): regions, kinds and flags as small integers, NaN where there is no boundary."""

    region: NDArray[np.int8]
    dew_point_temperature: Array
    dew_kind: NDArray[np.int8]
    margin_temperature: Array
    margin_pressure: Array
    dew_point_uncertainty: Array
    flags: NDArray[np.int16]


class MixtureOutline(NamedTuple):
    """A phase diagram: dew and bubble line as one curve, the water dew line, named points; K and Pa, None where missing."""

    temperature: Floats
    pressure: Floats
    water_temperature: Floats
    water_pressure: Floats
    critical: NamedPoint | None
    cricondentherm: NamedPoint | None
    cricondenbar: NamedPoint | None
    complete: bool
    end: str
