"""The bodies of the jobs' answers, for the OpenAPI document and for tests."""

from __future__ import annotations

from typing import Any

from marshmallow import Schema, fields

from gasapi.web import answer_schemas as answers

__all__ = [
    "ComparisonAnswerSchema",
    "FlowAnswerSchema",
    "FractionFromDensityAnswerSchema",
    "LookupTableAnswerSchema",
    "MolarMassAnswerSchema",
    "PhaseBoundaryAnswerSchema",
    "PressureDecayAnswerSchema",
    "VesselAnswerSchema",
]


def _maybe(description: str = "", required: bool = True) -> fields.Float:
    return fields.Float(required=required, allow_none=True, metadata={"description": description} if description else {})


def _object(schema: type[Schema], **kwargs: Any) -> fields.Nested:
    return fields.Nested(schema, required=True, **kwargs)


class JobAnswerSchema(Schema):
    """What every job answers around its result. A bad answer has status 200 and null numbers: read quality first."""

    gas = _object(answers.GasSchema)
    units = _object(answers.EchoedUnitsSchema)
    phase = _object(answers.PhaseSchema)
    model = _object(answers.ModelSchema)
    quality = _object(answers.QualitySchema)
    cautions = fields.List(fields.String(), required=True)
    trace = _object(answers.TraceSchema)


class FlowResultSchema(Schema):
    """The flow in every measure, in the answer's units."""

    actual_volume = _maybe("At the line state.")
    reference_volume = _maybe("Real gas at the reference condition; null without one.")
    mass = _maybe()
    amount = _maybe()
    correction_factor = _maybe("Multiply a reading in mass or reference volume made with the design density by it.", False)
    design_density = _maybe("As given, or at the design state.", False)
    relative_expanded_uncertainty = _maybe("Of the line density (k = 2); given where input_uncertainty was.", False)


class FlowAnswerSchema(JobAnswerSchema):
    """The answer to a flow."""

    result = _object(FlowResultSchema)


class VesselResultSchema(Schema):
    """The content, in the answer's units."""

    mass = _maybe("Held.")
    amount = _maybe("Held.")
    reference_volume = _maybe("Held; real gas at the reference condition.")
    used_mass = _maybe("Used up to the later state.", False)
    used_amount = _maybe(required=False)
    used_reference_volume = _maybe(required=False)
    usable_mass = _maybe("Down to the minimum pressure, at the vessel's temperature.", False)
    usable_amount = _maybe(required=False)
    usable_reference_volume = _maybe(required=False)
    duration = _maybe("How long the draw-off lasts.", False)
    relative_expanded_uncertainty = _maybe("Of what is held (k = 2); given where input_uncertainty was.", False)


class VesselAnswerSchema(JobAnswerSchema):
    """The answer to a vessel."""

    result = _object(VesselResultSchema)


class PressureDecayResultSchema(Schema):
    """The loss between start and end, in the answer's units unless a name says another."""

    lost_mass = _maybe("Start minus end.")
    leak_rate = _maybe("A mass flow.")
    lost_mass_expanded_uncertainty = _maybe("k = 2, of the readings alone.")
    leak_rate_expanded_uncertainty = _maybe("k = 2, of the readings alone.")
    resolved = fields.Boolean(
        required=True, allow_none=True, metadata={"description": "Whether the lost mass exceeds its uncertainty."}
    )
    throughput_pa_m3_per_s = _maybe("n R T at throughput_temperature, in Pa m3/s.")
    throughput_mbar_l_per_s = _maybe("The same in mbar L/s.")
    throughput_temperature = _maybe("That of the reference condition, else the mean of start and end.")
    reference_volume_flow = _maybe("Real gas at the reference condition.")
    reference_cm3_per_min = _maybe("The same in cm3/min.")
    duration_to_resolve = _maybe("How long a test resolves the leak limit.", False)


class PressureDecayAnswerSchema(JobAnswerSchema):
    """The answer to a leak test."""

    result = _object(PressureDecayResultSchema)


class FractionFromDensityResultSchema(Schema):
    """The fraction of the first gas."""

    mole_fraction = _maybe("Null where no mixture of the two explains the reading.")
    molar_mass = _maybe()
    explained = fields.Boolean(required=True, allow_none=True)
    mole_fraction_expanded_uncertainty = _maybe("k = 2, the equation's own part in it.", False)


class FractionFromDensityAnswerSchema(JobAnswerSchema):
    """The answer to a density of a blend."""

    result = _object(FractionFromDensityResultSchema)


