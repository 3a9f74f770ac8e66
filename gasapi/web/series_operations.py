"""Series and many states as the OpenAPI document has them. Plants and readings in the examples are invented."""

from __future__ import annotations

from typing import Any, Final

from gasapi.web.negotiation import CSV, JSON
from gasapi.web.operation import Example, Operation
from gasapi.web.query import QueryForm
from gasapi.web.routes.series import CSV_WITH_HEADER
from gasapi.web.series_answer_schemas import SeriesAnswerSchema, StatesAnswerSchema
from gasapi.web.series_questions import SeriesReader
from gasapi.web.series_schema import SeriesSchema, StatesSchema

__all__ = ["SERIES_OPERATIONS"]

_REFUSALS: Final = (400, 401, 406, 408, 413, 415, 422, 500, 503)
_UNITS: Final = {"pressure": "barg", "temperature": "degC"}
_CSV_QUESTION: Final = {
    "schema": {
        "type": "string",
        "description": (
            "RFC 4180 with a header. Columns: pressure, temperature, timestamps, input_status, fraction.<name>, each with its "
            "unit in brackets if wanted, as in pressure [barg]; others are named by keep. The question's other members are "
            "parameters. A row that cannot be read is a bad row."
        ),
    },
    "examples": {
        "history": {
            "summary": "A history with a tag column, asked with ?gas=nitrogen&keep=tag",
            "value": "timestamps,pressure [barg],temperature [degC],tag\r\n2026-01-01T00:00Z,40,25,PT-1\r\n",
        }
    },
}
_CSV_ANSWER: Final = {
    "type": "string",
    "description": (
        "RFC 4180, a row for each row: the given columns, then status_code, density, compressibility_factor, molar_volume, "
        "region and reasons; numbers empty in a bad row, and the line of a row that could not be read among its reasons."
    ),
}
_KEEP: Final = {
    "name": "keep",
    "in": "query",
    "description": "A column of a CSV body that is passed through; may be repeated.",
    "schema": {"type": "array", "items": {"type": "string"}},
    "style": "form",
    "explode": True,
}
_HISTORY: Final[dict[str, Any]] = {
    "gas": "nitrogen",
    "pressure": [40.0, 40.2, None, 41.1],
    "temperature": [25.0, 25.1, 25.1, 25.3],
    "timestamps": ["2026-01-01T00:00Z", "2026-01-01T00:01Z", "2026-01-01T00:02Z", "2026-01-01T00:03Z"],
    "input_status": [0, 0, 2147483648, 1073741824],
    "units": _UNITS,
}
_CHROMATOGRAPH: Final[dict[str, Any]] = {
    "gas": {"fractions": {"methane": [0.92, 0.90, 0.90], "nitrogen": [0.05, 0.07, 0.07], "ethane": 0.03}},
    "pressure": [60.0, 60.1, 60.2],
    "temperature": 15,
    "units": {"pressure": "bara", "temperature": "degC"},
}

_TABLE: Final[dict[str, Any]] = {
    "gas": "nitrogen",
    "pressure": [4e6, 4.1e6, 4.2e6],
    "temperature": 298.15,
    "accuracy": 1e-6,
}

SERIES_OPERATIONS: Final[tuple[Operation, ...]] = (
    Operation(
        "post",
        "/v1/series",
        "askSeries",
        "state",
        "A history in one call",
        "Columns of pressure and temperature of one gas, or of one whose composition changes by the row, in JSON or CSV "
        "either way. One equation serves all rows; a row has the numbers of the single state with that equation named. Missing "
        "and absurd readings make bad rows, never a failed request. Parameters belong to a CSV body alone.",
        {str(JSON): SeriesAnswerSchema, str(CSV_WITH_HEADER): _CSV_ANSWER, str(CSV): _CSV_ANSWER},
        body=SeriesSchema,
        other_bodies={"text/csv": _CSV_QUESTION},
        query=QueryForm(SeriesReader.schema),
        parameters=(_KEEP,),
        refusals=_REFUSALS,
        examples=(
            Example("history", "A history with a missing and an uncertain reading", _HISTORY),
            Example("chromatograph", "A composition by the row", _CHROMATOGRAPH),
            Example("table", "From a certified table, with an error of 1 part in a million at most", _TABLE),
            Example("rows", "The same as CSV rows", _HISTORY, accept=str(CSV_WITH_HEADER)),
        ),
    ),
    Operation(
        "post",
        "/v1/states",
        "askStates",
        "state",
        "Independent states in one call",
        "Up to 1000 state questions, answered in their order; one that is refused gets its problem in place of an answer.",
        {str(JSON): StatesAnswerSchema},
        body=StatesSchema,
        refusals=_REFUSALS,
        examples=(
            Example(
                "scan",
                "Two tags of a scan, one of them with a wrong name",
                {
                    "questions": [
                        {"gas": "nitrogen", "pressure": 40, "temperature": 25, "units": _UNITS},
                        {"gas": "nitrogem", "pressure": 40, "temperature": 25, "units": _UNITS},
                    ]
                },
            ),
        ),
    ),
)
"""The routes of series and of many states."""
