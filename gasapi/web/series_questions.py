"""A series in JSON into a question and columns in SI."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, NamedTuple

import numpy as np
from marshmallow import ValidationError

from gasapi.engine.elementary import Array
from gasapi.errors import GasapiError, UnknownModel
from gasapi.gases.catalogue import Catalogue
from gasapi.service.gas import resolve_gas
from gasapi.service.models import known_model
from gasapi.service.questions import GasSpec
from gasapi.service.series import Columns, RowComposition, SeriesQuestion, input_flags
from gasapi.units import UnitMap
from gasapi.web.columns import FractionColumns, lengths, repeated, stacked
from gasapi.web.json_body import parse_json
from gasapi.web.problems import Fault, Path, Problem, invalid, located, path_of, pointer
from gasapi.web.questions import STANDARD_ATMOSPHERE, Naming
from gasapi.web.series_schema import SeriesSchema

__all__ = ["MOST_JSON_ROWS", "AskedSeries", "SeriesReader", "Terms"]

MOST_JSON_ROWS = 1_000_000
"""Rows of a JSON body at most: what fits into the default limit of 32 MiB with a number of some digits each."""


class Terms(NamedTuple):
    """What holds for all rows: the question, the units of columns and answers, the ambient pressure (Pa) of gauge readings,
    and how the request names a member that stands at a path."""

    question: SeriesQuestion
    units: UnitMap
    ambient: float
    status_kind: Any
    naming: Naming

    def problem(self, error: GasapiError) -> Problem:
        """Return the problem of a question that the service refused."""
        gas = self.question.gas
        mixture = not isinstance(gas, GasSpec) or gas.name is None
        return invalid([Fault(self.naming(path_of(error, mixture=mixture)), str(error))])

    def columns(
        self, pressure: Array, temperature: Array, status: Array | None = None, fractions: Array | None = None
    ) -> Columns:
        """Return columns in SI from columns in the units of the request, each of shape (n,), fractions (n, names)."""
        with np.errstate(over="ignore", invalid="ignore"):
            return Columns(
                self.units.temperature.to_si(temperature),
                self.units.pressure.to_si(pressure, self.ambient),
                None if status is None else input_flags(status, self.status_kind),
                fractions,
            )


class AskedSeries(NamedTuple):
    """A series as it was asked: its terms, its columns in the caller's units, and its timestamps."""

    terms: Terms
    columns: Columns
    pressure: Array
    temperature: Array
    timestamps: list[Any] | None


class SeriesReader:
    """Reads series from JSON bodies.

    :param catalogue: where names of gases are looked up when a request is at fault anyway, so that all faults are told at once
    :param site_ambient: Pa, the ambient pressure of the site where it is known
    """

    schema = SeriesSchema()

    def __init__(self, catalogue: Catalogue, site_ambient: float | None = None) -> None:
        self._catalogue = catalogue
        self._site_ambient = site_ambient

    def of_body(self, body: bytes) -> AskedSeries:
        """Return the series of a JSON body.

        :raises Problem: 400 or 422, with every fault
        """
        loaded, wrong = self.load(parse_json(body, repeated_members=True))
        gas = loaded.get("gas")
        columns = {name: loaded.get(name) for name in ("pressure", "temperature", "timestamps", "input_status")}
        if isinstance(gas, FractionColumns):
            columns |= {f"gas/fractions/{n}": c for n, c in zip(gas.names, gas.columns, strict=True)}
        rows = _rows(columns, wrong)
        if wrong:
            raise self.refused(loaded, wrong, pointer, {})
        terms = self.terms(loaded, pointer)
        pressure, temperature = (repeated(loaded[name], rows) for name in ("pressure", "temperature"))
        status = loaded["input_status"]
        fractions = stacked(gas.columns, rows) if isinstance(gas, FractionColumns) else None
        converted = terms.columns(pressure, temperature, None if status is None else repeated(status, rows), fractions)
        return AskedSeries(terms, converted, pressure, temperature, loaded["timestamps"])

    def load(self, members: Any) -> tuple[dict[str, Any], list[tuple[Path, str]]]:
        """Return what could be loaded of the members of a series, and what is wrong."""
        try:
            return self.schema.load(members), []
        except ValidationError as error:
            return error.valid_data if isinstance(error.valid_data, dict) else {}, located(error.messages)

    def refused(
        self, loaded: Mapping[str, Any], wrong: list[tuple[Path, str]], naming: Naming, known: Mapping[Path, Fault]
    ) -> Problem:
        """Return the problem with all that is wrong, the names of gases and equations looked up as well."""
        found = [*wrong, *self._names(loaded)]
        return invalid([*known.values(), *(Fault(naming(path), detail) for path, detail in found if path not in known)])

    def terms(self, loaded: Mapping[str, Any], naming: Naming) -> Terms:
        """Return the terms of a series whose members are all right."""
        units: UnitMap = loaded["units"]
        ambient, assumed = loaded["ambient_pressure"], None
        if ambient is None:
            ambient = self._site_ambient
        if ambient is None:
            ambient = STANDARD_ATMOSPHERE
            assumed = STANDARD_ATMOSPHERE if units.pressure.gauge else None
        gas, substances = loaded["gas"], loaded["substances"] or ()
        asked = (
            RowComposition(gas.names, gas.basis, substances)
            if isinstance(gas, FractionColumns)
            else gas._replace(substances=substances)
        )
        question = SeriesQuestion(
            asked,
            loaded["model"],
            assumed,
            loaded["accept_two_phase"],
            loaded["dew_point_margin"],
            loaded["accuracy"],
        )
        return Terms(question, units, ambient, loaded["input_status_kind"], naming)

    def _names(self, loaded: Mapping[str, Any]) -> list[tuple[Path, str]]:
        found: list[tuple[Path, str]] = []
        gas = loaded.get("gas")
        if gas is not None and "substances" in loaded:
            if isinstance(gas, FractionColumns):
                share = 1.0 / len(gas.names)
                gas = GasSpec(None, tuple((name, share) for name in gas.names), gas.basis)
            try:
                resolve_gas(gas._replace(substances=loaded["substances"] or ()), self._catalogue)
            except GasapiError as error:
                found.append((path_of(error, mixture=gas.name is None), str(error)))
        model = loaded.get("model", "auto")
        if model != "auto":
            try:
                known_model(model)
            except UnknownModel as error:
                found.append((("model",), str(error)))
        return found


def _rows(columns: Mapping[str, Any], wrong: list[tuple[Path, str]]) -> int:
    """Return the number of rows; columns that differ from the first one are told in ``wrong``."""
    found = lengths(columns)
    if not found:
        return 1
    (first, rows), *others = found.items()
    for name, length in others:
        if length != rows:
            wrong.append((tuple(name.split("/", 2)), f"{length} rows, and {first} has {rows}; all arrays are of equal length"))
    if rows > MOST_JSON_ROWS:
        wrong.append(((first,), f"{rows} rows; a JSON body has {MOST_JSON_ROWS} at most: split the series, or send CSV"))
    return rows
