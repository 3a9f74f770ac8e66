"""Answers of the jobs in the caller's units. Nothing is computed here.

Every answer has ``gas``, ``units``, ``model``, ``phase``, ``quality``, ``cautions`` and ``trace`` as a state has them, and
the ``result`` of its job.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from gasapi.service.answers import StateAnswer
from gasapi.service.comparison import ComparisonAnswer
from gasapi.service.flow import FlowAnswer, FlowQuestion
from gasapi.service.fraction_from_density import FractionFromDensityAnswer, FractionFromDensityQuestion
from gasapi.service.molar_mass import MolarMassAnswer, MolarMassQuestion
from gasapi.service.phase_boundary import Line, PhaseBoundaryAnswer
from gasapi.service.pressure_decay import PressureDecayAnswer, PressureDecayQuestion
from gasapi.service.questions import GasSpec, StateQuestion
from gasapi.service.state import Answered
from gasapi.service.vessel import Content, VesselAnswer, VesselQuestion
from gasapi.units import UnitMap
from gasapi.web.answers import state_members
from gasapi.web.job_questions import PhaseBoundaryAsked
from gasapi.web.problems import pointer
from gasapi.web.questions import Asked

__all__ = [
    "comparison_members",
    "flow_members",
    "fraction_from_density_members",
    "job_members",
    "molar_mass_members",
    "phase_boundary_members",
    "pressure_decay_members",
    "vessel_members",
]

Members = dict[str, Any]

_PASCAL_TO_MILLIBAR_LITRE = 10.0  # 1 Pa m3 = 10 mbar L
_CM3_PER_MINUTE = 6e7  # in 1 m3/s


def job_members(state: StateAnswer, units: UnitMap, result: Members) -> Members:
    """Return the members of a job's answer around its result."""
    question = StateQuestion(GasSpec(), state.pressure, state.temperature)
    members = state_members(Asked(question, units, pointer), Answered(state, False))
    return {
        "gas": members["gas"],
        "result": result,
        "units": members["units"],
        "phase": members["phase"],
        "model": members["model"],
        "quality": members["quality"],
        "cautions": members["cautions"],
        "trace": members["trace"],
    }


def _writer(units: UnitMap) -> Callable[[str, float | None], float | None]:
    """Return what puts a value of SI into the caller's units."""

    def write(quantity: str, value: float | None) -> float | None:
        return None if value is None else units[quantity].from_si(value)

    return write


def flow_members(question: FlowQuestion, units: UnitMap, answer: FlowAnswer) -> Members:
    """Return the answer to a flow."""
    write, found = _writer(units), answer.result
    result: Members = {
        "actual_volume": write("volume_flow", found.actual_volume),
        "reference_volume": write("volume_flow", found.reference_volume),
        "mass": write("mass_flow", found.mass),
        "amount": write("amount_flow", found.amount),
    }
    if question.meter is not None:
        result["correction_factor"] = found.correction_factor
        result["design_density"] = write("density", found.design_density)
    if question.state.input_uncertainty is not None:
        result["relative_expanded_uncertainty"] = found.relative_expanded_uncertainty
    return job_members(answer.state, units, result)


def vessel_members(question: VesselQuestion, units: UnitMap, answer: VesselAnswer) -> Members:
    """Return the answer to a vessel."""
    write, found = _writer(units), answer.result

    def content(of: Content, prefix: str = "") -> Members:
        return {
            f"{prefix}mass": write("mass", of.mass),
            f"{prefix}amount": write("amount", of.amount),
            f"{prefix}reference_volume": write("volume", of.reference_volume),
        }

    result = content(found.held)
    if question.later is not None:
        result |= content(found.used, "used_")
    if question.draw_off is not None:
        result |= content(found.usable, "usable_")
        result["duration"] = write("duration", found.duration)
    if question.state.input_uncertainty is not None:
        result["relative_expanded_uncertainty"] = found.relative_expanded_uncertainty
    return job_members(answer.state, units, result)


