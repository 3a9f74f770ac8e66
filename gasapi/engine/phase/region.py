"""The regions of a phase verdict."""

from __future__ import annotations

from enum import IntEnum
from typing import Final

__all__ = ["REGION_NAMES", "Region"]


class Region(IntEnum):
    """Where a state lies; blocks hold the number as int8."""

    GAS = 0
    """One phase below the critical density, at any pressure above the critical temperature too."""

    SUPERCRITICAL = 1
    """Above critical temperature and pressure, at or above the critical density."""

    LIQUID = 2
    TWO_PHASE = 3
    SOLID_POSSIBLE = 4
    UNKNOWN = 5


REGION_NAMES: Final = ("gas", "supercritical", "liquid", "two-phase", "solid-possible", "unknown")
"""The word of each region in an answer."""
