"""The content of a vessel, what was used of it, and how long it lasts."""

from __future__ import annotations

from typing import Literal, NamedTuple

from gasapi.service.answers import StateAnswer
from gasapi.service.context import Context
from gasapi.service.joined import is_bad, joined, relative_density_uncertainty
from gasapi.service.questions import StateQuestion
from gasapi.service.reference_volume import at_reference
from gasapi.service.state import solve_state
from gasapi.units import ReferenceCondition

__all__ = ["Content", "DrawOff", "VesselAnswer", "VesselQuestion", "VesselResult", "answer_vessel"]

DrawOffKind = Literal["reference_volume", "mass", "amount"]


class DrawOff(NamedTuple):
    """A steady draw-off (m3/s at reference, kg/s or mol/s) down to a pressure (Pa) at the vessel's temperature."""

    kind: DrawOffKind
    value: float
    minimum_pressure: float
    ambient_pressure: float | None = None


class VesselQuestion(NamedTuple):
    """A vessel of a volume (m3); ``later`` is a second state of it, ``draw_off`` what is taken from it."""

    state: StateQuestion
    volume: float
    reference: ReferenceCondition | None = None
    later: StateQuestion | None = None
    draw_off: DrawOff | None = None


class Content(NamedTuple):
    """An amount of gas in kg, mol and m3 at the reference condition; None where it is not known."""

    mass: float | None = None
    amount: float | None = None
    reference_volume: float | None = None


class VesselResult(NamedTuple):
    """What is held, what was used up to the later state, what can be used down to the minimum, and for how long (s).

    ``relative_expanded_uncertainty`` (k = 2) of what is held is that of the density; the volume is taken as it was given.
    """

    held: Content = Content()
    used: Content = Content()
    usable: Content = Content()
    duration: float | None = None
    relative_expanded_uncertainty: float | None = None


class VesselAnswer(NamedTuple):
    """The result, and the state of the vessel with the verdict over all states behind it."""

    state: StateAnswer
    result: VesselResult


def answer_vessel(context: Context, question: VesselQuestion) -> VesselAnswer:
    """Return the content of a vessel; raises as ``answer_state`` does."""
    first = solve_state(context, question.state)
    if is_bad(first):
        return VesselAnswer(first, VesselResult())
    reference = at_reference(context, question.state, first.model.id, question.reference)
    sides = list(reference.answers)
    later = low = None
    if question.later is not None:
        later = solve_state(context, question.later._replace(model=first.model.id, input_uncertainty=None))
        sides.append(later)
    if question.draw_off is not None:
        low = solve_state(
            context,
            question.state._replace(
                pressure=question.draw_off.minimum_pressure,
                ambient_pressure=question.draw_off.ambient_pressure,
                input_uncertainty=None,
                model=first.model.id,
            ),
        )
        sides.append(low)
    verdict = joined([first, *sides], reference.warnings)
    if any(is_bad(side) for side in sides):
        return VesselAnswer(verdict, VesselResult())

    def content(of: StateAnswer, less: StateAnswer | None = None) -> Content:
        assert of.density is not None
        density = of.density if less is None or less.density is None else of.density - less.density
        amount = density * question.volume / of.gas.molar_mass
        volume = None if reference.molar_volume is None else amount * reference.molar_volume
        return Content(density * question.volume, amount, volume)

    usable = Content() if low is None else content(first, low)
    return VesselAnswer(
        verdict,
        VesselResult(
            held=content(first),
            used=Content() if later is None else content(first, later),
            usable=usable,
            relative_expanded_uncertainty=relative_density_uncertainty(first),
            duration=None if question.draw_off is None else _duration(usable, question.draw_off),
        ),
    )


def _duration(usable: Content, draw_off: DrawOff) -> float | None:
    """Return how long a draw-off can last, s."""
    held = {"mass": usable.mass, "amount": usable.amount, "reference_volume": usable.reference_volume}[draw_off.kind]
    return None if held is None else held / draw_off.value
