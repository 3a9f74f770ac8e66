"""Quality after OPC UA: the table from a reason to its level and status code, and the rule that ranks several.

Reasons are bits, so that a block of rows carries its quality as one integer a row and a single state as one integer. Names
and numbers of the status codes: OPC UA part 4, table of common codes, and part 8, data-access codes (IEC 62541-4 and -8);
the numbers are those of the standard's published code list.
"""

from __future__ import annotations

from enum import IntFlag
from functools import lru_cache
from typing import Final, NamedTuple, cast

import numpy as np
from numpy.typing import NDArray

from gasapi.service.answers import QualityAnswer

__all__ = ["BAD", "UNCERTAIN", "Reason", "level_codes", "quality_of", "status_codes"]


class Reason(IntFlag):
    """Why a state is less than plainly good; the snake_case name of a bit is its word in an answer."""

    AMBIENT_PRESSURE_ASSUMED = 1 << 0
    AMBIENT_PRESSURE_MATTERS = 1 << 1
    OUTSIDE_VALIDITY = 1 << 2
    NEAR_DEW_POINT = 1 << 3
    NEAR_CRITICAL = 1 << 4
    LIQUID = 1 << 5
    FRACTIONS_SCALED = 1 << 6
    UNCERTAINTY_LARGE = 1 << 7
    PHASE_UNKNOWN = 1 << 8
    TWO_PHASE_ACCEPTED = 1 << 9
    INTERACTION_MISSING = 1 << 10
    ASSOCIATING = 1 << 11
    INPUT_UNCERTAIN = 1 << 12
    TWO_PHASE = 1 << 16
    SOLID_POSSIBLE = 1 << 17
    NO_MODEL = 1 << 18
    NOT_CONVERGED = 1 << 19
    OUTSIDE_LIMITS = 1 << 20
    INPUT_BAD = 1 << 21
    FRACTIONS_BAD = 1 << 22


class _Code(NamedTuple):
    symbol: str
    number: int


_GOOD: Final = _Code("Good", 0)
_UNCERTAIN_CODE: Final = _Code("Uncertain", 0x40000000)
_UNITS_EXCEEDED: Final = _Code("UncertainEngineeringUnitsExceeded", 0x40940000)
_SENSOR: Final = _Code("UncertainSensorNotAccurate", 0x40930000)
_SUBNORMAL: Final = _Code("UncertainSubNormal", 0x40950000)
_BAD_CODE: Final = _Code("Bad", 0x80000000)
_OUT_OF_RANGE: Final = _Code("BadOutOfRange", 0x803C0000)
_NOT_SUPPORTED: Final = _Code("BadNotSupported", 0x803D0000)
_NO_DATA: Final = _Code("BadNoData", 0x809B0000)
_INVALID_ARGUMENT: Final = _Code("BadInvalidArgument", 0x80AB0000)
_INVALID_STATE: Final = _Code("BadInvalidState", 0x80AF0000)

# in order of rank: the first reason that is present gives the code
_CODES: Final[tuple[tuple[Reason, _Code], ...]] = (
    (Reason.INPUT_BAD, _NO_DATA),
    (Reason.FRACTIONS_BAD, _INVALID_ARGUMENT),
    (Reason.NO_MODEL, _NOT_SUPPORTED),
    (Reason.OUTSIDE_LIMITS, _OUT_OF_RANGE),
    (Reason.SOLID_POSSIBLE, _INVALID_STATE),
    (Reason.TWO_PHASE, _INVALID_STATE),
    (Reason.NOT_CONVERGED, _BAD_CODE),
    (Reason.OUTSIDE_VALIDITY, _UNITS_EXCEEDED),
    (Reason.INPUT_UNCERTAIN, _SENSOR),
    (Reason.AMBIENT_PRESSURE_MATTERS, _SENSOR),
    (Reason.UNCERTAINTY_LARGE, _SUBNORMAL),
    (Reason.ASSOCIATING, _SUBNORMAL),
    (Reason.INTERACTION_MISSING, _SUBNORMAL),
    (Reason.TWO_PHASE_ACCEPTED, _UNCERTAIN_CODE),
    (Reason.PHASE_UNKNOWN, _UNCERTAIN_CODE),
    (Reason.NEAR_CRITICAL, _UNCERTAIN_CODE),
    (Reason.NEAR_DEW_POINT, _UNCERTAIN_CODE),
    (Reason.LIQUID, _UNCERTAIN_CODE),
    (Reason.FRACTIONS_SCALED, _UNCERTAIN_CODE),
)

# reasons that share their word with another: the assumed ambient lowers the level only where it matters,
# and two phases are bad or, accepted, uncertain
_WORDS: Final = {
    Reason.AMBIENT_PRESSURE_MATTERS: "ambient_pressure_assumed",
    Reason.TWO_PHASE_ACCEPTED: "two_phase",
}

BAD: Final = int(
    Reason.TWO_PHASE
    | Reason.SOLID_POSSIBLE
    | Reason.NO_MODEL
    | Reason.NOT_CONVERGED
    | Reason.OUTSIDE_LIMITS
    | Reason.INPUT_BAD
    | Reason.FRACTIONS_BAD
)
"""The reasons for which no number is given."""

UNCERTAIN: Final = int(
    Reason.AMBIENT_PRESSURE_MATTERS
    | Reason.OUTSIDE_VALIDITY
    | Reason.NEAR_DEW_POINT
    | Reason.NEAR_CRITICAL
    | Reason.LIQUID
    | Reason.FRACTIONS_SCALED
    | Reason.UNCERTAINTY_LARGE
    | Reason.PHASE_UNKNOWN
    | Reason.TWO_PHASE_ACCEPTED
    | Reason.INTERACTION_MISSING
    | Reason.ASSOCIATING
    | Reason.INPUT_UNCERTAIN
)
"""The reasons for which a number is usable but not good."""

LEVELS: Final = ("good", "uncertain", "bad")


def _words(flags: int) -> tuple[str, ...]:
    words: list[str] = []
    for reason in Reason:
        if flags & reason:
            word = _WORDS.get(reason, str(reason.name).lower())
            if word not in words:
                words.append(word)
    return tuple(words)


@lru_cache(maxsize=4096)
def quality_of(flags: int) -> QualityAnswer:
    """Return the quality of a state.

    :param flags: the reasons, or-ed together
    """
    level = LEVELS[2] if flags & BAD else LEVELS[1] if flags & UNCERTAIN else LEVELS[0]
    code = next((code for reason, code in _CODES if flags & reason), _GOOD)
    return QualityAnswer(level, code.number, code.symbol, _words(flags))


def level_codes(flags: NDArray[np.int64]) -> NDArray[np.int8]:
    """Return 0 for good, 1 for uncertain and 2 for bad rows, shape (n,).

    :param flags: reasons of each row, shape (n,)
    """
    return np.where(flags & BAD, 2, np.where(flags & UNCERTAIN, 1, 0)).astype(np.int8)


def status_codes(flags: NDArray[np.int64]) -> NDArray[np.int64]:
    """Return the OPC UA status code of each row, shape (n,).

    :param flags: reasons of each row, shape (n,)
    """
    kinds, index = np.unique(flags, return_inverse=True)
    codes = np.array([quality_of(int(kind)).status_code for kind in kinds], dtype=np.int64)
    return cast("NDArray[np.int64]", codes[index] if kinds.size else np.zeros(0, dtype=np.int64))
