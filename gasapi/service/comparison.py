"""One state by every equation that can serve the gas, so that the choice of the equation can be seen to matter or not."""

from __future__ import annotations

from typing import NamedTuple

from gasapi.service.answers import StateAnswer
from gasapi.service.context import Context
from gasapi.service.models import MODEL_IDS, why_not
from gasapi.service.questions import StateQuestion
from gasapi.service.state import solve_state

__all__ = ["ComparedModel", "ComparisonAnswer", "answer_comparison"]


class ComparedModel(NamedTuple):
    """What one equation says: kg/m3 and [-], None where it gives no number; the difference is to the selected equation."""

    id: str
    density: float | None
    compressibility_factor: float | None
    relative_difference: float | None
    relative_uncertainty: float | None
    inside_validity: bool


class ComparisonAnswer(NamedTuple):
    """The state by the selected equation, and by every equation that can serve the gas, in the order of the table of models."""

    state: StateAnswer
    models: tuple[ComparedModel, ...]


def answer_comparison(context: Context, question: StateQuestion) -> ComparisonAnswer:
    """Return a state by every equation; raises as ``answer_state`` does."""
    selected = solve_state(context, question)
    gas = context.gas(question.gas)
    compared = []
    for id in MODEL_IDS:
        if why_not(id, gas) is not None:
            continue
        answer = selected if id == selected.model.id else solve_state(context, question._replace(model=id))
        difference = None
        if answer.density is not None and selected.density is not None:
            difference = (answer.density - selected.density) / selected.density
        compared.append(
            ComparedModel(
                id,
                answer.density,
                answer.compressibility_factor,
                difference,
                answer.model.relative_uncertainty,
                answer.model.inside_validity,
            )
        )
    return ComparisonAnswer(selected, tuple(compared))
