"""The OpenAPI 3.1 document, made from the very schemas that validate; ``python -m gasapi.web.openapi`` writes it.

The service serves the file as it stands; a test compares it with the routes and with what this module makes. apispec is
needed for the making alone, not by a running service.
"""

from __future__ import annotations

import json
from collections.abc import Mapping
from pathlib import Path
from typing import Any, Final

from apispec import APISpec
from apispec.ext.marshmallow import MarshmallowPlugin
from apispec.ext.marshmallow.openapi import OpenAPIConverter
from marshmallow import Schema
from marshmallow.fields import Field

from gasapi import __version__
from gasapi.web import answer_schemas as answers
from gasapi.web.caching import Freshness
from gasapi.web.edge import LARGE
from gasapi.web.fields import Member
from gasapi.web.job_operations import JOB_OPERATIONS
from gasapi.web.metrics import CONTENT_TYPE
from gasapi.web.negotiation import CSV, JSON
from gasapi.web.operation import Example, Operation
from gasapi.web.problems import KINDS, MEDIA_TYPE
from gasapi.web.query import QueryForm
from gasapi.web.questions import StateReader
from gasapi.web.schemas import StateSchema
from gasapi.web.series_operations import SERIES_OPERATIONS

__all__ = ["OPERATIONS", "make_document", "write_document"]

FILE: Final = Path(__file__).resolve().with_name("openapi.json").resolve()
"""The exported document: beside the package in the repository, inside it once installed."""

_JSON: Final = str(JSON)
_DESCRIPTION: Final = (
    "Density, compressibility factor and molar volume of real gases, with the equation behind them, its published range, its "
    "uncertainty and the phase. All errors are problems (RFC 9457). A number stands in a body as a JSON number; unknown "
    "members and members given twice are refused. Read quality before a number is put to use."
)


_STATE_ANSWER: Final = {
    _JSON: answers.StateAnswerSchema,
    str(CSV): {
        "type": "string",
        "description": "One line (RFC 4180): status_code,density,compressibility_factor,molar_volume,region; empty where null.",
    },
}

_PLANT: Final = {"gas": "nitrogen", "pressure": 40, "temperature": 25, "units": {"pressure": "barg", "temperature": "degC"}}
_MIXTURE: Final = {
    "gas": {"fractions": {"methane": 0.92, "nitrogen": 0.05, "carbon-dioxide": 0.03}},
    "pressure": 3000000,
    "temperature": 300,
    "input_uncertainty": {"pressure": 3000, "temperature": 0.2},
}
_NEAR_DEW: Final = {"gas": "propane", "pressure": 9.2, "temperature": 27, "units": {"pressure": "bara", "temperature": "degC"}}

