"""What the service knows: gases, equations, units and reference conditions."""

from __future__ import annotations

from typing import Any

import orjson
from flask import Blueprint, Response, request

from gasapi.engine.models import gerg_2008, reference
from gasapi.errors import UnknownGas
from gasapi.gases.loader import load_gerg
from gasapi.gases.records import Constant, Gas, Limits
from gasapi.service.context import Context
from gasapi.service.models import GENERALISED, MODEL_IDS, why_not
from gasapi.service.questions import GasSpec
from gasapi.units import QUANTITIES, REFERENCE_CONDITIONS, SI_UNITS, unit_map
from gasapi.web.negotiation import JSON, accepted
from gasapi.web.parts import Parts
from gasapi.web.problems import Fault, Problem, invalid, pointer
from gasapi.web.query import parameter_pairs

__all__ = ["catalogue_routes", "gas_entry", "gas_summary", "model_entry"]

_FORMS = (JSON,)
_LONGEST_SEARCH = 200


def catalogue_routes(parts: Parts) -> Blueprint:
    """Return the routes of the catalogue."""
    routes = Blueprint("catalogue", __name__)
    context = parts.context
    models = orjson.dumps({"models": [model_entry(id, context) for id in MODEL_IDS]})
    units = orjson.dumps({"quantities": {quantity: _quantity(quantity) for quantity in QUANTITIES}})
    conditions = orjson.dumps({"reference_conditions": {id: c._asdict() for id, c in REFERENCE_CONDITIONS.items()}})

    @routes.get("/v1/gases")
    def get_gases() -> Response:
        search = _parameters("search").get("search", "")
        if len(search) > _LONGEST_SEARCH:
            raise invalid([Fault("/search", f"a search has at most {_LONGEST_SEARCH} characters")])
        found = context.catalogue.search(search)
        return _json(orjson.dumps({"gases": [gas_summary(gas, context) for gas in found]}))

    @routes.get("/v1/gases/<name>")
    def get_gas(name: str) -> Response:
        _parameters()
        try:
            gas = context.catalogue.find(name[: 2 * _LONGEST_SEARCH])
        except UnknownGas as error:
            raise Problem(404, str(error)) from None
        return _json(orjson.dumps(gas_entry(gas, context)))

    @routes.get("/v1/models")
    def get_models() -> Response:
        _parameters()
        return _json(models)

    @routes.get("/v1/units")
    def get_units() -> Response:
        _parameters()
        return _json(units)

    @routes.get("/v1/reference-conditions")
    def get_reference_conditions() -> Response:
        _parameters()
        return _json(conditions)

    return routes


def _json(body: bytes) -> Response:
    """Return an answer as JSON, where the caller takes that."""
    accepted(request.environ.get("HTTP_ACCEPT", ""), _FORMS)
    return Response(body, content_type=str(JSON))


def _parameters(*known: str) -> dict[str, str]:
    """Return the parameters of the request.

    :raises Problem: 422 where one is unknown or given twice
    """
    pairs = parameter_pairs(request.environ["QUERY_STRING"])
    words = f"there is no such parameter; known: {', '.join(known)}" if known else "no parameter is taken here"
    unknown = [Fault(pointer((name,)), words) for name in pairs if name not in known]
    if unknown:
        raise invalid(unknown)
    return dict(pairs)


def gas_summary(gas: Gas, context: Context) -> dict[str, Any]:
    """Return what a list of gases says of one."""
    return {
        "id": gas.id,
        "name": gas.name,
        "formula": gas.formula,
        "cas": gas.cas,
        "synonyms": gas.synonyms,
        "kind": gas.kind,
        "hazard_tags": context.catalogue.hazard_tags(gas),
    }


def gas_entry(gas: Gas, context: Context) -> dict[str, Any]:
    """Return all that is known of a gas: constants with their sources, hazards, the models that can serve it."""
    hazard = gas.hazard
    components = context.catalogue.components(gas)
    return {
        **gas_summary(gas, context),
        "description": gas.description,
        "fractions": dict(components),
        **{name: _constant(constant) for name, constant in gas.constants},
        "hazard_basis": dict(hazard.basis),
        "hazard_figures": {name: _constant(constant) for name, constant in hazard.figures},
        "carcinogen_group": hazard.carcinogen_group,
        "absorbed_through_skin": hazard.absorbed_through_skin,
        "remarks": hazard.remarks,
        "cautions": context.catalogue.cautions(components),
        "models": _models_of(gas, context),
    }


def _models_of(gas: Gas, context: Context) -> list[dict[str, Any]]:
    resolved = context.gas(GasSpec(gas.id))
    models = context.models(resolved)
    found = []
    for id in MODEL_IDS:
        if why_not(id, resolved) is None:
            validity, extended = models.limits(id)
            found.append(
                {"id": id, "validity": _range(validity), "validity_basis": validity.basis, "extended_limits": _range(extended)}
            )
    return found


def model_entry(id: str, context: Context) -> dict[str, Any]:
    """Return an equation of state with its source and range."""
    if id == reference.ID:
        gases = [gas.id for gas in context.catalogue.gases if context.catalogue.reference_id(gas.id) is not None]
        return {
            "id": id,
            "name": "The published multiparameter equation of each gas",
            "source": "a publication for each gas, named in every answer",
            "kind": "published",
            "validity": None,
            "reduced_validity": None,
            "gases": gases,
        }
    if id == gerg_2008.ID:
        data = load_gerg()
        return {
            "id": id,
            "name": gerg_2008.NAME,
            "source": data.citation,
            "kind": "published",
            "validity": _range(data.validity),
            "reduced_validity": None,
            "gases": [component.id for component in data.components],
        }
    line = GENERALISED[id]
    return {
        "id": id,
        "name": line.module.NAME,
        "source": line.module.SOURCE,
        "kind": "generalised",
        "validity": None,
        "reduced_validity": {
            "temperature": [line.range.temperature_min, line.range.temperature_max],
            "pressure": [0.0, line.range.pressure_max],
            "basis": line.range.basis,
        },
        "gases": None,
    }


def _range(limits: Limits) -> dict[str, list[float]]:
    return {"temperature": [limits.temperature_min, limits.temperature_max], "pressure": [0.0, limits.pressure_max]}


def _constant(constant: Constant) -> dict[str, Any]:
    return {"value": constant.value, "unit": constant.unit, "source": constant.source}


def _quantity(quantity: str) -> dict[str, Any]:
    return {
        "default": unit_map(())[quantity].name,
        "si": SI_UNITS[quantity].name,
        "units": {
            name: {
                "scale": unit.numerator / unit.denominator,
                "offset": unit.offset,
                "gauge": unit.gauge,
                "source": unit.source,
            }
            for name, unit in QUANTITIES[quantity].items()
        },
    }
