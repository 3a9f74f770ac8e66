"""A flow in one measure into all others, and the factor that corrects a meter designed for another density."""

from __future__ import annotations

import math
from typing import Literal, NamedTuple

from gasapi.service.answers import StateAnswer
from gasapi.service.context import Context
from gasapi.service.joined import is_bad, joined, relative_density_uncertainty
from gasapi.service.questions import StateQuestion
from gasapi.service.reference_volume import at_reference
from gasapi.service.state import solve_state
from gasapi.units import ReferenceCondition

__all__ = ["FlowAnswer", "FlowQuestion", "FlowResult", "Meter", "answer_flow", "correction_factor"]

FlowKind = Literal["actual_volume", "reference_volume", "mass", "amount"]
Principle = Literal["differential_pressure", "volumetric"]


class Meter(NamedTuple):
    """A meter made for a design density (kg/m3), or for the density at a design pressure and temperature (Pa, K)."""

    principle: Principle
    design_density: float | None = None
    design_state: tuple[float, float] | None = None


class FlowQuestion(NamedTuple):
    """A flow at a line state: ``value`` in m3/s, kg/s or mol/s, as ``kind`` has it."""

    state: StateQuestion
    kind: FlowKind
    value: float
    reference: ReferenceCondition | None = None
    meter: Meter | None = None


class FlowResult(NamedTuple):
    """The flow in every measure: m3/s, m3/s at the reference condition, kg/s, mol/s; the factor [-] and kg/m3 of a meter.

    ``relative_expanded_uncertainty`` (k = 2) is that of the line density, which is the part of a conversion between actual
    volume and mass, amount or reference volume.
    """

    actual_volume: float | None = None
    reference_volume: float | None = None
    mass: float | None = None
    amount: float | None = None
    correction_factor: float | None = None
    design_density: float | None = None
    relative_expanded_uncertainty: float | None = None


class FlowAnswer(NamedTuple):
    """The result, and the line state with the verdict over all states behind it."""

    state: StateAnswer
    result: FlowResult


def correction_factor(principle: Principle, density: float, design_density: float) -> float:
    """Return the factor for a reading in mass or reference volume that was made with the design density, [-].

    A differential pressure gives q_m ~ sqrt(rho dp) (ISO 5167-1:2022, eq. 1), so the factor is sqrt(rho/rho_design);
    a volumetric meter gives q_m = rho q_V, so it is rho/rho_design.

    :param density: of the line state, kg/m3
    :param design_density: kg/m3
    """
    ratio = density / design_density
    return math.sqrt(ratio) if principle == "differential_pressure" else ratio


def answer_flow(context: Context, question: FlowQuestion) -> FlowAnswer:
    """Return a flow in every measure; raises as ``answer_state`` does."""
    line = solve_state(context, question.state)
    if line.density is None or line.molar_volume is None:
        return FlowAnswer(line, FlowResult())
    reference = at_reference(context, question.state, line.model.id, question.reference)
    sides = list(reference.answers)
    factor = design_density = None
    if question.meter is not None:
        design_density = question.meter.design_density
        if question.meter.design_state is not None:
            pressure, temperature = question.meter.design_state
            design = solve_state(
                context,
                question.state._replace(
                    pressure=pressure, temperature=temperature, model=line.model.id, input_uncertainty=None
                ),
            )
            sides.append(design)
            design_density = design.density
        if design_density is not None:
            factor = correction_factor(question.meter.principle, line.density, design_density)
    amount = _amount(question, line, reference.molar_volume)
    if amount is None:
        sides += reference.refused
    verdict = joined([line, *sides], reference.warnings)
    if amount is None or any(is_bad(side) for side in sides):
        return FlowAnswer(verdict, FlowResult())
    return FlowAnswer(
        verdict,
        FlowResult(
            actual_volume=amount * line.molar_volume,
            reference_volume=None if reference.molar_volume is None else amount * reference.molar_volume,
            mass=amount * line.gas.molar_mass,
            amount=amount,
            correction_factor=factor,
            design_density=design_density,
            relative_expanded_uncertainty=relative_density_uncertainty(line),
        ),
    )


def _amount(question: FlowQuestion, line: StateAnswer, reference_molar_volume: float | None) -> float | None:
    """Return the amount flow, mol/s; None where it takes a reference volume that is not known."""
    assert line.molar_volume is not None
    if question.kind == "actual_volume":
        return question.value / line.molar_volume
    if question.kind == "mass":
        return question.value / line.gas.molar_mass
    if question.kind == "amount":
        return question.value
    return None if reference_molar_volume is None else question.value / reference_molar_volume
