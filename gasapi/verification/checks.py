"""Repeats published check values with the program as it is installed, and says of each what was expected and what was found.

Three things are looked at: the pressure of every reference equation at given temperature and density; the density of
GERG-2008 at given temperature and pressure, by the whole path of a state; and for every state that can be asked by
temperature and pressure, that the service finds the density back, with the same bits alone and in a series.
"""

from __future__ import annotations

import json
import math
from collections.abc import Iterator, Mapping
from importlib.resources import files
from typing import Any, Final, NamedTuple

import numpy as np

from gasapi.engine.models import gerg_2008, reference
from gasapi.service.context import Context
from gasapi.service.questions import GasSpec, StateQuestion
from gasapi.service.series import Columns, Series, SeriesQuestion, Survey
from gasapi.service.state import answer_state

__all__ = ["Check", "Group", "check_values", "run_checks"]

# printed digits differ from 6 to 9, and a dense liquid multiplies the last one
_PRINTED: Final = 3e-6
# twelve digits, and what rounding to doubles adds in a sum of terms that cancel
_TWELVE_DIGITS: Final = 2e-11
_GERG: Final = 2e-11
_FOUND_BACK: Final = 1e-10


class Check(NamedTuple):
    """One value: what was looked at, what was expected and found, the relative difference and the one that is allowed."""

    subject: str
    quantity: str
    expected: float
    found: float | None
    difference: float
    allowed: float

    @property
    def passed(self) -> bool:
        """Whether what was found is what was expected."""
        return self.found is not None and self.difference <= self.allowed


class Group(NamedTuple):
    """Checks of one source."""

    id: str
    title: str
    source: str
    checks: tuple[Check, ...]


def check_values() -> list[dict[str, Any]]:
    """Return the check values by group, as they stand in the file."""
    text = files("gasapi.verification").joinpath("check_values.json").read_text(encoding="utf-8")
    groups: list[dict[str, Any]] = json.loads(text)["groups"]
    return groups


def run_checks(context: Context) -> Iterator[Group]:
    """Yield the groups of checks, each carried out.

    :param context: the data as installed
    """
    groups = {group["id"]: group for group in check_values()}
    published, states, gerg = (groups[id] for id in ("reference-published", "reference-states", "gerg-2008"))
    yield _group(published, [_pressure(context, point, _PRINTED) for point in published["points"]])
    yield _group(states, [_pressure(context, point, _TWELVE_DIGITS) for point in states["points"]])
    yield _group(gerg, [_density(context, point) for point in gerg["points"]])
    found_back = [check for point in states["points"] for check in _found_back(context, point)]
    words = "the same values, asked as a caller asks: by temperature and pressure, alone and as a row of a series"
    yield Group("states-found-back", "Densities found back by the service", words, tuple(found_back))


def _group(group: Mapping[str, Any], checks: list[Check]) -> Group:
    return Group(group["id"], group["title"], group["source"], tuple(checks))


def _relative(found: float, expected: float) -> float:
    difference = abs(found - expected) / abs(expected)
    return difference if math.isfinite(difference) else math.inf


def _pressure(context: Context, point: Mapping[str, Any], allowed: float) -> Check:
    """Check the pressure of a reference equation at temperature and density."""
    fluid = context.reference_fluid(point["id"])
    temperature = float(point["temperature_K"])
    density = point.get("density_mol_per_m3")
    density = float(point["density_kg_per_m3"]) / fluid.molar_mass if density is None else float(density)
    found = fluid.pressure(temperature, density)
    expected = float(point["pressure_Pa"])
    if allowed == _TWELVE_DIGITS:
        # a small pressure is the difference of large terms: what counts is the change of density that would explain it
        scale = density * max(found.density_derivative, fluid.gas_constant * temperature)
        allowed = allowed * scale / abs(expected)
    subject = f"{point['id']} at {temperature:.9g} K and {density:.9g} mol/m3"
    return Check(subject, "pressure, Pa", expected, found.pressure, _relative(found.pressure, expected), allowed)


def _density(context: Context, point: Mapping[str, Any]) -> Check:
    """Check the density of GERG-2008 at temperature and pressure, by the path of a state."""
    fractions = tuple((name, float(x)) for name, x in point["fractions"].items() if x)
    temperature, pressure = float(point["temperature_K"]), float(point["pressure_Pa"])
    spec = GasSpec(fractions=fractions)
    answer = answer_state(context, StateQuestion(spec, pressure, temperature, gerg_2008.ID)).answer
    expected = float(point["density_mol_per_m3"])
    found = None if answer.density is None else answer.density / answer.gas.molar_mass
    difference = math.inf if found is None else _relative(found, expected)
    names = fractions[0][0] if len(fractions) == 1 else f"mixture of {len(fractions)}"
    return Check(f"{names} at {temperature:g} K and {pressure:g} Pa", "density, mol/m3", expected, found, difference, _GERG)


def _found_back(context: Context, point: Mapping[str, Any]) -> Iterator[Check]:
    """Check the density that the service finds at temperature and pressure, and its bits alone and in a series."""
    temperature, pressure = float(point["temperature_K"]), float(point["pressure_Pa"])
    spec = GasSpec(name=point["id"])
    answer = answer_state(context, StateQuestion(spec, pressure, temperature, reference.ID)).answer
    expected = float(point["density_mol_per_m3"])
    if answer.density is None or answer.density_pressure is None:
        yield Check(f"{point['id']} at {temperature:.9g} K", "density, mol/m3", expected, None, math.inf, _FOUND_BACK)
        return
    found = answer.density / answer.gas.molar_mass
    # where the isotherm is flat, the twelfth digit of the pressure moves the density by more
    amplified = abs(pressure * answer.density_pressure / answer.density)
    subject = f"{point['id']} at {temperature:.9g} K and {pressure:.12g} Pa"
    yield Check(subject, "density, mol/m3", expected, found, _relative(found, expected), _FOUND_BACK * max(1.0, amplified))
    question = SeriesQuestion(spec, reference.ID)
    columns = Columns(np.array([temperature, 2.0 * temperature]), np.array([pressure, 0.5 * pressure]))
    survey = Survey(question)
    survey.add(columns)
    row = float(Series(context, question, survey).answer(columns).density[0])
    yield Check(subject, "density in a series, kg/m3", answer.density, row, _relative(row, answer.density), 0.0)
