"""``/v1/series``: a history in one call, as JSON or as CSV, in either direction.

A JSON series is held whole, a CSV one is answered in blocks: once through the rows for the choice of the equation where that
depends on them, once more for the answer, which leaves block by block.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import IO, Any

from flask import Blueprint, Response, request

from gasapi.errors import GasapiError
from gasapi.service.context import Context
from gasapi.service.selection import AUTO
from gasapi.service.series import RowComposition, Series, SeriesRows, Survey
from gasapi.units import UnitMap
from gasapi.web.body import Environ, read_body, require_json
from gasapi.web.csv_body import CsvSeries, CsvSeriesReader, put_aside, require_csv
from gasapi.web.metrics import Metrics
from gasapi.web.negotiation import CSV, JSON, MediaType, accepted, content_type
from gasapi.web.parts import Parts
from gasapi.web.problems import Problem
from gasapi.web.routes.jobs import refuse_parameters
from gasapi.web.series_answers import array_bytes, csv_header, csv_lines, given_lines, joined_rows, json_pieces
from gasapi.web.series_questions import AskedSeries, SeriesReader, Terms
from gasapi.web.turns import give_way

__all__ = ["CSV_WITH_HEADER", "MOST_JSON_ANSWERS", "series_routes"]

CSV_WITH_HEADER = MediaType("text", "csv", (("header", "present"),))
"""RFC 4180 with a header line."""

MOST_JSON_ANSWERS = 2_000_000
"""Rows of a CSV body that are answered in JSON at most: 45 bytes are held for each until the last one is read."""

_FORMS = (JSON, CSV_WITH_HEADER, CSV)


def series_routes(parts: Parts) -> Blueprint:
    """Return the route of a series."""
    routes = Blueprint("series", __name__)
    context, settings = parts.context, parts.settings
    reader = SeriesReader(context.catalogue, context.ambient_pressure)
    csv_reader = CsvSeriesReader(reader)

    @routes.post("/v1/series")
    def post_series() -> Response:
        environ = request.environ
        form = accepted(environ.get("HTTP_ACCEPT", ""), _FORMS)
        if _is_csv(environ):
            require_csv(environ)
            body = put_aside(environ, settings.csv_limit)
            try:
                return _answer_csv(parts, csv_reader, body, environ["QUERY_STRING"], form)
            except BaseException:
                body.close()
                raise
        require_json(environ)
        if environ["QUERY_STRING"]:
            refuse_parameters(environ["QUERY_STRING"])
        return _answer_json(parts, reader.of_body(read_body(environ, settings.json_limit)), form)

    return routes


def _is_csv(environ: Environ) -> bool:
    kind = content_type(environ.get("CONTENT_TYPE", ""))
    return kind is not None and (kind.type, kind.subtype) == ("text", "csv")


def _response(body: Any, form: MediaType) -> Response:
    return Response(body, headers=[("Content-Type", str(form)), ("Vary", "Accept")])


def _open(context: Context, terms: Terms, survey: Survey) -> Series:
    try:
        return Series(context, terms.question, survey, give_way)
    except GasapiError as error:
        raise terms.problem(error) from None


def _answer_json(parts: Parts, asked: AskedSeries, form: MediaType) -> Response:
    terms = asked.terms
    survey = Survey(terms.question)
    survey.add(asked.columns)
    series = _open(parts.context, terms, survey)
    rows = series.answer(asked.columns)
    summary = series.summary()
    parts.metrics.rows(summary.model.id, summary.counts)
    if form is JSON:
        timestamps = None if asked.timestamps is None else [array_bytes(asked.timestamps)]
        return _response(b"".join(json_pieces(rows, summary, terms.units, timestamps)), form)
    units = terms.units
    given: list[Any] = [asked.pressure, asked.temperature]
    names = [f"pressure [{units.pressure.name}]", f"temperature [{units.temperature.name}]"]
    if asked.timestamps is not None:
        given.insert(0, asked.timestamps)
        names.insert(0, "timestamps")
    lines = csv_lines(given_lines(given), rows, units, {})
    return _response((csv_header(",".join(names).encode(), units) if form is CSV_WITH_HEADER else b"") + lines, form)


def _answer_csv(parts: Parts, reader: CsvSeriesReader, body: IO[bytes], query: str, form: MediaType) -> Response:
    asked = reader.of_body(body, query)
    terms = asked.terms
    survey = Survey(terms.question)
    if isinstance(terms.question.gas, RowComposition) or terms.question.model == AUTO:
        for block in asked.blocks():
            survey.add(block.columns)
            give_way()
    series = _open(parts.context, terms, survey)
    if form is JSON:
        return _response(_json_of_csv(series, asked, parts.metrics), form)
    return _response(_csv_of_csv(series, asked, terms.units, form, parts.metrics), form)


def _csv_of_csv(series: Series, asked: CsvSeries, units: UnitMap, form: MediaType, metrics: Metrics) -> Iterator[bytes]:
    try:
        if form is CSV_WITH_HEADER:
            yield csv_header(asked.header, units)
        for block in asked.blocks():
            rows = series.answer(block.columns)
            yield csv_lines(block.texts, rows, units, block.unreadable)
        summary = series.summary()
        metrics.rows(summary.model.id, summary.counts)
    finally:
        asked.close()


def _json_of_csv(series: Series, asked: CsvSeries, metrics: Metrics) -> Iterator[bytes]:
    """Return the pieces of a JSON answer; the rows are answered here, before anything is sent."""
    parts: list[SeriesRows] = []
    timestamps: list[bytes] = []
    unreadable: dict[int, int] = {}
    count = 0
    for block in asked.blocks():
        unreadable |= {count + row: line for row, line in block.unreadable.items()}
        parts.append(series.answer(block.columns))
        count += len(block.texts)
        if count > MOST_JSON_ANSWERS:
            raise Problem(413, f"more than {MOST_JSON_ANSWERS} rows are answered in CSV alone; send Accept: text/csv")
        if block.timestamps is not None:
            timestamps.append(array_bytes([text.decode("utf-8", "replace") for text in block.timestamps]))
    asked.close()
    times = timestamps if asked.has_timestamps else None
    summary = series.summary()
    metrics.rows(summary.model.id, summary.counts)
    return json_pieces(joined_rows(parts), summary, asked.terms.units, times, unreadable)
