"""``/v1/state``: one state, asked in a body or in a query, answered as JSON or as one line."""

from __future__ import annotations

from flask import Blueprint, Response, request

from gasapi.errors import GasapiError, UnknownGas
from gasapi.service.context import Context
from gasapi.service.state import answer_state
from gasapi.web.answers import remembered_form, state_json, state_line
from gasapi.web.body import Environ, read_body, require_json
from gasapi.web.caching import SITE
from gasapi.web.edge import BODY, Direct, Reply, remember
from gasapi.web.negotiation import CSV, JSON, accepted
from gasapi.web.parts import Parts
from gasapi.web.problems import Fault, invalid, pointer
from gasapi.web.query import parameter_pairs
from gasapi.web.questions import Asked, StateReader

__all__ = ["PATH", "depends_on_site", "state_answerer", "state_routes"]

PATH = "/v1/state"

_FORMS = (JSON, CSV)
_JSON_HEADERS = [("Content-Type", str(JSON)), ("Vary", "Accept")]
_CSV_HEADERS = [("Content-Type", str(CSV)), ("Vary", "Accept")]


def state_answerer(parts: Parts) -> Direct:
    """Return what answers a GET or POST of a state, from its environ alone.

    The edge calls it directly, since the routing and the contexts of Flask cost as much as the density does.
    """
    context, limit, metrics = parts.context, parts.settings.json_limit, parts.metrics
    reader = StateReader(context.catalogue, context.ambient_pressure)

    def answer(environ: Environ) -> Reply:
        form = accepted(environ.get("HTTP_ACCEPT", ""), _FORMS)
        if environ["REQUEST_METHOD"] == "POST":
            require_json(environ)
            if environ["QUERY_STRING"]:
                _refuse_parameters(environ["QUERY_STRING"])
            body = environ.get(BODY)
            asked = reader.of_body(read_body(environ, limit) if body is None else body)
        else:
            asked = reader.of_query(environ["QUERY_STRING"])
        try:
            answered = answer_state(context, asked.question)
        except GasapiError as error:
            raise asked.problem(error) from None
        metrics.state(answered.answer, answered.cached)
        if context.site is not None and depends_on_site(context, asked):
            environ[SITE] = True
        if form is CSV:
            written = again = state_line(asked, answered)
            headers = _CSV_HEADERS
        else:
            written = state_json(asked, answered)
            again = remembered_form(written, answered)
            headers = _JSON_HEADERS
        remember(environ, [*headers, ("Content-Length", str(len(again)))], again)
        return Reply([*headers, ("Content-Length", str(len(written)))], written)

    return answer


def state_routes(answer: Direct) -> Blueprint:
    """Return the same as routes of Flask, which knows the other methods, too."""
    routes = Blueprint("state", __name__)

    @routes.route(PATH, methods=["GET", "POST"])
    def state() -> Response:
        headers, body = answer(request.environ)
        return Response(body, headers=headers)

    return routes


def depends_on_site(context: Context, asked: Asked) -> bool:
    """Return whether an answer could be another with another site file: by its gas, its ambient pressure or its margin."""
    site, question = context.site, asked.question
    if site is None:
        return False
    if site.dew_point_margin is not None and question.dew_point_margin is None:
        return True
    if site.ambient_pressure is not None and asked.units.pressure.gauge:
        return True
    names = [question.gas.name] if question.gas.name is not None else [name for name, _ in question.gas.fractions or ()]
    return any(_is_of_site(context, name) for name in names)


def _is_of_site(context: Context, name: str) -> bool:
    try:
        return context.catalogue.find(name).kind == "site"
    except UnknownGas:
        return False  # a substance of the question itself


def _refuse_parameters(query: str) -> None:
    names = parameter_pairs(query)
    raise invalid(
        [Fault(pointer((name,)), "a posted question has no parameters; give the member in the body") for name in names]
    )
