"""``/v1/lookup-table``: a table for a controller, as JSON, CSV or Structured Text. The date in its header comes from here."""

from __future__ import annotations

from collections.abc import Callable
from datetime import UTC, date, datetime

import orjson
from flask import Blueprint, Response, request

from gasapi.errors import GasapiError
from gasapi.service.lookup_table import answer_lookup_table
from gasapi.web.body import read_body, require_json
from gasapi.web.job_questions import LookupTableReader
from gasapi.web.negotiation import JSON, accepted
from gasapi.web.parts import Parts
from gasapi.web.problems import Fault, invalid
from gasapi.web.routes.jobs import refuse_parameters
from gasapi.web.table_answers import TABLE_CSV, TABLE_TEXT, table_csv, table_members, table_text
from gasapi.web.turns import give_way

__all__ = ["lookup_table_routes"]

_FORMS = (JSON, TABLE_CSV, TABLE_TEXT)


def _today() -> date:
    return datetime.now(UTC).date()


def lookup_table_routes(parts: Parts, today: Callable[[], date] = _today) -> Blueprint:
    """Return the route of tables.

    :param today: the date that is written into a header
    """
    routes = Blueprint("lookup_table", __name__)
    context, limit = parts.context, parts.settings.json_limit
    reader = LookupTableReader(context.ambient_pressure)

    @routes.post("/v1/lookup-table")
    def post_lookup_table() -> Response:
        environ = request.environ
        # which form the answer has is said by the member format; a caller need not say it twice
        accepted(environ.get("HTTP_ACCEPT", ""), _FORMS)
        require_json(environ)
        refuse_parameters(environ["QUERY_STRING"])
        asked = reader.of_body(read_body(environ, limit))
        try:
            answer = answer_lookup_table(context, asked.question.question, give_way)
        except GasapiError as error:
            raise asked.problem(error) from None
        form = asked.question.form
        if form == "json":
            return Response(orjson.dumps(table_members(asked.question, asked.units, answer)), content_type=str(JSON))
        if answer.table is None:
            raise invalid([Fault("/gas", f"{answer.state.model.selected_because}, so that there is no table to write")])
        if form == "csv":
            return Response(table_csv(asked.question, asked.units, answer, answer.table), content_type=str(TABLE_CSV))
        text = table_text(asked.question, asked.units, answer, answer.table, today().isoformat())
        return Response(text, content_type=str(TABLE_TEXT))

    return routes
