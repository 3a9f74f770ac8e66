"""The members of a series."""

from __future__ import annotations

from gasapi.web import fields
from gasapi.web.columns import Column, SeriesGas, StatusColumn, Timestamps
from gasapi.web.schemas import RequestSchema, StateSchema

__all__ = ["SeriesSchema", "StatesSchema"]

_STATE = StateSchema().fields


class SeriesSchema(RequestSchema):
    """Columns of a history: arrays of equal length; a number stands for all rows."""

    gas = SeriesGas(
        description="Id, name, synonym, formula or CAS number of a gas, or fractions; arrays for a composition by the row.",
        examples=["nitrogen", {"fractions": {"methane": [0.92, 0.9], "nitrogen": [0.08, 0.1]}}],
        required=True,
    )
    substances = fields.Substances(description="Substances that the catalogue lacks, by a name used in this question.")
    model = fields.Text(
        default="auto",
        description="auto, or the id of an equation of state as GET /v1/models lists them. One equation serves all rows.",
        examples=["auto", "reference", "gerg-2008"],
    )
    units = fields.Units(description="Units by quantity, for inputs and outputs alike; left out: the defaults.")
    ambient_pressure = fields.Number(
        above=0.0, most=1e6, description="Pa, for gauge units; left out: 101325, and every row says that it was assumed."
    )
    pressure = Column(required=True, description="In the unit of units.pressure.", examples=[[4101325.0, None, 4101400.0]])
    temperature = Column(required=True, description="In the unit of units.temperature.", examples=[[298.15, 298.2, 298.25]])
    timestamps = Timestamps(description="Returned as they came.")
    input_status = StatusColumn(description="Status of the readings: bad makes a bad row, uncertain caps it at uncertain.")
    input_status_kind = fields.Choice(
        ("opc-ua", "opc-classic"),
        default="opc-ua",
        description="What the codes are: OPC UA status codes, or the quality of OPC classic (192 good, 64 uncertain, 0 bad).",
    )
    accept_two_phase = fields.Flag(
        default=False, description="Give the density of a two-phase mixture as uncertain in place of a bad row."
    )
    dew_point_margin = fields.Number(
        least=0.0, most=1000.0, description="K; how near to the dew point a row says near_dew_point. Left out: 5."
    )
    accuracy = fields.Number(
        least=1e-12, most=0.1, description="A relative error that allows a certified table in place of the exact solve."
    )


class Questions(fields.Member):
    """An array of questions, each read by itself later on."""

    expected = "an array of 1 to 1000 state questions"
    most = 1000

    def _read(self, value: object) -> list[object]:
        if type(value) is not list or not 0 < len(value) <= self.most:
            self.refuse(f"{len(value)} questions" if type(value) is list else value)
        return value

    def _schema(self) -> fields.JsonSchema:
        question = {"$ref": "#/components/schemas/State"}
        return {"type": "array", "minItems": 1, "maxItems": self.most, "items": question}


class StatesSchema(RequestSchema):
    """Independent states in one call."""

    questions = Questions(required=True, description="State questions, answered in their order.")