OPERATIONS: Final[tuple[Operation, ...]] = (
    Operation(
        "post",
        "/v1/state",
        "askState",
        "state",
        "The density of a gas at one state",
        "The question in a body. The answer is JSON, or one CSV line for a controller that reads no JSON.",
        _STATE_ANSWER,
        body=StateSchema,
        refusals=(400, 401, 406, 408, 413, 415, 422, 500, 503),
        examples=(
            Example("plant", "Nitrogen in a line, gauge pressure and degrees Celsius", _PLANT),
            Example("mixture", "A mixture in SI units, with the uncertainty of the readings", _MIXTURE),
            Example("near-dew-point", "Propane close to condensing: uncertain, with margins", _NEAR_DEW),
            Example("line", "One line for a controller", _PLANT, accept=str(CSV)),
        ),
    ),
    Operation(
        "get",
        "/v1/state",
        "askStateByAddress",
        "state",
        "The density of a gas at one state, asked by an address alone",
        "The same question for clients that can only fetch an address. Numbers have the grammar of JSON.",
        _STATE_ANSWER,
        query=StateReader.query,
        refusals=(400, 401, 406, 422, 500, 503),
        examples=(
            Example(
                "plant",
                "Nitrogen in a line",
                query="gas=nitrogen&pressure=40&temperature=25&pressure_unit=barg&temperature_unit=degC",
            ),
        ),
    ),
    *SERIES_OPERATIONS,
    *JOB_OPERATIONS,
    Operation(
        "get",
        "/v1/gases",
        "listGases",
        "catalogue",
        "The gases by name",
        "All gases, or those that a search finds.",
        {_JSON: answers.GasListSchema},
        parameters=(
            {
                "name": "search",
                "in": "query",
                "description": "Part of an id, name, synonym, formula or CAS number.",
                "schema": {"type": "string", "maxLength": 200},
            },
        ),
        refusals=(400, 401, 406, 422, 500, 503),
        examples=(Example("search", "Gases that have to do with cyanogen", query="search=cyanogen"),),
    ),
    Operation(
        "get",
        "/v1/gases/{name}",
        "getGas",
        "catalogue",
        "All that is known of a gas",
        "Constants with their sources, hazards, and the equations that can serve it with their ranges.",
        {_JSON: answers.GasEntrySchema},
        parameters=(
            {
                "name": "name",
                "in": "path",
                "required": True,
                "description": "Id, name, synonym, formula or CAS number.",
                "schema": {"type": "string"},
                "example": "nitrogen",
            },
        ),
        refusals=(400, 401, 404, 406, 422, 500, 503),
        examples=(Example("nitrogen", "Nitrogen"),),
    ),
    Operation(
        "get",
        "/v1/models",
        "listModels",
        "catalogue",
        "The equations of state",
        "Each with its source and range.",
        {_JSON: answers.ModelListSchema},
        refusals=(401, 406, 422, 500, 503),
    ),
    Operation(
        "get",
        "/v1/units",
        "listUnits",
        "catalogue",
        "The units of each quantity",
        "Each with the factor that is used and where it comes from.",
        {_JSON: answers.UnitTableSchema},
        refusals=(401, 406, 422, 500, 503),
    ),
    Operation(
        "get",
        "/v1/reference-conditions",
        "listReferenceConditions",
        "catalogue",
        "The named reference conditions",
        "Temperature in K and pressure in Pa at which gas volumes are stated.",
        {_JSON: answers.ReferenceConditionListSchema},
        refusals=(401, 406, 422, 500, 503),
        examples=(Example("all", "All of them"),),
    ),
    Operation(
        "get",
        "/openapi.json",
        "getOpenapi",
        "operation",
        "This document",
        "OpenAPI 3.1.",
        {_JSON: {"type": "object"}},
        refusals=(401, 500, 503),
    ),
    Operation(
        "get",
        "/livez",
        "getLiveness",
        "operation",
        "Whether the process lives",
        "Answered without a token.",
        {_JSON: answers.HealthSchema},
        refusals=(500, 503),
        examples=(Example("alive", "It lives"),),
        open=True,
    ),
    Operation(
        "get",
        "/readyz",
        "getReadiness",
        "operation",
        "Whether questions are answered",
        "With the version, the hash of the data, and what stands in the way. Answered without a token.",
        {_JSON: answers.HealthSchema},
        refusals=(500, 503),
        examples=(Example("ready", "It is ready"),),
        open=True,
    ),
    Operation(
        "get",
        "/metrics",
        "getMetrics",
        "operation",
        "Counters",
        "In the text format of Prometheus, summed over the workers.",
        {CONTENT_TYPE: {"type": "string"}},
        refusals=(401, 500, 503),
    ),
    Operation(
        "get",
        "/",
        "getPage",
        "operation",
        "The page for people",
        "HTML. Answered without a token.",
        {"text/html; charset=utf-8": {"type": "string"}},
        refusals=(500, 503),
        open=True,
    ),
)
"""Every route, in the order of the document."""

_PROBLEM_HEADERS: Final[Mapping[int, Mapping[str, Any]]] = {
    401: {"WWW-Authenticate": {"description": "How to show a token (RFC 6750).", "schema": {"type": "string"}}},
    405: {"Allow": {"description": "The methods that are allowed.", "schema": {"type": "string"}}},
    429: {"Retry-After": {"description": "Seconds to wait.", "schema": {"type": "integer"}}},
    503: {"Retry-After": {"description": "Seconds to wait.", "schema": {"type": "integer"}}},
}
_KEPT_HEADERS: Final[Mapping[str, Any]] = {
    "ETag": {"description": "Weak validator of question and data (RFC 9110).", "schema": {"type": "string"}},
    "Cache-Control": {"description": "How long the answer keeps (RFC 9111).", "schema": {"type": "string"}},
}
_PREFER: Final[Mapping[str, Any]] = {
    "name": "Prefer",
    "in": "header",
    "description": "wait=<seconds>: how long the caller waits for the answer (RFC 7240); then 503, and the work stops.",
    "schema": {"type": "string"},
    "example": "wait=20",
}


class _Converter(OpenAPIConverter):
    """Lets the fields of requests describe themselves."""

    def field2property(self, field: Field[Any]) -> dict[str, Any]:
        if isinstance(field, Member):
            return field.json_schema()
        property_: dict[str, Any] = super().field2property(field)
        return property_


class _Plugin(MarshmallowPlugin):
    Converter = _Converter


def make_document(ask: Any = None) -> dict[str, Any]:
    """Return the document.

    :param ask: a test client of the application, by which worked examples are answered; without it they have no answers
    """
    spec = APISpec(
        title="gasapi",
        version=__version__,
        openapi_version="3.1.0",
        info={"description": _DESCRIPTION},
        plugins=[_Plugin(schema_name_resolver=_schema_name)],
        tags=[
            {"name": "state", "description": "The density of a gas"},
            {"name": "jobs", "description": "What people compute by hand from a density"},
            {"name": "catalogue", "description": "What the service knows"},
            {"name": "operation", "description": "Health and documents"},
        ],
        servers=[{"url": "/"}],
    )
    spec.components.security_scheme("token", {"type": "http", "scheme": "bearer"})
    spec.components.schema("Problem", schema=answers.ProblemSchema)
    for status, kind in KINDS.items():
        spec.components.response(kind.component, _problem_response(status, kind.title))
    for operation in OPERATIONS:
        spec.path(operation.path, operations={operation.method: _operation(operation, ask)})
    document: dict[str, Any] = json.loads(json.dumps(spec.to_dict()))
    return document


