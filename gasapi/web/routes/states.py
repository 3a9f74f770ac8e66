"""``/v1/states``: independent states in one call; a question that cannot be answered gets its problem and no more."""

from __future__ import annotations

import json
import logging
import re
import time
from typing import Any

import orjson
from flask import Blueprint, Response, request
from marshmallow import ValidationError

from gasapi.errors import GasapiError
from gasapi.service.state import answer_state
from gasapi.web.answers import state_json
from gasapi.web.body import read_body, require_json
from gasapi.web.edge import FAILURE
from gasapi.web.json_body import parse_json
from gasapi.web.negotiation import JSON, accepted
from gasapi.web.parts import Parts
from gasapi.web.problems import Fault, Problem, document, invalid, located, pointer
from gasapi.web.questions import StateReader
from gasapi.web.routes.jobs import refuse_parameters
from gasapi.web.series_schema import StatesSchema
from gasapi.web.turns import give_way

__all__ = ["states_routes"]

_FORMS = (JSON,)
_PATH = "/v1/states"
_LONGEST_TURN = 0.01  # s after which others have theirs

# what cannot be read at all has no other part than the whole; what can stands in a question or beside them
_QUESTION = re.compile(r"/questions/([0-9]+)(?=/|$)")

_log = logging.getLogger("gasapi")


def states_routes(parts: Parts) -> Blueprint:
    """Return the route of many states."""
    routes = Blueprint("states", __name__)
    context, limit = parts.context, parts.settings.json_limit
    reader = StateReader(context.catalogue, context.ambient_pressure)
    schema = StatesSchema()

    @routes.post(_PATH)
    def post_states() -> Response:
        environ = request.environ
        accepted(environ.get("HTTP_ACCEPT", ""), _FORMS)
        require_json(environ)
        if environ["QUERY_STRING"]:
            refuse_parameters(environ["QUERY_STRING"])
        members, told = _parsed(read_body(environ, limit))
        try:
            questions = schema.load(members)["questions"]
        except ValidationError as error:
            raise invalid([Fault(pointer(path), detail) for path, detail in located(error.messages)]) from None
        answers = []
        turn_ends = time.monotonic() + _LONGEST_TURN
        for number, question in enumerate(questions):
            faults = told.get(number)
            answers.append(_answer(question) if faults is None else _written(invalid(faults)))
            if time.monotonic() > turn_ends:
                give_way()
                turn_ends = time.monotonic() + _LONGEST_TURN
        return Response(b'{"answers":[' + b",".join(answers) + b"]}", content_type=str(JSON))

    def _answer(question: Any) -> bytes:
        try:
            try:
                asked = reader.of_members(question)
                answered = answer_state(context, asked.question)
            except GasapiError as error:
                raise asked.problem(error) from None
            return state_json(asked, answered)
        except Problem as problem:
            return _written(problem)
        except Exception:
            _log.exception("a question among several failed")
            return _written(Problem(500, FAILURE))

    return routes


def _parsed(body: bytes) -> tuple[Any, dict[int, list[Fault]]]:
    """Return the value of a JSON text, and the faults of form that lie within one question each, by its number.

    :raises Problem: 400 or 422 where the fault is that of the whole
    """
    try:
        return parse_json(body), {}
    except Problem as problem:
        told: dict[int, list[Fault]] = {}
        for fault in problem.faults:
            within = _QUESTION.match(fault.pointer)
            if within is None:
                raise
            told.setdefault(int(within[1]), []).append(Fault(fault.pointer[within.end() :], fault.detail))
        if not told:
            raise
        # a member that is there twice, or a number that is none, was found by the second reading, which this repeats
        return json.loads(body), told


def _written(problem: Problem) -> bytes:
    return orjson.dumps({"problem": document(problem, _PATH)})