class CandidateSchema(Schema):
    """A gas that a reading allows; no proof of anything."""

    id = fields.String(required=True)
    name = fields.String(required=True)
    molar_mass = fields.Float(required=True)
    density = fields.Float(required=True, metadata={"description": "Real gas at this state."})
    relative_difference = fields.Float(required=True, metadata={"description": "(density - reading) / reading."})
    toxic = fields.Boolean(required=True)
    hazard_tags = fields.List(fields.String(), required=True)
    model = fields.String(required=True)
    level = fields.String(required=True)


class MolarMassResultSchema(Schema):
    """Molar masses and candidates."""

    molar_mass = _maybe("With the Z of the gas that it resembles, else ideal.")
    molar_mass_ideal = _maybe("d R T / p.")
    compressibility_factor = _maybe("Of the gas that it resembles; 1 without one.")
    molar_mass_expanded_uncertainty = _maybe("k = 2; null without input_uncertainty.")
    candidates = fields.List(
        fields.Nested(CandidateSchema),
        required=True,
        allow_none=True,
        metadata={"description": "Catalogue gases that the reading allows, nearest first. Never a proof of identity."},
    )


class MolarMassAnswerSchema(JobAnswerSchema):
    """The answer to a density of a gas that is not known; gas is null where none was named that it resembles."""

    gas = fields.Nested(answers.GasSchema, required=True, allow_none=True)
    result = _object(MolarMassResultSchema)


class ComparedModelSchema(Schema):
    """What one equation says."""

    id = fields.String(required=True)
    density = _maybe()
    compressibility_factor = _maybe()
    relative_difference = _maybe("To the selected equation.")
    relative_uncertainty = _maybe("k = 2.")
    inside_validity = fields.Boolean(required=True)


class ComparisonResultSchema(Schema):
    """Every equation that can serve the gas."""

    models = fields.List(fields.Nested(ComparedModelSchema), required=True)


class ComparisonAnswerSchema(JobAnswerSchema):
    """The answer to a comparison."""

    result = _object(ComparisonResultSchema)


def _numbers(description: str) -> fields.List:
    return fields.List(fields.Float(), required=True, allow_none=True, metadata={"description": description})


class LookupTableResultSchema(Schema):
    """A table for bilinear interpolation."""

    property = fields.String(required=True)
    pressure = _numbers("Rising; its ends are the range.")
    temperature = _numbers("Rising; its ends are the range.")
    values = fields.List(
        fields.List(fields.Float()), required=True, allow_none=True, metadata={"description": "A row for each pressure."}
    )
    max_relative_error = _maybe("Of bilinear interpolation in 32-bit arithmetic, rounding included.")
    tolerance = fields.Float(required=True)
    bytes = fields.Integer(required=True, allow_none=True, metadata={"description": "Of axes and values, 4 for each number."})


class LookupTableAnswerSchema(JobAnswerSchema):
    """The answer to a table."""

    result = _object(LookupTableResultSchema)


class BoundaryPointSchema(Schema):
    """A named point of a boundary."""

    temperature = fields.Float(required=True)
    pressure = fields.Float(required=True)
    density = _maybe("Of the gas at the triple point; else of the fluid.")


class BoundaryLineSchema(Schema):
    """A line of states."""

    temperature = fields.List(fields.Float(), required=True)
    pressure = fields.List(fields.Float(), required=True)


class PhaseBoundaryResultSchema(Schema):
    """The dew line from its lowest pressure and, for a mixture, the bubble line back; the saturation curve of a pure gas."""

    temperature = _numbers("Along the boundary.")
    pressure = _numbers("Along the boundary.")
    points = fields.Dict(
        keys=fields.String(),
        values=fields.Nested(BoundaryPointSchema),
        required=True,
        allow_none=True,
        metadata={"description": "critical, triple, cricondentherm and cricondenbar, as far as there are such."},
    )
    water_dew = fields.Nested(
        BoundaryLineSchema,
        required=True,
        allow_none=True,
        metadata={"description": "Where liquid water forms; null for a gas without water."},
    )
    complete = fields.Boolean(
        required=True, allow_none=True, metadata={"description": "Whether the line was followed back to its lowest pressure."}
    )


class PhaseBoundaryAnswerSchema(JobAnswerSchema):
    """The answer to a phase boundary."""

    result = _object(PhaseBoundaryResultSchema)
