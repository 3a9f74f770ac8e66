"""One state, from the question to the answer: resolve the gas, select an equation, solve, classify, judge."""

from __future__ import annotations

from typing import Final, NamedTuple

import numpy as np

from gasapi.engine.certified import CertifiedFluid
from gasapi.engine.phase.region import REGION_NAMES, Region
from gasapi.service.answers import GasAnswer, ModelAnswer, PhaseAnswer, QualityAnswer, StateAnswer
from gasapi.service.context import Context, GasModels
from gasapi.service.evaluation import Point, evaluate_float
from gasapi.service.prepared import PreparedModel
from gasapi.service.quality import BAD, Reason, quality_of
from gasapi.service.questions import StateQuestion
from gasapi.service.selection import choose
from gasapi.service.two_phase import split
from gasapi.service.uncertainty import expanded_density_uncertainty

__all__ = ["AMBIENT_SHARE", "CRITICAL_AMPLIFICATION_MOST", "Answered", "answer_state", "solve_state"]

AMBIENT_SHARE: Final = 0.1
"""The part of the absolute pressure above which an assumed ambient lowers the level."""

_TWO_PHASE: Final = int(Reason.TWO_PHASE)
_TWO_PHASE_ACCEPTED: Final = int(Reason.TWO_PHASE_ACCEPTED)
_NEAR_CRITICAL: Final = int(Reason.NEAR_CRITICAL)
_INPUT_BAD: Final = int(Reason.INPUT_BAD)
_UNKNOWN: Final = int(Region.UNKNOWN)
_LIQUID: Final = int(Region.LIQUID)

CRITICAL_AMPLIFICATION_MOST: Final = 1e3
"""The most by which a flat isotherm makes the uncertainty of a density larger than stated."""


class Answered(NamedTuple):
    """An answer, and whether it was held from before."""

    answer: StateAnswer
    cached: bool


def answer_state(context: Context, question: StateQuestion) -> Answered:
    """Return the answer to a question, from the memo where it was asked before.

    :param context: the catalogue and the caches
    :param question: the state
    :raises UnknownGas: for a name that nothing has
    :raises FractionsInvalid: for fractions that make no gas
    :raises UnknownModel: for a model id that no equation has
    :raises ModelCannotServe: for a model asked for by name that cannot serve the gas at all
    """
    held = context.states.get(question)
    if held is not None:
        return Answered(held, True)
    answer = solve_state(context, question)
    context.states.put(question, answer)
    return Answered(answer, False)


def solve_state(context: Context, question: StateQuestion) -> StateAnswer:
    """Return the answer to a question, solved afresh; raises as ``answer_state`` does."""
    gas = context.gas(question.gas)
    models = context.models(gas)
    temperature, pressure = question.temperature, question.pressure
    choice = choose(models, question.model, temperature, pressure)
    assumed = ambient_flags(question.ambient_pressure, pressure)
    cautions = models.cautions
    if choice.model is None:
        return _no_model(context, models, question, choice.because, assumed | int(Reason.NO_MODEL), cautions)
    model = models.certified(choice.model, question.accuracy)
    margin = context.dew_point_margin if question.dew_point_margin is None else question.dew_point_margin
    point = evaluate_float(model, temperature, pressure, margin)
    flags = point.flags | assumed
    bad = flags & BAD != 0
    molar_mass = model.fluid.molar_mass
    two_phase = None
    if flags & BAD == _TWO_PHASE and question.accept_two_phase:
        two_phase = split(model, gas.components, temperature, pressure)
        if two_phase is not None:
            flags = flags & ~_TWO_PHASE | _TWO_PHASE_ACCEPTED
    density = z = volume = slope_p = slope_t = expanded = None
    uncertainty = point.uncertainty
    if two_phase is not None:
        bad = False
        molar = two_phase.density
        density = molar * molar_mass
        volume = 1.0 / molar
        z = pressure / (molar * model.fluid.gas_constant * temperature)
    elif not bad:
        assert point.derivatives is not None
        molar = point.density
        _, p_rho, p_t = point.derivatives
        density = molar * molar_mass
        volume = 1.0 / molar
        z = pressure / (molar * model.fluid.gas_constant * temperature)
        slope_p = molar_mass / p_rho
        slope_t = -molar_mass * p_t / p_rho
        if uncertainty is not None and flags & _NEAR_CRITICAL:
            uncertainty = _amplified(uncertainty, molar * p_rho / pressure)
        if question.input_uncertainty is not None:
            expanded = expanded_density_uncertainty(
                density, slope_p, slope_t, *question.input_uncertainty, uncertainty if uncertainty is not None else 0.0
            )
    return StateAnswer(
        gas=GasAnswer(gas.id, tuple(zip(gas.components, model.fractions, strict=True)), molar_mass),
        pressure=pressure,
        temperature=temperature,
        density=density,
        compressibility_factor=z,
        molar_volume=volume,
        density_pressure=slope_p,
        density_temperature=slope_t,
        density_expanded_uncertainty=expanded,
        phase=phase_answer(model, temperature, pressure, point, margin),
        model=model_answer(
            model, temperature, pressure, point, uncertainty, choice.because + table_words(model, point, temperature, pressure)
        ),
        quality=quality_of(flags),
        cautions=cautions,
        data=context.data,
        two_phase=None if two_phase is None else two_phase.answer,
    )


