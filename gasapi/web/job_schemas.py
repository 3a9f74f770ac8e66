"""The bodies of the jobs around a density. What every question has stands in ``schemas``."""

from __future__ import annotations

from marshmallow import RAISE

from gasapi.web import fields, job_fields
from gasapi.web.schemas import QuestionSchema, StateSchema

__all__ = [
    "ComparisonSchema",
    "FlowSchema",
    "FractionFromDensitySchema",
    "LookupTableSchema",
    "MolarMassSchema",
    "PhaseBoundarySchema",
    "PressureDecaySchema",
    "VesselSchema",
]

_PRESSURE = "In the unit of units.pressure."
_TEMPERATURE = "In the unit of units.temperature."
_UNCERTAINTY = "Standard uncertainties of the readings of the first state, in the units of the question."
_REFERENCE = "A reference condition by name, or its temperature (K) and pressure (Pa)."


class JobSchema(QuestionSchema):
    """What every job has beyond a question about a gas."""

    accept_two_phase = fields.Flag(
        default=False, description="Take the density of a two-phase mixture as uncertain in place of a bad answer."
    )
    dew_point_margin = fields.Number(
        least=0.0, most=1000.0, description="K; how near to the dew point the answer says near_dew_point. Left out: 5."
    )
    accuracy = fields.Number(
        least=1e-12, most=0.1, description="A relative error that allows a certified table in place of the exact solve."
    )


class FlowSchema(JobSchema):
    """A flow at a line state."""

    pressure = fields.Number(required=True, description=_PRESSURE)
    temperature = fields.Number(required=True, description=_TEMPERATURE)
    flow = job_fields.Flow(required=True, description="The flow in one measure; the answer has all.")
    reference = fields.Reference(description=_REFERENCE)
    meter = job_fields.Meter(description="A meter whose reading, made with a design density, is to be corrected.")
    input_uncertainty = fields.Uncertainties(("pressure", "temperature"), description=_UNCERTAINTY)


class VesselSchema(JobSchema):
    """A vessel with gas in it."""

    volume = job_fields.VesselVolume(required=True, description="The inner (water) volume, in the unit of units.volume.")
    pressure = fields.Number(required=True, description=_PRESSURE)
    temperature = fields.Number(required=True, description=_TEMPERATURE)
    reference = fields.Reference(description=_REFERENCE)
    later = job_fields.Readings(description="A second state of the same vessel: the answer says what was used.")
    draw_off = job_fields.DrawOffRate(description="A steady draw-off: the answer says how long the content lasts.")
    input_uncertainty = fields.Uncertainties(("pressure", "temperature"), description=_UNCERTAINTY)


class PressureDecaySchema(JobSchema):
    """A leak test of a closed volume."""

    volume = job_fields.VesselVolume(required=True, description="The inner volume, in the unit of units.volume.")
    duration = job_fields.Duration(required=True, description="From start to end, in the unit of units.duration.")
    start = job_fields.Readings(required=True, description="The readings at the start.")
    end = job_fields.Readings(required=True, description="The readings at the end.")
    input_uncertainty = fields.Uncertainties(
        ("pressure", "temperature"), description="Standard uncertainties of each reading, in the units of the question."
    )
    correlation = job_fields.Correlations(
        description="Of the start with the end reading of the same instrument; left out: 0, independent."
    )
    reference = fields.Reference(description=_REFERENCE)
    leak_limit = job_fields.LeakLimit(description="A leak rate that the test should resolve.")


class FractionFromDensitySchema(JobSchema):
    """A density of a blend of two gases."""

    class Meta:
        """The gas is what is asked for."""

        unknown = RAISE
        exclude = ("gas",)

    gases = job_fields.GasPair(required=True, description="The two gases; the answer is the fraction of the first.")
    density = fields.Number(above=0.0, required=True, description="As measured, in the unit of units.density.")
    pressure = fields.Number(required=True, description=_PRESSURE)
    temperature = fields.Number(required=True, description=_TEMPERATURE)
    input_uncertainty = fields.Uncertainties(
        ("density", "pressure", "temperature"), description="Standard uncertainties, in the units of the question."
    )


class MolarMassSchema(JobSchema):
    """A density, or a mass in a volume, of a gas that is not known."""

    class Meta:
        """The gas is what is asked for."""

        unknown = RAISE
        exclude = ("gas",)

    density = fields.Number(above=0.0, description="As measured, in the unit of units.density; or give mass and volume.")
    mass = fields.Number(above=0.0, description="In the unit of units.mass, with volume.")
    volume = job_fields.VesselVolume(description="In the unit of units.volume, with mass.")
    pressure = fields.Number(required=True, description=_PRESSURE)
    temperature = fields.Number(required=True, description=_TEMPERATURE)
    like = fields.Gas(description="A gas or mixture that it resembles, whose compressibility factor is taken.")
    input_uncertainty = fields.Uncertainties(
        ("density", "mass", "volume", "pressure", "temperature"),
        description="Standard uncertainties, in the units of the question.",
    )


class ComparisonSchema(StateSchema):
    """One state, by every equation."""


class LookupTableSchema(JobSchema):
    """A table for bilinear interpolation."""

    pressure = job_fields.Range(required=True, description="Low and high end, in the unit of units.pressure.")
    temperature = job_fields.Range(required=True, description="Low and high end, in the unit of units.temperature.")
    property = fields.Choice(
        ("density", "compressibility_factor", "molar_volume"), default="density", description="What the table holds."
    )
    tolerance = job_fields.Tolerance(required=True, description="The largest relative error of interpolation.")
    format = fields.Choice(("json", "csv", "st"), default="json", description="st: IEC 61131-3 Structured Text.")
    name = job_fields.Identifier(description="The name of the function block; left out: made of property and gas.")


class PhaseBoundarySchema(JobSchema):
    """The phase boundary of a gas."""