def pressure_decay_members(question: PressureDecayQuestion, units: UnitMap, answer: PressureDecayAnswer) -> Members:
    """Return the answer to a leak test; the throughputs and the flow in cm3/min have the units in their names."""
    write, found = _writer(units), answer.result
    throughput, flow = found.throughput, found.reference_volume_flow
    result: Members = {
        "lost_mass": write("mass", found.lost_mass),
        "leak_rate": write("mass_flow", found.leak_rate),
        "lost_mass_expanded_uncertainty": write("mass", found.lost_mass_expanded_uncertainty),
        "leak_rate_expanded_uncertainty": write("mass_flow", found.leak_rate_expanded_uncertainty),
        "resolved": found.resolved,
        "throughput_pa_m3_per_s": throughput,
        "throughput_mbar_l_per_s": None if throughput is None else throughput * _PASCAL_TO_MILLIBAR_LITRE,
        "throughput_temperature": write("temperature", found.throughput_temperature),
        "reference_volume_flow": write("volume_flow", flow),
        "reference_cm3_per_min": None if flow is None else flow * _CM3_PER_MINUTE,
    }
    if question.limit is not None:
        result["duration_to_resolve"] = write("duration", found.duration_to_resolve)
    return job_members(answer.state, units, result)


def fraction_from_density_members(
    question: FractionFromDensityQuestion, units: UnitMap, answer: FractionFromDensityAnswer
) -> Members:
    """Return the answer to a density of a blend."""
    found = answer.result
    result: Members = {
        "mole_fraction": found.mole_fraction,
        "molar_mass": _writer(units)("molar_mass", found.molar_mass),
        "explained": found.explained,
    }
    if question.uncertainty is not None:
        result["mole_fraction_expanded_uncertainty"] = found.mole_fraction_expanded_uncertainty
    return job_members(answer.state, units, result)


def molar_mass_members(question: MolarMassQuestion, units: UnitMap, answer: MolarMassAnswer) -> Members:
    """Return the answer to a density of a gas that is not known; without a gas that it resembles, ``gas`` is null."""
    write, found = _writer(units), answer.result
    candidates = None
    if found.candidates is not None:
        candidates = [
            {
                "id": c.id,
                "name": c.name,
                "molar_mass": write("molar_mass", c.molar_mass),
                "density": write("density", c.density),
                "relative_difference": c.relative_difference,
                "toxic": c.toxic,
                "hazard_tags": c.hazard_tags,
                "model": c.model,
                "level": c.level,
            }
            for c in found.candidates
        ]
    result: Members = {
        "molar_mass": write("molar_mass", found.molar_mass),
        "molar_mass_ideal": write("molar_mass", found.molar_mass_ideal),
        "compressibility_factor": found.compressibility_factor,
        "molar_mass_expanded_uncertainty": write("molar_mass", found.molar_mass_expanded_uncertainty),
        "candidates": candidates,
    }
    members = job_members(answer.state, units, result)
    if not question.has_like:
        members["gas"] = None
    return members


def comparison_members(question: StateQuestion, units: UnitMap, answer: ComparisonAnswer) -> Members:
    """Return the answer to a comparison."""
    write = _writer(units)
    models = [
        {
            "id": m.id,
            "density": write("density", m.density),
            "compressibility_factor": m.compressibility_factor,
            "relative_difference": m.relative_difference,
            "relative_uncertainty": m.relative_uncertainty,
            "inside_validity": m.inside_validity,
        }
        for m in answer.models
    ]
    return job_members(answer.state, units, {"models": models})


def phase_boundary_members(question: PhaseBoundaryAsked, units: UnitMap, answer: PhaseBoundaryAnswer) -> Members:
    """Return the answer to a phase boundary; arrays are null where no equation tells it."""
    boundary = answer.boundary

    def line(of: Line) -> Members:
        return {
            "temperature": [units.temperature.from_si(t) for t in of.temperature],
            "pressure": [units.pressure.from_si(p, question.ambient) for p in of.pressure],
        }

    result: Members = {"temperature": None, "pressure": None, "points": None, "water_dew": None, "complete": None}
    if boundary is not None:
        result |= line(boundary.line)
        result["points"] = {
            name: {
                "temperature": units.temperature.from_si(temperature),
                "pressure": units.pressure.from_si(pressure, question.ambient),
                "density": None if density is None else units.density.from_si(density),
            }
            for name, (temperature, pressure, density) in boundary.points
        }
        result["water_dew"] = line(boundary.water) if boundary.water.temperature else None
        result["complete"] = boundary.complete
    return job_members(answer.state, units, result)
