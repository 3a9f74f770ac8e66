"""The file of measured uncertainties of the generalised equations, checked and turned into records."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from itertools import pairwise
from types import MappingProxyType
from typing import Final, NamedTuple

from gasapi.gases.data_files import open_data
from gasapi.gases.reading import Table

__all__ = [
    "CLASSES",
    "ConstantsError",
    "ModelTables",
    "Rows",
    "StateGrid",
    "UncertaintyData",
    "load_generalised_uncertainty",
]

Rows = tuple[tuple[float, ...], ...]
"""A table over the grid: a row for each temperature, a number for each pressure."""

CLASSES: Final = ("non-polar", "polar", "hydrogen-bonding", "quantum", "unknown")
"""The classes of substances; ``unknown`` was measured on all but the quantum gases together."""

_FILE: Final = "generalised_uncertainty.json"


class ConstantsError(NamedTuple):
    """Expanded uncertainties (k = 2) of critical temperature and pressure, relative, and of the acentric factor, [-]."""

    critical_temperature: float
    critical_pressure: float
    acentric_factor: float


@dataclass(frozen=True, slots=True)
class StateGrid:
    """The states of the tables.

    ``temperatures`` are reduced; ``gas_pressures`` are p/p_sat below the critical temperature and p/pc above it;
    ``liquid_temperatures``, the first of the temperatures up to 1, and ``liquid_pressures`` (p/pc) are those of the liquid.
    """

    temperatures: tuple[float, ...]
    gas_pressures: tuple[float, ...]
    liquid_temperatures: tuple[float, ...]
    liquid_pressures: tuple[float, ...]


@dataclass(frozen=True, slots=True)
class ModelTables:
    """What was measured of one equation: relative expanded uncertainties over the grid.

    ``gas`` and ``liquid`` map a class to its table (``liquid`` is empty for an equation without one); ``mixing`` is the part
    of unlike pairs, ``missing_interaction`` that of pairs without a published k_ij, each at a share of unlike pairs of 1;
    None where the equation knows no k_ij. ``constants`` tells which constants the equation uses.
    """

    gas: Mapping[str, Rows]
    liquid: Mapping[str, Rows]
    mixing: Rows
    missing_interaction: Rows | None
    constants: frozenset[str]


@dataclass(frozen=True, slots=True)
class UncertaintyData:
    """The whole file.

    ``polar_from`` is the reduced dipole moment at which a substance counts as polar, ``strongly_polar_from`` that beyond which
    none was measured and ``strong_departure`` adds, as a multiple of a polar gas's departure from the ideal one;
    ``hydrogen_bonding`` holds the ids of molecules with a hydrogen bond of their own kind; ``acentric_factors`` is the range
    that was measured; ``molar_mass`` is the part of molar mass and gas constant;
    ``association`` the part of a component that associates; ``grades`` the errors of constants by grade;
    ``gas_sensitivity`` and ``liquid_sensitivity`` the relative change of density with each constant.
    """

    grid: StateGrid
    polar_from: float
    strongly_polar_from: float
    strong_departure: float
    strong_departure_with_polar_term: float
    hydrogen_bonding: frozenset[str]
    acentric_factors: tuple[float, float]
    molar_mass: float
    association: float
    grades: Mapping[str, ConstantsError]
    gas_sensitivity: Mapping[str, Rows]
    liquid_sensitivity: Mapping[str, Rows]
    models: Mapping[str, ModelTables]


@cache
def load_generalised_uncertainty() -> UncertaintyData:
    """Return the measured uncertainties of the generalised equations.

    :raises DataError: the file does not hold what it must
    """
    table = open_data(_FILE)
    table.text("title")
    table.texts("notes")
    grid = _grid(table.table("grid"))
    classes = table.table("classes")
    polar_from = classes.positive("polar_from_reduced_dipole")
    strongly_polar_from = classes.positive("strongly_polar_from_reduced_dipole")
    strong_departure = classes.positive("strong_departure")
    with_polar_term = classes.positive("strong_departure_with_polar_term")
    acentric_factors = classes.two_numbers("acentric_factors")
    bonding = frozenset(classes.texts("hydrogen_bonding"))
    classes.close()
    grades = table.table("grades")
    errors = {grade: _errors(grades.table(grade)) for grade in ("A", "B", "C", "D")}
    grades.close()
    gas_shape = (len(grid.temperatures), len(grid.gas_pressures))
    liquid_shape = (len(grid.liquid_temperatures), len(grid.liquid_pressures))
    sensitivity = table.table("sensitivity")
    gas_sensitivity = _by_name(sensitivity.table("gas"), ConstantsError._fields, gas_shape, 1e3)
    liquid_sensitivity = _by_name(sensitivity.table("liquid"), ConstantsError._fields, liquid_shape, 1e3)
    sensitivity.close()
    models = table.table("models")
    tables = {name: _model(models.table(name), gas_shape, liquid_shape) for name in models.members}
    models.close()
    data = UncertaintyData(
        grid=grid,
        polar_from=polar_from,
        strongly_polar_from=strongly_polar_from,
        strong_departure=strong_departure,
        strong_departure_with_polar_term=with_polar_term,
        acentric_factors=acentric_factors,
        hydrogen_bonding=bonding,
        molar_mass=table.number("molar_mass", 0.0, 1e-2),
        association=table.positive("association"),
        grades=MappingProxyType(errors),
        gas_sensitivity=gas_sensitivity,
        liquid_sensitivity=liquid_sensitivity,
        models=MappingProxyType(tables),
    )
    table.close()
    return data


def _grid(table: Table) -> StateGrid:
    grid = StateGrid(
        _rising(table, "temperatures"),
        _rising(table, "gas_pressures"),
        _rising(table, "liquid_temperatures"),
        _rising(table, "liquid_pressures"),
    )
    table.close()
    cold = grid.liquid_temperatures
    if cold != grid.temperatures[: len(cold)] or cold[-1] != 1.0:
        raise table.fault("liquid_temperatures", "must be the temperatures up to 1")
    return grid


def _rising(table: Table, key: str) -> tuple[float, ...]:
    values = table.numbers(key)
    if len(values) < 2 or values[0] <= 0.0 or any(a >= b for a, b in pairwise(values)):
        raise table.fault(key, "must be at least two rising numbers above zero")
    return values


def _errors(table: Table) -> ConstantsError:
    errors = ConstantsError(*(table.positive(name) for name in ConstantsError._fields))
    table.close()
    return errors


def _rows(table: Table, key: str, shape: tuple[int, int], most: float) -> Rows:
    rows = table.rows(key, shape[1])
    if len(rows) != shape[0]:
        raise table.fault(key, f"has {len(rows)} rows, must have {shape[0]}")
    if any(not 0.0 < value <= most for row in rows for value in row):
        raise table.fault(key, f"must hold numbers above 0 and up to {most:g}")
    return rows


def _by_name(table: Table, names: tuple[str, ...], shape: tuple[int, int], most: float) -> Mapping[str, Rows]:
    tables = {name: _rows(table, name, shape, most) for name in names}
    table.close()
    return MappingProxyType(tables)


def _model(table: Table, gas_shape: tuple[int, int], liquid_shape: tuple[int, int]) -> ModelTables:
    liquid = table.optional_table("liquid")
    constants = table.texts("constants") if table.has("constants") else ()
    for name in constants:
        if name not in ConstantsError._fields:
            raise table.fault("constants", f"holds {name!r}, may hold {', '.join(ConstantsError._fields)}")
    model = ModelTables(
        gas=_by_name(table.table("gas"), CLASSES, gas_shape, 1.0),
        liquid=MappingProxyType({}) if liquid is None else _by_name(liquid, CLASSES, liquid_shape, 1.0),
        mixing=_rows(table, "mixing", gas_shape, 1.0),
        missing_interaction=(_rows(table, "missing_interaction", gas_shape, 1.0) if table.has("missing_interaction") else None),
        constants=frozenset(constants),
    )
    table.close()
    return model
