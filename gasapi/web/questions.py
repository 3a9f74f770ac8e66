"""Requests into questions: checked members in the caller's units become a question in SI, all faults told at once."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any, NamedTuple

from marshmallow import ValidationError

from gasapi.errors import GasapiError, UnknownModel
from gasapi.gases.catalogue import Catalogue
from gasapi.service.gas import resolve_gas
from gasapi.service.models import known_model
from gasapi.service.questions import GasSpec, InputUncertainty, StateQuestion
from gasapi.units import Unit, UnitMap
from gasapi.web.json_body import parse_json
from gasapi.web.problems import Fault, Path, Problem, invalid, located, path_of, pointer, shown
from gasapi.web.query import QueryForm
from gasapi.web.schemas import StateSchema

__all__ = ["STANDARD_ATMOSPHERE", "Asked", "StateReader"]

STANDARD_ATMOSPHERE = 101325.0
"""Pa; taken as the ambient pressure of a gauge reading where none is given."""

Located = list[tuple[Path, str]]
Naming = Callable[[Path], str]


class Asked(NamedTuple):
    """A question, the units in which its answer is to be given, and how the request names a member that stands at a path."""

    question: StateQuestion
    units: UnitMap
    naming: Naming

    def problem(self, error: GasapiError) -> Problem:
        """Return the problem of a question that the service refused."""
        path = path_of(error, mixture=self.question.gas.name is None)
        return invalid([Fault(self.naming(path), str(error))])


class StateReader:
    """Reads state questions: from the bytes of a body, from its members, from a query.

    :param catalogue: where names of gases are looked up when a request is at fault anyway, so that all faults are told at once
    :param site_ambient: Pa, the ambient pressure of the site where it is known
    """

    schema = StateSchema()
    query = QueryForm(schema)

    def __init__(self, catalogue: Catalogue, site_ambient: float | None = None) -> None:
        self._catalogue = catalogue
        self._site_ambient = site_ambient

    def of_body(self, body: bytes) -> Asked:
        """Return the question of a JSON body.

        :raises Problem: 400 or 422, with every fault
        """
        return self._read(parse_json(body), pointer, {})

    def of_members(self, members: Any) -> Asked:
        """Return the question of a JSON value.

        :raises Problem: 422, with every fault
        """
        return self._read(members, pointer, {})

    def of_query(self, query: str) -> Asked:
        """Return the question of a query, percent-encoded.

        :raises Problem: 400 or 422, with every fault; the pointers name parameters
        """
        members, faults = self.query.read(query)
        return self._read(members, self._parameter, faults)

    def _parameter(self, path: Path) -> str:
        return pointer((self.query.parameter_of(path),))

    def _read(self, members: Any, naming: Naming, known: Mapping[Path, Fault]) -> Asked:
        """Return the question of members; a fault that is already known stands in place of what follows from it."""
        try:
            loaded = self.schema.load(members)
            wrong: Located = []
        except ValidationError as error:
            loaded = error.valid_data if isinstance(error.valid_data, dict) else {}
            wrong = located(error.messages)
        ambient, assumed = self._ambient(loaded)
        pressure = _absolute(loaded, "pressure", "Pa", ambient, wrong)
        temperature = _absolute(loaded, "temperature", "K", ambient, wrong)
        if wrong or known:
            wrong += self._names(loaded)
            found = [Fault(naming(path), detail) for path, detail in wrong if path not in known]
            raise invalid([*known.values(), *found])
        units: UnitMap = loaded["units"]
        gas: GasSpec = loaded["gas"]
        substances = loaded["substances"]
        uncertainty = loaded["input_uncertainty"]
        question = StateQuestion(
            gas._replace(substances=substances) if substances else gas,
            pressure,
            temperature,
            loaded["model"],
            assumed,
            loaded["accept_two_phase"],
            loaded["dew_point_margin"],
            _uncertainty(uncertainty, units) if uncertainty is not None else None,
            loaded["accuracy"],
        )
        return Asked(question, units, naming)

    def _ambient(self, loaded: Mapping[str, Any]) -> tuple[float, float | None]:
        """Return the ambient pressure, Pa, and the same again where it was assumed for a gauge reading."""
        given = loaded.get("ambient_pressure")
        if given is not None:
            return given, None
        if self._site_ambient is not None:
            return self._site_ambient, None
        units: UnitMap | None = loaded.get("units")
        return STANDARD_ATMOSPHERE, STANDARD_ATMOSPHERE if units is not None and units.pressure.gauge else None

    def _names(self, loaded: Mapping[str, Any]) -> Located:
        """Return what is wrong with the names of gas and model in a request that is at fault elsewhere."""
        found: Located = []
        gas: GasSpec | None = loaded.get("gas")
        if gas is not None and "substances" in loaded:
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


def _absolute(loaded: Mapping[str, Any], quantity: str, si: str, ambient: float, wrong: Located) -> float:
    """Return a pressure or temperature in SI, 0 where it is not known; what does not lie above zero is told in ``wrong``."""
    units, value = loaded.get("units"), loaded.get(quantity)
    if units is None or value is None:
        return 0.0
    unit: Unit = units[quantity]
    absolute = unit.to_si(value, ambient)
    if not 0.0 < absolute < float("inf"):
        at_ambient = f" at an ambient of {ambient:g} Pa" if unit.gauge else ""
        wrong.append(
            (
                (quantity,),
                f"{shown(value)} {unit.name} is {absolute:.7g} {si}{at_ambient}; "
                f"an absolute {quantity} lies above 0 {si} and within the range of a double",
            )
        )
    return absolute


def _uncertainty(given: Mapping[str, float | None], units: UnitMap) -> InputUncertainty:
    return InputUncertainty(
        units.pressure.difference_to_si(given["pressure"] or 0.0),
        units.temperature.difference_to_si(given["temperature"] or 0.0),
    )
