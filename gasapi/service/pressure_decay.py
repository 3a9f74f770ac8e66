"""A leak test by pressure decay: the mass lost between two states of a closed volume, and whether it stands out.

The temperature is compensated with the real gas, since both masses come from density. Uncertainty after JCGM 100:2008,
eq. 13 (correlated inputs) with coverage factor 2 (6.2.1): the four readings are independent unless a correlation between the
start and the end reading of the same instrument is given. The equation's own uncertainty is common to both states and left
out; so is the volume's, which scales the loss and cannot make one.
"""

from __future__ import annotations

import math
from typing import NamedTuple

from gasapi.service.answers import PhaseWarning, StateAnswer
from gasapi.service.context import Context
from gasapi.service.joined import is_bad, joined
from gasapi.service.questions import InputUncertainty, StateQuestion
from gasapi.service.reference_volume import at_reference
from gasapi.service.state import solve_state
from gasapi.units import ReferenceCondition

__all__ = [
    "Correlation",
    "LeakLimit",
    "PressureDecayAnswer",
    "PressureDecayQuestion",
    "PressureDecayResult",
    "answer_pressure_decay",
    "lost_mass_uncertainty",
]

COVERAGE = 2.0
"""The coverage factor k of every expanded uncertainty."""


_GAINED = PhaseWarning(
    "mass_gained",
    "The volume holds more at the end than at the start, by more than the uncertainty: gas flowed in, the gas was not at the "
    "measured temperature, or a reading is wrong. This is no proof of tightness.",
)


class Correlation(NamedTuple):
    """The correlation coefficient of the start and the end reading of pressure and of temperature, [-], within -1 to 1."""

    pressure: float = 0.0
    temperature: float = 0.0


class LeakLimit(NamedTuple):
    """A leak rate that a test should be able to resolve: in kg/s, or as a throughput p dV/dt in Pa m3/s."""

    value: float
    is_throughput: bool


class PressureDecayQuestion(NamedTuple):
    """A closed volume (m3) at two states, ``duration`` s apart; ``uncertainty`` holds for the readings of both."""

    start: StateQuestion
    end: StateQuestion
    volume: float
    duration: float
    uncertainty: InputUncertainty | None = None
    correlation: Correlation = Correlation()
    reference: ReferenceCondition | None = None
    limit: LeakLimit | None = None


class PressureDecayResult(NamedTuple):
    """The loss in kg and kg/s, both with k = 2, if it is resolved; Pa m3/s at ``throughput_temperature`` K; m3/s at reference.

    ``duration_to_resolve`` (s) is how long the test would have to run for a leak at the limit to equal the uncertainty.
    """

    lost_mass: float | None = None
    leak_rate: float | None = None
    lost_mass_expanded_uncertainty: float | None = None
    leak_rate_expanded_uncertainty: float | None = None
    resolved: bool | None = None
    throughput: float | None = None
    throughput_temperature: float | None = None
    reference_volume_flow: float | None = None
    duration_to_resolve: float | None = None


class PressureDecayAnswer(NamedTuple):
    """The result, and the start state with the verdict over all states behind it."""

    state: StateAnswer
    result: PressureDecayResult


def lost_mass_uncertainty(
    volume: float, start: StateAnswer, end: StateAnswer, uncertainty: InputUncertainty, correlation: Correlation
) -> float | None:
    """Return the expanded uncertainty (k = 2) of a lost mass, kg.

    :param volume: m3
    :param start: with sensitivities
    :param end: with sensitivities
    :param uncertainty: standard, Pa and K
    :param correlation: of the start with the end reading, [-]
    :returns: None where a state has no sensitivities, as two phases together have not
    """
    variance = 0.0
    for first, last, u, r in (
        (start.density_pressure, end.density_pressure, uncertainty.pressure, correlation.pressure),
        (start.density_temperature, end.density_temperature, uncertainty.temperature, correlation.temperature),
    ):
        if first is None or last is None:
            return None
        a, b = volume * first * u, volume * last * u
        # (a - b)^2 and the rest kept apart, so that full correlation of equal parts gives zero and not rounding
        variance += (a - b) * (a - b) + 2.0 * (1.0 - r) * a * b
    return COVERAGE * math.sqrt(max(variance, 0.0))


def answer_pressure_decay(context: Context, question: PressureDecayQuestion) -> PressureDecayAnswer:
    """Return what a leak test shows; raises as ``answer_state`` does."""
    start = solve_state(context, question.start)
    end = solve_state(context, question.end._replace(model=start.model.id)) if not is_bad(start) else start
    warnings = _warnings(question)
    if start.density is None or end.density is None:
        return PressureDecayAnswer(joined([start, end], warnings), PressureDecayResult())
    reference = at_reference(context, question.start, start.model.id, question.reference)
    lost = question.volume * (start.density - end.density)
    rate = lost / question.duration
    expanded = None
    if question.uncertainty is not None:
        expanded = lost_mass_uncertainty(question.volume, start, end, question.uncertainty, question.correlation)
        if expanded is not None and lost < -expanded:
            warnings = (*warnings, _GAINED)
    if question.reference is not None:
        temperature = question.reference.temperature
    else:
        temperature = 0.5 * (question.start.temperature + question.end.temperature)
    # p dV/dt of the leaked gas, taken as ideal at the pressure of the surroundings: n R T (EN 1330-8, from memory)
    per_mass = _gas_constant(start) * temperature / start.gas.molar_mass
    return PressureDecayAnswer(
        joined([start, end, *reference.answers], (*warnings, *reference.warnings)),
        PressureDecayResult(
            lost_mass=lost,
            leak_rate=rate,
            lost_mass_expanded_uncertainty=expanded,
            leak_rate_expanded_uncertainty=None if expanded is None else expanded / question.duration,
            resolved=None if expanded is None else lost > expanded,
            throughput=rate * per_mass,
            throughput_temperature=temperature,
            reference_volume_flow=(
                None if reference.molar_volume is None else rate / start.gas.molar_mass * reference.molar_volume
            ),
            duration_to_resolve=_duration_to_resolve(question.limit, expanded, per_mass),
        ),
    )


def _gas_constant(answer: StateAnswer) -> float:
    """Return the gas constant behind a compressibility factor, J/mol/K: Z = p V / (R T)."""
    assert answer.molar_volume is not None
    assert answer.compressibility_factor is not None
    return answer.pressure * answer.molar_volume / (answer.compressibility_factor * answer.temperature)


def _duration_to_resolve(limit: LeakLimit | None, expanded: float | None, per_mass: float) -> float | None:
    if limit is None or expanded is None:
        return None
    return expanded / (limit.value / per_mass if limit.is_throughput else limit.value)


def _warnings(question: PressureDecayQuestion) -> tuple[PhaseWarning, ...]:
    rise = question.end.temperature - question.start.temperature
    if not rise > 0.0:
        return ()
    message = (
        f"The end is {rise:.4g} K warmer than the start: warming raises the pressure and can hide a leak. The temperature is "
        "compensated here, as well as the gas temperature was measured; let the volume settle and repeat the test if in doubt."
    )
    return (PhaseWarning("end_warmer_than_start", message),)
