"""The molar volume of a gas at a reference condition: the real gas, by the equation of the line state."""

from __future__ import annotations

from typing import NamedTuple

from gasapi.service.answers import PhaseWarning, StateAnswer
from gasapi.service.context import Context
from gasapi.service.joined import is_bad
from gasapi.service.questions import StateQuestion
from gasapi.service.state import solve_state
from gasapi.units import ReferenceCondition

__all__ = ["ReferenceState", "at_reference"]


class ReferenceState(NamedTuple):
    """The gas at the reference condition.

    ``molar_volume`` is in m3/mol, None where no condition was asked or the gas is no gas there; ``answers`` is the state behind
    it; where it gave no volume it is in ``refused`` instead, and ``warnings`` say why.
    """

    molar_volume: float | None
    answers: tuple[StateAnswer, ...] = ()
    refused: tuple[StateAnswer, ...] = ()
    warnings: tuple[PhaseWarning, ...] = ()


def at_reference(context: Context, line: StateQuestion, model: str, condition: ReferenceCondition | None) -> ReferenceState:
    """Return the state of a gas at a reference condition.

    :param line: the question about the line state, of which the gas and the options are taken
    :param model: the equation of the line state, by id
    :param condition: K and Pa, None where none is asked
    """
    if condition is None:
        return ReferenceState(None)
    answer = solve_state(
        context,
        line._replace(
            pressure=condition.pressure,
            temperature=condition.temperature,
            model=model,
            ambient_pressure=None,
            accept_two_phase=False,
            input_uncertainty=None,
        ),
    )
    if is_bad(answer) or answer.phase.region == "liquid":
        message = (
            f"At the reference condition ({condition.temperature:g} K, {condition.pressure:g} Pa) this is no plain gas "
            f"({', '.join(answer.quality.reasons) or answer.phase.region}); no reference volume is given."
        )
        return ReferenceState(None, (), (answer,), (PhaseWarning("no_gas_at_reference", message),))
    return ReferenceState(answer.molar_volume, (answer,))
