"""``/v1/state``: one state, asked in a body or in a query, answered as JSON or as one line."""

from __future__ import annotations

from flask import Blueprint, Response, request

from gasapi.errors import GasapiError
from gasapi.service.state import answer_state
from gasapi.web.answers import remembered_form, state_json, state_line
from gasapi.web.body import read_body, require_json
from gasapi.web.edge import BODY, remember
from gasapi.web.negotiation import CSV, JSON, accepted
from gasapi.web.parts import Parts
from gasapi.web.problems import Fault, invalid, pointer
from gasapi.web.query import parameter_pairs
from gasapi.web.questions import Asked, StateReader

__all__ = ["state_routes"]

_FORMS = (JSON, CSV)
_JSON_HEADERS = [("Content-Type", str(JSON)), ("Vary", "Accept")]
_CSV_HEADERS = [("Content-Type", str(CSV)), ("Vary", "Accept")]


def state_routes(parts: Parts) -> Blueprint:
    """Return the routes of a state."""
    routes = Blueprint("state", __name__)
    context, limit = parts.context, parts.settings.json_limit
    reader = StateReader(context.catalogue, context.ambient_pressure)

    @routes.post("/v1/state")
    def post_state() -> Response:
        environ = request.environ
        form = accepted(environ.get("HTTP_ACCEPT", ""), _FORMS)
        require_json(environ)
        if environ["QUERY_STRING"]:
            _refuse_parameters(environ["QUERY_STRING"])
        body = environ.get(BODY)
        return _answer(reader.of_body(read_body(environ, limit) if body is None else body), form is CSV)

    @routes.get("/v1/state")
    def get_state() -> Response:
        form = accepted(request.environ.get("HTTP_ACCEPT", ""), _FORMS)
        return _answer(reader.of_query(request.environ["QUERY_STRING"]), form is CSV)

    def _answer(asked: Asked, as_line: bool) -> Response:
        try:
            answered = answer_state(context, asked.question)
        except GasapiError as error:
            raise asked.problem(error) from None
        if as_line:
            body = again = state_line(asked, answered)
            headers = _CSV_HEADERS
        else:
            body = state_json(asked, answered)
            again = remembered_form(body, answered)
            headers = _JSON_HEADERS
        remember(request.environ, [*headers, ("Content-Length", str(len(again)))], again)
        return Response(body, headers=headers)

    return routes


def _refuse_parameters(query: str) -> None:
    names = parameter_pairs(query)
    raise invalid(
        [Fault(pointer((name,)), "a posted question has no parameters; give the member in the body") for name in names]
    )
