"""What is in the line or the cylinder? From a density reading to the molar mass and to the gases that the reading allows.

A reading never proves what a gas is; the answer says so, and names toxic candidates first.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from typing import Final, NamedTuple

from gasapi.engine.models import ideal_gas
from gasapi.gases.catalogue import Catalogue
from gasapi.gases.hazards import GENERAL_CAUTION
from gasapi.gases.records import Gas
from gasapi.service.answers import GasAnswer, ModelAnswer, PhaseAnswer, PhaseWarning, StateAnswer
from gasapi.service.context import Context
from gasapi.service.joined import is_bad, joined
from gasapi.service.quality import Reason, quality_of
from gasapi.service.questions import GasSpec, StateQuestion
from gasapi.service.state import ambient_flags, solve_state

__all__ = ["GAS_CONSTANT", "Candidate", "MolarMassAnswer", "MolarMassQuestion", "MolarMassResult", "answer_molar_mass"]

GAS_CONSTANT: Final = 8.314462618
"""J/mol/K, CODATA 2018."""

DEFAULT_TOLERANCE: Final = 0.01
"""How far a candidate's density may lie from a reading whose uncertainty is not given, relative."""

_MOST_NAMED: Final = 12
_HOTTEST: Final = 1e6
_HIGHEST: Final = 1e13
_BETWEEN_PAUSES: Final = 8
_FAR_FROM_IDEAL: Final = 0.2
_SATURATION_SLACK: Final = 3.0
_BEYOND_SECOND_VIRIAL: Final = 0.1
_LIQUID_LEAST: Final = 0.9


class MolarMassQuestion(NamedTuple):
    """A density (kg/m3) at a pressure and a temperature. ``state.gas`` is the gas that it resembles where ``has_like``.

    Uncertainties are standard: that of the density relative [-], the others Pa and K; all None where none was given.
    """

    state: StateQuestion
    density: float
    has_like: bool
    density_uncertainty: float | None = None
    pressure_uncertainty: float = 0.0
    temperature_uncertainty: float = 0.0


class Candidate(NamedTuple):
    """A gas that the reading allows: kg/mol, its own density here in kg/m3, (density - reading) / reading, and its hazards."""

    id: str
    name: str
    molar_mass: float
    density: float
    relative_difference: float
    toxic: bool
    hazard_tags: tuple[str, ...]
    model: str
    level: str


class MolarMassResult(NamedTuple):
    """Molar masses in kg/mol (k = 2), Z [-], and the candidates, nearest first; None where the gas that it resembles is bad."""

    molar_mass: float | None = None
    molar_mass_ideal: float | None = None
    compressibility_factor: float | None = None
    molar_mass_expanded_uncertainty: float | None = None
    candidates: tuple[Candidate, ...] | None = None


class MolarMassAnswer(NamedTuple):
    """The result, and the state of the gas that it resembles; an ideal gas of no known composition where there is none."""

    state: StateAnswer
    result: MolarMassResult


def answer_molar_mass(
    context: Context, question: MolarMassQuestion, pause: Callable[[], None] = lambda: None
) -> MolarMassAnswer:
    """Return what a density says of a gas; raises as ``answer_state`` does.

    :param pause: called now and then, to let other work have its turn
    """
    pressure, temperature = question.state.pressure, question.state.temperature
    ideal = question.density * GAS_CONSTANT * temperature / pressure
    # the Z of two phases together would be that of neither
    like = solve_state(context, question.state._replace(accept_two_phase=False)) if question.has_like else None
    if like is not None and is_bad(like):
        return MolarMassAnswer(like, MolarMassResult())
    if not (temperature < _HOTTEST and pressure < _HIGHEST):
        return MolarMassAnswer(_unknown_gas(context, question, ideal, Reason.INPUT_BAD), MolarMassResult())
    candidates = tuple(sorted(_candidates(context, question, ideal, pause), key=lambda c: (abs(c.relative_difference), c.id)))
    warnings, caution = _words(candidates, like is None)
    state = _unknown_gas(context, question, ideal) if like is None else like
    state = joined([state], warnings)._replace(cautions=(caution, *state.cautions))
    if like is None:
        molar_mass, z = ideal, 1.0
    else:
        assert like.density is not None
        assert like.compressibility_factor is not None
        # d Z R T / p with the gas constant of the equation: Z R T / p is the molar volume of the gas that it resembles
        molar_mass, z = like.gas.molar_mass * (question.density / like.density), like.compressibility_factor
    expanded = None
    if question.density_uncertainty is not None:
        expanded = molar_mass * _relative_uncertainty(question, like, 0.0 if like is None else _model_part(like))
    return MolarMassAnswer(state, MolarMassResult(molar_mass, ideal, z, expanded, candidates))


