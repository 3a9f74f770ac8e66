"""Conversion between the units of a caller and SI, by the table in ``units.json``.

A value goes to SI as ``value * numerator / denominator + offset``; for a gauge pressure the offset is the ambient
pressure. A difference (a margin, a standard uncertainty) takes the scale alone. Numerator and denominator come from
exact rational arithmetic, so that 40 barg at 101325 Pa is exactly 4101325 Pa and 760 Torr exactly 101325 Pa. Only
``+ - * /`` are used: a float and an element of an array get the same bits.
"""

from __future__ import annotations

import json
from collections.abc import Iterator, Mapping
from difflib import get_close_matches
from fractions import Fraction
from functools import lru_cache
from importlib.resources import files
from types import MappingProxyType
from typing import Any, NamedTuple, TypeVar

import numpy as np
from numpy.typing import NDArray

from gasapi.errors import GasapiError

__all__ = ["QUANTITIES", "SI_UNITS", "Unit", "UnitMap", "UnknownQuantity", "UnknownUnit", "unit", "unit_map"]

Real = TypeVar("Real", float, NDArray[np.float64])
"""A float or a block of floats: what goes in comes out."""

_LARGEST_EXACT = 2**53
_KEPT_MAPS = 4096


class UnknownQuantity(GasapiError):
    """The table of units has no such quantity."""

    def __init__(self, quantity: str, known: tuple[str, ...]) -> None:
        self.quantity = quantity
        self.known = known
        super().__init__(f"no quantity is called {quantity!r}; known: {', '.join(known)}")


class UnknownUnit(GasapiError):
    """The quantity has no unit of this name."""

    def __init__(self, quantity: str, name: str, known: tuple[str, ...]) -> None:
        self.quantity = quantity
        self.name = name
        self.known = known
        self.nearest = _nearest(name, known)
        hint = f"; nearest: {', '.join(self.nearest)}" if self.nearest else ""
        super().__init__(f"{name!r} is no unit of {quantity.replace('_', ' ')}{hint}; known: {', '.join(known)}")


class Unit(NamedTuple):
    """One unit: SI is ``value * numerator / denominator + offset``, plus the ambient pressure if ``gauge``."""

    quantity: str
    name: str
    numerator: float
    denominator: float
    offset: float
    gauge: bool
    source: str

    def to_si(self, value: Real, ambient_pressure: float = 0.0) -> Real:
        """Return a value in SI.

        :param value: in this unit, a float or an array of any shape
        :param ambient_pressure: Pa, used by gauge units alone
        """
        value = self.difference_to_si(value)
        if self.offset != 0.0:
            value = value + self.offset
        if self.gauge:
            value = value + ambient_pressure
        return value

    def from_si(self, value: Real, ambient_pressure: float = 0.0) -> Real:
        """Return a value of SI in this unit.

        :param value: in SI, a float or an array of any shape
        :param ambient_pressure: Pa, used by gauge units alone
        """
        if self.gauge:
            value = value - ambient_pressure
        if self.offset != 0.0:
            value = value - self.offset
        return self.difference_from_si(value)

    def difference_to_si(self, value: Real) -> Real:
        """Return a difference in SI: the scale alone, neither offset nor ambient pressure."""
        if self.numerator != 1.0:
            value = value * self.numerator
        if self.denominator != 1.0:
            value = value / self.denominator
        return value

    def difference_from_si(self, value: Real) -> Real:
        """Return a difference of SI in this unit: the scale alone."""
        if self.denominator != 1.0:
            value = value * self.denominator
        if self.numerator != 1.0:
            value = value / self.numerator
        return value


