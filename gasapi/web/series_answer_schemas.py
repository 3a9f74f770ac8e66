"""The bodies of answers to series and to many states, for the OpenAPI document and for tests."""

from __future__ import annotations

from typing import Any

from marshmallow import Schema, fields, validate

from gasapi.web import answer_schemas as answers

__all__ = ["SeriesAnswerSchema", "StatesAnswerSchema"]


def _column(description: str, items: fields.Field[Any]) -> fields.List:
    return fields.List(items, required=True, metadata={"description": description})


def _numbers(description: str) -> fields.List:
    return _column(description + " Null in a bad row.", fields.Float(allow_none=True))


class SeriesGasSchema(Schema):
    """The gas as it was understood; where it changes by the row, fractions and molar mass are arrays."""

    id = fields.String(required=True, allow_none=True, metadata={"description": "Null for a mixture given by fractions."})
    fractions = fields.Dict(
        keys=fields.String(),
        values=fields.Raw(metadata={"type": ["number", "array"], "items": {"type": ["number", "null"]}}),
        required=True,
        metadata={"description": "Mole fractions by catalogue id, summing to 1."},
    )
    molar_mass = fields.Raw(
        required=True,
        metadata={
            "type": ["number", "array"],
            "items": {"type": ["number", "null"]},
            "description": "The one that the equation used.",
        },
    )


class SeriesResultSchema(Schema):
    """The numbers by the row."""

    density = _numbers("")
    compressibility_factor = _numbers("Z = p V / (R T) with the equation's own R.")
    molar_volume = _numbers("")


class SeriesPhaseSchema(Schema):
    """The phase by the row."""

    region = _column("The phase of each row.", fields.String(validate=validate.OneOf(answers.REGIONS)))
    model = fields.String(required=True, allow_none=True, metadata={"description": "The equation behind the verdict."})


class SeriesModelSchema(answers.ModelSchema):
    """The equation behind all rows: one for the whole series, so that no step appears where a range ends."""

    inside_validity = fields.Boolean(required=True, metadata={"description": "Whether every row lies in the published range."})
    relative_uncertainty = fields.Float(
        required=True,
        allow_none=True,
        metadata={"description": "Expanded (k = 2), a fraction of density: the largest of all rows that have a number."},
    )


class CountsSchema(Schema):
    """How many rows there are of each level."""

    good = fields.Integer(required=True)
    uncertain = fields.Integer(required=True)
    bad = fields.Integer(required=True)


class CertificateSchema(Schema):
    """What a table in place of the exact solve is good for."""

    accuracy = fields.Float(required=True, metadata={"description": "The relative error that was allowed."})
    largest_error = fields.Float(
        required=True,
        allow_none=True,
        metadata={"description": "The largest relative error on an independent grid of every patch that was used."},
    )
    table_rows = fields.Integer(required=True, metadata={"description": "Rows answered from the table; the others are exact."})


class SeriesAnswerSchema(Schema):
    """The answer to a series. Bad rows have no numbers: read status_code or reasons first."""

    gas = fields.Nested(SeriesGasSchema, required=True)
    timestamps = fields.List(
        fields.Raw(metadata={"type": ["string", "number", "null"]}), metadata={"description": "As they came, where any did."}
    )
    result = fields.Nested(SeriesResultSchema, required=True)
    status_code = _column("The OPC UA status code of each row.", fields.Integer(validate=validate.Range(0, 2**32 - 1)))
    phase = fields.Nested(SeriesPhaseSchema, required=True)
    counts = fields.Nested(CountsSchema, required=True)
    reasons = fields.Dict(
        keys=fields.String(),
        values=fields.List(fields.String()),
        required=True,
        metadata={"description": "Words of each row that is not good, by row number from 0."},
    )
    unreadable = fields.Dict(
        keys=fields.String(),
        values=fields.Integer(),
        metadata={"description": "For a CSV body: the line at which an unreadable row begins, by row number."},
    )
    units = fields.Nested(answers.EchoedUnitsSchema, required=True)
    model = fields.Nested(SeriesModelSchema, required=True)
    cautions = fields.List(fields.String(), required=True)
    certificate = fields.Nested(CertificateSchema, metadata={"description": "Given where accuracy was."})
    trace = fields.Nested(answers.TraceSchema, required=True)


class StatesAnswerSchema(Schema):
    """Answers in the order of the questions."""

    answers = fields.List(
        fields.Raw(
            metadata={
                "oneOf": [
                    {"$ref": "#/components/schemas/StateAnswer"},
                    {
                        "type": "object",
                        "required": ["problem"],
                        "properties": {"problem": {"$ref": "#/components/schemas/Problem"}},
                        "additionalProperties": False,
                    },
                ]
            }
        ),
        required=True,
    )
