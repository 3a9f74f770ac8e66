"""Units of measurement: one table, and conversion at the edge of the service.

Everything behind the edge is in SI (Pa absolute, K, kg/m3, m3/mol, kg/mol). This package knows numbers and the names of
units; it knows no gas, no request and no answer, and imports nothing of gasapi but its exceptions.
"""

from gasapi.units.conversion import (
    QUANTITIES,
    SI_UNITS,
    Unit,
    UnitMap,
    UnknownQuantity,
    UnknownUnit,
    unit,
    unit_map,
)
from gasapi.units.reference_conditions import REFERENCE_CONDITIONS, ReferenceCondition

__all__ = [
    "QUANTITIES",
    "REFERENCE_CONDITIONS",
    "SI_UNITS",
    "ReferenceCondition",
    "Unit",
    "UnitMap",
    "UnknownQuantity",
    "UnknownUnit",
    "unit",
    "unit_map",
]
