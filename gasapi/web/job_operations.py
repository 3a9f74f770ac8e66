"""The routes of the jobs as the OpenAPI document has them. Plants and readings in the examples are invented."""

from __future__ import annotations

from typing import Any, Final

from marshmallow import Schema

from gasapi.web import job_answer_schemas as answers
from gasapi.web import job_schemas as questions
from gasapi.web.negotiation import JSON
from gasapi.web.operation import Example, Operation
from gasapi.web.table_answers import TABLE_CSV, TABLE_TEXT

__all__ = ["JOB_OPERATIONS"]

_REFUSALS: Final = (400, 401, 406, 408, 413, 415, 422, 500, 503)
_PLANT_UNITS: Final = {"pressure": "barg", "temperature": "degC"}


def _job(
    name: str,
    id: str,
    summary: str,
    description: str,
    question: type[Schema],
    answer: type[Schema],
    *examples: Example,
    more: dict[str, Any] | None = None,
) -> Operation:
    return Operation(
        "post",
        f"/v1/{name}",
        id,
        "jobs",
        summary,
        description,
        {str(JSON): answer, **(more or {})},
        body=question,
        refusals=_REFUSALS,
        examples=examples,
    )


JOB_OPERATIONS: Final[tuple[Operation, ...]] = (
    _job(
        "flow",
        "convertFlow",
        "A flow in one measure into all others",
        "Actual volume, volume at a reference condition, mass and amount, by the real gas at the line; the reference volume by "
        "the same equation. With a meter also the factor that corrects a reading made with a design density.",
        questions.FlowSchema,
        answers.FlowAnswerSchema,
        Example(
            "orifice",
            "Nitrogen through an orifice plate that was sized for another density",
            {
                "gas": "nitrogen",
                "pressure": 40,
                "temperature": 25,
                "units": {**_PLANT_UNITS, "volume_flow": "m3/h", "mass_flow": "kg/h"},
                "ambient_pressure": 100500,
                "flow": {"kind": "actual_volume", "value": 120, "unit": "m3/h"},
                "reference": "din-1343",
                "meter": {"principle": "differential_pressure", "design": {"pressure": 35, "temperature": 20}},
            },
        ),
    ),
    _job(
        "vessel",
        "weighVessel",
        "What a vessel holds, what was used, how long it lasts",
        "Mass, amount and reference volume of a cylinder, trailer or receiver; with a later state what was used; with a "
        "draw-off how long it lasts down to a minimum pressure at the vessel's temperature.",
        questions.VesselSchema,
        answers.VesselAnswerSchema,
        Example(
            "cylinder",
            "A 50 L cylinder of argon that feeds 12 L/min",
            {
                "gas": "argon",
                "volume": 50,
                "pressure": 200,
                "temperature": 15,
                "units": {**_PLANT_UNITS, "volume": "L", "duration": "h"},
                "ambient_pressure": 101325,
                "reference": "iso-13443",
                "draw_off": {"kind": "reference_volume", "value": 12, "unit": "L/min", "minimum_pressure": 20},
            },
        ),
    ),
    _job(
        "pressure-decay",
        "testLeak",
        "A leak test by pressure decay",
        "The mass lost between two states of a closed volume, compensated for temperature with the real gas, with its expanded "
        "uncertainty and whether it stands out from it.",
        questions.PressureDecaySchema,
        answers.PressureDecayAnswerSchema,
        Example(
            "receiver",
            "An air receiver over one night, with the barometer read at both ends",
            {
                "gas": "air",
                "volume": 0.5,
                "duration": 12,
                "start": {"pressure": 6.0, "temperature": 21.0, "ambient_pressure": 101300},
                "end": {"pressure": 5.91, "temperature": 18.5, "ambient_pressure": 100900},
                "input_uncertainty": {"pressure": 0.003, "temperature": 0.15},
                "leak_limit": {"value": 0.02, "unit": "mbar L/s"},
                "reference": "20C-101.325kPa",
                "units": {**_PLANT_UNITS, "duration": "h", "mass_flow": "g/h", "mass": "g"},
            },
        ),
    ),
    _job(
        "fraction-from-density",
        "findFraction",
        "The fraction of one gas in a blend of two, from a density",
        "The mixture of the two real gases that has the measured density, or the plain statement that there is none.",
        questions.FractionFromDensitySchema,
        answers.FractionFromDensityAnswerSchema,
        Example(
            "casing",
            "Hydrogen with air in it, in the casing of a generator",
            {
                "gases": ["hydrogen", "air"],
                "density": 0.45,
                "pressure": 4.0,
                "temperature": 40,
                "units": {"pressure": "bar", "temperature": "degC"},
                "input_uncertainty": {"density": 0.002, "pressure": 0.005, "temperature": 0.2},
            },
        ),
    ),
    _job(
        "molar-mass",
        "findMolarMass",
        "The molar mass from a density, and the gases that it allows",
        "From a densitometer or a weighed volume. A density is never a proof of identity: toxic candidates count first.",
        questions.MolarMassSchema,
        answers.MolarMassAnswerSchema,
        Example(
            "flare",
            "A weighed sample from a line that should hold nitrogen",
            {
                "mass": 1.152,
                "volume": 1.0,
                "pressure": 101325,
                "temperature": 296.15,
                "units": {"mass": "g", "volume": "L"},
                "input_uncertainty": {"mass": 0.003, "volume": 0.002, "pressure": 50, "temperature": 0.3},
            },
        ),
    ),
    _job(
        "comparison",
        "compareModels",
        "One state by every equation that can serve the gas",
        "How wrong is the ideal gas here, and is the choice of the equation the problem? Differences to the selected equation.",
        questions.ComparisonSchema,
        answers.ComparisonAnswerSchema,
        Example(
            "carbon-dioxide",
            "Carbon dioxide at 50 bar",
            {
                "gas": "carbon dioxide",
                "pressure": 50,
                "temperature": 40,
                "units": {"pressure": "bar", "temperature": "degC"},
            },
        ),
    ),
    _job(
        "phase-boundary",
        "traceBoundary",
        "Where a gas begins to condense",
        "The saturation curve of a pure gas, dew and bubble line of a mixture, the water line of a wet one, and named points.",
        questions.PhaseBoundarySchema,
        answers.PhaseBoundaryAnswerSchema,
        Example(
            "propane",
            "The saturation curve of propane",
            {"gas": "propane", "units": {"pressure": "bar", "temperature": "degC"}},
        ),
    ),
    _job(
        "lookup-table",
        "makeTable",
        "A small table for a controller",
        "The smallest grid found for bilinear interpolation within a tolerance, as JSON, as CSV whose first row and column are "
        "the axes, or as a function block in IEC 61131-3 Structured Text (the member format says which). A range that touches "
        "two phases is refused, and the refusal names a state where it does.",
        questions.LookupTableSchema,
        answers.LookupTableAnswerSchema,
        Example(
            "nitrogen",
            "Nitrogen, 1 to 60 bar, within 1 %",
            {
                "gas": "nitrogen",
                "pressure": [1, 60],
                "temperature": [-20, 80],
                "tolerance": 0.01,
                "units": {"pressure": "bar", "temperature": "degC"},
            },
        ),
        more={
            str(TABLE_CSV): {"type": "string", "description": "Where format is csv."},
            str(TABLE_TEXT): {"type": "string", "description": "Where format is st."},
        },
    ),
)
"""The jobs around a density, in the order of the guide."""
