"""The bodies of answers, for the OpenAPI document and for tests. Nothing is dumped through them: see ``answers``."""

from __future__ import annotations

from typing import Any

from marshmallow import Schema, fields, validate

from gasapi.units import QUANTITIES

__all__ = [
    "GasEntrySchema",
    "GasListSchema",
    "HealthSchema",
    "ModelListSchema",
    "ProblemSchema",
    "ReferenceConditionListSchema",
    "StateAnswerSchema",
    "UnitTableSchema",
]

REGIONS = ("gas", "supercritical", "liquid", "two-phase", "solid-possible", "unknown")
LEVELS = ("good", "uncertain", "bad")

_PAIR = validate.Length(equal=2)


def _number(description: str = "", **kwargs: Any) -> fields.Float:
    return fields.Float(required=True, metadata={"description": description} if description else {}, **kwargs)


def _maybe(description: str = "") -> fields.Float:
    return _number(description, allow_none=True)


def _text(description: str = "", **kwargs: Any) -> fields.String:
    return fields.String(required=True, metadata={"description": description} if description else {}, **kwargs)


def _texts(description: str = "") -> fields.List:
    return fields.List(fields.String(), required=True, metadata={"description": description} if description else {})


def _fractions() -> fields.Dict:
    return fields.Dict(
        keys=fields.String(),
        values=fields.Float(),
        required=True,
        metadata={"description": "Mole fractions by catalogue id, summing to 1."},
    )


def _object(schema: type[Schema], description: str = "") -> fields.Nested:
    return fields.Nested(schema, required=True, metadata={"description": description} if description else {})


class GasSchema(Schema):
    """The gas as it was understood."""

    id = _text("Null for a mixture that was given by fractions.", allow_none=True)
    fractions = _fractions()
    molar_mass = _number("The one that the equation used.")


class PointSchema(Schema):
    """The state, always Pa absolute and K."""

    pressure = _number("Pa, absolute.")
    temperature = _number("K.")


class ResultSchema(Schema):
    """The numbers; all null in a bad answer."""

    density = _maybe()
    compressibility_factor = _maybe("Z = p V / (R T) with the equation's own R.")
    molar_volume = _maybe()
    density_expanded_uncertainty = fields.Float(
        allow_none=True,
        metadata={"description": "k = 2, the equation's own part in it (JCGM 100); given where input_uncertainty was."},
    )


class WarningSchema(Schema):
    """A warning about the phase."""

    code = _text("A snake_case word.")
    message = _text("A sentence for a person.")


class PhasePartSchema(Schema):
    """One of two phases."""

    phase_fraction = _number("Moles of this phase in a mole of the whole.")
    density = _number()
    fractions = _fractions()


class PhaseSchema(Schema):
    """Region and distance to the dew point, in the answer's units; margins are differences, positive on the gas side."""

    region = fields.String(required=True, validate=validate.OneOf(REGIONS))
    dew_point_temperature = _maybe("At the pressure of the state; null where there is none.")
    margin_temperature = _maybe()
    margin_pressure = _maybe()
    model = _text("The equation behind the verdict.", allow_none=True)
    warnings = fields.List(fields.Nested(WarningSchema), required=True)
    vapour = fields.Nested(PhasePartSchema, metadata={"description": "Given for a two-phase state that was accepted."})
    liquid = fields.Nested(PhasePartSchema, metadata={"description": "Given for a two-phase state that was accepted."})


class RangeSchema(Schema):
    """A range of states."""

    temperature = fields.List(fields.Float(), required=True, validate=_PAIR, metadata={"description": "K."})
    pressure = fields.List(fields.Float(), required=True, validate=_PAIR, metadata={"description": "Pa."})


class ModelSchema(Schema):
    """The equation behind the numbers."""

    id = _text()
    name = _text()
    source = _text("Authors, journal, year, DOI.")
    validity = _object(RangeSchema, "The published range.")
    inside_validity = fields.Boolean(required=True)
    relative_uncertainty = _maybe("Expanded (k = 2), a fraction of density at this state.")
    uncertainty_basis = _text("publication, calibration or estimate.")
    selected_because = _text()


class SensitivitySchema(Schema):
    """Derivatives of density, in the answer's units."""

    density_pressure = _maybe("At constant temperature.")
    density_temperature = _maybe("At constant pressure.")


class QualitySchema(Schema):
    """Quality after OPC UA (IEC 62541-4 and -8)."""

    level = fields.String(required=True, validate=validate.OneOf(LEVELS))
    status_code = fields.Integer(required=True, validate=validate.Range(0, 2**32 - 1))
    symbol = _text("The standard's name of the code.")
    reasons = _texts("Short snake_case words.")


class TraceSchema(Schema):
    """Where the answer comes from."""

    cached = fields.Boolean(
        required=True, metadata={"description": "Whether it was held from before; the numbers are the same."}
    )
    version = _text("Of the service.")
    data = _text("A hash over all coefficients and the code of the engine.", validate=validate.Regexp("^sha256:"))


EchoedUnitsSchema = Schema.from_dict(
    {quantity: fields.String(required=True, validate=validate.OneOf(list(units))) for quantity, units in QUANTITIES.items()},
    name="EchoedUnitsSchema",
)