def _relative_uncertainty(question: MolarMassQuestion, gas: StateAnswer | None, model: float) -> float:
    """Return the expanded uncertainty (k = 2) of the reading over the density of a gas, of an ideal one for None, relative.

    JCGM 100:2008, eq. 10 and 6.2.1.

    :param model: the equation's own part, relative with k = 2
    """
    if gas is None:
        by_pressure, by_temperature = 1.0 / question.state.pressure, 1.0 / question.state.temperature
    else:
        assert gas.density is not None
        assert gas.density_pressure is not None
        assert gas.density_temperature is not None
        by_pressure, by_temperature = gas.density_pressure / gas.density, gas.density_temperature / gas.density
    return 2.0 * math.hypot(
        question.density_uncertainty or 0.0,
        by_pressure * question.pressure_uncertainty,
        by_temperature * question.temperature_uncertainty,
        0.5 * model,
    )


def _model_part(answer: StateAnswer) -> float:
    return answer.model.relative_uncertainty or 0.0


def _candidates(context: Context, question: MolarMassQuestion, ideal: float, pause: Callable[[], None]) -> Iterator[Candidate]:
    tried = 0
    for gas in context.catalogue.gases:
        if not _possible(context.catalogue, gas, question, ideal):
            continue
        tried += 1
        if tried % _BETWEEN_PAUSES == 0:
            pause()
        answer = solve_state(
            context,
            question.state._replace(gas=GasSpec(gas.id), model="auto", ambient_pressure=None, accept_two_phase=False),
        )
        if answer.density is None:
            continue
        difference = (answer.density - question.density) / question.density
        allowed = DEFAULT_TOLERANCE
        if question.density_uncertainty is not None:
            # the equation's part counts too: a gas must not be ruled out because its equation is off
            allowed = _relative_uncertainty(question, answer, _model_part(answer))
        if abs(difference) <= allowed:
            tags = context.catalogue.hazard_tags(gas)
            yield Candidate(
                gas.id,
                gas.name,
                answer.gas.molar_mass,
                answer.density,
                difference,
                "toxic" in tags,
                tags,
                answer.model.id,
                answer.quality.level,
            )