def write_document() -> None:
    """Write the document to its file, the worked examples answered by the service as it is."""
    from gasapi.app import create_app
    from gasapi.settings import Settings

    document = make_document(create_app(Settings()).test_client())
    FILE.write_text(json.dumps(document, indent=1, ensure_ascii=False) + "\n", encoding="utf-8")


def _schema_name(schema: type[Schema] | Schema) -> str:
    kind = schema if isinstance(schema, type) else type(schema)
    return kind.__name__.removesuffix("Schema")


def _problem_response(status: int, title: str) -> dict[str, Any]:
    response: dict[str, Any] = {
        "description": title,
        "content": {MEDIA_TYPE: {"schema": {"$ref": "#/components/schemas/Problem"}}},
    }
    if status in _PROBLEM_HEADERS:
        response["headers"] = dict(_PROBLEM_HEADERS[status])
    return response


def _operation(operation: Operation, ask: Any) -> dict[str, Any]:
    contents: dict[str, dict[str, Any]] = {media: {"schema": schema} for media, schema in operation.answer.items()}
    described: dict[str, Any] = {
        "operationId": operation.id,
        "tags": [operation.tag],
        "summary": operation.summary,
        "description": operation.description,
        "responses": {"200": {"description": "The answer", "content": contents}},
    }
    if not operation.open:
        described["security"] = [{"token": []}, {}]
    if Freshness.keeps(operation.path) and operation.method == "get":
        described["responses"]["200"]["headers"] = dict(_KEPT_HEADERS)
        described["responses"]["304"] = {"description": "The answer that If-None-Match names is still the answer"}
    parameters = [*operation.parameters, *(_parameters(operation.query) if operation.query else ())]
    if operation.path in LARGE:
        parameters.append(dict(_PREFER))
    if parameters:
        described["parameters"] = parameters
    if operation.body is not None:
        content: dict[str, Any] = {"schema": operation.body}
        examples = {e.name: {"summary": e.summary, "value": e.body} for e in operation.examples if e.accept == _JSON}
        if examples:
            content["examples"] = examples
        described["requestBody"] = {"required": True, "content": {_JSON: content, **operation.other_bodies}}
    for status in sorted({*operation.refusals, *(() if operation.open else (429,))}):
        described["responses"][str(status)] = KINDS[status].component
    if ask is not None:
        for example in operation.examples:
            media, value = _answer(operation, example, ask)
            summary = example.summary + (f" (?{example.query})" if example.query else "")
            contents[media].setdefault("examples", {})[example.name] = {"summary": summary, "value": value}
    return described


def _answer(operation: Operation, example: Example, ask: Any) -> tuple[str, Any]:
    """Return the media type and the value of an example's answer."""
    path = operation.path.replace("{name}", example.name)
    address = f"{path}?{example.query}" if example.query else path
    headers = {"Accept": example.accept}
    response = ask.open(address, method=operation.method.upper(), json=example.body, headers=headers)
    if response.status_code != 200:
        raise ValueError(f"the example {example.name} of {operation.id} is answered {response.status}: {response.text[:500]}")
    if example.accept != _JSON:
        return example.accept, response.text
    value = response.get_json()
    for holder in (value, value.get("trace", {}), *(answer.get("trace", {}) for answer in value.get("answers", ()))):
        if "data" in holder:
            # the hash of data and code would make the document change with every change of the engine
            holder["data"] = "sha256:" + 64 * "0"
    return _JSON, value


def _parameters(form: QueryForm) -> list[dict[str, Any]]:
    """Return the parameters of a query; open-ended names as an object whose members are parameters of their own."""
    described = []
    for parameter in form.parameters:
        schema = dict(parameter.schema)
        description = schema.pop("description", None)
        entry: dict[str, Any] = {"name": parameter.name.rstrip("."), "in": "query"}
        if parameter.open_ended:
            pattern = "^" + parameter.name.replace(".", "\\.") + ".+$"
            schema = {"type": "object", "patternProperties": {pattern: schema}, "additionalProperties": False}
            entry |= {"style": "form", "explode": True}
            description = f"Any number of parameters {parameter.name}<name>."
        if parameter.required:
            entry["required"] = True
        entry["schema"] = schema
        if description:
            entry["description"] = description
        described.append(entry)
    return described


if __name__ == "__main__":
    write_document()