class StateAnswerSchema(Schema):
    """The answer to a state question. A bad answer has status 200 and no numbers: read quality first."""

    gas = _object(GasSchema)
    state = _object(PointSchema)
    result = _object(ResultSchema)
    units = _object(EchoedUnitsSchema)
    phase = _object(PhaseSchema)
    model = _object(ModelSchema)
    sensitivity = _object(SensitivitySchema)
    quality = _object(QualitySchema)
    cautions = _texts("Hazards of the gas and limits of use, in sentences.")
    trace = _object(TraceSchema)


class FaultSchema(Schema):
    """What is wrong with one member."""

    pointer = _text("JSON pointer (RFC 6901) of the member, or of the parameter in a query.")
    detail = _text()


class ProblemSchema(Schema):
    """A problem (RFC 9457)."""

    type = _text()
    title = _text()
    status = fields.Integer(required=True)
    detail = _text()
    instance = _text()
    errors = fields.List(fields.Nested(FaultSchema))


class ConstantSchema(Schema):
    """A number with its unit and source."""

    value = _number()
    unit = _text()
    source = _text()


class GasSummarySchema(Schema):
    """A gas in a list."""

    id = _text()
    name = _text()
    formula = _text(allow_none=True)
    cas = _text("CAS number.", allow_none=True)
    synonyms = _texts()
    kind = fields.String(required=True, validate=validate.OneOf(("pure", "blend", "site")))
    hazard_tags = _texts("A missing tag means not known, never safe.")


class GasListSchema(Schema):
    """Gases."""

    gases = fields.List(fields.Nested(GasSummarySchema), required=True)


class GasModelSchema(Schema):
    """An equation that can serve the gas, with its range."""

    id = _text()
    validity = _object(RangeSchema)
    validity_basis = _text()
    extended_limits = _object(
        RangeSchema, "Beyond validity and inside these a number is uncertain; beyond these there is none."
    )


def _constant(description: str) -> fields.Nested:
    return fields.Nested(ConstantSchema, metadata={"description": description})


class GasEntrySchema(GasSummarySchema):
    """All that is known of a gas. A blend has no critical constants of its own."""

    description = _text()
    fractions = _fractions()
    molar_mass = _constant("g/mol")
    critical_temperature = _constant("K")
    critical_pressure = _constant("Pa")
    acentric_factor = _constant("1")
    critical_volume = _constant("m3/mol")
    dipole_moment = _constant("D")
    boiling_temperature = _constant("K, at 101325 Pa")
    sublimation_temperature = _constant("K, at 101325 Pa")
    triple_temperature = _constant("K")
    triple_pressure = _constant("Pa")
    melting_temperature = _constant("K, near 1 bar")
    van_der_waals_a = _constant("Pa m6/mol2")
    van_der_waals_b = _constant("m3/mol")
    hazard_basis = fields.Dict(keys=fields.String(), values=fields.String(), required=True)
    hazard_figures = fields.Dict(keys=fields.String(), values=fields.Nested(ConstantSchema), required=True)
    carcinogen_group = _text("Group of IARC.", allow_none=True)
    absorbed_through_skin = fields.Boolean(required=True)
    remarks = _texts()
    cautions = _texts()
    models = fields.List(fields.Nested(GasModelSchema), required=True)


class ReducedRangeSchema(RangeSchema):
    """A range in reduced temperature and pressure."""

    temperature = fields.List(fields.Float(), required=True, validate=_PAIR, metadata={"description": "T/Tc."})
    pressure = fields.List(fields.Float(), required=True, validate=_PAIR, metadata={"description": "p/pc."})
    basis = _text()


class ModelEntrySchema(Schema):
    """An equation of state."""

    id = _text()
    name = _text()
    source = _text()
    kind = fields.String(required=True, validate=validate.OneOf(("published", "generalised")))
    validity = fields.Nested(RangeSchema, required=True, allow_none=True)
    reduced_validity = fields.Nested(ReducedRangeSchema, required=True, allow_none=True)
    gases = fields.List(
        fields.String(),
        required=True,
        allow_none=True,
        metadata={"description": "Null where it serves any gas with constants."},
    )


class ModelListSchema(Schema):
    """Equations of state."""

    models = fields.List(fields.Nested(ModelEntrySchema), required=True)


class UnitSchema(Schema):
    """A unit: SI is value * scale + offset, plus the ambient pressure for a gauge unit."""

    scale = _number()
    offset = _number()
    gauge = fields.Boolean(required=True)
    source = _text()


class QuantitySchema(Schema):
    """A quantity and its units."""

    default = _text()
    si = _text()
    units = fields.Dict(keys=fields.String(), values=fields.Nested(UnitSchema), required=True)


class UnitTableSchema(Schema):
    """Units by quantity."""

    quantities = fields.Dict(keys=fields.String(), values=fields.Nested(QuantitySchema), required=True)


class ReferenceConditionSchema(Schema):
    """A state at which gas volumes are stated."""

    temperature = _number("K.")
    pressure = _number("Pa.")
    name = _text()
    source = _text()


class ReferenceConditionListSchema(Schema):
    """Reference conditions by id."""

    reference_conditions = fields.Dict(keys=fields.String(), values=fields.Nested(ReferenceConditionSchema), required=True)


class HealthSchema(Schema):
    """Health."""

    status = _text()
    version = fields.String()
    data = fields.String()
    checks = fields.Dict(keys=fields.String(), values=fields.String())