class UnitMap(Mapping[str, Unit]):
    """A unit for every quantity of the table. Immutable, hashable, and made once for each choice (see ``unit_map``).

    Besides the mapping from quantity to ``Unit`` there are attributes for the quantities of every answer, so that the
    edge need not look them up, and ``names``, the plain mapping that an answer echoes.
    """

    __slots__ = (
        "_hash",
        "_units",
        "density",
        "molar_mass",
        "molar_volume",
        "names",
        "pressure",
        "temperature",
    )

    def __init__(self, units: Mapping[str, Unit]) -> None:
        self._units = {quantity: units[quantity] for quantity in QUANTITIES}
        self.names: Mapping[str, str] = MappingProxyType({q: u.name for q, u in self._units.items()})
        self.pressure = self._units["pressure"]
        self.temperature = self._units["temperature"]
        self.density = self._units["density"]
        self.molar_volume = self._units["molar_volume"]
        self.molar_mass = self._units["molar_mass"]
        self._hash = hash(tuple(self.names.items()))

    def __getitem__(self, quantity: str) -> Unit:
        return self._units[quantity]

    def __iter__(self) -> Iterator[str]:
        return iter(self._units)

    def __len__(self) -> int:
        return len(self._units)

    def __hash__(self) -> int:
        return self._hash

    def __eq__(self, other: object) -> bool:
        return self is other or (isinstance(other, UnitMap) and self.names == other.names)

    def ratio_from_si(self, numerator: str, denominator: str, value: Real) -> Real:
        """Return a derivative of SI, such as d density / d pressure, in the units of the two quantities.

        :param numerator: the quantity that is differentiated
        :param denominator: the quantity by which it is
        :param value: in SI, a float or an array of any shape
        """
        return self._units[denominator].difference_to_si(self._units[numerator].difference_from_si(value))


def unit(quantity: str, name: str) -> Unit:
    """Return a unit by its quantity and name.

    :raises UnknownQuantity: the table has no such quantity
    :raises UnknownUnit: the quantity has no such unit
    """
    units = _TABLE.get(quantity)
    if units is None:
        raise UnknownQuantity(quantity, tuple(_TABLE))
    found = units.get(name)
    if found is None:
        raise UnknownUnit(quantity, name, tuple(units))
    return found


@lru_cache(maxsize=_KEPT_MAPS)
def unit_map(choices: tuple[tuple[str, str], ...]) -> UnitMap:
    """Return the map in which the named quantities have the named units and all others their default.

    :param choices: (quantity, unit) pairs, each quantity at most once
    :raises UnknownQuantity: the table has no such quantity
    :raises UnknownUnit: the quantity has no such unit
    """
    units = dict(_DEFAULTS)
    for quantity, name in choices:
        units[quantity] = unit(quantity, name)
    return UnitMap(units)


def _nearest(name: str, known: tuple[str, ...]) -> tuple[str, ...]:
    short = name[:40]
    folded = {k.casefold(): k for k in known}
    return tuple(folded[k] for k in get_close_matches(short.casefold(), folded, n=3, cutoff=0.5))


def _product(text: str) -> Fraction:
    """Return the exact value of ``number [* or / number]...``, read from left to right."""
    words = text.split()
    value = Fraction(words[0])
    for operator, number in zip(words[1::2], words[2::2], strict=True):
        value = value * Fraction(number) if operator == "*" else value / Fraction(number)
    return value


def _unit(quantity: str, name: str, row: Mapping[str, Any]) -> Unit:
    scale = _product(row["scale"])
    numerator, denominator = float(scale.numerator), float(scale.denominator)
    if max(scale.numerator, scale.denominator) > _LARGEST_EXACT:
        numerator, denominator = float(scale), 1.0
    offset = float(_product(row.get("offset", "0")))
    return Unit(quantity, name, numerator, denominator, offset, bool(row.get("gauge", False)), row["source"])


def _read_table() -> tuple[dict[str, Mapping[str, Unit]], dict[str, Unit], dict[str, Unit]]:
    document = json.loads(files("gasapi.units").joinpath("units.json").read_text(encoding="utf-8"))
    table: dict[str, Mapping[str, Unit]] = {}
    defaults: dict[str, Unit] = {}
    si: dict[str, Unit] = {}
    for quantity, entry in document["quantities"].items():
        units = {name: _unit(quantity, name, row) for name, row in entry["units"].items()}
        table[quantity] = MappingProxyType(units)
        defaults[quantity] = units[entry["default"]]
        si[quantity] = units[entry["si"]]
    return table, defaults, si


_TABLE, _DEFAULTS, _SI = _read_table()

QUANTITIES: Mapping[str, Mapping[str, Unit]] = MappingProxyType(_TABLE)
"""Every quantity with its units by name."""

SI_UNITS: Mapping[str, Unit] = MappingProxyType(_SI)
"""The unit in which the service works within, by quantity."""