def _possible(catalogue: Catalogue, gas: Gas, question: MolarMassQuestion, ideal: float) -> bool:
    """Return whether a gas may have the reading at all, by its molar mass and a rough Z; so that few equations are solved.

    Z by the second virial coefficient of Pitzer and Curl in the form of Abbott (Smith, Van Ness, Abbott, Introduction to
    Chemical Engineering Thermodynamics, 7th ed. (2005), eqs 3.61 to 3.66); where it is far from 1 nearly everything passes.
    """
    m = tc = pc = omega = 0.0
    for id, x in catalogue.components(gas):
        s = catalogue.substance(id)
        m += x * s.molar_mass
        tc += x * s.critical_temperature
        pc += x * s.critical_pressure
        omega += x * s.acentric_factor
    tr, pr = question.state.temperature / tc, question.state.pressure / pc
    may_be_gas = True
    if tr < 1.0:
        # vapour pressure by Wilson's estimate (1968)
        saturation = math.exp(5.373 * (1.0 + omega) * (1.0 - 1.0 / tr))
        may_be_gas = pr < _SATURATION_SLACK * saturation
        # a liquid is denser than the critical point, here with Z_c = 0.3
        if pr > saturation / _SATURATION_SLACK and question.density > _LIQUID_LEAST * m * pc / (0.3 * GAS_CONSTANT * tc):
            return True
    if not may_be_gas:
        return False
    # the powers of the formula, kept from running away
    tr = min(max(tr, 0.3), 100.0)
    b = 0.083 - 0.422 / tr**1.6 + omega * (0.139 - 0.172 / tr**4.2)
    departure = b * pr / tr
    ratio = m / ideal
    if pr > 1.0 or abs(departure) > _FAR_FROM_IDEAL:
        return 0.1 < ratio < 4.0
    reading = DEFAULT_TOLERANCE
    if question.density_uncertainty is not None:
        reading = 2.0 * _relative_uncertainty(question, None, 0.0) + 0.02
    slack = 0.03 + reading + abs(departure) + _BEYOND_SECOND_VIRIAL * pr / tr
    return (1.0 + departure) * (1.0 - slack) <= ratio <= (1.0 + departure) * (1.0 + slack)


def _unknown_gas(
    context: Context, question: MolarMassQuestion, molar_mass: float, reason: Reason = Reason.PHASE_UNKNOWN
) -> StateAnswer:
    """Return the state of an ideal gas of no known composition."""
    pressure, temperature = question.state.pressure, question.state.temperature
    flags = ambient_flags(question.state.ambient_pressure, pressure) | int(reason)
    return StateAnswer(
        gas=GasAnswer(None, (), molar_mass),
        pressure=pressure,
        temperature=temperature,
        density=question.density,
        compressibility_factor=1.0,
        molar_volume=molar_mass / question.density,
        density_pressure=question.density / pressure,
        density_temperature=-question.density / temperature,
        density_expanded_uncertainty=None,
        phase=PhaseAnswer("unknown", None, None, None, None, ()),
        model=ModelAnswer(
            ideal_gas.ID,
            ideal_gas.NAME,
            ideal_gas.SOURCE,
            (0.0, 0.0),
            (0.0, 0.0),
            False,
            None,
            "estimate",
            "no gas that the reading resembles was named, so that Z is taken as 1",
        ),
        quality=quality_of(flags),
        cautions=(GENERAL_CAUTION,),
        data=context.data,
    )


def _words(candidates: tuple[Candidate, ...], is_ideal: bool) -> tuple[list[PhaseWarning], str]:
    """Return the warnings of an answer and its first caution."""
    toxic = [c for c in candidates if c.toxic]
    if not candidates:
        counted = "No gas of the catalogue has this density here; a mixture, another gas or a wrong reading remain."
    elif toxic:
        names = ", ".join(c.name for c in toxic[:_MOST_NAMED]) + (", ..." if len(toxic) > _MOST_NAMED else "")
        counted = (
            f"Toxic candidates: {len(toxic)} of {len(candidates)} ({names}). "
            "Count these first, and treat the gas as toxic until an analysis has ruled them out."
        )
    else:
        counted = (
            f"{len(candidates)} gases of the catalogue have this density here, none tagged toxic; "
            "a missing tag means not known, and a mixture may hold a toxic gas all the same."
        )
    caution = f"A density is never a proof of identity: it proves nothing about what the gas is. {counted}"
    warnings = [PhaseWarning("not_a_proof_of_identity", caution)]
    if is_ideal:
        message = "The molar mass is that of an ideal gas; name a gas that it resembles (like) to take that gas's Z."
        warnings.append(PhaseWarning("ideal_gas_assumed", message))
    return warnings, caution