def table_words(model: PreparedModel, point: Point, temperature: float, pressure: float) -> str:
    """Return what is to be said of a density that a certified table gave, nothing where it was solved for."""
    fluid = model.fluid
    if not isinstance(fluid, CertifiedFluid) or point.flags & BAD or point.region == _LIQUID:
        return ""
    certificate = fluid.certificate(np.array([temperature]), np.array([pressure]))
    if certificate.largest_error is None:
        return ""
    return f"; density from a certified table, its largest error {certificate.largest_error:.2g}"


def ambient_flags(ambient: float | None, pressure: float) -> int:
    """Return the reasons that an assumed ambient pressure gives (Pa, None where none was assumed)."""
    if ambient is None:
        return 0
    flags = int(Reason.AMBIENT_PRESSURE_ASSUMED)
    return flags | int(Reason.AMBIENT_PRESSURE_MATTERS) if ambient > AMBIENT_SHARE * pressure else flags


def _amplified(uncertainty: float, stiffness: float) -> float:
    """Return what a relative pressure uncertainty does to a density where the isotherm is nearly flat."""
    least = 1.0 / CRITICAL_AMPLIFICATION_MOST
    return uncertainty / min(1.0, max(least, stiffness))


def model_answer(
    model: PreparedModel, temperature: float, pressure: float, point: Point, uncertainty: float | None, because: str
) -> ModelAnswer:
    """Return what an answer says of its equation at one state."""
    v = model.validity
    inside = v.temperature_min <= temperature <= v.temperature_max and pressure <= v.pressure_max
    basis = model.uncertainty.basis
    if uncertainty is not None:
        basis = model.uncertainty.basis_at(temperature, pressure, point.density)
    return ModelAnswer(
        model.id,
        model.name,
        model.source,
        (v.temperature_min, v.temperature_max),
        (0.0, v.pressure_max),
        inside,
        uncertainty,
        basis,
        because,
    )


def phase_answer(model: PreparedModel, temperature: float, pressure: float, point: Point, margin: float) -> PhaseAnswer:
    """Return what an answer says of the phase at one state."""
    judge = model.phase
    if point.flags & _INPUT_BAD or point.region == _UNKNOWN:
        return PhaseAnswer(REGION_NAMES[point.region], None, None, None, judge.model, ())
    m = judge.margins(temperature, pressure, None if point.flags & BAD else point.density, point.region, margin, point.surveyed)
    return PhaseAnswer(
        REGION_NAMES[point.region], m.dew_point_temperature, m.margin_temperature, m.margin_pressure, judge.model, m.warnings
    )


def _no_model(
    context: Context, models: GasModels, question: StateQuestion, because: str, flags: int, cautions: tuple[str, ...]
) -> StateAnswer:
    gas = models.gas
    molar_mass = sum(x * s.molar_mass for x, s in zip(models.mole_fractions, gas.substances, strict=True))
    quality: QualityAnswer = quality_of(flags)
    return StateAnswer(
        gas=GasAnswer(gas.id, tuple(zip(gas.components, models.mole_fractions, strict=True)), molar_mass),
        pressure=question.pressure,
        temperature=question.temperature,
        density=None,
        compressibility_factor=None,
        molar_volume=None,
        density_pressure=None,
        density_temperature=None,
        density_expanded_uncertainty=None,
        phase=PhaseAnswer("unknown", None, None, None, None, ()),
        model=ModelAnswer("none", "no equation", "", (0.0, 0.0), (0.0, 0.0), False, None, "estimate", because),
        quality=quality,
        cautions=cautions,
        data=context.data,
    )
